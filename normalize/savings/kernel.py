"""Before against after, compiled: the whole answer of one account, over a ragged batch."""

from __future__ import annotations

from typing import Final

import numpy as np

from normalize.fitting.batch import take_side
from normalize.fitting.columns import (
    AFTER,
    BASE,
    BEFORE,
    SLOPE_C,
    SLOPE_H,
    SLOPE_LINE,
    TAU_C,
    TAU_H,
    WIDTH,
)
from normalize.fitting.correlation import (
    RHO,
    RHO_ZERO,
    positions,
    signed_power,
    through_rho,
    weights_of,
)
from normalize.fitting.forms import COOLING, HEATING, LINE, N_FORMS, TWO_SLOPES
from normalize.fitting.linear import coefficients_of, design_and_jacobian, linearise, times
from normalize.fitting.mixture import difference_range, mixture_range
from normalize.fitting.side import choose, fit_side
from normalize.fitting.student import t_quantile
from normalize.fitting.sweep import SHIFT_F
from normalize.jit import kernel

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
ANSWER_WIDTH: Final = 25


@kernel
def year_at(base, temp, days, degrees):
    """(days below, H0, C0) of a long-term year at a base."""
    k = np.searchsorted(temp, base)
    below = days[k]
    heating = base * days[k] - degrees[k]
    last = days.shape[0] - 1
    cooling = degrees[last] - degrees[k] - base * (days[last] - days[k])
    return below, heating, cooling


@kernel
def nac_of(row, form, temp, days, degrees):
    """Normalized annual consumption of a fitted row."""
    last = days.shape[0] - 1
    total = days[last] * row[BASE]
    if form == LINE:
        total += row[SLOPE_LINE] * degrees[last]
    if form == HEATING or form >= TWO_SLOPES:
        total += row[SLOPE_H] * year_at(row[TAU_H], temp, days, degrees)[1]
    if form == COOLING or form >= TWO_SLOPES:
        total += row[SLOPE_C] * year_at(row[TAU_C], temp, days, degrees)[2]
    return total


@kernel
def nac_gradient(row, form, k, temp, days, degrees):
    """(k,) derivatives of NAC in the order of the Jacobian's columns."""
    last = days.shape[0] - 1
    g = np.zeros(k)
    g[0] = days[last]
    at = 1
    heating = form == HEATING or form >= TWO_SLOPES
    cooling = form == COOLING or form >= TWO_SLOPES
    if form == LINE:
        g[at] = degrees[last] - SHIFT_F * days[last]
    below = 0.0
    if heating:
        below, g[at], _ = year_at(row[TAU_H], temp, days, degrees)
        at += 1
    above = 0.0
    if cooling:
        _, _, g[at] = year_at(row[TAU_C], temp, days, degrees)
        # Strictly above, as the Jacobian counts: a day at τ itself does not move.
        above = days[last] - days[np.searchsorted(temp, row[TAU_C], side="right")]
        at += 1
    if at < k:
        if form == TWO_SLOPES:
            g[at] = row[SLOPE_H] * below - row[SLOPE_C] * above
            return g
        if heating:
            g[at] = row[SLOPE_H] * below
            at += 1
        if cooling:
            g[at] = -row[SLOPE_C] * above
    return g


@kernel
def sum_noise(d, place, rho, mean_days):
    """Variance of the summed errors of periods, in units of the innovation variance."""
    total = 0.0
    carried = 0.0
    for p in range(d.shape[0]):
        a = np.sqrt(d[p] * mean_days)
        if p > 0:
            carried = signed_power(rho, place[p] - place[p - 1]) * carried
        total += a * a + 2.0 * a * carried
        carried += a
    return total / (1.0 - rho * rho)


@kernel
def _one_range(out, at, value, like_w, shift, scale2, df, confidence):
    """Writes value, default range and plain range (ρ = 0) of a single t."""
    out[at] = value
    scale = np.sqrt(scale2)
    low, high = mixture_range(like_w, value + shift, scale, df, confidence)
    out[at + 1] = low
    out[at + 2] = high
    half = t_quantile(0.5 + 0.5 * confidence, df) * scale[RHO_ZERO]
    out[at + 3] = value - half
    out[at + 4] = value + half


@kernel
def _avoided_target(out, row, form, rep, k, held):
    """Predicted and actual use of the reporting periods; gradient of the prediction (k,)."""
    ts2, ps2, y2, d2, _, _ = rep
    x2, jac2 = design_and_jacobian(row, form, ts2, ps2, d2, not held)
    predicted = times(x2, coefficients_of(row, form))
    target = np.zeros(k)
    total = 0.0
    actual = 0.0
    for p in range(d2.shape[0]):
        total += d2[p] * predicted[p]
        actual += d2[p] * y2[p]
        for j in range(k):
            target[j] += d2[p] * jac2[p, j]
    out[PREDICTED] = total
    out[ACTUAL] = actual
    return target


@kernel
def _avoided(out, rep, like, shift, scale2, innovation, mean_days, df, confidence):
    """Avoided use over the reporting periods, from the baseline alone."""
    _, _, _, d2, s2, e2 = rep
    place = positions(s2, e2)
    total = scale2.copy()
    for i in range(RHO.shape[0]):
        total[i] += innovation[i] * sum_noise(d2, place, RHO[i], mean_days)
    value = out[PREDICTED] - out[ACTUAL]
    _one_range(out, AVOIDED, value, weights_of(like), shift, total, df, confidence)


@kernel
def _normalized(out, value, like1, sh1, sc1, df1, like2, sh2, sc2, df2, n1, n2, confidence):
    """Ranges of both NAC and of their difference, ρ shared between before and after."""
    weight = weights_of(like1 + like2)
    mean = 0.0
    for i in range(RHO.shape[0]):
        mean += weight[i] * RHO[i]
    out[RHO_MEAN] = mean
    _one_range(out, NAC_BEFORE, n1, weight, sh1, sc1, df1, confidence)
    _one_range(out, NAC_AFTER, n2, weight, sh2, sc2, df2, confidence)
    low, high = difference_range(
        weight, n1 + sh1, np.sqrt(sc1), df1, n2 + sh2, np.sqrt(sc2), df2, confidence
    )
    out[NORMALIZED] = value
    out[NORMALIZED + 1] = low
    out[NORMALIZED + 2] = high
    v1 = sc1[RHO_ZERO]
    v2 = sc2[RHO_ZERO]
    welch = (v1 + v2) ** 2 / (v1 * v1 / df1 + v2 * v2 / df2) if v1 + v2 > 0.0 else df1
    half = t_quantile(0.5 + 0.5 * confidence, max(int(welch), 1)) * np.sqrt(v1 + v2)
    out[NORMALIZED + 3] = value - half
    out[NORMALIZED + 4] = value + half


@kernel
def compare_sides(out, row1, form1, side1, row2, form2, side2, year, hold, confidence):
    """One account's answer for given forms; writes what can be known into ``out``.

    side : (ts, ps, y, d, w, start, end); year : (temp, cum days, cum degrees).
    form < 0 : that side has no fit.
    """
    temp, days, degrees = year
    ts, ps, y, d, w, s, e = side1
    ts2, ps2, y2, d2, w2, s2, e2 = side2
    if form1 < 0:
        return
    jac, resid, held = linearise(row1, form1, ts, ps, y, d, w, hold)
    out[HELD_BEFORE] = 1.0 if held else 0.0
    n, k = jac.shape
    # One pass over ρ serves both the normal year and the reporting period.
    target = np.zeros((2, k))
    rep = (ts2, ps2, y2, d2, s2, e2)
    has_year = temp.shape[0] > 0
    if has_year:
        target[0] = nac_gradient(row1, form1, k, temp, days, degrees)
    if y2.shape[0] > 0:
        target[1] = _avoided_target(out, row1, form1, rep, k, held)
    like, shift, scale2, innovation = through_rho(jac, resid, w, positions(s, e), target)
    sh1 = shift[:, 0].copy()
    sc1 = scale2[:, 0].copy()
    if y2.shape[0] > 0:
        mean_days = w.sum() / n
        _avoided(
            out, rep, like, shift[:, 1].copy(), scale2[:, 1].copy(), innovation, mean_days,
            n - k, confidence,
        )  # fmt: skip
    if not has_year:
        return
    nac1 = nac_of(row1, form1, temp, days, degrees)
    if form2 < 0:
        _one_range(out, NAC_BEFORE, nac1, weights_of(like), sh1, sc1, n - k, confidence)
        return
    jac2, resid2, held2 = linearise(row2, form2, ts2, ps2, y2, d2, w2, hold)
    out[HELD_AFTER] = 1.0 if held2 else 0.0
    n2, k2 = jac2.shape
    target2 = np.zeros((1, k2))
    target2[0] = nac_gradient(row2, form2, k2, temp, days, degrees)
    like2, shift2, scale22, _ = through_rho(jac2, resid2, w2, positions(s2, e2), target2)
    nac2 = nac_of(row2, form2, temp, days, degrees)
    _normalized(
        out, nac1 - nac2, like, sh1, sc1, n - k, like2, shift2[:, 0].copy(),
        scale22[:, 0].copy(), n2 - k2, nac1, nac2, confidence,
    )  # fmt: skip


@kernel
def compare_batch(
    start, end, use, side, offsets, station, offered, wanted, net, forced,
    temp, order, soff, first_day, ytemp, yoff, ydays, ydegrees, ydoff,
    settings, criterion, equal, hold, confidence,
):  # fmt: skip
    """Fits of both sides, the forms chosen and the answer of every account.

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
        for which in range(2):
            ts, ps, y, d, w, _, _ = sides[which]
            drivers = np.empty((y.shape[0], 0))
            rows = fit_side(ts, ps, y, d, w, drivers, wanted[i], net[i], settings)
            fits[i, which] = rows
            chosen[i, which] = choose(rows, offered[i], criterion)
            if forced[i, which] >= 0:
                fitted = rows[forced[i, which], 0] >= 0 and not np.isnan(
                    rows[forced[i, which], BASE]
                )
                chosen[i, which] = forced[i, which] if fitted else np.int8(-1)
        y1, y2 = yoff[at], yoff[at + 1]
        d1, d2 = ydoff[at], ydoff[at + 1]
        compare_sides(
            answers[i], fits[i, 0, max(chosen[i, 0], 0)], chosen[i, 0], sides[0],
            fits[i, 1, max(chosen[i, 1], 0)], chosen[i, 1], sides[1],
            (ytemp[y1:y2], ydays[d1:d2], ydegrees[d1:d2]), hold, confidence,
        )  # fmt: skip
    return fits, chosen, answers
