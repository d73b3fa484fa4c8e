"""Odd periods, flagged and left as they are: compiled, the same for one account and a million.

What belongs here: what use alone, without weather, can say against itself.  Thresholds and their
sources are in rules.py.  Nothing here changes a period.  (normalize.jit)
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from normalize.bills import rules
from normalize.jit import kernel

if TYPE_CHECKING:
    from numpy.typing import ArrayLike, NDArray

    Int = NDArray[np.int32]
    Long = NDArray[np.int64]
    Float = NDArray[np.float64]
    Short = NDArray[np.uint16]

# Plain names: numba freezes these into the compiled code.
_ZERO = rules.ZERO_USE
_REPEATED = rules.REPEATED_NUMBER
_TIMES_10 = rules.TIMES_10
_TIMES_100 = rules.TIMES_100
_EMPTY = rules.EMPTY_HOUSE
_ALTERNATING = rules.ALTERNATING
_REPEATS = rules.REPEATS
_YEAR_SLACK = rules.YEAR_SLACK_DAYS
_JUMP_DECADES = rules.JUMP_DECADES
_JUMP_RUN = rules.JUMP_RUN
_SPIKE_DECADES = rules.SPIKE_DECADES
_SPIKE_LEAST = rules.SPIKE_LEAST
_EMPTY_SHARE = rules.EMPTY_SHARE
_EMPTY_DAYS = rules.EMPTY_DAYS
_SEASON_TERMS = rules.SEASON_TERMS
_MIN_ALTERNATING = rules.ALTERNATING_MIN_PERIODS
_SWAY = rules.ALTERNATING_SIGMAS
_STUB = rules.STUB_DAYS


@kernel
def _year_apart(middle: Float, i: int, step: int) -> int:
    """The period a year before (step -1) or after (1) period i; -1 where there is none."""
    best, distance = -1, float(_YEAR_SLACK)
    j = i + step
    while 0 <= j < middle.shape[0]:
        gap = abs(abs(middle[j] - middle[i]) - 365.25)
        if gap <= distance:
            best, distance = j, gap
        if abs(middle[j] - middle[i]) > 365.25 + _YEAR_SLACK:
            break
        j += step
    return best


@kernel
def _decade(ratio: float, slack: float) -> int:
    """2 for a hundredfold, 1 for tenfold, 0 for neither, negative for the inverse."""
    if ratio <= 0.0:
        return 0
    power = np.log10(ratio)
    near = int(np.round(power))
    if 1 <= abs(near) <= 2 and abs(power - near) <= slack:
        return near
    return 0


@kernel
def _flag_repeats(use: Float, whole: int, flag: Short) -> None:
    i, n = 0, use.shape[0]
    while i < n:
        j = i
        while j + 1 < n and use[j + 1] == use[i]:
            j += 1
        if use[i] > 0.0 and j - i + 1 >= whole:
            for k in range(i, j + 1):
                flag[k] |= _REPEATED
        i = j + 1


@kernel
def _flag_jumps(per_day: Float, middle: Float, flag: Short) -> None:
    """A single bill ten times both neighbours; or a run ten times the year before."""
    n = per_day.shape[0]
    for i in range(1, n - 1):
        a, b = per_day[i - 1], per_day[i + 1]
        if a > 0.0 and b > 0.0:
            power = _decade(per_day[i] / np.sqrt(a * b), _SPIKE_DECADES)
            least = max(per_day[i] / max(a, b), min(a, b) / max(per_day[i], 1e-300))
            if power != 0 and least >= _SPIKE_LEAST:
                flag[i] |= _TIMES_10 if abs(power) == 1 else _TIMES_100
    run, before = 0, 0
    for i in range(n):
        j = _year_apart(middle, i, -1)
        jump = _decade(per_day[i] / per_day[j], _JUMP_DECADES) if j >= 0 and per_day[j] > 0.0 else 0
        run = run + 1 if jump != 0 and jump == before else (1 if jump != 0 else 0)
        before = jump
        if run >= _JUMP_RUN:
            for k in range(i - run + 1, i + 1):
                flag[k] |= _TIMES_10 if abs(jump) == 1 else _TIMES_100


@kernel
def _flag_empty(per_day: Float, middle: Float, days: Int, flag: Short) -> None:
    """Runs whose use fell to a small part of the same season's, the year before and after."""
    n, low = per_day.shape[0], 0
    while low < n:
        high, total = low, 0
        while high < n and _fell(per_day, middle, high):
            total += days[high]
            high += 1
        if total >= _EMPTY_DAYS:
            for k in range(low, high):
                flag[k] |= _EMPTY
        low = max(high, low + 1)


@kernel
def _fell(per_day: Float, middle: Float, i: int) -> bool:
    before, after = _year_apart(middle, i, -1), _year_apart(middle, i, 1)
    if before < 0 and after < 0:
        return False
    for j in (before, after):
        if j >= 0 and not 0.0 <= per_day[i] <= _EMPTY_SHARE * per_day[j]:
            return False
    return True


@kernel
def _alternates(per_day: Float, middle: Float) -> bool:
    """Whether what is left beside the season sways from bill to bill, as guessed readings do."""
    n = per_day.shape[0]
    if n < _MIN_ALTERNATING:
        return False
    x = np.empty((n, _SEASON_TERMS))
    for i in range(n):
        turn = 2.0 * np.pi * middle[i] / 365.25
        x[i, 0] = 1.0
        x[i, 1], x[i, 2] = np.cos(turn), np.sin(turn)
        x[i, 3], x[i, 4] = np.cos(2.0 * turn), np.sin(2.0 * turn)
    left = per_day.copy()
    for k in range(_SEASON_TERMS):  # Gram-Schmidt, twice for exactness
        for _ in range(2):
            for m in range(k):
                dot = 0.0
                for i in range(n):
                    dot += x[i, k] * x[i, m]
                for i in range(n):
                    x[i, k] -= dot * x[i, m]
        size = 0.0
        for i in range(n):
            size += x[i, k] * x[i, k]
        if size < 1e-9:
            return False
        dot = 0.0
        for i in range(n):
            x[i, k] /= np.sqrt(size)
            dot += x[i, k] * left[i]
        for i in range(n):
            left[i] -= dot * x[i, k]
    square, product, mean = 0.0, 0.0, 0.0
    for i in range(n):
        square += left[i] * left[i]
        mean += per_day[i] / n
        if i > 0:
            product += left[i] * left[i - 1]
    if square <= (1e-6 * mean) ** 2 * n:
        return False
    # The least squares leave white noise a lag-1 correlation of about -terms/n, not zero.
    return bool(product / square < -_SEASON_TERMS / n - _SWAY / np.sqrt(n))


@kernel
def flag_account(start: Int, end: Int, use: Float, whole: int, flag: Short) -> None:
    """Bits of rules.FLAGS for each period of one account. whole : how many repeats are odd."""
    n = start.shape[0]
    if n == 0:
        return
    per_day, middle = np.empty(n), np.empty(n)
    days = np.empty(n, np.int32)
    for i in range(n):
        days[i] = end[i] - start[i]
        per_day[i] = use[i] / max(1, days[i])
        middle[i] = 0.5 * (start[i] + end[i])
        if use[i] == 0.0:
            flag[i] |= _ZERO
    if np.sort(days)[n // 2] < _STUB:  # days swing too much for these rules
        return
    _flag_repeats(use, whole, flag)
    _flag_jumps(per_day, middle, flag)
    _flag_empty(per_day, middle, days, flag)
    if _alternates(per_day, middle):
        for i in range(n):
            flag[i] |= _ALTERNATING


@kernel
def flag_accounts(start: Int, end: Int, use: Float, offsets: Long, whole: int, flag: Short) -> None:
    """A ragged batch: account a owns periods offsets[a]:offsets[a+1]."""
    for a in range(offsets.shape[0] - 1):
        s = slice(offsets[a], offsets[a + 1])
        flag_account(start[s], end[s], use[s], whole, flag[s])


def flag_batch(
    start: ArrayLike, end: ArrayLike, use: ArrayLike, offsets: ArrayLike
) -> NDArray[np.uint16]:
    """Bits of rules.FLAGS for each period of a ragged batch of accounts.

    >>> flag_batch([0, 30, 61], [30, 61, 91], [12.0, 0.0, 14.0], [0, 3]).tolist()
    [0, 1, 0]
    """
    begin = np.ascontiguousarray(start, np.int32)
    flag = np.zeros(begin.shape[0], np.uint16)
    flag_accounts(
        begin, np.ascontiguousarray(end, np.int32), np.ascontiguousarray(use, np.float64),
        np.ascontiguousarray(offsets, np.int64), _REPEATS, flag,
    )  # fmt: skip
    return flag
