"""Kernels that decide which version of a bill stands: cancelled, corrected, repeated rows.

What belongs here: rules among rows of the *same* service period.  Rows of different periods
meet in repair_overlaps.py, and neighbours are joined in repair_join.py.  (normalize.jit)

Common to the kernels: ``reason`` 0 is a row still standing, ``host[i]`` the row whose bill row
i is counted with (itself for most), ``version[i]`` its place from oldest to newest.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from normalize.bills import rules
from normalize.jit import kernel

if TYPE_CHECKING:
    from numpy.typing import NDArray

    Int = NDArray[np.int32]
    Long = NDArray[np.int64]
    Float = NDArray[np.float64]
    Byte = NDArray[np.uint8]

# Plain names: numba freezes these into the compiled code.
_FIRST_DAY = rules.FIRST_DAY
_LAST_DAY = rules.LAST_DAY
_ABSURD = rules.ABSURD_USE
_CANCEL = rules.CANCEL_TOLERANCE
_MAX_TANGLE = rules.MAX_TANGLE
_KEPT = rules.KEPT
_BAD_DATE = rules.BAD_DATE
_BACKWARDS = rules.BACKWARDS
_NO_DAYS = rules.NO_DAYS
_BAD_USE = rules.BAD_USE
_NEGATIVE = rules.NEGATIVE
_DUPLICATE = rules.DUPLICATE
_REPLACED = rules.REPLACED
_CANCELLED = rules.CANCELLED
_TANGLE = rules.TANGLE
_NETTED = rules.NETTED
_CORRECTION = rules.CORRECTION
_CREDIT = rules.CREDIT
_LAST_VERSION = rules.LAST_VERSION
_SAME_DAY = rules.SAME_DAY


@kernel
def screen(start: Int, end: Int, use: Float, reason: Byte) -> None:
    """Leave out rows that no rule can save: impossible dates, no days, impossible usage."""
    for i in range(start.shape[0]):
        if min(start[i], end[i]) < _FIRST_DAY or max(start[i], end[i]) > _LAST_DAY:
            reason[i] = _BAD_DATE
        elif end[i] < start[i]:
            reason[i] = _BACKWARDS
        elif end[i] == start[i]:
            reason[i] = _NO_DAYS
        elif not abs(use[i]) <= _ABSURD:  # also true of NaN
            reason[i] = _BAD_USE


@kernel
def versions(end: Int, reason: Byte, version: Long) -> None:
    """Number rows from oldest to newest version: file order, or its reverse if newest first."""
    n = end.shape[0]
    up, last = 0, -1
    for i in range(n):
        if reason[i] == _KEPT:
            if last >= 0:
                up += np.sign(end[i] - end[last])
            last = i
    for i in range(n):
        version[i] = i if up >= 0 else n - 1 - i


@kernel
def by_time(start: Int, end: Int, reason: Byte, version: Long) -> Long:
    """Standing rows in order of start, then end, then version."""
    count = 0
    rows = np.empty(start.shape[0], np.int64)
    for i in range(start.shape[0]):
        if reason[i] == _KEPT:
            rows[count] = i
            count += 1
    rows = rows[:count]
    key = np.empty(count, np.int64)
    for k in range(count):
        i = rows[k]
        days = (np.int64(start[i] - _FIRST_DAY) << 17) | np.int64(end[i] - _FIRST_DAY)
        key[k] = (days << 29) | version[i]  # 17 bits hold 1900-2100; the key is unique
    return rows[np.argsort(key)]


@kernel
def _same_bill(i: int, j: int, use: Float, cost: Float) -> bool:
    same_cost = cost[i] == cost[j] or (np.isnan(cost[i]) and np.isnan(cost[j]))
    return bool(use[i] == use[j] and same_cost)


@kernel
def _cancels(i: int, j: int, use: Float) -> bool:
    return bool(use[i] != 0.0 and abs(use[i] + use[j]) <= _CANCEL * abs(use[i]))


@kernel
def _partner(group: Long, k: int, use: Float, netted: Byte, later: bool) -> int:
    """Row that row k of the group cancels: the nearest earlier one, else (later) one after."""
    i = group[k]
    for m in range(k - 1, -1, -1):
        j = group[m]
        if netted[j] == 0 and _cancels(i, j, use):
            return int(j)
    if later:
        for m in range(k + 1, group.shape[0]):
            j = group[m]
            if netted[j] == 0 and _cancels(i, j, use):
                return int(j)
    return -1


@kernel
def _net_pairs(group: Long, use: Float, net: int, netted: Byte, other: Int) -> None:
    """Pair each cancelling row with the one it cancels."""
    standing = 0
    for k in range(group.shape[0]):
        if use[group[k]] >= 0.0:
            standing += 1
    for k in range(group.shape[0]):
        i = group[k]
        if netted[i] or (use[i] >= 0.0 and not net):
            continue
        # A row *after* the cancellation is its partner only if a third row remains: with two
        # it is the new bill, and what was cancelled is not in the file.
        j = _partner(group, k, use, netted, use[i] < 0.0 and standing > 1)
        if j >= 0:
            netted[i] = netted[j] = 1
            other[i], other[j] = j, i
            standing -= 1


@kernel
def _main_row(group: Long, use: Float, estimated: Byte, net: int, netted: Byte) -> int:
    """The row that stands for the period: has usage, is actual, is the newest; in that order."""
    best, best_rank = -1, -1
    for k in range(group.shape[0]):
        i = group[k]
        if netted[i]:
            continue
        has_use = use[i] > 0.0 or (net and use[i] != 0.0)
        rank = (4 if has_use else (2 if use[i] == 0.0 else 0)) + (0 if estimated[i] else 1)
        if rank >= best_rank:
            best, best_rank = int(i), rank
    return best


@kernel
def _repeats(
    group: Long, k: int, main: int, use: Float, cost: Float, estimated: Byte, host: Long, n_all: int
) -> int:
    """Row that row k repeats: the main one, or one already counted with it; -1 if none."""
    i = group[k]
    if _same_bill(i, main, use, cost) and (not n_all or estimated[i] == estimated[main]):
        return main
    for m in range(k):
        j = group[m]
        if j != main and host[j] == main and _same_bill(i, j, use, cost):
            return int(j)
    return -1


@kernel
def _settle(
    group: Long, main: int, use: Float, cost: Float, estimated: Byte, version: Long,
    delivery: int, net: int, netted: Byte, host: Long, reason: Byte, note: Int, other: Int,
) -> None:  # fmt: skip
    """Give every other row of the period its place beside the main one."""
    total = use[main]
    for k in range(group.shape[0]):
        i = group[k]
        if i == main:
            continue
        if netted[i]:
            host[i] = main
            note[i] |= _NETTED
            note[main] |= _LAST_VERSION
            continue
        other[i] = main
        twin = _repeats(group, k, main, use, cost, estimated, host, delivery)
        after = version[i] > version[main]
        if twin >= 0:
            reason[i], other[i] = _DUPLICATE, twin
        elif delivery and use[i] >= 0.0:
            host[i] = main
            note[i] |= _SAME_DAY
            total += use[i]
        elif after and use[i] == 0.0:
            host[i] = main
            note[i] |= _CREDIT
        elif after and not net and use[i] < 0.0 and total + use[i] >= 0.0:
            host[i] = main
            note[i] |= _CORRECTION
            total += use[i]
        elif use[i] < 0.0 and not net and (after or use[main] < 0.0):
            reason[i] = _NEGATIVE
        else:
            reason[i] = _REPLACED
            note[main] |= _LAST_VERSION


@kernel
def settle_versions(
    order: Long, start: Int, end: Int, use: Float, cost: Float, estimated: Byte, version: Long,
    delivery: int, net: int, host: Long, reason: Byte, note: Int, other: Int,
) -> None:  # fmt: skip
    """Leave one standing bill per service period, with its corrections counted beside it."""
    netted = np.zeros(start.shape[0], np.uint8)
    low = 0
    while low < order.shape[0]:
        high = low + 1
        first = order[low]
        while (
            high < order.shape[0]
            and start[order[high]] == start[first]
            and end[order[high]] == end[first]
        ):
            high += 1
        group = order[low:high]
        low = high
        if group.shape[0] == 1:
            continue
        if group.shape[0] > _MAX_TANGLE:
            for k in range(group.shape[0]):
                reason[group[k]] = _TANGLE
            continue
        _net_pairs(group, use, net, netted, other)
        main = _main_row(group, use, estimated, net, netted)
        if main < 0:
            for k in range(group.shape[0]):
                reason[group[k]] = _CANCELLED
            continue
        _settle(
            group, main, use, cost, estimated, version, delivery, net, netted,
            host, reason, note, other,
        )  # fmt: skip
