"""The ways in which bill files say when a bill began and ended.

What belongs here: start and end dates, dates with days, dates alone, deliveries: each turns
the records of a file into BillRows ``[start, end)``.  Cells are already dates and numbers
here; questions about the order of day and month are settled before (dates.py).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

from normalize.bills.columns import answer
from normalize.bills.periods import BillRow
from normalize.bills.sum_rows import month_edge
from normalize.days import iso
from normalize.errors import AmbiguousBills

OPENS = "opens the record: the first period runs from this {event}"
REOPENS = (
    "opens the record again: the {event} on line {line} cannot be used, so what this one "
    "measures began at an unknown date"
)
ENDS_EXCLUSIVE = "an end date is the day of the reading, not itself in the bill"
ENDS_INCLUSIVE = "an end date is the last day of the bill"
DAILY_LINES = 10  # fewer lines a day apart are no daily record (our own, no source)
NOT_OPENED = {
    "reading": "an estimated reading before any actual one: it cannot open the record",
    "delivery": "before the first full fill: it is not known when this fuel began to be used",
}


@dataclass(slots=True)
class Record:
    """One line of the file, its cells read.

    start, end : day numbers or None.  days : of a days column.  use, cost, mean_temp_f : None
    where blank.  estimated : estimated reading, or a fill not known to be full.
    problem : why the line cannot be used; the first one found stays.
    note : what reading it took.
    """

    line: int
    start: int | None = None
    end: int | None = None
    days: int | None = None
    use: float | None = None
    cost: float | None = None
    estimated: bool = False
    mean_temp_f: float | None = None
    problem: str = ""
    note: str = ""

    def blame(self, problem: str) -> None:
        """Note a problem, unless an earlier one is already known."""
        if not self.problem:
            self.problem = problem

    def row(self, file: str) -> BillRow:
        """The record as a BillRow."""
        if self.use is None:
            self.blame("no usage given")
        return BillRow(
            file, self.line, self.start, self.end, self.use, self.cost, self.estimated,
            self.mean_temp_f, self.problem, self.note,
        )  # fmt: skip


def from_days(records: Sequence[Record]) -> None:
    """Reading date and days: the bill began that many days before its reading."""
    for record in records:
        if record.end is None or record.problem:
            continue
        if record.days is None:
            record.blame("no number of days given")
        else:
            record.start = record.end - record.days


def from_start_days(records: Sequence[Record]) -> None:
    """Start date and days."""
    for record in records:
        if record.start is None or record.problem:
            continue
        if record.days is None:
            record.blame("no number of days given")
        else:
            record.end = record.start + record.days


def newest_first(days: Sequence[int]) -> bool:
    """Whether a file lists its newest bill first."""
    steps = [b - a for a, b in pairwise(days)]
    return sum(s < 0 for s in steps) > sum(s > 0 for s in steps)


def from_months(
    records: Sequence[Record], months: Sequence[tuple[int, int] | None], read_day: int
) -> str:
    """Bills that name only a month; returns a sentence.

    read_day : 0 for whole calendar months; else the day of that month on which the meter is
    read, so that the bill of January runs from that day of December to that of January.
    """
    for record, month in zip(records, months, strict=True):
        if month is None:
            continue
        year, number = month
        if read_day == 0:
            record.start, record.end = month_edge(year, number, 1), month_edge(year, number + 1, 1)
        else:
            record.start = month_edge(year, number - 1, read_day)
            record.end = month_edge(year, number, read_day)
    if read_day == 0:
        return "a bill is of its whole calendar month, as you said"
    return f"a bill ends on day {read_day} of the month it names, as you said"


def are_days(records: Sequence[Record]) -> bool:
    """Whether nearly every line is the day after, or before, the line above it."""
    days = [r.end for r in records if r.end is not None]
    steps = [abs(b - a) for a, b in pairwise(days)]
    return len(steps) >= DAILY_LINES and steps.count(1) >= 0.9 * len(steps)


def read_with_others(records: Sequence[Record]) -> list[Record]:
    """The readings of one fuel in a table that gives several side by side; blames the rest.

    A blank beside another fuel's number may be a month in which this meter was not read, or a
    bill that is missing.  Where hardly two numbers follow each other the meter is read at every
    other date, and the blank ones are passed over; else what follows a blank began at an unknown
    date (from_dates_alone with ``blanks_break``).
    """
    filled = [r.use is not None for r in records]
    both = sum(1 for a, b in pairwise(filled) if a and b)
    apart = sum(1 for a, b in pairwise(filled) if a and not b)
    if not apart or apart < 4 * both:
        return list(records)
    for record in records:
        if record.use is None:
            record.blame("the meter of this fuel was not read on this date")
    return [r for r in records if r.use is not None]


def from_dates_alone(records: Sequence[Record], event: str, *, blanks_break: bool = False) -> None:
    """Each period runs from the reading (or full fill) before to this one.

    event : "reading" or "delivery".  The first opens the record; so does the first after a
    line whose date, or whose delivered amount, cannot be used; blanks_break : or whose use.
    """
    blanks_break = blanks_break or event == "delivery"
    opened, broken_by = False, 0
    before = this = -(2**31)
    for record in _in_time(records):
        if record.end is None or (blanks_break and record.use is None):
            opened, broken_by = False, record.line
            if record.end is not None:
                record.blame("no amount given" if event == "delivery" else "no usage given")
            continue
        if opened and record.end != this:
            before, this = this, record.end
            record.start = before
        elif opened and before > -(2**31):
            record.start = before  # a second line of the same date
        elif record.estimated and not opened:
            record.blame(NOT_OPENED[event])
        else:
            opened, before, this = True, -(2**31), record.end
            words = REOPENS if broken_by else OPENS
            record.blame(words.format(event=event, line=broken_by))


def _in_time(records: Sequence[Record]) -> list[Record]:
    """Oldest first.  A line without a date keeps its place behind the line before it."""
    days = [r.end for r in records if r.end is not None]
    ordered = list(reversed(records)) if newest_first(days) else list(records)
    keyed, key = [], -(2**31)
    for record in ordered:
        key = record.end if record.end is not None else key
        keyed.append((key, record))
    return [record for _, record in sorted(keyed, key=lambda pair: pair[0])]


def settle_ends(records: Sequence[Record], *, said: str | None, where: str) -> str:
    """Make ends exclusive; returns a sentence.  Raises AmbiguousBills.

    said : the user's answer, else the file's own evidence: bills that follow each other (the
    next start is this end, or the day after it) and a days column.
    """
    inclusive, why = _ends_are_inclusive(records, said, where)
    if not inclusive:
        return f"{ENDS_EXCLUSIVE}{why}"
    for record in records:
        if record.end is not None:
            record.end += 1
    return f"{ENDS_INCLUSIVE}{why}"


def ends_inclusive(sentence: str) -> bool | None:
    """What a sentence of settle_ends says; None where nothing hung on it or it was an answer."""
    return {ENDS_INCLUSIVE: True, ENDS_EXCLUSIVE: False}.get(sentence)


def _ends_are_inclusive(
    records: Sequence[Record], said: str | None, where: str
) -> tuple[bool, str]:
    if said is not None:
        return said == "inclusive", ", as you said"
    spans = sorted({(r.start, r.end) for r in records if r.start is not None and r.end is not None})
    steps = [b[0] - a[1] for a, b in pairwise(spans)]
    same, next_day = steps.count(0), steps.count(1)
    counted = [
        r.days - (r.end - r.start)
        for r in records
        if r.days is not None and r.start is not None and r.end is not None
    ]
    less, equal = counted.count(1), counted.count(0)
    follows = _verdict(next_day, same)
    counts = _verdict(less, equal)
    if follows is not None and counts is not None and follows != counts:
        raise _which_end("the days column and the dates of neighbouring bills disagree", where)
    verdict = counts if counts is not None else follows
    if verdict is not None:
        return verdict, ""
    if not any(r.start is not None and r.end is not None and not r.problem for r in records):
        return False, ""  # nothing hangs on it
    raise _which_end("it is not clear whether a bill's end date is a day of that bill", where)


def _verdict(yes: int, no: int) -> bool | None:
    """True or false when four in five agree, else None."""
    if yes + no == 0:
        return None
    if yes >= 4 * no:
        return True
    return False if no >= 4 * yes else None


def _which_end(found: str, where: str) -> AmbiguousBills:
    return AmbiguousBills(
        found,
        where=where,
        wanted="to know if the end is the last day of the bill, or the day of the reading "
        "on which the next bill starts",
        next_step=answer("end_dates", "inclusive", "exclusive"),
    )


def days_that_disagree(records: Sequence[Record], file: str) -> tuple[str, ...]:
    """Cautions on bills whose dates and days column differ by more than one."""
    wrong = [
        r
        for r in records
        if r.days is not None
        and r.start is not None
        and r.end is not None
        and abs(r.end - r.start - r.days) > 1
    ]
    said = [
        f"{file}:{r.line}: from {iso(r.start)} to {iso(r.end)} is {r.end - r.start} days, but the "
        f"days column says {r.days}; the dates were used."
        for r in wrong[:5]
        if r.start is not None and r.end is not None and abs(r.start) < 10**6 > abs(r.end)
    ]
    if len(wrong) > 5:
        said.append(f"{file}: {len(wrong) - 5} more bills whose days column differs.")
    return tuple(said)
