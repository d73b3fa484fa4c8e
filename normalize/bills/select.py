"""Which lines of a file are bills of the account that is asked for.

What belongs here: passing over repeated headers, totals and remarks; telling accounts, fuels
and units of one file apart.  Lines of different accounts are split or asked about, never added.
"""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise

from normalize.bills.amounts import as_text, is_blank
from normalize.bills.columns import Columns, answer
from normalize.bills.dates import ORDERS, read_written, settle
from normalize.bills.headings import squeeze
from normalize.bills.table import Cell, RawRow
from normalize.bills.vocabulary import TOTALS
from normalize.errors import AmbiguousBills, BillError, UnknownUnit, UnreadableBills
from normalize.units import canonical_fuel, canonical_unit

SURE_METER_LINES = 2  # of each meter, before a replacement is believed (our own, no source)
_SERVICE_WORDS = {
    "usage",
    "use",
    "service",
    "consumption",
    "delivery",
    "meter",
    "account",
    "billing",
}
_DATE_ROLES = ("start", "end", "read", "range", "delivery", "bill date", "year", "month")


def cell(row: RawRow, column: int | None) -> Cell:
    """The cell of a column; None beyond the row's end."""
    if column is None or column >= len(row.cells):
        return None
    return row.cells[column]


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
        body = _named_rows(columns, body, str(rows), where)
    if fuel is not None and (k := columns.get("fuel")) is not None:
        body = _of_fuel(body, k, fuel, where)
    if (k := columns.get("unit")) is not None:
        body = _of_unit(body, k, fuel, unit)
    notes: tuple[str, ...] = ()
    if rows is None:
        for k in (columns.get("fuel"), columns.get("unit"), *columns.accounts):
            if k is None:
                continue
            if "meter" in columns.headings[k].words and _succeed(columns, body, k):
                notes = ("the meter was replaced: one follows the other, without overlap",)
            else:
                _ask_if_several(columns, body, k, where)
    left = before - len(body)
    if left:
        notes += (f"{left} lines belong to other accounts, fuels or units",)
    return body, notes


def _succeed(columns: Columns, body: list[RawRow], k: int) -> bool:
    """Whether meters follow each other in time, as when one is replaced by another."""
    when = next((c for r in ("end", "read", "start") if (c := columns.get(r)) is not None), None)
    meters = list(dict.fromkeys(squeeze(_plain(cell(row, k))) for row in body))
    if when is None or not 2 <= len(meters) <= 4 or "" in meters:
        return False
    written = [read_written(cell(row, when)) for row in body]
    answers = []
    for order in ORDERS[:2]:
        days: dict[str, list[int]] = {m: [] for m in meters}
        for row, one in zip(body, written, strict=True):
            day, _ = settle(one, order)
            if day is not None:
                days[squeeze(_plain(cell(row, k)))].append(day)
        if all(len(d) >= SURE_METER_LINES for d in days.values()):
            spans = sorted((min(d), max(d)) for d in days.values())
            answers.append(all(a[1] <= b[0] for a, b in pairwise(spans)))
    return bool(answers) and all(answers)


def _named_rows(columns: Columns, body: list[RawRow], rows: str, where: str) -> list[RawRow]:
    wanted = squeeze(rows)
    keys = [*columns.accounts]
    keys += [k for role in ("fuel", "unit") if (k := columns.get(role)) is not None]
    if not keys:
        raise UnreadableBills(
            "rows was given, but the file has no column of accounts, meters or fuels",
            where=where,
            next_step="Leave out rows.",
        )
    kept = [row for row in body if any(_is(cell(row, k), wanted) for k in keys)]
    if not kept:
        seen = {masked(cell(row, k)) for row in body for k in keys} - {""}
        raise UnreadableBills(
            "no line belongs to what rows names",
            where=where,
            wanted="one of " + ", ".join(sorted(seen)[:12]),
        )
    return kept


def _is(value: Cell, wanted: str) -> bool:
    text = squeeze(_plain(value))
    return text == wanted or (len(wanted) >= 4 and text.endswith(wanted))


def _plain(value: Cell) -> str:
    """An account number as text, also where a spreadsheet made it a number."""
    if isinstance(value, float) and value == int(value):
        return str(int(value))
    return as_text(value)


def masked(value: Cell) -> str:
    """An account or meter for a message: its last four characters.

    >>> masked("0012345678")
    '…5678'
    """
    text = _plain(value)
    if any(c.isdigit() for c in text) and len(text) > 4:
        return "…" + text[-4:]
    return text if len(text) <= 20 else "…" + text[-4:]


def _of_fuel(body: list[RawRow], k: int, fuel: str, where: str) -> list[RawRow]:
    kept = [row for row in body if is_blank(cell(row, k)) or _fuel_of(cell(row, k)) == fuel]
    if not kept:
        raise UnreadableBills(
            f"no line is of {fuel}", where=where, next_step="Check the fuel of the account."
        )
    return kept


def fuel_named(text: str, *, where: str = "") -> str:
    """The fuel that a cell names, also as "Electric usage" or "Gas service".

    >>> fuel_named("Natural gas usage")
    'natural gas'
    """
    words = [w for w in text.split() if w.lower().strip(".,:") not in _SERVICE_WORDS]
    return canonical_fuel(" ".join(words) or text, where=where)


def _fuel_of(value: Cell) -> str:
    try:
        return fuel_named(as_text(value))
    except BillError:
        return ""  # water, sewer, rubbish: another service on the same bill


def _of_unit(body: list[RawRow], k: int, fuel: str | None, unit: str | None) -> list[RawRow]:
    """Lines in the wanted unit, or else in any unit of the fuel (not its demand in kW)."""
    units = {row.line: _unit_of(cell(row, k), fuel) for row in body}
    wanted = {unit} if unit is not None and unit in units.values() else set(units.values()) - {""}
    if not wanted:
        return body
    return [row for row in body if units[row.line] in wanted or is_blank(cell(row, k))]


def _unit_of(value: Cell, fuel: str | None) -> str:
    if is_blank(value):
        return ""
    try:
        return canonical_unit(as_text(value), fuel)
    except UnknownUnit:
        return ""


def _ask_if_several(columns: Columns, body: list[RawRow], k: int, where: str) -> None:
    values = {squeeze(_plain(cell(row, k))): cell(row, k) for row in body}
    values.pop("", None)
    if len(values) < 2:
        return
    dated = sum(1 for v in values.values() if read_written(v).parts is not None)
    if dated == len(values):  # a "Meter" column of dates is no column of meters
        return
    shown = sorted({masked(v) for v in values.values()})
    raise AmbiguousBills(
        f"column {columns.headings[k].text!r} tells {len(values)} accounts, meters or fuels "
        f"apart ({', '.join(shown[:8])})",
        where=where,
        wanted="to know which is meant, for they are never added up",
        next_step=answer("rows", shown[0].lstrip("…"), shown[1].lstrip("…") if shown[1:] else "…"),
    )
