"""Which of the layouts a bill file has: how it says when a bill began and ended.

What belongs here: the choice, from the columns that are there, and the question to ask when
no column will do.  What each layout then does is in layouts.py.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from normalize.bills import records as rec
from normalize.bills.columns import Columns, answer
from normalize.bills.dates import read_written
from normalize.bills.groups import cell
from normalize.bills.repair import Kind
from normalize.bills.table import RawRow
from normalize.errors import AmbiguousBills, BillError, UnreadableBills


@dataclass(frozen=True, slots=True)
class Layout:
    """How dates are given.

    name : "start and end", "date and days", "start and days" or "dates alone".
    where : the columns that hold them.  roles : the same, to be shown to the user.
    """

    name: str
    where: rec.Where
    roles: tuple[str, ...]


def layout_of(columns: Columns, body: Sequence[RawRow], kind: Kind, where: str) -> Layout:
    """The layout of a file.  Raises AmbiguousBills or UnreadableBills with what is missing."""
    get = columns.get
    end_role = "end" if get("end") is not None else "read"
    if get("start") is not None and get(end_role) is not None:
        place = rec.Where(start=get("start"), end=get(end_role))
        return Layout("start and end", place, ("start", end_role))
    ranges = get("range")
    if ranges is not None:
        texts = [cell(row, ranges) for row in body]
        if 2 * sum(1 for t in texts if rec.split_range(t)) >= len(texts):
            return Layout("start and end", rec.Where(range=ranges), ("range",))
    with_days = get("days") is not None and kind == "meter"
    name = "date and days" if with_days else "dates alone"
    order = ("delivery", "end", "read") if kind == "delivery" else ("end", "read", "delivery")
    for role in (*order, "range"):
        if get(role) is not None:
            return Layout(name, rec.Where(end=get(role)), (role,))
    year, month, day = get("year"), get("month"), get("day")
    if year is not None and month is not None and day is not None:
        place = rec.Where(parts=(year, month, day))
        return Layout(name, place, ("year", "month", "day"))
    if get("start") is not None and with_days:
        return Layout("start and days", rec.Where(start=get("start")), ("start",))
    if month is not None and year is None and _are_dates(body, month):
        return Layout(name, rec.Where(end=month), ("month",))
    if month is not None and year is not None:
        return Layout(name, rec.Where(months=(year, month)), ("year", "month"))
    raise _no_dates(columns, where)


def _are_dates(body: Sequence[RawRow], k: int) -> bool:
    found = [read_written(cell(row, k)) for row in body]
    good = sum(1 for w in found if w.day is not None or w.parts is not None or w.month)
    return 2 * good > len(found)


def _no_dates(columns: Columns, where: str) -> BillError:
    if columns.get("bill date") is not None:
        heading = columns.heading("bill date").text
        return AmbiguousBills(
            f"the only date is that of the bill itself ({heading!r}), and a bill is written days "
            "after the meter is read",
            where=where,
            wanted="the date of the reading, or the first and last day of each bill",
            next_step="If it is as good as the date of the reading: "
            + answer("end_column", heading),
        )
    if columns.get("month") is not None:
        return AmbiguousBills(
            "the file names months, but no years and no days on which the meter was read",
            where=where,
            wanted="the date of the reading, or the first and last day of each bill",
            next_step="Add a column 'end' with the date of each reading.",
        )
    if columns.get("start") is not None:
        return AmbiguousBills(
            "the file has start dates, but no end dates and no days",
            where=where,
            next_step="If these are the dates of the readings: "
            + answer("end_column", columns.heading("start").text),
        )
    return UnreadableBills(
        "no column looks like a date",
        where=where,
        wanted="a heading such as 'Read date', or 'Start' and 'End'",
        next_step='Name it: end_column = "…" under [[account]] in site.toml, or --end-column.',
    )


def ask_read_day(where: str) -> AmbiguousBills:
    """The question of a file that names months and no days."""
    return AmbiguousBills(
        "the file names months, but not the days on which the meter was read",
        where=where,
        wanted="the date of the reading, or the first and last day of each bill",
        next_step="Put read_day = 5 (the day of the month on which the meter is read, so that a "
        'bill of January ends on 5 January) or read_day = "calendar" (bills of whole calendar '
        "months) under [[account]] in site.toml, or use --read-day.",
    )
