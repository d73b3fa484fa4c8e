"""Kernels that join neighbouring bills into periods: estimates forward, stubs to the next.

What belongs here: rules between bills that follow each other in time, and the kernel that
runs all rules over a ragged batch.  (normalize.jit)
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from normalize.bills import rules
from normalize.bills.repair_overlaps import (
    leave_out_lone_negatives,
    settle_overlaps,
    standing,
    trim_starts,
)
from normalize.bills.repair_versions import by_time, screen, settle_versions, versions
from normalize.jit import kernel

if TYPE_CHECKING:
    from numpy.typing import NDArray

    Int = NDArray[np.int32]
    Long = NDArray[np.int64]
    Float = NDArray[np.float64]
    Byte = NDArray[np.uint8]

_JOIN_GAP = rules.JOIN_GAP_DAYS
_STUB = rules.STUB_DAYS
_MONTHLY = rules.MONTHLY_DAYS
_TWO_MONTHLY = rules.TWO_MONTHLY_DAYS
_DELIVERY = rules.DELIVERY_DAYS
_TWO_MONTHLY_MEDIAN = rules.TWO_MONTHLY_MEDIAN
_KEPT = rules.KEPT
_NEGATIVE = rules.NEGATIVE
_OPEN_ESTIMATE = rules.OPEN_ESTIMATE
_ESTIMATE_JOINED = rules.ESTIMATE_JOINED
_CLOSES_ESTIMATE = rules.CLOSES_ESTIMATE
_STUB_JOINED = rules.STUB_JOINED
_STUB_JOINED_BACK = rules.STUB_JOINED_BACK
_TOOK_STUB = rules.TOOK_STUB
_SHORT = rules.SHORT
_LONG = rules.LONG


@kernel
def _totals(use: Float, host: Long, reason: Byte) -> Float:
    """Usage of each bill with the rows counted with it, in order of rows."""
    total = use.copy()
    for i in range(use.shape[0]):
        if reason[i] == _KEPT and host[i] != i:
            total[host[i]] += use[i]
    return total


@kernel
def _costs(cost: Float, host: Long, reason: Byte) -> Float:
    """Cost likewise; a row without a cost adds none to another's."""
    total = cost.copy()
    for i in range(cost.shape[0]):
        if reason[i] == _KEPT and host[i] != i and not np.isnan(cost[i]):
            total[host[i]] += cost[i]
    return total


@kernel
def _leave_out(rows: Long, why: int, reason: Byte) -> None:
    for k in range(rows.shape[0]):
        reason[rows[k]] = why


@kernel
def _join_estimates(
    mains: Long, begin: Int, end: Int, total: Float, estimated: Byte, net: int,
    reason: Byte, note: Int, first: Long, last: Long,
) -> int:  # fmt: skip
    """Runs of estimates with the actual reading that closes them: groups first[g]..last[g]."""
    groups, k = 0, 0
    while k < mains.shape[0]:
        j = k
        use = total[mains[k]]
        while (
            estimated[mains[j]]
            and j + 1 < mains.shape[0]
            and begin[mains[j + 1]] - end[mains[j]] <= _JOIN_GAP
        ):
            j += 1
            use += total[mains[j]]
        if estimated[mains[j]]:
            _leave_out(mains[k : j + 1], _OPEN_ESTIMATE, reason)
        elif use < 0.0 and not net:
            _leave_out(mains[k : j + 1], _NEGATIVE, reason)
        else:
            for m in range(k, j):
                note[mains[m]] |= _ESTIMATE_JOINED
            if j > k:
                note[mains[j]] |= _CLOSES_ESTIMATE
            first[groups], last[groups] = k, j
            groups += 1
        k = j + 1
    return groups


@kernel
def _median_days(mains: Long, begin: Int, end: Int, first: Long, last: Long, groups: int) -> int:
    if groups == 0:
        return 0
    days = np.empty(groups, np.int64)
    for g in range(groups):
        days[g] = end[mains[last[g]]] - begin[mains[first[g]]]
    return int(np.sort(days)[groups // 2])


@kernel
def _join_stubs(
    mains: Long, begin: Int, end: Int, note: Int, first: Long, last: Long, groups: int
) -> int:
    """Join periods under STUB_DAYS to a neighbour, the next before the last; in place."""
    done, g = 0, 0
    while g < groups:
        low, high = first[g], last[g]
        while (
            end[mains[high]] - begin[mains[low]] < _STUB
            and g + 1 < groups
            and begin[mains[first[g + 1]]] - end[mains[high]] <= _JOIN_GAP
        ):
            note[mains[high]] |= _STUB_JOINED
            g += 1
            high = last[g]
            note[mains[high]] |= _TOOK_STUB
        if (
            end[mains[high]] - begin[mains[low]] < _STUB
            and done > 0
            and begin[mains[low]] - end[mains[last[done - 1]]] <= _JOIN_GAP
        ):
            note[mains[high]] |= _STUB_JOINED_BACK
            last[done - 1] = high
        else:
            first[done], last[done] = low, high
            done += 1
        g += 1
    return done


@kernel
def _length_note(days: int, median: int, delivery: int) -> int:
    if median < _STUB:  # daily readings: no length is odd
        return 0
    low, high = _MONTHLY
    if delivery:
        low, high = _DELIVERY
    elif median > _TWO_MONTHLY_MEDIAN:
        low, high = _TWO_MONTHLY
    if days < low:
        return _SHORT
    return _LONG if days > high else 0


@kernel
def _emit(
    rows: Long, begin: Int, end: Int, total: Float, price: Float, temp: Float,
    p: int, fate: Int, p_start: Int, p_end: Int, p_use: Float, p_cost: Float, p_temp: Float,
    p_joined: Int,
) -> None:  # fmt: skip
    """Write period p, made of ``rows`` in order of time."""
    use, cost, heat, days = 0.0, 0.0, 0.0, 0
    for k in range(rows.shape[0]):
        i = rows[k]
        fate[i] = p
        length = end[i] - begin[i]
        use += total[i]
        cost += price[i]
        heat += temp[i] * length
        days += length
    p_start[p], p_end[p] = begin[rows[0]], end[rows[-1]]
    p_use[p], p_cost[p] = use, cost
    p_temp[p] = temp[rows[0]] if rows.shape[0] == 1 else heat / days
    p_joined[p] = rows.shape[0]


@kernel
def _follow_hosts(host: Long, fate: Int, reason: Byte, other: Int) -> None:
    """Rows counted with another share its fate, whatever that became."""
    for i in range(host.shape[0]):
        h = host[i]
        if h != i and reason[i] == _KEPT:
            fate[i] = fate[h]
            reason[i] = reason[h]
            if reason[h] != _KEPT:
                other[i] = other[h]


@kernel
def repair_account(
    start: Int, end: Int, use: Float, cost: Float, estimated: Byte, temp: Float,
    delivery: int, net: int,
    fate: Int, reason: Byte, note: Int, other: Int,
    p_start: Int, p_end: Int, p_use: Float, p_cost: Float, p_temp: Float, p_joined: Int,
) -> int:  # fmt: skip
    """All rules over one account; returns how many periods it has."""
    n = start.shape[0]
    host = np.arange(n)
    version = np.empty(n, np.int64)
    screen(start, end, use, reason)
    versions(end, reason, version)
    order = by_time(start, end, reason, version)
    settle_versions(
        order, start, end, use, cost, estimated, version, delivery, net, host, reason, note, other
    )
    total = _totals(use, host, reason)
    price = _costs(cost, host, reason)
    mains = standing(order, host, reason)
    if not net:
        leave_out_lone_negatives(mains, start, end, total, estimated, reason)
        mains = standing(mains, host, reason)
    settle_overlaps(mains, start, end, total, estimated, version, reason, other)
    mains = standing(mains, host, reason)
    begin = trim_starts(mains, start, end, note)
    first = np.empty(mains.shape[0], np.int64)
    last = np.empty(mains.shape[0], np.int64)
    groups = _join_estimates(mains, begin, end, total, estimated, net, reason, note, first, last)
    if _median_days(mains, begin, end, first, last, groups) >= _STUB:
        groups = _join_stubs(mains, begin, end, note, first, last, groups)
    each = np.arange(mains.shape[0])
    median = _median_days(mains, begin, end, each, each, mains.shape[0])  # of bills, unjoined
    for g in range(groups):
        low, high = first[g], last[g]
        days = end[mains[high]] - begin[mains[low]]
        note[mains[high]] |= _length_note(days, median, delivery)
        _emit(
            mains[low : high + 1], begin, end, total, price, temp, g, fate,
            p_start, p_end, p_use, p_cost, p_temp, p_joined,
        )  # fmt: skip
    _follow_hosts(host, fate, reason, other)
    return groups


@kernel
def repair_accounts(
    start: Int, end: Int, use: Float, cost: Float, estimated: Byte, temp: Float, offsets: Long,
    delivery: Byte, net: Byte,
    fate: Int, reason: Byte, note: Int, other: Int,
    p_start: Int, p_end: Int, p_use: Float, p_cost: Float, p_temp: Float, p_joined: Int,
    counts: Int,
) -> None:  # fmt: skip
    """A ragged batch: account a owns rows offsets[a]:offsets[a+1], and as many period slots.

    Row and period numbers written to ``fate`` and ``other`` count within the account.
    """
    for a in range(offsets.shape[0] - 1):
        s = slice(offsets[a], offsets[a + 1])
        counts[a] = repair_account(
            start[s], end[s], use[s], cost[s], estimated[s], temp[s],
            delivery[a], net[a],
            fate[s], reason[s], note[s], other[s],
            p_start[s], p_end[s], p_use[s], p_cost[s], p_temp[s], p_joined[s],
        )  # fmt: skip
