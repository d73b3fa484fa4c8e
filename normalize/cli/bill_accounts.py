"""``normalize bills FILE`` where the file holds several accounts: one after the other, never added.

What belongs here: the words and the JSON of several accounts at once.  One account is shown by
cli/bills.py, whatever file it came from.
"""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

from normalize.cli.tables import paragraph, table
from normalize.errors import BillError, UnwritableReport

if TYPE_CHECKING:
    from normalize.bills.accounts import FileAccount, FileAccounts
    from normalize.bills.periods import Bills

A_FEW: Final = 3  # accounts that need no table of their own
SHOWN_IN_FULL: Final = 20  # accounts; of more, the table and where to find the rest
TABLE_LINES: Final = 100  # of accounts, from either end
NOBODYS: Final = 50  # lines shown
MOST_PICTURES: Final = 200


def to_text(found: FileAccounts, keep: list[str]) -> str:
    """Every account: a table if there are more than a few, each in turn, the lines of nobody.

    keep : lines of site.toml that keep the answers given.
    """
    from normalize.report.numbers import mask

    read = found.readable
    blocks = [_opening(found)]
    if len(found.accounts) > A_FEW:
        blocks.append(_table(found.accounts))
    shown = read[:SHOWN_IN_FULL]
    common = _common([bills for _, bills in read])
    if common:
        blocks.append(
            "How the file was understood:\n"
            + "\n".join(paragraph(mask(f"{text}."), indent="  ") for text in common)
        )
    blocks += [_one(account.label, bills, common) for account, bills in shown]
    if len(read) > len(shown):
        blocks.append(
            f"… and {len(read) - len(shown):,} more accounts: --rows shows one, --write and "
            "--json save all of them."
        )
    blocks += [*_unread(found.accounts), *_nobodys(found)]
    blocks += [f"Caution: {paragraph(mask(text))}" for text in found.notes]
    blocks.append(_how_to_choose(found, keep))
    return "\n\n".join(blocks)


def _opening(found: FileAccounts) -> str:
    from normalize.report.numbers import mask

    n = len(found.accounts)
    unread = sum(1 for a in found.accounts if a.bills is None)
    text = (
        f"{mask(found.name)}: {n:,} account{'' if n == 1 else 's'}, read apart and never added up"
    )
    if unread:
        text += f"; {unread:,} could not be read"
    if found.nobodys:
        many = len(found.nobodys)
        text += f"; {many:,} line{' belongs' if many == 1 else 's belong'} to none"
    return paragraph(f"{text}.")


def _table(accounts: tuple[FileAccount, ...]) -> str:
    from normalize.days import iso
    from normalize.report.numbers import mask, plain

    rows = []
    for account in accounts:
        b = account.bills
        if b is None:
            rows.append([mask(account.label), account.fuel or "–", "–", "–", "not read", "–", "–"])
            continue
        p = b.periods
        left = sum(1 for e in b.ledger if e.fate == "left out")
        rows.append([
            mask(account.label), b.fuel, iso(int(p.start[0])), iso(int(p.end[-1])), str(p.n),
            f"{plain(float(p.use.sum()), 1)} {b.unit}", str(left),
        ])  # fmt: skip
    if len(rows) > 2 * TABLE_LINES:
        gap = [[f"… {len(rows) - 2 * TABLE_LINES:,} more", "", "", "", "", "", ""]]
        rows = rows[:TABLE_LINES] + gap + rows[-TABLE_LINES:]
    return table(["account", "fuel", "from", "to", "periods", "use", "left out"], rows, left=2)


def _common(read: list[Bills]) -> list[str]:
    """Sentences that are true of every account."""
    if len(read) < 2:
        return []
    others = [set(bills.reading) for bills in read[1:]]
    return [text for text in read[0].reading if all(text in other for other in others)]


def _one(name: str, bills: Bills, common: list[str]) -> str:
    from dataclasses import replace

    from normalize.cli.bills import to_text as account_text
    from normalize.report.numbers import mask

    own = tuple(text for text in bills.reading if text not in common)
    label = f"Account {mask(name)}"
    return f"{label}\n{'-' * len(label)}\n{account_text(replace(bills, reading=own))}"


def _unread(accounts: tuple[FileAccount, ...]) -> list[str]:
    """Accounts that could not be read, together where the reason is the same."""
    from normalize.report.numbers import mask

    by_reason: dict[str, list[FileAccount]] = {}
    for account in accounts:
        if account.bills is None:
            by_reason.setdefault(account.problem, []).append(account)
    if not by_reason:
        return []
    lines = []
    for reason, those in list(by_reason.items())[:NOBODYS]:
        names = ", ".join(mask(a.label) for a in those[:8])
        more = f" and {len(those) - 8:,} more" if len(those) > 8 else ""
        lines.append(paragraph(f"{names}{more}: {mask(reason)}", indent="  "))
    if len(by_reason) > NOBODYS:
        lines.append(f"  … and {len(by_reason) - NOBODYS:,} more reasons; --json has all of them.")
    return ["Accounts that could not be read:\n" + "\n".join(lines)]


def _nobodys(found: FileAccounts) -> list[str]:
    from normalize.report.numbers import mask

    if not found.nobodys:
        return []
    lines = [
        paragraph(mask(f"{e.file}:{e.line}: {e.fate}: {e.note}"), indent="  ")
        for e in found.nobodys[:NOBODYS]
    ]
    if len(found.nobodys) > NOBODYS:
        lines.append(f"  … and {len(found.nobodys) - NOBODYS:,} more; --json has all of them.")
    return ["Lines that are of no account:\n" + "\n".join(lines)]


def _how_to_choose(found: FileAccounts, keep: list[str]) -> str:
    """The lines of site.toml with which one account is chosen."""
    from normalize.report.numbers import mask

    lines = [
        f"  {mask(a.label)}: " + ", ".join(f'{k} = "{v}"' for k, v in a.choice.items())
        for a in found.accounts[:SHOWN_IN_FULL]
        if a.choice
    ]
    if not lines:
        return ""
    more = ["  …"] if len(found.accounts) > SHOWN_IN_FULL else []
    kept = [f"  and for each: {mask(line)}" for line in keep]
    return "To read one of them in site.toml, put under its [[account]]:\n" + "\n".join(
        [*lines, *more, *kept]
    )


def to_json(found: FileAccounts, *, full_numbers: bool) -> str:
    """The same as JSON, schema 1: accounts as cli.bills writes one, each with its name."""
    import json

    from normalize.cli.bills import to_dict

    def name(account: FileAccount) -> str:
        return account.full_name if full_numbers else account.label

    whole: dict[str, Any] = {
        "schema": 1,
        "file": found.name,
        "accounts": [{"account": name(a), **to_dict(bills)} for a, bills in found.readable],
        "unread": [
            {"account": name(a), "fuel": a.fuel or None, "lines": a.lines, "problem": a.problem}
            for a in found.accounts
            if a.bills is None
        ],
        "nobodys": [
            {"file": e.file, "line": e.line, "fate": e.fate, "note": e.note} for e in found.nobodys
        ],
        "notes": list(found.notes),
    }
    return json.dumps(whole, indent=2, ensure_ascii=False, allow_nan=False)


def write_pictures(found: FileAccounts, path: Path) -> str:
    """A picture of each account, numbered beside ``path``; a sentence on where they are.

    Raises UnwritableReport, before anything is drawn where there are too many.
    """
    from normalize.report.figure_bills import write_bills_figure

    read = found.readable
    if len(read) > MOST_PICTURES:
        raise UnwritableReport(
            f"there are {len(read):,} accounts", where=path.name,
            wanted=f"at most {MOST_PICTURES} pictures", next_step="Name one account with --rows.",
        )  # fmt: skip
    width = len(str(len(read)))
    names = [path.with_name(f"{path.stem}-{n:0{width}}{path.suffix}")
             for n in range(1, len(read) + 1)]  # fmt: skip
    taken = next((p for p in names if p.exists()), None)
    if taken is not None:
        raise UnwritableReport(
            "there is a file of that name", where=taken.name, next_step="Choose another name."
        )
    for (account, bills), place in zip(read, names, strict=True):
        write_bills_figure(bills, place, account.label)
    return f"Pictures: {names[0].name} to {names[-1].name}, in the order of the accounts."


def none_read(found: FileAccounts) -> BillError:
    """The error of a file in which no account can be read."""
    return BillError(
        f"not one of {len(found.accounts)} accounts can be read", where=found.name,
        next_step="The reasons stand above, account by account.",
    )  # fmt: skip
