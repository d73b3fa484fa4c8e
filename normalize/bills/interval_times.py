"""When each line of an interval file was: local moments, their step, and what settled them.

What belongs here: columns of stamps or of dates and times to local seconds; the order of day
and month; whether a stamp is the start or the end of its interval; time zones.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from normalize.bills.answers import Answers
from normalize.bills.columns import answer
from normalize.bills.dates import Order
from normalize.bills.interval_kernel import FULL, NO_OFFSET, Lines, local_seconds
from normalize.bills.local_days import DAY, Clock, clock_of, spoken
from normalize.errors import AmbiguousBills, UnreadableBills

if TYPE_CHECKING:
    from numpy.typing import NDArray

    Long = NDArray[np.int64]

LONGEST_STEP = 36 * 3600
SURELY_NO_DATES = 200  # lines looked at before a file of months by name is ruled out
_CLOCK_TIME = re.compile(rb"(\d{1,2}):(\d{2})(?::(\d{2}))?[\d.]*\s*([aApP])?")
_FIRST_OF_MONTH = (
    np.arange("1900-01", "2100-03", dtype="datetime64[M]").astype("datetime64[D]").astype(np.int64)
)


@dataclass(frozen=True, slots=True)
class Moments:
    """local : (n,) local seconds of each interval's start.  offset : (n,) from UTC, or NO_OFFSET.

    known : (n,) lines with a moment.  step : seconds of an interval.  clock : where known.
    """

    local: Long
    offset: Long
    known: NDArray[np.bool_]
    step: int
    clock: Clock | None
    notes: tuple[str, ...]
    cautions: tuple[str, ...]
    zoned: bool

    def lengths(self, keep: NDArray[np.bool_]) -> Long | None:
        """Seconds of each day that has lines, from the file's own offsets; None without them."""
        if self.clock is not None or not self.zoned:
            return None
        day, offset = self.local[keep] // DAY, self.offset[keep]
        order = np.argsort(self.local[keep] - offset, kind="stable")
        days, first = np.unique(day[order], return_index=True)
        last = np.append(first[1:], day.size) - 1
        change: Long = offset[order][first] - offset[order][last]
        return DAY + change if days.size else None


def moments_of(lines: Lines, role: str, data: bytes, answers: Answers, where: str) -> Moments:
    """Moments of an interval file. role : of the column of stamps: start, read or end.

    Raises AmbiguousBills, UnreadableBills.
    """
    bad = np.flatnonzero((lines.fields[:, 0] < 0) & (lines.state == FULL))
    if 2 * bad.size > np.count_nonzero(lines.state == FULL):
        _months_as_numbers(lines, data, bad)
    order, note = _order(lines, answers, where)
    local, known = _local(lines, order)
    if not np.any(known):
        raise UnreadableBills("no line begins with a moment of time", where=where)
    zoned = bool(np.any(lines.offset[known] != NO_OFFSET))
    offset = lines.offset.astype(np.int64)
    step = _step(local, offset, known, zoned=zoned, where=where)
    notes = [note] if note else []
    cautions: list[str] = []
    label = _label(role, local[known], step, answers, notes, cautions)
    if label == "end":
        local -= step
    clock = clock_of(answers.time_zone, where=where) if answers.time_zone is not None else None
    if clock is None and zoned and bool(np.all(offset[known] == 0)):
        raise AmbiguousBills(
            "the times are UTC, and the file does not say in which time zone the meter is",
            where=where,
            next_step='Put time_zone = "America/New_York" (your own) under [[account]] in '
            "site.toml, or use --time-zone.",
        )
    if clock is not None and zoned:
        local = clock.local(local - np.where(offset == NO_OFFSET, 0, offset))
    return Moments(local, offset, known, step, clock, tuple(notes), tuple(cautions), zoned)


def _months_as_numbers(lines: Lines, data: bytes, bad: NDArray[np.intp]) -> None:
    """Stamps whose dates name their month, in place; each date is looked up once.

    bad : lines that are no stamps in numbers.  When none of the first is a date either, the rest
    is not looked at.
    """
    dates: dict[bytes, tuple[int, int, int]] = {}
    first = bad[:SURELY_NO_DATES]
    _named_stamps(lines, data, first, dates)
    if any(year > 0 for year, _, _ in dates.values()):
        _named_stamps(lines, data, bad[SURELY_NO_DATES:], dates)


def _named_stamps(
    lines: Lines, data: bytes, bad: NDArray[np.intp], dates: dict[bytes, tuple[int, int, int]]
) -> None:
    for i, (a, b) in zip(bad.tolist(), lines.span[bad].tolist(), strict=True):
        text = data[a:b]
        cut = text.find(b":")
        cut = text.rfind(b" ", 0, cut) if cut > 0 else len(text)
        date = text[:cut]
        if date not in dates:
            dates[date] = _named_date(date)
        if dates[date][0] < 0:
            continue
        lines.fields[i, :3] = dates[date]
        found = _CLOCK_TIME.search(text[cut:])
        if found:
            hour = int(found[1])
            if found[4]:
                hour = hour % 12 + (12 if found[4] in b"pP" else 0)
            lines.fields[i, 3:6] = hour, int(found[2]), int(found[3] or 0)


def _named_date(text: bytes) -> tuple[int, int, int]:
    """Year, month and day of a date that names its month; -1 for anything else."""
    from normalize.bills.dates import read_written
    from normalize.days import date_of

    day = read_written(text.decode("utf-8", "replace")).day
    if day is None or abs(day) > 10**6:
        return (-1, -1, -1)
    when = date_of(day)
    return (when.year, when.month, when.day)


def _order(lines: Lines, answers: Answers, where: str) -> tuple[Order, str]:
    a, b = lines.fields[:, 0], lines.fields[:, 1]
    if 2 * np.count_nonzero(a > 31) >= np.count_nonzero(a >= 0):
        return "year first", ""
    b = np.where(a >= 0, b, -1)
    if answers.dates is not None:
        return answers.dates, f"dates are {answers.dates}, as you said"
    first, second = np.count_nonzero(a > 12), np.count_nonzero(b > 12)
    if first > 10 * second:
        return "day first", "dates are day first: some can only be read so"
    if second > 10 * first:
        return "month first", "dates are month first: some can only be read so"
    raise AmbiguousBills(
        "the dates can be read with the month first or with the day first",
        where=where,
        next_step=answer("dates", "month first", "day first"),
    )


def _local(lines: Lines, order: Order) -> tuple[Long, NDArray[np.bool_]]:
    """Local seconds, and which lines have them; 24:00 is the end of its day."""
    places = {"year first": (0, 1, 2), "month first": (2, 0, 1), "day first": (2, 1, 0)}[order]
    n = lines.state.shape[0]
    local, known = np.empty(n, np.int64), np.empty(n, np.uint8)
    local_seconds(
        lines.fields, lines.state, np.array(places, np.int64), _FIRST_OF_MONTH, local, known
    )
    return local, known.view(np.bool_)


def _step(local: Long, offset: Long, known: NDArray[np.bool_], *, zoned: bool, where: str) -> int:
    """The commonest step between neighbouring moments."""
    moved = (
        local[known] - np.where(offset == NO_OFFSET, 0, offset)[known] if zoned else local[known]
    )
    steps = np.diff(moved)
    if np.any(steps <= 0):
        steps = np.diff(np.sort(moved))
    steps = steps[(steps > 0) & (steps <= LONGEST_STEP)]
    if steps.size == 0:
        raise UnreadableBills("the lines do not follow each other within days", where=where)
    return int(np.argmax(np.bincount(steps)))


def _label(
    role: str, local: Long, step: int, answers: Answers, notes: list[str], cautions: list[str]
) -> str:
    """Whether a stamp begins or ends its interval."""
    if answers.interval_times is not None:
        notes.append(f"a time is the {answers.interval_times} of its interval, as you said")
        return answers.interval_times
    if role in ("start", "end") or step >= DAY:
        return role if role == "end" and step < DAY else "start"
    first, last = int(local.min() % DAY), int(local.max() % DAY)
    if np.any(local % DAY == 0) and first == 0 and last == DAY - step:
        return "start"
    if first == step % DAY and last == 0:
        notes.append("a time is the end of its interval: the file begins and ends so")
        return "end"
    cautions.append(
        f"It is not clear whether a time is the start or the end of its {spoken(step)}; the start "
        'was taken, which can move one reading a day. interval_times = "end" says otherwise.'
    )
    return "start"
