"""A table of a driver's amounts, or a column of the bill file, as spans of days with a value.

What belongs here: which column holds the amounts, which days each row stands for, and the
questions where a file leaves that open.  What a driver does to a fit is in fitting/drivers.py.
"""

from __future__ import annotations

import calendar
import os
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date
from itertools import pairwise
from typing import Final

from normalize.bills.amounts import Decimal, as_text, decide_decimal, is_blank, number_of
from normalize.bills.dates import (
    ORDERS,
    Order,
    Written,
    order_by_spacing,
    order_by_values,
    quoted,
    read_written,
    settle,
)
from normalize.bills.headings import Heading, squeeze, take_apart
from normalize.bills.periods import Bills
from normalize.bills.records import split_range
from normalize.bills.table import (
    HEADER_LINES,
    Cell,
    RawRow,
    RawTable,
    Score,
    open_file,
    read_table,
)
from normalize.days import FIRST_SANE_DAY, LAST_SANE_DAY, day_of, iso
from normalize.errors import AmbiguousBills, UnreadableBills

LARGEST: Final = 1e12  # of any amount: more is a slip of the keyboard (our own, no source)
LONGEST_SPAN: Final = 400  # days that one row may stand for (our own, no source)
MOST_SHOWN: Final = 3  # faulty lines that a note names
YES: Final = {"yes", "y", "true", "x", "open", "in session"}
NO: Final = {"no", "n", "false", "closed"}
_DATES: Final = ("start", "end", "range", "read", "month", "year", "bill date")
KINDS: Final = ("total", "level")


@dataclass(frozen=True, slots=True)
class DriverAnswers:
    """What site.toml says of a driver's table; None where it says nothing.

    column : heading of the amounts.  values : "total" (of all the row's days together) or
    "level" (of a typical day).  dates, end_dates, decimal, sheet : as for bills.
    """

    column: str | None = None
    values: str | None = None
    dates: Order | None = None
    end_dates: str | None = None
    decimal: Decimal | None = None
    sheet: str | None = None


@dataclass(frozen=True, slots=True)
class DriverRows:
    """Rows of a driver's table.  start, end : day numbers, half-open.

    values : "total" or "level"; of rows of one day each both are the same, and it is "total".
    source : (file, SHA-256).  reading : how the file was understood, as sentences.
    """

    start: tuple[int, ...]
    end: tuple[int, ...]
    value: tuple[float, ...]
    values: str
    source: tuple[str, str]
    reading: tuple[str, ...] = ()


def read_driver(path: str | os.PathLike[str], name: str, answers: DriverAnswers) -> DriverRows:
    """A driver's own file: dates or spans, and a column of amounts.

    Dates may be days, months, or a start and an end.  Raises MissingFile, UnreadableBills,
    and AmbiguousBills where the file can be read in two ways.
    """
    wanted = answers.column or name
    file = open_file(path)
    table = read_table(file, score=_score(wanted), sheet=answers.sheet)
    at = _header(table, wanted)
    header, body = table.rows[at], table.rows[at + 1 :]
    headings = tuple(take_apart(as_text(c)) for c in header.cells)
    where = f"{table.name}:{header.line}"
    column = _value_column(headings, wanted, answers.column is not None, where)
    written, form = _written(table, headings, body, column, where)
    order = _order(written, form, answers.dates, where)
    spans, problems = _spans(written, form, body, order, answers, where)
    amounts, bad = _amounts(table, body, column, answers.decimal)
    return _assembled(
        table, headings[column], spans, amounts, answers, [*problems, *bad], form, where
    )


def driver_of_bills(
    path: str | os.PathLike[str], bills: Bills, name: str, answers: DriverAnswers
) -> DriverRows:
    """A column of the bill file itself: each bill's amount over that bill's own days.

    Only rows that became (part of) a period count.  Errors as ``read_driver``.
    """
    wanted = answers.column or name
    table = read_table(open_file(path), score=_score(wanted), sheet=answers.sheet)
    at = _header(table, wanted)
    header = table.rows[at]
    headings = tuple(take_apart(as_text(c)) for c in header.cells)
    where = f"{table.name}:{header.line}"
    column = _named(headings, wanted)
    if column is None:
        raise _no_column(headings, wanted, where)
    used = {e.line for e in bills.ledger if e.fate.startswith("period")}
    days = {
        row.line: (row.start, row.end)
        for row in bills.rows
        if row.line in used and row.start is not None and row.end is not None
    }
    body = [row for row in table.rows[at + 1 :] if row.line in days]
    amounts, bad = _amounts(table, body, column, answers.decimal)
    spans = [days[row.line] for row in body]
    return _assembled(table, headings[column], spans, amounts, answers, bad, "bills", where)


def _score(wanted: str) -> Score:
    """How much a line looks like the header: dates named, and the column that was asked for."""
    name = squeeze(wanted)

    def score(cells: Sequence[Cell]) -> float:
        texts = [as_text(c) for c in cells if isinstance(c, str) and len(c) <= 80]
        roles = {take_apart(t).role for t in texts if t and any(ch.isalpha() for ch in t)}
        dated = 8.0 * bool(roles & set(_DATES))
        return dated + 10.0 * any(squeeze(t) == name for t in texts)

    return score


def _header(table: RawTable, wanted: str) -> int:
    score = _score(wanted)
    head = table.rows[:HEADER_LINES]
    at = max(range(len(head)), key=lambda k: score(head[k].cells))
    if score(head[at].cells) < 8.0:
        raise UnreadableBills(
            "no line looks like the header of a table of dates and amounts",
            where=table.name,
            wanted=f"headings such as 'Date' or 'Month', and {wanted!r}",
        )
    return at


def _named(headings: Sequence[Heading], wanted: str) -> int | None:
    hits = [k for k, h in enumerate(headings) if squeeze(h.text) == squeeze(wanted)[:40]]
    return hits[0] if len(hits) == 1 else None


def _value_column(headings: Sequence[Heading], wanted: str, asked: bool, where: str) -> int:
    """The column called so; else, where nobody named it, the only one that holds no dates."""
    found = _named(headings, wanted)
    if found is not None:
        return found
    others = [
        k
        for k, h in enumerate(headings)
        if h.text and h.role not in _DATES and squeeze(h.text) not in ("day", "days")
    ]
    if not asked and len(others) == 1:
        return others[0]
    raise _no_column(headings, wanted, where)


def _no_column(headings: Sequence[Heading], wanted: str, where: str) -> UnreadableBills:
    shown = ", ".join(repr(h.text) for h in headings if h.text)
    return UnreadableBills(
        f"no column is called {wanted[:40]!r}",
        where=where,
        wanted=f"one of {shown[:300]}",
        next_step='Name it with column = "…" under [[driver]] in site.toml.',
    )


def _written(
    table: RawTable, headings: Sequence[Heading], body: Sequence[RawRow], column: int, where: str
) -> tuple[list[tuple[Written, Written]], str]:
    """(start, end) of each row as written, and how rows are dated: "span", "month" or "day"."""
    by_role: dict[str, int] = {}
    for k, heading in enumerate(headings):
        if heading.role in _DATES and k != column:
            by_role.setdefault(heading.role, k)

    def one(row: RawRow, role: str) -> Written:
        return read_written(_cell(row, by_role[role]), epoch_1904=table.epoch_1904)

    if {"start", "end"} <= set(by_role):
        return [(one(r, "start"), one(r, "end")) for r in body], "span"
    if "range" in by_role and any(split_range(_cell(r, by_role["range"])) for r in body[:9]):
        pairs = [split_range(_cell(r, by_role["range"])) or ("", "") for r in body]
        return [(read_written(a), read_written(b)) for a, b in pairs], "span"
    if {"year", "month"} <= set(by_role):
        return [(Written(), _year_month(r, by_role)) for r in body], "month"
    single = next((r for r in ("read", "month", "start", "end", "range", "bill date")
                   if r in by_role), None)  # fmt: skip
    if single is None:
        raise UnreadableBills(
            "no column holds dates", where=where, wanted="a column 'Date', 'Month', or 'Start' "
            "and 'End'",
        )  # fmt: skip
    found = [(Written(), one(r, single)) for r in body]
    months = sum(1 for _, w in found if w.month is not None)
    filled = sum(1 for _, w in found if w != Written())
    if 2 * months > filled or (single == "month" and filled):
        return [(Written(), _as_month(w)) for _, w in found], "month"
    return found, "day"


def _year_month(row: RawRow, by_role: dict[str, int]) -> Written:
    year, month = (
        as_text(_cell(row, by_role[role])).removesuffix(".0") for role in ("year", "month")
    )
    if not year and not month:
        return Written()
    return read_written(f"{month} {year}" if not month.isdigit() else f"{month}/{year}")


def _as_month(written: Written) -> Written:
    """A spreadsheet makes "Jan 2023" the first of January; under "Month" it is a month."""
    if written.day is None or written.month is not None:
        return written
    when = date.fromordinal(written.day + date(1970, 1, 1).toordinal())
    return Written(month=(when.year, when.month)) if when.day == 1 else written


def _order(
    written: Sequence[tuple[Written, Written]], form: str, said: Order | None, where: str
) -> Order:
    if said is not None:
        return said
    cells = [w for pair in written for w in pair]
    if not any(w.parts for w in cells):
        return "month first"
    found = order_by_values(cells)
    if found is None:
        found = _order_by_days(written) if form == "day" else order_by_spacing(written)
    if found is None:
        raise AmbiguousBills(
            "the dates can be read with the month first or with the day first",
            where=where,
            next_step='Put dates = "month first" or dates = "day first" under [[driver]].',
        )
    return found


def _order_by_days(written: Sequence[tuple[Written, Written]]) -> Order | None:
    """The order under which one row follows the other by a day; None if both or neither."""
    fits: list[Order] = []
    for order in ORDERS[:2]:
        days = [d for _, w in written if (d := settle(w, order)[0]) is not None]
        steps = [abs(b - a) for a, b in pairwise(days)]
        if steps and 10 * steps.count(1) >= 9 * len(steps):
            fits.append(order)
    return fits[0] if len(fits) == 1 else None


def _spans(
    written: Sequence[tuple[Written, Written]],
    form: str,
    body: Sequence[RawRow],
    order: Order,
    answers: DriverAnswers,
    where: str,
) -> tuple[list[tuple[int, int] | None], list[str]]:
    """[start, end) of each row, None with a problem where it has none."""
    found: list[tuple[int, int] | None] = []
    problems: list[str] = []
    for (start, end), row in zip(written, body, strict=True):
        span, problem = _span(start, end, form, order)
        if problem and not all(is_blank(c) for c in row.cells):
            problems.append(f"line {row.line}: {problem}")
        found.append(span)
    if form == "span":
        found = _half_open(found, answers.end_dates, where)
    elif form == "day":
        _must_be_days([s for s in found if s is not None], where)
    for k, span in enumerate(found):
        if span is not None and not 0 < span[1] - span[0] <= LONGEST_SPAN:
            problems.append(f"line {body[k].line}: it spans {span[1] - span[0]} days")
            found[k] = None
    return found, problems


def _span(
    start: Written, end: Written, form: str, order: Order
) -> tuple[tuple[int, int] | None, str]:
    if form == "month":
        if end.month is None:
            return None, end.problem or "no month is given"
        year, month = end.month
        opens = day_of(date(year, month, 1))
        return (opens, opens + calendar.monthrange(year, month)[1]), ""
    last, problem = settle(end, order)
    first, early = settle(start, order) if form == "span" else (last, "")
    if first is None or last is None:
        return None, problem or early or "no date is given"
    if first < FIRST_SANE_DAY or last > LAST_SANE_DAY:
        return None, "a date outside 1900 to 2100"
    return (first, last + (form == "day")), ""


def _half_open(
    spans: Sequence[tuple[int, int] | None], said: str | None, where: str
) -> list[tuple[int, int] | None]:
    """Spans with the end exclusive, by how rows follow each other; asks where they do not."""
    known = sorted(s for s in spans if s is not None)
    if said is None:
        steps = [b[0] - a[1] for a, b in pairwise(known)]
        meet, apart = steps.count(0), steps.count(1)
        if not steps or max(meet, apart) * 2 <= len(steps):
            raise AmbiguousBills(
                "it cannot be seen whether each row's end is its last day or the day after",
                where=where,
                next_step='Put end_dates = "inclusive" (the last day counts) or end_dates = '
                '"exclusive" under [[driver]].',
            )
        said = "inclusive" if apart > meet else "exclusive"
    extra = int(said == "inclusive")
    return [None if s is None else (s[0], s[1] + extra) for s in spans]


def _must_be_days(spans: Sequence[tuple[int, int]], where: str) -> None:
    """One date a row is a day's row; dates weeks apart leave open which days each stands for."""
    starts = sorted({s[0] for s in spans})
    steps = sorted(b - a for a, b in pairwise(starts))
    if steps and steps[len(steps) // 2] > 3:
        raise AmbiguousBills(
            f"its dates lie {steps[len(steps) // 2]} days apart, and it does not say which days "
            "each amount stands for",
            where=where,
            wanted="one row a day, a column 'Month', or columns 'Start' and 'End'",
        )


def _amounts(
    table: RawTable, body: Sequence[RawRow], column: int, said: Decimal | None
) -> tuple[list[float | None], list[str]]:
    """Each row's amount; None where there is none, with a problem where that is a fault."""
    cells = [_cell(row, column) for row in body]
    decimal, _ = decide_decimal(cells, delimiter=table.delimiter, answer=said, where=table.name)
    found: list[float | None] = []
    problems = []
    for row, value in zip(body, cells, strict=True):
        word = as_text(value).lower()
        number = 1.0 if word in YES else 0.0 if word in NO else number_of(value, decimal)
        if is_blank(value):
            number = None
        elif number is None or not abs(number) <= LARGEST:
            problems.append(f"line {row.line}: {quoted(as_text(value))} is not an amount")
            number = None
        found.append(number)
    return found, problems


def _cell(row: RawRow, k: int) -> Cell:
    return row.cells[k] if k < len(row.cells) else None


def _assembled(
    table: RawTable,
    heading: Heading,
    spans: Sequence[tuple[int | None, int | None] | None],
    amounts: Sequence[float | None],
    answers: DriverAnswers,
    problems: Sequence[str],
    form: str,
    where: str,
) -> DriverRows:
    rows = sorted(
        {
            (int(s[0]), int(s[1]), value)
            for s, value in zip(spans, amounts, strict=True)
            if s is not None and s[0] is not None and s[1] is not None and value is not None
        }
    )
    if not rows:
        raise UnreadableBills("no row has both its days and an amount", where=where)
    long = any(end - start > 1 for start, end, _ in rows)
    values = answers.values or ("level" if heading.per_day else None)
    if values is None and long:
        raise AmbiguousBills(
            f"rows of {heading.text!r} stand for several days each, and it is not said whether "
            "the amount is the sum of those days or that of one of them",
            where=where,
            next_step='Put values = "total" (tonnes made, school days in the month) or values = '
            '"level" (occupied units, hours a day) under [[driver]].',
        )
    values = values or "total"
    if form == "bills":
        rows, clash = _without_clashes(rows)
        problems = [*problems, *clash]
    else:
        _no_overlaps(rows, where)
    return DriverRows(
        start=tuple(r[0] for r in rows),
        end=tuple(r[1] for r in rows),
        value=tuple(r[2] for r in rows),
        values=values,
        source=(table.name, table.sha256),
        reading=_sentences(heading, form, values, long, problems),
    )


def _no_overlaps(rows: Sequence[tuple[int, int, float]], where: str) -> None:
    for (_, end, first), (start, _, second) in pairwise(rows):
        if start < end:
            raise AmbiguousBills(
                f"{iso(start)} stands in two rows, with {first:g} and {second:g}",
                where=where,
                wanted="one amount a day",
                next_step="Remove one of the rows, or make their days meet.",
            )


def _without_clashes(
    rows: list[tuple[int, int, float]],
) -> tuple[list[tuple[int, int, float]], list[str]]:
    """Bills that overlap leave their driver unknown; their repair is elsewhere."""
    bad = {k for i, (a, b) in enumerate(pairwise(rows)) if b[0] < a[1] for k in (i, i + 1)}
    kept = [row for i, row in enumerate(rows) if i not in bad]
    return kept, [f"{len(bad)} bills overlap, so their amounts are not used"] if bad else []


def _sentences(
    heading: Heading, form: str, values: str, long: bool, problems: Sequence[str]
) -> tuple[str, ...]:
    dated = {
        "span": "each row from its start to its end",
        "month": "each row a calendar month",
        "day": "each row a day",
        "bills": "each bill's own days",
    }[form]
    said = [f"amounts from column {heading.text!r}, {dated}"]
    if long and values == "total":
        said.append("each row's total is spread evenly over its days")
    elif long:
        said.append("each row's level holds on each of its days")
    if problems:
        more = f" and {len(problems) - MOST_SHOWN} more" if len(problems) > MOST_SHOWN else ""
        said.append("not used: " + "; ".join(problems[:MOST_SHOWN]) + more)
    return tuple(said)


__all__ = ["KINDS", "ORDERS", "DriverAnswers", "DriverRows", "driver_of_bills", "read_driver"]
