"""From instants to local days: clocks that change, and readings summed to the days they fell on.

What belongs here: time zones (IANA names, fixed offsets, the eight hex digits of ESPI's
LocalTimeParameters) as tables of offsets, and the sum of short intervals over local days with
a count of what is missing.  Nothing here knows a file format.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from datetime import UTC, date, datetime, timedelta
from typing import TYPE_CHECKING

import numpy as np

from normalize.bills.interval_sums import add_days, day_lengths, span_of
from normalize.days import FIRST_SANE_DAY, LAST_SANE_DAY, date_of, day_of
from normalize.errors import BillError

if TYPE_CHECKING:
    from numpy.typing import NDArray

    Int = NDArray[np.int32]
    Long = NDArray[np.int64]
    Float = NDArray[np.float64]
    Byte = NDArray[np.uint8]

DAY = 86_400  # seconds
_FIRST_YEAR, _LAST_YEAR = 1970, 2099
_OFFSET = re.compile(r"^(?:utc|gmt)?\s*([+-])(\d{1,2}):?(\d{2})?$", re.IGNORECASE)
_NO_DST = 0xFFFFFFFF


@dataclass(frozen=True, slots=True)
class Clock:
    """Local time: ``offset[k]`` seconds from UTC from ``since[k]`` on, ``offset`` one longer.

    since : (m,) epoch seconds, rising.  offset : (m + 1,) seconds, east positive.
    """

    name: str
    since: Long
    offset: Long

    def local(self, epoch: Long) -> Long:
        """Local seconds of instants.

        >>> fixed_clock(-18000).local(np.array([0])).tolist()
        [-18000]
        """
        return epoch + self.offset[np.searchsorted(self.since, epoch, side="right")]

    def seconds_of_day(self, day: Long) -> Long:
        """How long each local day is: 86,400 seconds, but 82,800 or 90,000 when clocks change.

        >>> clock_of("America/New_York").seconds_of_day(np.array([day_of(date(2024, 3, 10))]))
        array([82800])
        """
        begin, end = self._midnight(day), self._midnight(day + 1)
        return end - begin

    def _midnight(self, day: Long) -> Long:
        local = day * DAY
        guess = local - self.offset[np.searchsorted(self.since, local, side="right")]
        return local - self.offset[np.searchsorted(self.since, guess, side="right")]


def fixed_clock(offset: int, name: str = "") -> Clock:
    """A clock that never changes. offset : seconds from UTC, east positive."""
    return Clock(name, np.empty(0, np.int64), np.array([offset], np.int64))


def clock_of(text: str, *, where: str = "") -> Clock:
    """The clock of an IANA zone such as America/New_York, or of an offset such as -05:00.

    Raises BillError if there is no such zone.
    """
    found = _OFFSET.match(text.strip())
    if found:
        seconds = int(found[2]) * 3600 + int(found[3] or 0) * 60
        if seconds <= 14 * 3600:
            return fixed_clock(-seconds if found[1] == "-" else seconds, text.strip())
    if text.strip().upper() in ("UTC", "GMT", "Z"):
        return fixed_clock(0, "UTC")
    return _zone(text.strip(), where)


def _zone(name: str, where: str) -> Clock:
    from zoneinfo import ZoneInfo

    try:
        zone = ZoneInfo(name)
    except (OSError, ValueError, LookupError):
        raise BillError(
            f"no time zone is called {name[:40]!r}",
            where=where,
            wanted="a zone such as America/New_York, or an offset such as -05:00",
        ) from None

    def offset_at(epoch: int) -> int:
        moved = datetime.fromtimestamp(epoch, UTC).astimezone(zone).utcoffset()
        return int(moved.total_seconds()) if moved is not None else 0

    since, offset = [], [offset_at(_epoch(_FIRST_YEAR, 1, 1))]
    step = 7 * DAY  # clocks change twice a year, weeks apart
    for low in range(_epoch(_FIRST_YEAR, 1, 1), _epoch(_LAST_YEAR, 12, 31), step):
        if offset_at(low + step) == offset[-1]:
            continue
        a, b = low, low + step
        while b - a > 1:
            middle = (a + b) // 2
            a, b = (middle, b) if offset_at(middle) == offset[-1] else (a, middle)
        since.append(b)
        offset.append(offset_at(b))
    return Clock(name, np.array(since, np.int64), np.array(offset, np.int64))


def _epoch(year: int, month: int, day: int) -> int:
    return day_of(date(year, month, day)) * DAY


def espi_clock(tz_offset: int, dst_offset: int, start_rule: str, end_rule: str) -> Clock | None:
    """The clock of ESPI LocalTimeParameters; None where a rule is cut short or no rule.

    start_rule, end_rule : eight hex digits, FFFFFFFF for none.  Bits 28-31 month, 25-27
    operator (0 day of month; 1 weekday on or after it; 2 to 6 first to fifth; 7 last), 20-24
    day of month, 17-19 weekday (Monday 1), 12-16 hour, 0-11 seconds.  Source: NAESB REQ.21.

    >>> clock = espi_clock(-18000, 3600, "360E2000", "B40E2000")
    >>> clock.local(np.array([1710054000])).tolist() == [1710054000 - 4 * 3600]
    True
    """
    codes = [_rule_code(start_rule), _rule_code(end_rule)]
    if None in codes or abs(tz_offset) > 14 * 3600 or abs(dst_offset) > 2 * 3600:
        return None
    if _NO_DST in codes or dst_offset == 0:
        return fixed_clock(tz_offset, "the file's own")
    changes: list[tuple[int, int]] = []
    for year in range(_FIRST_YEAR, _LAST_YEAR + 1):
        first, last = (_rule_instant(code or 0, year) for code in codes)
        if first is None or last is None:
            return None
        changes.append((first - tz_offset, tz_offset + dst_offset))
        changes.append((last - tz_offset - dst_offset, tz_offset))
    changes.sort()
    before = tz_offset if changes[0][1] != tz_offset else tz_offset + dst_offset
    return Clock(
        "the file's own",
        np.array([c[0] for c in changes], np.int64),
        np.array([before, *(c[1] for c in changes)], np.int64),
    )


def _rule_code(text: str) -> int | None:
    text = text.strip()
    return int(text, 16) if re.fullmatch(r"[0-9A-Fa-f]{8}", text) else None


def _rule_instant(code: int, year: int) -> int | None:
    """Local seconds at which a rule takes effect in a year; None if the rule makes no sense."""
    month, how, day = code >> 28 & 15, code >> 25 & 7, code >> 20 & 31
    weekday, hour, seconds = code >> 17 & 7, code >> 12 & 31, code & 0xFFF
    if not 1 <= month <= 12 or hour > 24 or (how and not 1 <= weekday <= 7):
        return None
    try:
        if how == 0:
            when = date(year, month, day)
        elif how == 7:
            when = (date(year, month, 28) + timedelta(days=4)).replace(day=1) - timedelta(days=1)
            when -= timedelta(days=(when.isoweekday() - weekday) % 7)
        else:
            when = date(year, month, max(1, day) if how == 1 else 1)
            when += timedelta(days=(weekday - when.isoweekday()) % 7)
            when += timedelta(weeks=how - 2 if how > 1 else 0)
    except ValueError:
        return None
    return day_of(when) * DAY + hour * 3600 + seconds


@dataclass(frozen=True, slots=True)
class DaySums:
    """Readings summed to local days.

    day : (n,) int64.  use, cost : (n,), cost NaN where no reading of the day had one.
    line : (n,) that of the day's first reading.  count : (n,) its readings, estimated : how many
    of them are estimates.  missing : (n,) seconds of the day without a reading.  twice : (n,)
    seconds that are there more than once.
    """

    day: Long
    use: Float
    cost: Float
    line: Long
    count: Long
    estimated: Long
    missing: Long
    twice: Long


def sum_days(
    local: Long, seconds: Long, use: Float, cost: Float, line: Long, estimated: Long,
    *, keep: Byte | None = None, offset: Int | None = None, clock: Clock | None = None,
    room: int | None = None,
) -> DaySums:  # fmt: skip
    """Sum readings to the local days in which they begin.

    local, use : (n,) local seconds of each reading's start, and its use.  seconds, cost,
    estimated : (n,), or (1,) where it is the same for all.  line : (n,), or (1,) that of the
    first.  keep : (n,) 1 for readings that count.  offset : (n,) from UTC, where the file says
    its own; clock : where it is known.  With neither, a day of 23 or 25 hours passes as whole
    where clocks can have changed: on a Sunday of March, April or September to November.
    room : seconds of a day beyond which the file has no place for readings.

    >>> hours = np.arange(24) * 3600
    >>> one = np.ones(24)
    >>> sum_days(hours, hours * 0 + 3600, one, one, hours, hours * 0).use.tolist()
    [24.0]
    """
    arrays = (np.ascontiguousarray(a, np.int64) for a in (local, seconds, line, estimated))
    local, seconds, line, estimated = arrays
    use, cost = np.ascontiguousarray(use, np.float64), np.ascontiguousarray(cost, np.float64)
    if keep is None:
        keep = np.isfinite(use).astype(np.uint8)
    low, high = span_of(local, keep, FIRST_SANE_DAY * DAY, (LAST_SANE_DAY + 1) * DAY)
    if low > high:
        none = np.empty(0, np.int64)
        return DaySums(none, np.empty(0), np.empty(0), none, none, none, none, none)
    first, size = low // DAY, high // DAY - low // DAY + 1
    count, covered, priced, top, guessed = (np.zeros(size, np.int64) for _ in range(5))
    total, money = np.zeros(size), np.zeros(size)
    add_days(
        local, keep, seconds, use, cost, line, estimated, first,
        count, covered, total, money, priced, top, guessed,
    )  # fmt: skip
    there = np.flatnonzero(count)
    days, covered = (there + first).astype(np.int64), covered[there]
    if offset is not None and clock is None:
        full = _by_offsets(local, offset, keep, first, size)[there]
    else:
        full = _lengths(days, covered, clock)
    full = full if room is None else np.minimum(full, room)
    return DaySums(
        day=days,
        use=total[there],
        cost=np.where(priced[there] > 0, money[there], np.nan),
        line=top[there],
        count=count[there],
        estimated=guessed[there],
        missing=np.maximum(0, full - covered),
        twice=np.maximum(0, covered - full),
    )


def _by_offsets(local: Long, offset: Int, keep: Byte, first: int, size: int) -> Long:
    """Seconds of each day from ``first`` on, by the file's own offsets."""
    full, early, late = (np.zeros(size, np.int64) for _ in range(3))
    day_lengths(local, offset, keep, first, early, late, full)
    return full


def _lengths(days: Long, covered: Long, clock: Clock | None) -> Long:
    if clock is not None:
        return clock.seconds_of_day(days)
    full = np.full(days.size, DAY, np.int64)
    for k in np.flatnonzero(np.abs(covered - DAY) == 3600):
        when = date_of(int(days[k]))
        if when.isoweekday() == 7 and when.month in (3, 4, 9, 10, 11):
            full[k] = covered[k]
    return full


def spoken(seconds: int) -> str:
    """A length of time in words: 5400 is "1 h 30 min"."""
    hours, rest = divmod(int(seconds), 3600)
    minutes = rest // 60
    words = [f"{hours} h"] if hours else []
    return " ".join([*words, f"{minutes} min"] if minutes or not hours else words)
