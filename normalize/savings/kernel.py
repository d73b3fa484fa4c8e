"""Before against after, compiled: the whole answer of one account, over a ragged batch."""

from __future__ import annotations

from typing import Final

import numpy as np

from normalize.fitting.batch import take_drivers, take_side
from normalize.fitting.blocks import judge_in_blocks
from normalize.fitting.columns import AFTER, BASE, BEFORE, WIDTH
from normalize.fitting.correlation import weights_of
from normalize.fitting.forms import N_FORMS
from normalize.fitting.mixture import difference_range_with, mixture_range_with
from normalize.fitting.rho import RHO
from normalize.fitting.side import choose, fit_side
from normalize.fitting.student import no_tables, t_quantile
from normalize.jit import kernel, part
from normalize.savings.one_side import side_evidence

# Columns of an account's answer.  Each estimate has value, low, high, plain low, plain high.
NAC_BEFORE: Final = 0
NAC_AFTER: Final = 5
NORMALIZED: Final = 10
AVOIDED: Final = 15
PREDICTED: Final = 20
ACTUAL: Final = 21
HELD_BEFORE: Final = 22  # 1 when τ was held because the bills do not determine it
HELD_AFTER: Final = 23
RHO_MEAN: Final = 24  # posterior mean of the shared serial correlation
UNSURE_BEFORE: Final = 25  # 1 when the range integrates over τ, because the bills place it badly
UNSURE_AFTER: Final = 26
ANSWER_WIDTH: Final = 27


@kernel
def _one_range(out, at, value, like_w, seen, confidence, tables):
    """Writes value, default range and plain range of a single t.

    seen : (shift (27,), scale2 (27,), plain scale², degrees of freedom).
    """
    shift, scale2, plain2, df = seen
    out[at] = value
    low, high = mixture_range_with(like_w, value + shift, np.sqrt(scale2), df, confidence, tables)
    out[at + 1] = low
    out[at + 2] = high
    half = t_quantile(0.5 + 0.5 * confidence, df) * np.sqrt(plain2)
    out[at + 3] = value - half
    out[at + 4] = value + half


@part
def _normalized(out, n1, like1, seen1, n2, like2, seen2, confidence, tables):
    """Ranges of both NAC and of their difference, ρ shared between before and after."""
    weight = weights_of(like1 + like2)
    mean = 0.0
    for i in range(RHO.shape[0]):
        mean += weight[i] * RHO[i]
    out[RHO_MEAN] = mean
    _one_range(out, NAC_BEFORE, n1, weight, seen1, confidence, tables)
    _one_range(out, NAC_AFTER, n2, weight, seen2, confidence, tables)
    sh1, sc1, v1, df1 = seen1
    sh2, sc2, v2, df2 = seen2
    low, high = difference_range_with(
        weight, n1 + sh1, np.sqrt(sc1), df1, n2 + sh2, np.sqrt(sc2), df2, confidence, tables
    )
    value = n1 - n2
    out[NORMALIZED] = value
    out[NORMALIZED + 1] = low
    out[NORMALIZED + 2] = high
    welch = (v1 + v2) ** 2 / (v1 * v1 / df1 + v2 * v2 / df2) if v1 + v2 > 0.0 else df1
    half = t_quantile(0.5 + 0.5 * confidence, max(int(welch), 1)) * np.sqrt(v1 + v2)
    out[NORMALIZED + 3] = value - half
    out[NORMALIZED + 4] = value + half


@kernel
def _flag(yes):
    return 1.0 if yes else 0.0


@part
def compare_sides(
    out, row1, form1, side1, drivers1, row2, form2, side2, drivers2, year, hold, confidence, tables
):  # fmt: skip
    """One account's answer for given forms; writes what can be known into ``out``.

    side : (ts, ps, y, d, w, start, end); drivers (n, k), from their normal level;
    year : (temp, cum days, cum degrees).  form < 0 : that side has no fit.
    """
    if form1 < 0:
        return
    has_year = year[0].shape[0] > 0
    values, like, shift, scale2, plain2, df, held, wide = side_evidence(
        row1, form1, side1, drivers1, side2, drivers2, year, hold
    )
    out[HELD_BEFORE] = _flag(held)
    out[UNSURE_BEFORE] = _flag(wide)
    y2, d2 = side2[2], side2[3]
    if y2.shape[0] > 0:
        out[PREDICTED] = values[1]
        out[ACTUAL] = (y2 * d2).sum()
        seen = (shift[:, 1].copy(), scale2[:, 1].copy(), plain2[1], df)
        _one_range(
            out, AVOIDED, out[PREDICTED] - out[ACTUAL], weights_of(like), seen, confidence, tables
        )
    if not has_year:
        return
    seen1 = (shift[:, 0].copy(), scale2[:, 0].copy(), plain2[0], df)
    if form2 < 0:
        _one_range(out, NAC_BEFORE, values[0], weights_of(like), seen1, confidence, tables)
        return
    zero = np.empty(0)
    none = (zero, np.empty(0, np.int32), zero, zero, zero, zero, zero)
    values2, like2, shift2, scale22, plain22, df2, held2, wide2 = side_evidence(
        row2, form2, side2, drivers2, none, np.empty((0, drivers2.shape[1])), year, hold
    )
    out[HELD_AFTER] = _flag(held2)
    out[UNSURE_AFTER] = _flag(wide2)
    seen2 = (shift2[:, 0].copy(), scale22[:, 0].copy(), plain22[0], df2)
    _normalized(out, values[0], like, seen1, values2[0], like2, seen2, confidence, tables)


@part
def fit_both(sides, drivers, offered, wanted, net, forced, settings, criterion):
    """Every form on both sides, and the form chosen or forced on each."""
    fits = np.empty((2, N_FORMS, WIDTH))
    chosen = np.empty(2, dtype=np.int8)
    for which in range(2):
        ts, ps, y, d, w, s, e = sides[which]
        rows = fit_side(ts, ps, y, d, w, drivers[which], wanted, net, settings)
        judge_in_blocks(rows, ts, ps, y, d, w, drivers[which], s, e, wanted, net, settings)
        fits[which] = rows
        chosen[which] = choose(rows, offered, criterion)
        if forced[which] >= 0:
            chosen[which] = -1 if np.isnan(rows[forced[which], BASE]) else forced[which]
    return fits, chosen


@kernel
def compare_batch(
    start, end, use, side, offsets, station, drivers, n_drivers, offered, wanted, net, forced,
    temp, order, soff, first_day, ytemp, yoff, ydays, ydegrees, ydoff,
    settings, criterion, equal, hold, confidence,
):  # fmt: skip
    """Fits of both sides, the forms chosen and the answer of every account.

    drivers (rows, K), n_drivers (accounts,) : how many of the columns are an account's own.
    forced (accounts, 2) int8 : a form to use whatever the choice says, or −1.
    hold : balance temperatures are stated, not found: their uncertainty is left to the caller.
    ytemp/yoff, ydays, ydegrees/ydoff : long-term years by station, ragged.
    Returns fits (accounts, 2, N_FORMS, WIDTH), chosen (accounts, 2), answers (accounts,
    ANSWER_WIDTH).
    """
    accounts = offsets.shape[0] - 1
    fits = np.full((accounts, 2, N_FORMS, WIDTH), np.nan)
    chosen = np.full((accounts, 2), np.int8(-1))
    answers = np.full((accounts, ANSWER_WIDTH), np.nan)
    tables = no_tables()
    for i in range(accounts):
        a, b = offsets[i], offsets[i + 1]
        at = station[i]
        g, h = soff[at], soff[at + 1]
        sides = (
            take_side(start[a:b], end[a:b], use[a:b], side[a:b], BEFORE, temp[g:h],
                      first_day[at], order[g:h], equal),
            take_side(start[a:b], end[a:b], use[a:b], side[a:b], AFTER, temp[g:h],
                      first_day[at], order[g:h], equal),
        )  # fmt: skip
        own = (
            take_drivers(drivers[a:b], n_drivers[i], side[a:b], BEFORE),
            take_drivers(drivers[a:b], n_drivers[i], side[a:b], AFTER),
        )
        fits[i], chosen[i] = fit_both(
            sides, own, offered[i], wanted[i], net[i], forced[i], settings, criterion
        )
        y1, y2 = yoff[at], yoff[at + 1]
        d1, d2 = ydoff[at], ydoff[at + 1]
        compare_sides(
            answers[i], fits[i, 0, max(chosen[i, 0], 0)], chosen[i, 0], sides[0], own[0],
            fits[i, 1, max(chosen[i, 1], 0)], chosen[i, 1], sides[1], own[1],
            (ytemp[y1:y2], ydays[d1:d2], ydegrees[d1:d2]), hold, confidence, tables,
        )  # fmt: skip
    return fits, chosen, answers
