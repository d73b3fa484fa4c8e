"""Kernels for bills of different periods that claim the same days.

What belongs here: lone negative rows, subtotals and overlaps, among rows that already stand
for their own service period (repair_versions.py).  (normalize.jit)
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

_JOIN_GAP = rules.JOIN_GAP_DAYS
_TRIM = rules.TRIM_OVERLAP_DAYS
_SUBTOTAL_TOLERANCE = rules.SUBTOTAL_TOLERANCE
_MAX_TANGLE = rules.MAX_TANGLE
_KEPT = rules.KEPT
_NEGATIVE = rules.NEGATIVE
_OVERLAP = rules.OVERLAP
_SUBTOTAL = rules.SUBTOTAL
_TANGLE = rules.TANGLE
_MOVED_START = rules.MOVED_START


@kernel
def standing(order: Long, host: Long, reason: Byte) -> Long:
    """Rows of ``order`` that still stand for a period of their own."""
    kept = np.empty(order.shape[0], np.int64)
    count = 0
    for k in range(order.shape[0]):
        i = order[k]
        if reason[i] == _KEPT and host[i] == i:
            kept[count] = i
            count += 1
    return kept[:count]


@kernel
def leave_out_lone_negatives(
    mains: Long, start: Int, end: Int, total: Float, estimated: Byte, reason: Byte
) -> None:
    """A negative bill stands only as the true-up that ends a run of estimates."""
    for k in range(mains.shape[0]):
        i = mains[k]
        if total[i] >= 0.0:
            continue
        closes = (
            k > 0 and estimated[mains[k - 1]] and abs(start[i] - end[mains[k - 1]]) <= _JOIN_GAP
        )
        if not closes:
            reason[i] = _NEGATIVE


@kernel
def _conflict(i: int, j: int, start: Int, end: Int) -> bool:
    """Whether two bills overlap by more than a slip of dates."""
    shared = min(end[i], end[j]) - max(start[i], start[j])
    if shared <= 0:
        return False
    shorter = min(end[i] - start[i], end[j] - start[j])
    return bool(shared > _TRIM or 2 * shared >= shorter)


@kernel
def _leave_out_subtotals(tangle: Long, start: Int, end: Int, total: Float, reason: Byte) -> None:
    for a in range(tangle.shape[0]):
        i = tangle[a]
        inside, days, use = 0, 0, 0.0
        for b in range(tangle.shape[0]):
            j = tangle[b]
            if j != i and reason[j] == _KEPT and start[j] >= start[i] and end[j] <= end[i]:
                inside += 1
                days += end[j] - start[j]
                use += total[j]
        length = end[i] - start[i]
        if (
            inside >= 2
            and total[i] > 0.0
            and abs(days - length) <= 0.1 * length
            and abs(use - total[i]) <= _SUBTOTAL_TOLERANCE * total[i]
        ):
            reason[i] = _SUBTOTAL


@kernel
def _rank(i: int, total: Float, estimated: Byte, version: Long) -> int:
    """Of two bills that overlap: one with usage, then an actual one, then the later version."""
    rank = (2 if total[i] != 0.0 else 0) + (0 if estimated[i] else 1)
    return int((rank << 40) | version[i])


@kernel
def _choose(
    tangle: Long, start: Int, end: Int, total: Float, estimated: Byte, version: Long,
    reason: Byte, other: Int,
) -> None:  # fmt: skip
    """Keep bills of a tangle by rank; each left out names the one preferred to it."""
    rank = np.empty(tangle.shape[0], np.int64)
    for a in range(tangle.shape[0]):
        rank[a] = -_rank(tangle[a], total, estimated, version)
    ranked = tangle[np.argsort(rank)]
    for a in range(ranked.shape[0]):
        i = ranked[a]
        for b in range(a):
            j = ranked[b]
            if reason[i] == _KEPT and reason[j] == _KEPT and _conflict(i, j, start, end):
                reason[i], other[i] = _OVERLAP, j


@kernel
def settle_overlaps(
    mains: Long, start: Int, end: Int, total: Float, estimated: Byte, version: Long,
    reason: Byte, other: Int,
) -> None:  # fmt: skip
    """Break every run of overlapping bills into ones that share at most a few days."""
    low = 0
    while low < mains.shape[0]:
        high = low + 1
        reach = end[mains[low]]
        while high < mains.shape[0] and start[mains[high]] < reach:
            reach = max(reach, end[mains[high]])
            high += 1
        tangle = mains[low:high]
        low = high
        if tangle.shape[0] == 1:
            continue
        if tangle.shape[0] > _MAX_TANGLE:
            for k in range(tangle.shape[0]):
                reason[tangle[k]] = _TANGLE
            continue
        _leave_out_subtotals(tangle, start, end, total, reason)
        _choose(tangle, start, end, total, estimated, version, reason, other)


@kernel
def trim_starts(mains: Long, start: Int, end: Int, note: Int) -> Int:
    """Start of each row (by row number) once small overlaps are taken off the later bill."""
    begin = start.copy()
    for k in range(1, mains.shape[0]):
        i, before = mains[k], mains[k - 1]
        if begin[i] < end[before]:
            begin[i] = end[before]
            note[i] |= _MOVED_START
    return begin
