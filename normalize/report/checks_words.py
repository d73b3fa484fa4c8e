"""Checks in words, for the terminal shortened; and what each bill weighs, as a table."""

from __future__ import annotations

from typing import TYPE_CHECKING

from normalize.report import numbers as n
from normalize.savings.cook import LOOK_COOK, STRONG_COOK

if TYPE_CHECKING:
    from collections.abc import Sequence

    from normalize.savings.evidence import SideEvidence
    from normalize.savings.influence import BillWeight
    from normalize.savings.results import Check

OUTCOMES = {True: "met", False: "not met", None: "for information"}


def outcome(check: Check) -> str:
    """The outcome in words, never in colour."""
    return OUTCOMES[check.meets]


def advice(check: Check) -> str:
    """What to do when a check is not met."""
    return f". What to do: {check.do}" if check.meets is False and check.do else ""


def meaning(check: Check) -> str:
    """What a check means, as a sentence, with what to do where it is missed."""
    text = n.clean(f"{check.means[:1].upper()}{check.means[1:]}{advice(check)}")
    return text if text.endswith((".", "?", "!")) else f"{text}."


def number(value: float | None) -> str:
    """A value or a limit: whole numbers whole, others with three significant digits.

    >>> number(23.0), number(0.03919), number(None), number(5e-5), number(1e-17)
    ('23', '0.0392', '–', '0.00005', '0')
    """
    if value is None:
        return n.UNKNOWN
    if abs(value) < 1e-9:
        return "0"
    if float(value).is_integer() and abs(value) < 1e9:
        return n.plain(value, 0)
    text = n.significant(value, 3)
    return text.rstrip("0").rstrip(".") if "." in text and "e" not in text else text


def lines(checks: Sequence[Check]) -> list[str]:
    """One entry a check: the missed ones first and in full, then the others by side."""
    missed = [c for c in checks if c.meets is False]
    rest = [c for c in checks if c.meets is not False]
    out = [f"Not met: {_named(c)}. {meaning(c)} [{n.clean(c.source)}]" for c in missed]
    for side in dict.fromkeys(c.side for c in rest):
        mine = "; ".join(_named(c) for c in rest if c.side == side)
        out.append(f"Met or for information, {n.clean(side)}: {mine}")
    sources = dict.fromkeys(n.clean(c.source) for c in rest)
    if sources:
        out.append(f"These are asked for by: {'; '.join(sources)}")
    return out


def _named(check: Check) -> str:
    limit = f" (limit {number(check.limit)})" if check.limit is not None else ""
    side = f", {n.clean(check.side)}" if check.meets is False and check.side else ""
    return f"{n.clean(check.name)}{side} {number(check.value)}{limit}"


def weight_rows(evidence: Sequence[SideEvidence]) -> tuple[tuple[str, ...], ...]:
    """One row a bill: what it weighs in its side's fit, and whether that is worth a look."""
    rows = []
    for side in evidence:
        for w, (start, end) in zip(side.weights, side.spans, strict=True):
            rows.append(
                (
                    f"{w.number}", n.short_date(start), n.short_date(end), side.side,
                    n.plain(w.leverage, 2), n.plain(w.cook, 3), n.plain(w.dffits, 2),
                    _look(w, len(side.weights)),
                )
            )  # fmt: skip
    return tuple(rows)


def _look(weight: BillWeight, n_bills: int) -> str:
    if weight.cook > STRONG_COOK:
        return f"over {STRONG_COOK:g}: moves the fit a lot; look at it, it stays in"
    if weight.cook > LOOK_COOK / n_bills:
        return f"over {LOOK_COOK:g}/n: worth a look; it stays in"
    return ""
