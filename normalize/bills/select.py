"""Which lines of a file are bills of the account that is asked for.

What belongs here: passing over repeated headers, totals and remarks; telling accounts, fuels
and units of one file apart.  Lines of different accounts are split or asked about, never added.
"""

from __future__ import annotations

from collections.abc import Sequence

from normalize.bills.amounts import as_text, is_blank
from normalize.bills.columns import Columns
from normalize.bills.groups import (
    NO_NUMBER,
    Group,
    answers_that_choose,
    cell,
    fuel_named,
    group_lines,
    labels,
    masked,
    named,
    plain,
)
from normalize.bills.headings import squeeze
from normalize.bills.sum_rows import several
from normalize.bills.table import RawRow
from normalize.bills.vocabulary import TOTALS
from normalize.errors import AmbiguousBills, BillError, UnknownUnit, UnreadableBills
from normalize.units import canonical_unit

MOST_CHOICES = 12  # shown in a question
_DATE_ROLES = ("start", "end", "read", "range", "delivery", "bill date", "year", "month")


def without_remarks(
    columns: Columns, header: Sequence[str], body: Sequence[RawRow]
) -> tuple[list[RawRow], list[int], tuple[str, ...]]:
    """Bill lines; the lines among them that are totals; sentences about those passed over."""
    bills, totals, repeated, remarks = [], [], [], []
    for row in body:
        if _repeats_header(header, row):
            repeated.append(row.line)
        elif _is_total(columns, row):
            bills.append(row)
            totals.append(row.line)
        elif _says_nothing(columns, row):
            remarks.append(row.line)
        else:
            bills.append(row)
    notes = []
    if repeated:
        notes.append(f"the header is repeated on {_lines(repeated)}")
    if remarks:
        notes.append(f"{_lines(remarks)} passed over: no date and no usage")
    return bills, totals, tuple(notes)


def _lines(numbers: Sequence[int]) -> str:
    shown = ", ".join(str(n) for n in numbers[:5])
    more = f" and {len(numbers) - 5} more" if len(numbers) > 5 else ""
    return f"line {shown}" if len(numbers) == 1 else f"lines {shown}{more}"


def _repeats_header(header: Sequence[str], row: RawRow) -> bool:
    cells = [squeeze(c) for c in row.cells]
    same = sum(1 for a, b in zip(header, cells, strict=False) if a and a == b)
    return same >= 2 and 2 * same > sum(1 for c in cells if c)


def _dated(columns: Columns, row: RawRow) -> bool:
    """Whether a date column of the row holds something that is, or tries to be, a date."""
    for role in _DATE_ROLES:
        text = as_text(cell(row, columns.get(role)))
        if text and any(c.isdigit() for c in text):
            return True
    return False


def _is_total(columns: Columns, row: RawRow) -> bool:
    if _dated(columns, row):
        return False
    for value in row.cells:
        words = as_text(value).lower().strip(" :.")
        if words in TOTALS or words.split(" ")[0] in ("total", "totals", "average", "subtotal"):
            return any(not is_blank(c) for c in row.cells if c is not value)
    return False


def _says_nothing(columns: Columns, row: RawRow) -> bool:
    return not _dated(columns, row) and is_blank(cell(row, columns.get("usage")))


def select_rows(
    columns: Columns,
    body: list[RawRow],
    *,
    rows: str | None,
    fuel: str | None,
    unit: str | None,
    where: str,
) -> tuple[list[RawRow], tuple[str, ...]]:
    """Lines of one account, fuel and unit.

    rows : the value (or its last four characters) of an account, meter, fuel or unit column.
    Raises AmbiguousBills when the file holds several and nothing says which.
    """
    before = len(body)
    if rows is not None:
        body, rows = _in_named_unit(columns, body, str(rows), where)
    found = group_lines(columns, body, fuel=fuel)
    chosen = _named(columns, found.accounts, rows, where) if rows else list(found.accounts)
    if not chosen and body:
        raise _none_left(columns, body, fuel, where)
    if len(chosen) > 1:
        raise ask_which(chosen, where)
    group = chosen[0] if chosen else Group((), "", ())
    kept = lines_of_unit(columns, group, fuel=fuel, unit=unit)
    notes = group.notes
    nobodys = sum(1 for _, why in found.nobodys if why == NO_NUMBER)
    left = before - len(kept) - nobodys
    if left:
        verb = "belongs" if left == 1 else "belong"
        notes += (f"{several(left, 'line')} {verb} to other accounts, fuels or units",)
    if nobodys:
        notes += (f"{several(nobodys, 'line')} left out: {NO_NUMBER}",)
    return kept, notes


def _none_left(columns: Columns, body: Sequence[RawRow], fuel: str | None, where: str) -> BillError:
    """Not a line is of the fuel that was given, or of any fuel."""
    if fuel is not None:
        return UnreadableBills(
            f"no line is of {fuel}", where=where, next_step="Check the fuel of the account."
        )
    texts = dict.fromkeys(as_text(cell(row, columns.get("fuel"))) for row in body)
    try:
        for text in texts:
            fuel_named(text, where=where)
    except BillError as err:
        return err
    return UnreadableBills("no line says whose it is", where=where)


def _in_named_unit(
    columns: Columns, body: list[RawRow], rows: str, where: str
) -> tuple[list[RawRow], str | None]:
    """Lines in the unit that ``rows`` names; else all of them, and rows still to be looked for."""
    keys = [k for role in ("fuel", "unit") if (k := columns.get(role)) is not None]
    if not keys and not columns.accounts:
        raise UnreadableBills(
            "rows was given, but the file has no column of accounts, meters or fuels",
            where=where,
            next_step="Leave out rows.",
        )
    k, wanted = columns.get("unit"), squeeze(rows)
    kept = [row for row in body if squeeze(plain(cell(row, k))) == wanted] if wanted else []
    return (kept, None) if kept else (body, rows)


def _named(columns: Columns, groups: Sequence[Group], rows: str, where: str) -> list[Group]:
    found = named(groups, rows)
    if not found and columns.get("fuel") is not None:
        try:
            fuel = fuel_named(rows)
        except BillError:
            fuel = ""
        found = [g for g in groups if fuel and g.fuel == fuel]
    if found:
        return found
    seen = {label for g in groups for label in (*map(masked, g.names), g.fuel)} - {""}
    raise UnreadableBills(
        "no line belongs to what rows names",
        where=where,
        wanted="one of " + ", ".join(sorted(seen)[:MOST_CHOICES]),
    )


def lines_of_unit(
    columns: Columns, group: Group, *, fuel: str | None, unit: str | None
) -> list[RawRow]:
    """Lines in the wanted unit, or else in any unit of the fuel (not its demand in kW)."""
    k = columns.get("unit")
    if k is None:
        return list(group.rows)
    texts = {as_text(cell(row, k)) for row in group.rows}
    units = {text: _unit_of(text, fuel or group.fuel or None) for text in texts}
    wanted = {unit} if unit is not None and unit in units.values() else set(units.values()) - {""}
    if not wanted:
        return list(group.rows)
    return [
        row
        for row in group.rows
        if is_blank(cell(row, k)) or units[as_text(cell(row, k))] in wanted
    ]


def _unit_of(text: str, fuel: str | None) -> str:
    if is_blank(text):
        return ""
    try:
        return canonical_unit(text, fuel)
    except UnknownUnit:
        return ""


def ask_which(groups: Sequence[Group], where: str) -> AmbiguousBills:
    """The question of a file of several accounts: every choice, each with its line."""
    choices = []
    for lines in answers_that_choose(groups):
        text = " and ".join(f'{key} = "{value}"' for key, value in lines.items())
        if text and text not in choices:
            choices.append(text)
    fuels = {g.fuel for g in groups}
    what = "fuels" if len(fuels) == len(groups) else "accounts, meters or fuels"
    shown = labels(groups[:MOST_CHOICES])
    more = f" and {len(groups) - len(shown)} more" if len(groups) > len(shown) else ""
    first = " or ".join(choices[:MOST_CHOICES])
    return AmbiguousBills(
        f"the file holds {len(groups)} {what} ({', '.join(shown)}{more})",
        where=where,
        wanted="to know which is meant, for they are never added up",
        next_step=(f"Put {first}{' or …' if more else ''} under [[account]] in site.toml, or use "
                   "the option of that name; normalize bills shows all of them.")
        if choices
        else "Give them files of their own: nothing in the file tells them apart.",
    )  # fmt: skip
