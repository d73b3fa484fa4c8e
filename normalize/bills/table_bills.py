"""A table of bills becomes rows of one account: columns, lines, dates, numbers, marks.

What belongs here: the order of the steps between a raw table and BillRows.  Each step has its
module: columns (roles) → select (lines of the account) → records (dates, numbers) → layouts
(start and end of each bill), registers, deliveries.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Literal

from normalize.bills import records as rec
from normalize.bills.amounts import Decimal, number_of
from normalize.bills.answers import ENOUGH_BILLS, ONE_BILL, Answers, Understood
from normalize.bills.columns import (
    Columns,
    choose_cost,
    choose_usage,
    described,
    find_columns,
    is_delivered,
)
from normalize.bills.dates import Written, read_written
from normalize.bills.deliveries import open_by_levels, use_by_levels
from normalize.bills.found import Found, add_generation, tanks_of
from normalize.bills.fuel_and_unit import fuel_of, unit_of
from normalize.bills.groups import cell
from normalize.bills.headings import squeeze
from normalize.bills.layout_choice import ask_read_day, layout_of
from normalize.bills.layouts import (
    Record,
    are_days,
    days_that_disagree,
    ends_inclusive,
    from_dates_alone,
    from_days,
    from_months,
    from_start_days,
    read_with_others,
    settle_ends,
)
from normalize.bills.records import Proven, settled_by_all
from normalize.bills.registers import Register, difference
from normalize.bills.repair import Kind
from normalize.bills.sections import with_sections
from normalize.bills.select import select_rows, without_remarks
from normalize.bills.sum_rows import several
from normalize.bills.table import RawRow, RawTable
from normalize.days import date_of
from normalize.errors import AmbiguousBills, NoBills

AS_YOU_SAID = ", as you said"
BY_VALUES = "some of the file can only be read so"


@dataclass(frozen=True, slots=True)
class Head:
    """A table whose header is understood, and its lines beneath.

    body : bill lines and totals, without remarks and repeated headers.  totals : the lines
    among them that are totals.  notes : sentences.
    """

    table: RawTable
    columns: Columns
    body: list[RawRow]
    totals: frozenset[int]
    notes: tuple[str, ...]
    where: str


def head_of(table: RawTable, answers: Answers) -> Head:
    """The header of a table for the fuel of the answers.  Raises as read_bills does."""
    columns, all_rows = find_columns(table, answers.named)
    columns, all_rows, section_notes = with_sections(table, columns, all_rows)
    where = f"{table.name}:{columns.line}"
    header = [squeeze(c) for row in table.rows if row.line == columns.line for c in row.cells]
    columns, usage_notes = choose_usage(
        columns, fuel=answers.fuel, unit=answers.unit, where=table.name
    )
    body, totals, remark_notes = without_remarks(columns, header, all_rows)
    notes = (*usage_notes, *section_notes, *remark_notes)
    return Head(table, columns, body, frozenset(totals), notes, where)


def understand_table(table: RawTable, answers: Answers) -> Understood:
    """Rows of one account from a raw table.  Raises as read_bills does."""
    head = head_of(table, answers)
    body, notes = select_rows(
        head.columns, head.body, rows=answers.rows, fuel=answers.fuel, unit=answers.unit,
        where=head.where,
    )  # fmt: skip
    proven = Proven()
    if len(body) < len(head.body):  # the other accounts' lines are written in the same way
        proven = settled_by_all(table, head.columns, head.body)
    return understand_lines(head, body, notes, answers, proven)


def understand_lines(
    head: Head,
    body: Sequence[RawRow],
    other_notes: tuple[str, ...],
    answers: Answers,
    proven: Proven,
) -> Understood:
    """Rows of one account from its lines.

    other_notes : sentences on how they were chosen.  proven : by all lines of the file.
    """
    dates, decimal = answers.dates or proven.dates, answers.decimal or proven.decimal
    found = _understood(head, body, other_notes, replace(answers, dates=dates, decimal=decimal))
    words = {}  # nothing is put into the user's mouth that the file as a whole has shown
    if answers.dates is None:
        words[f"dates are {dates}{AS_YOU_SAID}"] = f"dates are {dates}: {BY_VALUES}"
    if answers.decimal is None:
        comma = "numbers have a decimal comma" if decimal == "comma" else ""
        words[f"decimal {decimal}{AS_YOU_SAID}"] = comma
    reading = tuple(s for text in found.reading if (s := words.get(text, text)))
    return replace(found, reading=reading)


def _understood(
    head: Head, body: Sequence[RawRow], other_notes: tuple[str, ...], answers: Answers
) -> Understood:
    if not body:
        raise NoBills(
            "there is a header but no bill beneath it", where=head.where,
            next_step=" ".join(_unseen(head.table, head.table.rows)),
        )  # fmt: skip
    table, columns, where = head.table, head.columns, head.where
    fuel = answers.fuel or fuel_of(columns, body, answers.unit, where)
    columns = choose_cost(columns, fuel)
    kind = answers.kind or _kind_of(columns, fuel)
    layout = layout_of(columns, body, kind, where)
    found = Found(table, columns, body, head.totals, layout, kind, where)
    try:
        records, notes, cautions, settled = _records(found, answers)
    except AmbiguousBills:
        if sum(1 for row in body if row.line not in head.totals) > 1:
            raise
        # No answer to the question could make one bill enough.
        raise NoBills(ONE_BILL, where=where, next_step=ENOUGH_BILLS) from None
    solar = add_generation([record for record, _ in records], found, answers)
    unit, unit_note = unit_of(
        columns, body, (suffix for _, suffix in records),
        said=answers.unit, fuel=fuel, where=where,
    )  # fmt: skip
    return Understood(
        fuel, unit, kind, tuple(record.row(table.name) for record, _ in records),
        (
            *_sheet_note(table), f"header on line {columns.line}", f"fuel: {fuel}", unit_note,
            *described(columns, (*layout.roles, "usage", "cost", _mark(kind), "temperature")),
            *notes, *solar.notes, *head.notes, *other_notes,
        ),
        (*cautions, *_unseen(table, body)), sent=solar.sent, generation=solar.generation,
        settled=settled,
    )  # fmt: skip


def _unseen(table: RawTable, body: Sequence[RawRow]) -> tuple[str, ...]:
    """Cautions on what a person who looks at the sheet does not see."""
    lines = {row.line for row in body}
    hidden = [line for line in table.hidden if line in lines]
    said = []
    if hidden:
        said.append(
            f"{several(len(hidden), 'row')} that the sheet hides, read like the others (first on "
            f"line {hidden[0]})."
        )
    if table.uncomputed:
        said.append(
            f"{several(table.uncomputed, 'formula')} without a stored result, read as "
            "empty; open the workbook in a spreadsheet program and save it."
        )
    return tuple(said)


def _sheet_note(table: RawTable) -> tuple[str, ...]:
    return (f"sheet {table.sheet[:40]!r}",) if table.sheet else ()


def _mark(kind: Kind) -> str:
    return "fill" if kind == "delivery" else "estimated"


def _kind_of(columns: Columns, fuel: str) -> Kind:
    """Dealer deliveries: a column of deliveries or fills, or a fuel that comes by truck."""
    if columns.get("delivery") is not None or columns.get("fill") is not None:
        return "delivery"
    return "delivery" if is_delivered(fuel) else "meter"


def _records(
    found: Found, answers: Answers
) -> tuple[list[tuple[Record, str]], tuple[str, ...], tuple[str, ...], dict[str, str]]:
    """Each bill line's record with what stood behind its number; sentences; cautions; what was
    settled about dates.
    """
    columns, body = found.columns, found.body
    written = rec.written_dates(found.table, found.layout.where, body)
    months = _months_named(written, found, answers)
    used = [columns.get(role) for role in ("usage", "cost", "temperature", "days")]
    numbers = rec.how_numbers_are_written(found.table, body, used, answers.decimal)
    days = [rec.days_of(cell(row, columns.get("days")), numbers.decimal) for row in body]
    others = [
        read_written(cell(row, k))
        for role in ("bill date", "read", "end", "start")
        if (k := columns.get(role)) is not None
        for row in body
    ]
    order, order_notes = rec.decide_order(
        columns, written, days, others, said=answers.dates, where=found.where
    )
    records = []
    both = found.layout.name == "start and end"
    for row, pair in zip(body, written, strict=True):
        record = Record(row.line)
        if row.line in found.totals:
            record.blame("a total, not a bill")
        if found.layout.name == "start and days":
            pair = (pair[0], pair[0])  # the end comes from the days
        if months is None or pair[1].month is None:
            rec.put_dates(record, pair, order, both=both)
        records.append((record, _put_numbers(record, row, columns, numbers.decimal)))
    plain = [record for record, _ in records]
    cautions = _put_marks(plain, found)
    _put_temperature(plain, found, answers, numbers.decimal)
    notes = (*order_notes, *((numbers.sentence,) if numbers.sentence else ()))
    settled: dict[str, str] = {"dates": order} if order_notes else {}
    if months is not None:
        notes += (from_months(plain, months, answers.read_day or 0),)
    else:
        said = _put_periods(plain, found, answers)
        if both and (inclusive := ends_inclusive(said[0])) is not None:
            settled["end_dates"] = "inclusive" if inclusive else "exclusive"
        notes += said
    if columns.differenced:
        notes += _difference(plain, found, answers, numbers.decimal)
    _per_day(plain, columns)
    cautions += days_that_disagree(plain, found.table.name) if both else ()
    return records, notes, cautions, settled


def _months_named(
    written: Sequence[tuple[Written, Written]], found: Found, answers: Answers
) -> list[tuple[int, int] | None] | None:
    """(year, month) of each line of a file that names months only; asks for the reading day.

    A spreadsheet makes "Jan 2023" the first of January: under a heading of months, too.
    """
    ends = [w for _, w in written if w != Written()]
    named = [w for w in ends if w.month is not None]
    months: list[tuple[int, int] | None]
    if ends and 2 * len(named) > len(ends):
        months = [w.month for _, w in written]
    elif found.layout.roles == ("month",) and ends and all(_is_first(w) for w in ends):
        whens = [date_of(w.day) if w.day is not None else None for _, w in written]
        months = [(d.year, d.month) if d is not None else None for d in whens]
    else:
        return None
    if answers.read_day is None:
        raise ask_read_day(found.where)
    return months


def _is_first(written: Written) -> bool:
    return written.day is not None and date_of(written.day).day == 1


def _difference(
    records: Sequence[Record], found: Found, answers: Answers, decimal: Decimal
) -> tuple[str, ...]:
    """Readings of the meter become use."""
    columns = found.columns
    meters = [k for k in columns.accounts if "meter" in columns.headings[k].words]
    times = [number_of(cell(row, columns.get("multiplier")), decimal) for row in found.body]
    said = answers.multiplier
    registers = [
        Register(
            record,
            record.use,
            number_of(cell(row, columns.get("register start")), decimal),
            squeeze(cell(row, meters[0])) if meters else "",
            said or (each if each is not None and each > 0 else 1.0),
        )
        for record, row, each in zip(records, found.body, times, strict=True)
    ]
    notes = difference(registers)
    factors = sorted({r.times for r in registers} - {1.0})
    return (*notes, *(f"times the multiplier of the meter, {f:g}" for f in factors[:3]))


def _put_numbers(record: Record, row: RawRow, columns: Columns, decimal: Decimal) -> str:
    suffix = rec.put_use(record, cell(row, columns.get("usage")), decimal)
    rec.put_days(record, cell(row, columns.get("days")), decimal)
    cost = number_of(cell(row, columns.get("cost")), decimal)
    record.cost = cost if cost is not None and abs(cost) < 1e12 else None
    return suffix


def _put_marks(records: Sequence[Record], found: Found) -> tuple[str, ...]:
    """Estimated readings, or fills not known to be full; returns cautions."""
    delivery = found.kind == "delivery"
    role = "fill" if delivery else "estimated"
    k = found.columns.get(role)
    filled = k is not None and any(str(cell(row, k) or "").strip() for row in found.body)
    unknown: list[int] = []
    bad: list[int] = []
    for record, row in zip(records, found.body, strict=True):
        if filled and k is not None:
            heading = found.columns.headings[k]
            judge = rec.is_partial if delivery else rec.is_estimated
            mark = judge(cell(row, k), heading)
            if mark is None:
                unknown.append(record.line)
            record.estimated = record.estimated or bool(mark if mark is not None else delivery)
        said = rec.notes_say(row, found.columns, delivery=delivery)
        record.estimated = record.estimated or bool(said)
        if said == "bad":
            bad.append(record.line)
    cautions = []
    if bad:
        # A wrong reading does to the next bill what an estimate does: its error comes back.
        cautions.append(
            f"The notes call {len(bad)} readings bad (first on line {bad[0]}); they are treated "
            "like estimated ones."
        )
    if unknown:
        taken = "counted as partial fills" if delivery else "taken for actual readings"
        heading_text = found.columns.heading(role).text
        cautions.append(
            f"{len(unknown)} marks in column {heading_text!r} are not known (first on line "
            f"{unknown[0]}); {taken}."
        )
    if delivery and not filled and found.layout.name == "dates alone":
        cautions.append(
            "No column says which deliveries filled the tank, so every one counts as a full fill; "
            "a partial one moves use from its own interval to the next."
        )
    return tuple(cautions)


def _put_temperature(
    records: Sequence[Record], found: Found, answers: Answers, decimal: Decimal
) -> None:
    k = found.columns.get("temperature")
    if k is None:
        return
    values = [number_of(cell(row, k), decimal) for row in found.body]
    sane = [v for v in values if v is not None and abs(v) < 200.0]
    if not sane:
        return
    celsius = rec.temperature_is_celsius(
        found.columns.headings[k], sane, said=answers.temperature_unit, where=found.where
    )
    for record, value in zip(records, values, strict=True):
        if value is not None and abs(value) < 200.0:
            record.mean_temp_f = value * 1.8 + 32.0 if celsius else value


def _put_periods(records: Sequence[Record], found: Found, answers: Answers) -> tuple[str, ...]:
    """Start and end of every record, by the file's layout; returns sentences."""
    name = found.layout.name
    if name == "start and end":
        return (settle_ends(records, said=answers.end_dates, where=found.where),)
    if name == "start and days":
        from_start_days(records)
        return ("a bill ends so many days after its start",)
    if answers.end_dates == "inclusive":
        for record in records:
            record.end = None if record.end is None else record.end + 1
    if name == "date and days":
        from_days(records)
        return ("a bill starts so many days before its reading",)
    if found.kind == "meter" and are_days(records):
        for record in records:
            record.start, record.end = record.end, None if record.end is None else record.end + 1
        return ("each line is the use of its day",)
    event: Literal["delivery", "reading"] = "delivery" if found.kind == "delivery" else "reading"
    tanks = tanks_of(records, found, answers) if found.kind == "delivery" else []
    open_by_levels(tanks)
    beside = found.kind == "meter" and len(found.columns.usage) > 1  # another fuel's numbers
    readings = read_with_others(records) if beside else records
    from_dates_alone(readings, event, blanks_break=beside)
    if use_by_levels(tanks):
        return ("use between deliveries by the levels of the tank",)
    return (f"a bill runs from the {event} before to its own",)


def _per_day(records: Sequence[Record], columns: Columns) -> None:
    """Turn use per day into use."""
    if not columns.heading("usage").per_day:
        return
    for record in records:
        if record.use is not None and record.start is not None and record.end is not None:
            days = record.days if record.days is not None else record.end - record.start
            record.use *= days
