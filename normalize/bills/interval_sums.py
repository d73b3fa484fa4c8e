"""Moments and sums of a million readings, compiled: one pass each, nothing made for a reading.

What belongs here: loops over arrays of readings.  What their results mean is said in
interval_times.py and local_days.py.  (normalize.jit)
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from normalize.bills.interval_cells import NO_OFFSET
from normalize.jit import kernel

if TYPE_CHECKING:
    from numpy.typing import NDArray

    Int = NDArray[np.int32]
    Long = NDArray[np.int64]
    Float = NDArray[np.float64]
    Byte = NDArray[np.uint8]

NO_DAY = -(1 << 40)
_NO_DAY = NO_DAY
_NO_OFFSET = NO_OFFSET


@kernel
def count_lines(data: Byte, begin: int) -> int:
    """Line ends from a byte on."""
    count = 0
    for j in range(begin, data.shape[0]):
        if data[j] == 10:
            count += 1
    return count


@kernel
def local_seconds(date: Int, second: Int, days: Long, local: Long, known: Byte) -> int:
    """Seconds since 1970 by the file's own clock; how many lines have such a moment.

    days : day number of each date, NO_DAY for what is none.
    """
    count = 0
    for i in range(date.shape[0]):
        local[i], known[i] = 0, 0
        if date[i] >= 0 and second[i] >= 0 and days[date[i]] != _NO_DAY:
            local[i], known[i] = days[date[i]] * 86400 + second[i], 1
            count += 1
    return count


@kernel
def count_steps(local: Long, offset: Int, known: Byte, counts: Long) -> bool:
    """How often neighbouring moments are so many seconds apart; whether they always rise.

    counts : (longest + 1,).  With an offset, moments are compared in UTC.
    """
    before, some, rising = 0, False, True
    for i in range(local.shape[0]):
        if known[i] == 0:
            continue
        moment = local[i] if offset[i] == _NO_OFFSET else local[i] - offset[i]
        if some:
            step = moment - before
            if step <= 0:
                rising = False
            elif step < counts.shape[0]:
                counts[step] += 1
        before, some = moment, True
    return rising


@kernel
def keep_lines(state: Byte, known: Byte, own: Byte, use: Float, most: float, keep: Byte) -> int:
    """Mark lines that count: whole, the account's, with a moment and a sane number; how many."""
    count = 0
    for i in range(state.shape[0]):
        keep[i] = state[i] == 1 and known[i] == 1 and own[i] == 1 and abs(use[i]) < most
        count += keep[i]
    return count


@kernel
def span_of(local: Long, keep: Byte, low: int, high: int) -> tuple[int, int]:
    """First and last moment of the readings kept within [low, high); last < first for none."""
    first, last = high, low
    for i in range(local.shape[0]):
        if keep[i] == 1 and low <= local[i] < high:
            first, last = min(first, local[i]), max(last, local[i])
    return first, last


@kernel
def add_days(
    local: Long, keep: Byte, seconds: Long, use: Float, cost: Float, line: Long, estimated: Long,
    first: int, count: Long, covered: Long, total: Float, money: Float, priced: Long, top: Long,
    guessed: Long,
) -> None:  # fmt: skip
    """Sums over days, one place for each day from ``first`` on.

    seconds, cost, estimated, line : (n,), or (1,) for all (of line: that of the first reading).
    """
    n = local.shape[0]
    for i in range(n):
        if keep[i] == 0:
            continue
        k = local[i] // 86400 - first
        if not 0 <= k < count.shape[0]:
            continue
        here = line[i] if line.shape[0] == n else line[0] + i
        if count[k] == 0 or here < top[k]:
            top[k] = here
        count[k] += 1
        covered[k] += seconds[i] if seconds.shape[0] == n else seconds[0]
        total[k] += use[i]
        guessed[k] += estimated[i] if estimated.shape[0] == n else estimated[0]
        price = cost[i] if cost.shape[0] == n else cost[0]
        if not np.isnan(price):
            money[k] += price
            priced[k] += 1


@kernel
def day_lengths(
    local: Long, offset: Int, keep: Byte, first: int, early: Long, late: Long, length: Long
) -> None:
    """Seconds of each day from ``first`` on, by the offsets of its first and last reading.

    early, late : (days,) the instants of those readings, workspace.
    """
    for k in range(length.shape[0]):
        early[k], late[k], length[k] = np.iinfo(np.int64).max, np.iinfo(np.int64).min, 0
    for i in range(local.shape[0]):
        k = local[i] // 86400 - first
        if keep[i] == 0 or not 0 <= k < length.shape[0]:
            continue
        shift = 0 if offset[i] == _NO_OFFSET else offset[i]
        early[k] = min(early[k], local[i] - shift)
        late[k] = max(late[k], local[i] - shift)
    for i in range(local.shape[0]):
        k = local[i] // 86400 - first
        if keep[i] == 0 or not 0 <= k < length.shape[0]:
            continue
        shift = 0 if offset[i] == _NO_OFFSET else offset[i]
        if local[i] - shift == early[k]:
            early[k] = np.iinfo(np.int64).max
            length[k] += 86400 + shift
        if local[i] - shift == late[k]:
            late[k] = np.iinfo(np.int64).min
            length[k] -= shift
