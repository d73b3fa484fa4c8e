"""Daily data in blocks of four weeks: days err too much alike for one correlation to describe.

Neighbouring days share habits, the week's rhythm and slow drifts.  Over four whole weeks the
rhythm cancels and what is left is like the error of bills, so the form is chosen and the
range is made from such blocks, while the fit itself keeps its days (docs/method.md §5).
"""

from __future__ import annotations

from typing import Final

import numpy as np

from normalize.fitting.columns import (
    AICC,
    BASE,
    BIC,
    SE_BASE,
    SE_C,
    SE_H,
    SE_LINE,
    STATUS,
    WORST_T,
)
from normalize.fitting.correlation import positions
from normalize.fitting.forms import FITTED, N_FORMS
from normalize.fitting.side import fit_side
from normalize.jit import kernel, part

BLOCK_DAYS: Final = 28  # four whole weeks
BLOCK_BELOW_DAYS: Final = 7  # periods typically shorter than this are put into blocks
MIN_BLOCKS: Final = 8  # with fewer, days stay days


@kernel
def block_of(start, end):
    """(block of each period (n,), place of each block); one block a period if not daily.

    Places count the correlation's steps, gaps included.
    """
    n = start.shape[0]
    own = np.arange(n)
    if n < MIN_BLOCKS or np.median(end - start) >= BLOCK_BELOW_DAYS:
        return own, positions(start, end)
    which = np.empty(n, dtype=np.int64)
    place = np.empty(n)
    count = 0
    for p in range(n):
        when = np.floor((start[p] - start[0]) / BLOCK_DAYS)
        if p == 0 or when > place[count - 1]:
            place[count] = when
            count += 1
        which[p] = count - 1
    if count < MIN_BLOCKS:
        return own, positions(start, end)
    return which, place[:count].copy()


@kernel
def in_blocks(columns, d, which, count):
    """(count, k) means of columns (n, k) over blocks, by days; and the days (count,)."""
    n, k = columns.shape
    days = np.zeros(count)
    out = np.zeros((count, k))
    for p in range(n):
        days[which[p]] += d[p]
        for j in range(k):
            out[which[p], j] += d[p] * columns[p, j]
    for b in range(count):
        for j in range(k):
            out[b, j] /= days[b]
    return out, days


@part
def judge_in_blocks(rows, ts, ps, y, d, w, drivers, start, end, wanted, net, settings):
    """For daily data: what decides a form (screens, criteria, errors) taken from the blocks."""
    which, place = block_of(start, end)
    count = place.shape[0]
    if count == y.shape[0]:
        return
    n, k = drivers.shape
    both = np.empty((n, k + 1))
    for p in range(n):
        for j in range(k):
            both[p, j] = drivers[p, j]
        both[p, k] = y[p]
    means, days = in_blocks(both, d, which, count)
    weight = np.zeros(count)
    for p in range(n):
        weight[which[p]] += w[p]
    ps2 = np.empty(ps.shape[0], dtype=np.int32)
    for i in range(ps.shape[0]):
        ps2[i] = which[ps[i]]
    found = fit_side(
        ts, ps2, np.ascontiguousarray(means[:, k]), days, weight,
        np.ascontiguousarray(means[:, :k]), wanted, net, settings,
    )  # fmt: skip
    for form in range(N_FORMS):
        if np.isnan(rows[form, BASE]):
            continue
        if np.isnan(found[form, BASE]):
            rows[form, STATUS] = found[form, STATUS]
            continue
        for column in (BIC, AICC, WORST_T, SE_BASE, SE_LINE, SE_H, SE_C):
            rows[form, column] = found[form, column]
        if rows[form, STATUS] == FITTED or found[form, STATUS] != FITTED:
            rows[form, STATUS] = found[form, STATUS]
