"""The savings taken apart, compiled: a part for each parameter, over a ragged batch.

Every parameter has one part, what the savings would be if it alone had changed, the others at
the mean of before and after; the parts add up to the savings exactly (docs/method.md §7).
"""

from __future__ import annotations

from typing import Final

import numpy as np

from normalize import jit
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
)
from normalize.fitting.correlation import positions, through_rho, weights_of
from normalize.fitting.forms import COOLING, HEATING, LINE, TWO_SLOPES
from normalize.fitting.linear import linearise
from normalize.fitting.mixture import difference_range, mixture_range
from normalize.fitting.rho import RHO_ZERO
from normalize.fitting.student import t_quantile
from normalize.fitting.sweep import SHIFT_F

kernel = jit.kernel
MOST_PARTS: Final = 5
ESTIMATE: Final = 5  # value, low, high, plain low, plain high

# Rows of the heating slope's table.
SLOPE_BEFORE: Final = 0
SLOPE_AFTER: Final = 1
SLOPE_CHANGE: Final = 2

# Why there are no parts.
KNOWN: Final = 0
NO_FIT: Final = 1
FORMS_DIFFER: Final = 2
HELD: Final = 3
NO_YEAR: Final = 4


@kernel
def load_at(tau, cooling, temp, days, degrees):
    """(degree-days of the long-term year, their derivative by the balance temperature)."""
    last = days.shape[0] - 1
    k = np.searchsorted(temp, tau)
    if not cooling:
        return tau * days[k] - degrees[k], days[k]
    load = degrees[last] - degrees[k] - tau * (days[last] - days[k])
    # Strictly above, as the Jacobian counts: a day at τ itself does not move.
    return load, days[np.searchsorted(temp, tau, side="right")] - days[last]


@kernel
def _one_load(value, g1, g2, p, q, drivers, b1, b2, load1, load2):
    """Writes the part of a slope (p) and adds that of its balance temperature (q).

    Their columns of θ stand that many drivers further right.
    """
    l1, d1 = load1
    l2, d2 = load2
    mean_load = 0.5 * (l1 + l2)
    mean_slope = 0.5 * (b1 + b2)
    value[p] = (b1 - b2) * mean_load
    slope = p + drivers
    balance = q + drivers
    g1[p, slope] = mean_load
    g2[p, slope] = mean_load
    g1[p, balance] = 0.5 * (b1 - b2) * d1
    g2[p, balance] = -0.5 * (b1 - b2) * d2
    value[q] += mean_slope * (l1 - l2)
    g1[q, slope] = 0.5 * (l1 - l2)
    g2[q, slope] = -0.5 * (l1 - l2)
    g1[q, balance] += mean_slope * d1
    g2[q, balance] += mean_slope * d2


@kernel
def parts_in(form):
    """How many parts a form's savings have: one for each parameter."""
    if form in (HEATING, COOLING):
        return 3
    if form >= TWO_SLOPES:
        return 4 if form == TWO_SLOPES else 5
    return 2 if form == LINE else 1


@kernel
def parts_about(row1, row2, form, k, temp, days, degrees):
    """(m,) parts, and their gradients on either side (m, k): part = g1·θ1 − g2·θ2 about the fit.

    k : columns of the Jacobian: base load, drivers if there are any (no part is theirs: in a
    normal year they stand at their normal level), slopes, balance temperatures.  Parts stand in
    that order.
    """
    last = days.shape[0] - 1
    m = parts_in(form)
    value = np.zeros(m)
    g1 = np.zeros((m, k))
    g2 = np.zeros((m, k))
    value[0] = days[last] * (row1[BASE] - row2[BASE])
    g1[0, 0] = days[last]
    g2[0, 0] = days[last]
    if form == LINE:
        slope = row1[SLOPE_LINE] - row2[SLOPE_LINE]
        from_shift = degrees[last] - SHIFT_F * days[last]
        value[0] += days[last] * SHIFT_F * slope
        value[1] = slope * from_shift
        g1[1, k - 1] = from_shift
        g2[1, k - 1] = from_shift
        return value, g1, g2
    heating = form == HEATING or form >= TWO_SLOPES
    cooling = form == COOLING or form >= TWO_SLOPES
    p = 1
    q = 3 if heating and cooling else 2
    if heating:
        _one_load(
            value, g1, g2, p, q, k - m, row1[SLOPE_H], row2[SLOPE_H],
            load_at(row1[TAU_H], False, temp, days, degrees),
            load_at(row2[TAU_H], False, temp, days, degrees),
        )  # fmt: skip
        p += 1
        q += 1 if form > TWO_SLOPES else 0
    if cooling:
        _one_load(
            value, g1, g2, p, q, k - m, row1[SLOPE_C], row2[SLOPE_C],
            load_at(row1[TAU_C], True, temp, days, degrees),
            load_at(row2[TAU_C], True, temp, days, degrees),
        )  # fmt: skip
    return value, g1, g2


@kernel
def _single(out, value, weight, shift, scale2, df, confidence):
    """Value, default range and plain range of one t."""
    out[0] = value
    scale = np.sqrt(scale2)
    out[1], out[2] = mixture_range(weight, value + shift, scale, df, confidence)
    half = t_quantile(0.5 + 0.5 * confidence, df) * scale[RHO_ZERO]
    out[3] = value - half
    out[4] = value + half


@kernel
def _difference(out, value, weight, sh1, sc1, df1, sh2, sc2, df2, confidence):
    """Value, default range and plain range of a difference of two t, ρ shared."""
    out[0] = value
    out[1], out[2] = difference_range(
        weight, value + sh1, np.sqrt(sc1), df1, sh2, np.sqrt(sc2), df2, confidence
    )
    v1 = sc1[RHO_ZERO]
    v2 = sc2[RHO_ZERO]
    welch = (v1 + v2) ** 2 / (v1 * v1 / df1 + v2 * v2 / df2) if v1 + v2 > 0.0 else df1
    half = t_quantile(0.5 + 0.5 * confidence, max(int(welch), 1)) * np.sqrt(v1 + v2)
    out[3] = value - half
    out[4] = value + half


@kernel
def _through(jac, resid, w, s, e, targets):
    """Log-likelihood, shifts and scales² of the targets through every ρ."""
    like, shift, scale2, _ = through_rho(jac, resid, w, positions(s, e), targets)
    return like, shift, scale2


@kernel
def _has_heating(form):
    return form == HEATING or form >= TWO_SLOPES


@kernel
def _targets(gradients, m, k, heating):
    """(m + 1, k): the parts' gradients, then the heating slope's own."""
    out = np.zeros((m + 1, k))
    for j in range(m):
        for c in range(k):
            out[j, c] = gradients[j, c]
    if heating:
        out[m, 1] = 1.0
    return out


@kernel
def take_apart(parts, slopes, row1, form1, side1, row2, form2, side2, year, hold, confidence):
    """One account's parts and heating slopes; returns why there are no parts, or KNOWN.

    parts (MOST_PARTS, ESTIMATE), slopes (3, ESTIMATE) : written; NaN stays where nothing is
    known.  side : (ts, ps, y, d, w, start, end); year : (temp, cum days, cum degrees).
    """
    if form1 < 0:
        return NO_FIT
    ts, ps, y, d, w, s, e = side1
    temp, days, degrees = year
    jac, resid, held = linearise(row1, form1, ts, ps, y, d, w, hold)
    n, k = jac.shape
    none = np.zeros((0, k))
    heating1 = _has_heating(form1)
    if form2 < 0:
        if heating1:
            target = _targets(none, 0, k, True)
            like, sh, sc = _through(jac, resid, w, s, e, target)
            _single(
                slopes[SLOPE_BEFORE], row1[SLOPE_H], weights_of(like), sh[:, 0].copy(),
                sc[:, 0].copy(), n - k, confidence,
            )  # fmt: skip
        return NO_FIT
    ts2, ps2, y2, d2, w2, s2, e2 = side2
    jac2, resid2, held2 = linearise(row2, form2, ts2, ps2, y2, d2, w2, hold)
    n2, k2 = jac2.shape
    why = KNOWN
    if form1 != form2:
        why = FORMS_DIFFER
    elif held or held2:
        why = HELD
    elif temp.shape[0] == 0:
        why = NO_YEAR
    m = 0
    value = np.zeros(0)
    g1 = none
    g2 = np.zeros((0, k2))
    if why == KNOWN:
        m = parts_in(form1)
        value, g1, _ = parts_about(row1, row2, form1, k, temp, days, degrees)
        _, _, g2 = parts_about(row1, row2, form1, k2, temp, days, degrees)
    heating2 = _has_heating(form2)
    like, sh, sc = _through(jac, resid, w, s, e, _targets(g1, m, k, heating1))
    like2, sh2, sc2 = _through(jac2, resid2, w2, s2, e2, _targets(g2, m, k2, heating2))
    weight = weights_of(like + like2)
    for j in range(m):
        _difference(
            parts[j], value[j], weight, sh[:, j].copy(), sc[:, j].copy(), n - k,
            sh2[:, j].copy(), sc2[:, j].copy(), n2 - k2, confidence,
        )  # fmt: skip
    a, b = sh[:, m].copy(), sc[:, m].copy()
    a2, b2 = sh2[:, m].copy(), sc2[:, m].copy()
    if heating1:
        _single(slopes[SLOPE_BEFORE], row1[SLOPE_H], weight, a, b, n - k, confidence)
    if heating2:
        _single(slopes[SLOPE_AFTER], row2[SLOPE_H], weight, a2, b2, n2 - k2, confidence)
    if heating1 and heating2:
        _difference(
            slopes[SLOPE_CHANGE], row1[SLOPE_H] - row2[SLOPE_H], weight, a, b, n - k, a2, b2,
            n2 - k2, confidence,
        )  # fmt: skip
    return why


@kernel
def parts_batch(
    start, end, use, side, offsets, station, fits, chosen, temp, order, soff, first_day,
    ytemp, yoff, ydays, ydegrees, ydoff, equal, hold, confidence,
):  # fmt: skip
    """Parts and heating slopes of every account, from the fits that ``compare_batch`` made.

    fits (accounts, 2, N_FORMS, WIDTH), chosen (accounts, 2); the rest as ``compare_batch``.
    Returns parts (accounts, MOST_PARTS, ESTIMATE) in the order of the form's parameters,
    slopes (accounts, 3, ESTIMATE), why (accounts,) int8.
    """
    accounts = offsets.shape[0] - 1
    parts = np.full((accounts, MOST_PARTS, ESTIMATE), np.nan)
    slopes = np.full((accounts, 3, ESTIMATE), np.nan)
    why = np.zeros(accounts, dtype=np.int8)
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
        y1, y2 = yoff[at], yoff[at + 1]
        d1, d2 = ydoff[at], ydoff[at + 1]
        why[i] = take_apart(
            parts[i], slopes[i], fits[i, 0, max(chosen[i, 0], 0)], chosen[i, 0], sides[0],
            fits[i, 1, max(chosen[i, 1], 0)], chosen[i, 1], sides[1],
            (ytemp[y1:y2], ydays[d1:d2], ydegrees[d1:d2]), hold, confidence,
        )  # fmt: skip
    return parts, slopes, why
