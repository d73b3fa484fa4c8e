"""When each line of an interval file was: local moments, their step, and what settled them.

What belongs here: dates and times of day to local seconds; the order of day and month; whether
a stamp is the start or the end of its interval; time zones.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from normalize.bills.answers import Answers
from normalize.bills.columns import answer
from normalize.bills.dates import Order
from normalize.bills.interval_cells import BAD_TIME, BARE_HOUR, NO_OFFSET
from normalize.bills.interval_kernel import Lines
from normalize.bills.interval_sums import NO_DAY, count_steps, local_seconds
from normalize.bills.local_days import DAY, Clock, clock_of, spoken
from normalize.bills.wide_head import WideHead
from normalize.errors import AmbiguousBills, UnreadableBills

if TYPE_CHECKING:
    from numpy.typing import NDArray

    Long = NDArray[np.int64]
    Int = NDArray[np.int32]
    Byte = NDArray[np.uint8]

LONGEST_STEP = 36 * 3600
SURELY_NO_DATES = 200  # dates looked at before a file of months by name is ruled out
MOST_OFFSETS = 4  # a place has two, winter's and summer's; more are ends of ranges (13:00-14:00)
_FIRST_MONTH = np.datetime64("1900-01")


@dataclass(frozen=True, slots=True)
class Moments:
    """local : (n,) local seconds of each interval's start.  offset : (n,) from UTC, or NO_OFFSET.

    known : (n,) 1 for lines with a moment.  step : seconds of an interval.  clock : where known.
    rising : each moment is later than the one before.  zoned : the file gives its own offsets.
    """

    local: Long
    offset: Int
    known: Byte
    step: int
    clock: Clock | None
    rising: bool
    zoned: bool
    notes: tuple[str, ...]
    cautions: tuple[str, ...]


def moments_of(
    lines: Lines, days: Long, note: str, role: str, answers: Answers, where: str
) -> Moments:
    """Moments of one account. role : of the column of stamps: start, read or end.

    days, note : as days_of gives them for the whole file.  Raises AmbiguousBills, UnreadableBills.
    """
    second = lines.second
    local, known = np.empty(second.shape, np.int64), np.empty(second.shape, np.uint8)
    if local_seconds(lines.date, second, days, local, known) == 0:
        raise UnreadableBills("no line begins with a moment of time", where=where)
    offset, zoned = _offsets(lines.offset, known)
    step, rising = _step(local, offset, known, where)
    notes = [note] if note else []
    cautions: list[str] = []
    label = _label(role, local, known, step, answers, notes, cautions)
    if label == "end":
        local -= step
    clock = clock_of(answers.time_zone, where=where) if answers.time_zone is not None else None
    if clock is None and zoned and not np.any(offset[known == 1]):
        raise AmbiguousBills(
            "the times are UTC, and the file does not say in which time zone the meter is",
            where=where,
            next_step='Put time_zone = "America/New_York" (your own) under [[account]] in '
            "site.toml, or use --time-zone.",
        )
    if clock is not None and zoned:
        local = clock.local(local - np.where(offset == NO_OFFSET, 0, offset))
        rising = bool(np.all(np.diff(local) > 0))
    return Moments(local, offset, known, step, clock, rising, zoned, tuple(notes), tuple(cautions))


def wide_moments(
    lines: Lines, days: Long, note: str, wide: WideHead, answers: Answers, where: str
) -> Moments:
    """Moments of a wide file's readings, line by line. Raises as moments_of does."""
    day = np.append(days, NO_DAY)[lines.date]  # the last for -1, no date
    if not np.any(day != NO_DAY):
        raise UnreadableBills("no line begins with a date", where=where)
    # The hour that comes twice when clocks go back is, nearly everywhere, the one from 1 to 2.
    more = {k: 3600 + n * wide.step for n, k in enumerate(wide.extra)}
    starts = np.array([(wide.starts | more)[k] for k in wide.columns], np.int64)
    known = np.repeat((day != NO_DAY).astype(np.uint8), starts.size)
    local = (np.where(day == NO_DAY, 0, day)[:, None] * DAY + starts).reshape(-1)
    clock = clock_of(answers.time_zone, where=where) if answers.time_zone is not None else None
    rising = not wide.extra and bool(np.all(np.diff(day[day != NO_DAY]) > 0))
    notes = (f"a column for each {spoken(wide.step)}", *([note] if note else []))
    offset = np.full(local.shape, NO_OFFSET, np.int32)
    return Moments(local, offset, known, wide.step, clock, rising, False, notes, ())


def _offsets(offset: Int, known: Byte) -> tuple[Int, bool]:
    """Offsets from UTC, unless they are no offsets, and whether there are any."""
    some = offset[(offset != NO_OFFSET) & (known == 1)]
    if some.size == 0:
        return offset, False
    if np.unique(some[: 10 * SURELY_NO_DATES]).size > MOST_OFFSETS:
        return np.full_like(offset, NO_OFFSET), False
    return offset, True


def bare_numbers(second: Int) -> Int:
    """Times such as 13, 1300 or 130000 to seconds; which of these they are, all of them show."""
    bare = second <= BARE_HOUR
    if not np.any(bare):
        return second
    value = BARE_HOUR - second[bare].astype(np.int64)
    top = int(value.max())
    scale = 10000 if top > 2400 else 100 if top > 24 else 1
    hour, minute, rest = value // scale, value % scale, np.zeros_like(value)
    if scale == 10000:
        minute, rest = minute // 100, minute % 100
    total = hour * 3600 + minute * 60 + rest
    good = (minute < 60) & (rest < 60) & (total <= DAY)
    out = second.copy()
    out[bare] = np.where(good, total, BAD_TIME)
    return out


def days_of(lines: Lines, data: bytes, answers: Answers, where: str) -> tuple[Long, str]:
    """Day number of each date, NO_DAY for none, and a sentence on their order."""
    parts = lines.parts.astype(np.int64)
    bad = np.flatnonzero(parts[:, 0] < 0)
    if 2 * bad.size > parts.shape[0]:
        _months_by_name(parts, lines.spans, data, bad)
    order, note = _order(parts, answers, where)
    places = {"year first": (0, 1, 2), "month first": (2, 0, 1), "day first": (2, 1, 0)}[order]
    year, month, day = (parts[:, k] for k in places)
    year = np.where(year >= 100, year, np.where(year < 70, year + 2000, year + 1900))
    good = (parts[:, 0] >= 0) & (year >= 1900) & (year < 2100) & (month >= 1) & (month <= 12)
    good &= (day >= 1) & (day <= 31)
    months = np.where(good, (year - 1900) * 12 + month - 1, 0)
    first, after = (
        (_FIRST_MONTH + months + k).astype("datetime64[D]").astype(np.int64) for k in (0, 1)
    )
    good &= first + day <= after
    return np.where(good, first + day - 1, NO_DAY), note


def _months_by_name(parts: Long, spans: Long, data: bytes, bad: NDArray[np.intp]) -> None:
    """Dates that name their month, in place; each is looked up once.

    bad : those that are no numbers.  When none of the first is a date either, the rest is not
    looked at.
    """
    known: dict[bytes, tuple[int, int, int]] = {}
    for count, (i, (a, b)) in enumerate(zip(bad.tolist(), spans[bad].tolist(), strict=True)):
        if count == SURELY_NO_DATES and all(year < 0 for year, _, _ in known.values()):
            return
        text = data[a:b]
        if text not in known:
            known[text] = _named_date(text)
        parts[i] = known[text]


def _named_date(text: bytes) -> tuple[int, int, int]:
    """Year, month and day of a date that names its month; -1 for anything else."""
    from normalize.bills.dates import read_written
    from normalize.days import date_of

    day = read_written(text.decode("utf-8", "replace")).day
    if day is None or abs(day) > 10**6:
        return (-1, -1, -1)
    when = date_of(day)
    return (when.year, when.month, when.day)


def _order(parts: Long, answers: Answers, where: str) -> tuple[Order, str]:
    a, b = parts[:, 0], np.where(parts[:, 0] >= 0, parts[:, 1], -1)
    if 2 * np.count_nonzero(a > 31) >= np.count_nonzero(a >= 0):
        return "year first", ""
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


def _step(local: Long, offset: Int, known: Byte, where: str) -> tuple[int, bool]:
    """The commonest step between neighbouring moments, and whether each is later than the last."""
    counts = np.zeros(LONGEST_STEP + 1, np.int64)
    rising = count_steps(local, offset, known, counts)
    if not rising:
        some = known == 1
        moved = local[some] - np.where(offset == NO_OFFSET, 0, offset)[some]
        steps = np.diff(np.sort(moved))
        counts = np.bincount(steps[(steps > 0) & (steps <= LONGEST_STEP)], minlength=1)
    if not np.any(counts):
        raise UnreadableBills("the lines do not follow each other within days", where=where)
    return int(np.argmax(counts)), rising


def _label(
    role: str, local: Long, known: Byte, step: int, answers: Answers, notes: list[str],
    cautions: list[str],
) -> str:  # fmt: skip
    """Whether a stamp begins or ends its interval."""
    if answers.interval_times is not None:
        notes.append(f"a time is the {answers.interval_times} of its interval, as you said")
        return answers.interval_times
    if role in ("start", "end") or step >= DAY:
        return role if role == "end" and step < DAY else "start"
    if not np.all(known):
        local = local[known == 1]
    first, last = int(local.min() % DAY), int(local.max() % DAY)
    if first == 0 and last == DAY - step:
        return "start"
    if first == step % DAY and last == 0:
        notes.append("a time is the end of its interval: the file begins and ends so")
        return "end"
    cautions.append(
        f"It is not clear whether a time is the start or the end of its {spoken(step)}; the start "
        'was taken, which can move one reading a day. interval_times = "end" says otherwise.'
    )
    return "start"
