"""Typed bills against a total that is printed elsewhere.

What belongs here: the comparison, and where to look first when it fails.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from normalize.bills.amounts import number_of, split_amount
from normalize.bills.periods import Bills
from normalize.days import iso
from normalize.errors import BillError

if TYPE_CHECKING:
    from normalize.bills.accounts import FileAccounts


def check_total(bills: Bills, expected: str) -> str:
    """A sentence when use adds up to ``expected``.  Raises BillError, with what may be wrong.

    expected : as printed; it is right to half of its last digit.
    """
    wanted = number_of(expected, "point")
    if wanted is None or abs(wanted) > 1e15:
        raise BillError(
            f"the expected total {expected[:30]!r} is not a number", wanted="one such as 1074.8"
        )
    total = float(bills.periods.use.sum())
    unit = bills.unit
    if abs(total - wanted) <= _half_digit(expected) + 1e-9 * abs(wanted):
        return f"The bills add up to {total:,.10g} {unit}, as expected."
    gap = total - wanted
    raise BillError(
        f"the bills add up to {total:,.10g} {unit}, {abs(gap):,.6g} "
        f"{'more' if gap > 0 else 'less'} than the {wanted:,.10g} expected",
        where=bills.source[0][0] if bills.source else "",
        next_step=_where_to_look(bills, gap),
    )


def check_totals(found: FileAccounts, expected: Sequence[str]) -> list[str]:
    """Sentences for totals such as "5678=1074.8", one account each.

    Raises BillError where a total does not agree, names no account or more than one: totals of
    several accounts are never compared with one number.
    """
    from normalize.bills.groups import Group, named

    groups = [Group((*a.names, a.label), a.fuel, ()) for a in found.accounts]
    said = []
    for text in expected:
        name, _, total = text.rpartition("=")
        hits = [groups.index(g) for g in named(groups, name)] if name else []
        account = found.accounts[hits[0]] if len(hits) == 1 else None
        if account is None or account.bills is None:
            shown = " or ".join(f'"{a.label}={total}"' for a in found.accounts[:3])
            raise BillError(
                f"the expected total {text[:40]!r} does not say of which account it is"
                if account is None
                else f"account {account.label} could not be read",
                where=found.name,
                wanted="the account and its total, for accounts are never added up",
                next_step=f"Write --expect-total {shown}, one for each account.",
            )
        said.append(f"{account.label}: {check_total(account.bills, total)}")
    return said


def _half_digit(text: str) -> float:
    amount = split_amount(text)
    decimals = len(amount.body.partition(".")[2]) if amount is not None else 0
    return 0.5 * 10.0**-decimals


def _where_to_look(bills: Bills, gap: float) -> str:
    close = 1e-6 * max(1.0, abs(gap))
    left_out = {e.line for e in bills.ledger if e.fate == "left out"}
    for row in bills.rows:
        use = row.use or 0.0
        if row.line in left_out and abs(use + gap) <= close:
            return f"Line {row.line}, which was left out, has just that use."
        if row.line not in left_out and abs(use - gap) <= close and use:
            return f"Line {row.line} has just that use: is it there twice?"
    if left_out:
        return f"{len(left_out)} lines were left out: the ledger says why."
    swapped = _digits_swapped(bills, gap)
    if swapped:
        return swapped
    return f"Compare the {len(bills.rows)} bills with their paper."


def _digits_swapped(bills: Bills, gap: float) -> str:
    """Two neighbouring digits the wrong way round: bookkeepers' rule of nine."""
    for row in bills.rows:
        text = f"{row.use or 0.0:.10g}"
        for k in range(len(text) - 1):
            other = text[:k] + text[k + 1] + text[k] + text[k + 2 :]
            try:
                apart = (row.use or 0.0) - float(other)
            except ValueError:
                continue
            if apart and abs(apart - gap) <= 1e-6 * max(1.0, abs(gap)):
                when = f" (to {iso(row.end)})" if row.end is not None else ""
                return f"Line {row.line}{when} has {text}: should it be {other}?"
    return ""
