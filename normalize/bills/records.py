"""Lines of a bill file become records: dates, numbers and marks, each read or blamed.

What belongs here: reading the cells of known columns.  Which column is which is decided in
columns.py, which dates make a bill in layouts.py.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from datetime import date

from normalize.bills.amounts import (
    Decimal,
    as_text,
    decide_decimal,
    is_blank,
    number_of,
    split_amount,
)
from normalize.bills.columns import Columns, answer
from normalize.bills.dates import (
    Order,
    Written,
    not_a_date,
    order_by_days,
    order_by_spacing,
    order_by_values,
    pivot,
    quoted,
    read_written,
    settle,
)
from normalize.bills.groups import cell
from normalize.bills.headings import Heading
from normalize.bills.layouts import Record
from normalize.bills.table import Cell, RawRow, RawTable
from normalize.bills.vocabulary import (
    CELSIUS,
    ESTIMATED_NO,
    ESTIMATED_YES,
    FAHRENHEIT,
    FULL,
    NO,
    PARTIAL,
    YES,
)
from normalize.days import FIRST_SANE_DAY, LAST_SANE_DAY, day_of
from normalize.errors import AmbiguousBills

HOTTEST_MEAN_C = 45.0  # °C: no place on Earth has a month so hot, so above it is °F
#                        (common practice, no source)
_ESTIMATE = re.compile(r"\bestimat", re.IGNORECASE)
_NO_ESTIMATE = re.compile(r"\b(?:not|no|non|never|un)\b[^.;]*estimat", re.IGNORECASE)
_BAD_READING = re.compile(
    r"\b(?:bad|wrong|faulty|false) (?:meter )?read|\bmisread|\bread(?:ing)? error", re.IGNORECASE
)
_PARTIAL = re.compile(r"\bpartial|\bnot full", re.IGNORECASE)
_RANGE = re.compile(r"\s+-+\s+|\s+(?:to|thru|through|until)\s+|(?<=\d{4})-(?=\d{1,2}/)")


@dataclass(frozen=True, slots=True)
class Where:
    """The columns that hold dates: one or two columns, a range, or year, month and day."""

    start: int | None = None
    end: int | None = None
    range: int | None = None
    parts: tuple[int, int, int] | None = None
    months: tuple[int, int] | None = None  # columns of year and month


def split_range(value: Cell) -> tuple[str, str] | None:
    """Both dates of "01/05/2023 - 02/06/2023"; None if the cell is no range.

    >>> split_range("1/5/23 to 2/6/23")
    ('1/5/23', '2/6/23')
    """
    pieces = _RANGE.split(as_text(value))
    return (pieces[0], pieces[1]) if len(pieces) == 2 else None


def written_dates(
    table: RawTable, where: Where, rows: Sequence[RawRow]
) -> list[tuple[Written, Written]]:
    """(start, end) of each row, as written."""
    found = []
    for row in rows:
        if where.months is not None:
            year, month = (as_text(cell(row, k)).removesuffix(".0") for k in where.months)
            named = f"{month} {year}" if not month.isdigit() else f"{month}/{year}"
            found.append((Written(), read_written(named) if month or year else Written()))
        elif where.parts is not None:
            found.append((Written(), _from_parts(row, where.parts)))
        elif where.range is not None:
            both = split_range(cell(row, where.range))
            if both is None:
                text = as_text(cell(row, where.range))
                bad = Written(problem=f"{quoted(text)} is not two dates" if text else "")
                found.append((bad, bad))
            else:
                found.append((read_written(both[0]), read_written(both[1])))
        else:
            start, end = (
                read_written(cell(row, k), epoch_1904=table.epoch_1904)
                if k is not None
                else Written()
                for k in (where.start, where.end)
            )
            found.append((start, end))
    return found


def _from_parts(row: RawRow, parts: tuple[int, int, int]) -> Written:
    texts = [as_text(cell(row, k)).removesuffix(".0") for k in parts]
    if not any(texts):
        return Written()
    year, month, day = texts
    if not month.isdigit() and month:
        return read_written(f"{day} {month} {year}")
    shown = "-".join(t.zfill(2) for t in texts)
    try:
        return Written(day=day_of(date(pivot(int(year)), int(month), int(day))))
    except (ValueError, OverflowError):
        return Written(problem=not_a_date(shown))


def decide_order(
    columns: Columns,
    written: Sequence[tuple[Written, Written]],
    days: Sequence[int | None],
    others: Sequence[Written],
    *,
    said: Order | None,
    where: str,
) -> tuple[Order, tuple[str, ...]]:
    """Day first or month first, for the whole file, with a sentence.  Raises AmbiguousBills.

    days : of a days column.  others : dates of other columns, such as that of the bill itself;
    one file writes all its dates in one way.
    """
    if said is not None:
        return said, (f"dates are {said}, as you said",)
    cells = [w for pair in written for w in pair]
    if not any(w.parts for w in cells):
        return "month first", ()
    hints = {h.replace(" ", "") for heading in columns.headings for h in heading.hints}
    for order, patterns in (("month first", r"^mm?[-/.]dd?"), ("day first", r"^dd?[-/.]mm?")):
        if any(re.match(patterns, h) for h in hints):
            return ("month first" if order == "month first" else "day first"), (
                f"dates are {order}, as the heading says",
            )
    proven = order_by_values([*cells, *others])
    if proven is not None:
        return proven, (f"dates are {proven}: some can only be read so",)
    counted = order_by_days(written, days)
    if counted is not None:
        return counted, (f"dates are {counted}: only so do they agree with the days column",)
    spaced = order_by_spacing(written)
    if spaced is not None:
        return spaced, (f"dates are {spaced}: only so do the bills follow each other",)
    raise AmbiguousBills(
        "the dates can be read with the month first or with the day first",
        where=where,
        next_step=answer("dates", "month first", "day first"),
    )


@dataclass(frozen=True, slots=True)
class Proven:
    """What all lines of a file prove, whoever they belong to; None where they prove nothing."""

    dates: Order | None = None
    decimal: Decimal | None = None


def settled_by_all(table: RawTable, columns: Columns, body: Sequence[RawRow]) -> Proven:
    """The order of dates and the decimal mark, from every line of a file of several accounts."""
    dates = [
        read_written(text, epoch_1904=table.epoch_1904)
        for role in ("start", "end", "read", "delivery", "bill date", "range")
        if (k := columns.get(role)) is not None
        for row in body
        for text in (split_range(cell(row, k)) or (cell(row, k),))
    ]
    order = order_by_values(dates)
    used = [columns.get(role) for role in ("usage", "cost", "temperature", "days")]
    try:
        return Proven(order, how_numbers_are_written(table, body, used, None).decimal)
    except AmbiguousBills:
        return Proven(order)


def put_dates(
    record: Record, written: tuple[Written, Written], order: Order, *, both: bool
) -> None:
    """Day numbers of a record.  both : the file gives starts, so a blank one is missed."""
    for name, one in zip(("start", "end"), written, strict=True):
        day, problem = settle(one, order)
        if problem:
            record.blame(problem)
        if day is not None and not FIRST_SANE_DAY <= day <= LAST_SANE_DAY:
            record.blame("a date outside 1900 to 2100")
            day = None
        if name == "start":
            record.start = day
        else:
            record.end = day
        if day is None and not problem and (both or name == "end"):
            record.blame(f"no {name} date given" if both else "no date given")


@dataclass(frozen=True, slots=True)
class Numbers:
    """How the file writes numbers."""

    decimal: Decimal
    sentence: str


def how_numbers_are_written(
    table: RawTable, rows: Sequence[RawRow], used: Iterable[int | None], said: Decimal | None
) -> Numbers:
    """The decimal mark, from every number in the columns that are used."""
    wanted = [k for k in used if k is not None]
    cells = (cell(row, k) for row in rows for k in wanted)
    decimal, sentence = decide_decimal(
        cells, delimiter=table.delimiter, answer=said, where=table.name
    )
    if not sentence and decimal == "comma":
        sentence = "numbers have a decimal comma"
    return Numbers(decimal, sentence)


def put_use(record: Record, value: Cell, decimal: Decimal) -> str:
    """Usage of a record; returns what is written behind the number, such as a unit."""
    if is_blank(value):
        return ""
    use = number_of(value, decimal)
    amount = split_amount(value) if isinstance(value, str) else None
    if use is None:
        record.blame(f"usage {quoted(as_text(value))} is not a number")
        return ""
    record.use = use
    suffix = amount.suffix.strip("() .*") if amount is not None else ""
    if suffix in ESTIMATED_YES:
        record.estimated = True
        return ""
    return "" if suffix in ESTIMATED_NO else suffix


def days_of(value: Cell, decimal: Decimal) -> int | None:
    """A whole number of days from 0 to 800; None if the cell is none."""
    days = None if is_blank(value) else number_of(value, decimal)
    return int(days) if days is not None and days.is_integer() and 0 <= days <= 800 else None


def put_days(record: Record, value: Cell, decimal: Decimal) -> None:
    """Days of a record, or blame for a number of days that no bill has."""
    record.days = days_of(value, decimal)
    if record.days is None and not is_blank(value):
        record.blame(f"{quoted(as_text(value))} is no number of days that a bill has")


def is_estimated(value: Cell, heading: Heading) -> bool | None:
    """What a mark says of a reading: estimated, not, or nothing known (None).

    >>> from normalize.bills.headings import take_apart
    >>> is_estimated("E", take_apart("A/E")), is_estimated("N", take_apart("Estimated"))
    (True, False)
    """
    text = as_text(value).lower().strip(" .*()")
    if is_blank(value):
        return False
    if text in ESTIMATED_YES or (_ESTIMATE.search(text) and not _NO_ESTIMATE.search(text)):
        return True
    if text in ESTIMATED_NO or text.startswith("act"):
        return False
    asks_actual = "actual" in heading.words and not {"est", "estimated"} & set(heading.words)
    if text in YES:
        return not asks_actual
    return asks_actual if text in NO else None


def is_partial(value: Cell, heading: Heading) -> bool | None:
    """What a mark says of a fill: not full, full, or nothing known (None)."""
    text = as_text(value).lower().strip(" .*()")
    asks_partial = "partial" in heading.words and "full" not in heading.words
    if is_blank(value):
        return not asks_partial
    if asks_partial and text in YES | NO:
        return text in YES
    if text in PARTIAL:
        return True
    if text in FULL or text in YES:
        return False
    return True if text in NO else None


def notes_say(row: RawRow, columns: Columns, *, delivery: bool) -> str:
    """What a free note says of the reading: "estimated", "bad", "partial" or ""."""
    for k in columns.notes:
        text = as_text(cell(row, k))
        if delivery:
            if _PARTIAL.search(text):
                return "partial"
        elif _ESTIMATE.search(text) and not _NO_ESTIMATE.search(text):
            return "estimated"
        elif _BAD_READING.search(text):
            return "bad"
    return ""


def temperature_is_celsius(
    heading: Heading, values: Sequence[float], *, said: str | None, where: str
) -> bool:
    """Whether bills' mean temperatures are in °C.  Raises AmbiguousBills if nothing says so."""
    words = {*heading.hints, *heading.words, " ".join(heading.words[-2:])}
    for text in [said.strip().lower()] if said else [*words]:
        if text in CELSIUS:
            return True
        if text in FAHRENHEIT:
            return False
    if said:
        raise AmbiguousBills(f"temperature_unit is {said[:20]!r}", where=where, wanted='"F" or "C"')
    if any(v > HOTTEST_MEAN_C for v in values):
        return False
    raise AmbiguousBills(
        f"the temperatures in column {heading.text!r} can be °F or °C",
        where=where,
        next_step=answer("temperature_unit", "F", "C"),
    )
