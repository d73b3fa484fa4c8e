"""The savings taken apart, compiled: a part for each parameter, over a ragged batch.

Every parameter has one part, what the savings would be if it alone had changed, the others at
the mean of before and after; the parts add up to the savings exactly (docs/method.md §7).
"""

from __future__ import annotations

from typing import Final

import numpy as np

from normalize.fitting.batch import take_drivers, take_side
from normalize.fitting.blocks import block_of
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
from normalize.fitting.correlation import weights_of
from normalize.fitting.forms import COOLING, HEATING, LINE, TWO_SLOPES
from normalize.fitting.linear import linearise_with
from normalize.fitting.mixture import difference_range_with, mixture_range_with
from normalize.fitting.spread import through_errors
from normalize.fitting.student import no_tables, t_quantile
from normalize.fitting.sweep import SHIFT_F
from normalize.jit import kernel
from normalize.savings.one_side import unsure

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
def _single(out, value, weight, seen, confidence, tables):
    """Value, default range and plain range of one t.

    seen : (shift (27,), scale2 (27,), plain scale², degrees of freedom).
    """
    shift, scale2, plain2, df = seen
    out[0] = value
    out[1], out[2] = mixture_range_with(
        weight, value + shift, np.sqrt(scale2), df, confidence, tables
    )
    half = t_quantile(0.5 + 0.5 * confidence, df) * np.sqrt(plain2)
    out[3] = value - half
    out[4] = value + half


@kernel
def _difference(out, value, weight, seen1, seen2, confidence, tables):
    """Value, default range and plain range of a difference of two t, ρ shared."""
    sh1, sc1, v1, df1 = seen1
    sh2, sc2, v2, df2 = seen2
    out[0] = value
    out[1], out[2] = difference_range_with(
        weight, value + sh1, np.sqrt(sc1), df1, sh2, np.sqrt(sc2), df2, confidence, tables
    )
    welch = (v1 + v2) ** 2 / (v1 * v1 / df1 + v2 * v2 / df2) if v1 + v2 > 0.0 else df1
    half = t_quantile(0.5 + 0.5 * confidence, max(int(welch), 1)) * np.sqrt(v1 + v2)
    out[3] = value - half
    out[4] = value + half


@kernel
def _side(row, form, side, drivers, hold):
    """One side as a straight line: (Jacobian, residuals, degrees of freedom, τ placed?)."""
    ts, ps, y, d, w, s, e = side
    jac, resid, _, held = linearise_with(row, form, ts, ps, y, d, w, drivers, hold)
    _, place = block_of(s, e)
    df = place.shape[0] - jac.shape[1]
    placed = not hold and not held and not unsure(row, form, side, drivers, df)
    return jac, resid, df, placed


@kernel
def _through(jac, resid, side, targets):
    """The targets through every ρ and way that errors grow: (like, shift, scale2, plain2)."""
    zero = np.empty(0)
    none = (zero, np.empty(0, np.int32), zero, zero, zero, zero, zero)
    return through_errors(jac, resid, side[2] - resid, side, targets, none, zero)


@kernel
def _has_heating(form):
    return form == HEATING or form >= TWO_SLOPES


@kernel
def _targets(gradients, m, k, slope):
    """(m + 1, k): the parts' gradients, then the heating slope's own (its column, or −1)."""
    out = np.zeros((m + 1, k))
    for j in range(m):
        for c in range(k):
            out[j, c] = gradients[j, c]
    if slope >= 0:
        out[m, slope] = 1.0
    return out


@kernel
def _seen(found, j, df):
    """One target of what ``_through`` found, with the degrees of freedom."""
    _, shift, scale2, plain2 = found
    return shift[:, j].copy(), scale2[:, j].copy(), plain2[j], df


@kernel
def take_apart(
    parts, slopes, row1, form1, side1, drivers1, row2, form2, side2, drivers2, year, hold,
    confidence, tables,
):  # fmt: skip
    """One account's parts and heating slopes; returns why there are no parts, or KNOWN.

    parts (MOST_PARTS, ESTIMATE), slopes (3, ESTIMATE) : written; NaN stays where nothing is
    known.  side : (ts, ps, y, d, w, start, end); drivers (n, k), from their normal level;
    year : (temp, cum days, cum degrees).
    """
    if form1 < 0:
        return NO_FIT
    temp, days, degrees = year
    jac, resid, df, placed = _side(row1, form1, side1, drivers1, hold)
    k = jac.shape[1]
    # The slope's column, where a balance temperature that is placed makes it worth telling.
    slope = 1 + drivers1.shape[1] if placed and _has_heating(form1) else -1
    none = np.zeros((0, k))
    if form2 < 0:
        found = _through(jac, resid, side1, _targets(none, 0, k, slope))
        if slope >= 0:
            weight = weights_of(found[0])
            _single(slopes[SLOPE_BEFORE], row1[SLOPE_H], weight, _seen(found, 0, df), confidence,
                    tables)  # fmt: skip
        return NO_FIT
    jac2, resid2, df2, placed2 = _side(row2, form2, side2, drivers2, hold)
    k2 = jac2.shape[1]
    slope2 = 1 + drivers2.shape[1] if placed2 and _has_heating(form2) else -1
    why = KNOWN
    if form1 != form2:
        why = FORMS_DIFFER
    elif form1 > LINE and not (placed and placed2):
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
    found = _through(jac, resid, side1, _targets(g1, m, k, slope))
    found2 = _through(jac2, resid2, side2, _targets(g2, m, k2, slope2))
    weight = weights_of(found[0] + found2[0])
    for j in range(m):
        _difference(
            parts[j], value[j], weight, _seen(found, j, df), _seen(found2, j, df2), confidence,
            tables,
        )  # fmt: skip
    one, two = _seen(found, m, df), _seen(found2, m, df2)
    if slope >= 0:
        _single(slopes[SLOPE_BEFORE], row1[SLOPE_H], weight, one, confidence, tables)
    if slope2 >= 0:
        _single(slopes[SLOPE_AFTER], row2[SLOPE_H], weight, two, confidence, tables)
    if slope >= 0 and slope2 >= 0:
        change = row1[SLOPE_H] - row2[SLOPE_H]
        _difference(slopes[SLOPE_CHANGE], change, weight, one, two, confidence, tables)
    return why


@kernel
def parts_batch(
    start, end, use, side, offsets, station, drivers, n_drivers, fits, chosen,
    temp, order, soff, first_day, ytemp, yoff, ydays, ydegrees, ydoff, equal, hold, confidence,
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
        y1, y2 = yoff[at], yoff[at + 1]
        d1, d2 = ydoff[at], ydoff[at + 1]
        why[i] = take_apart(
            parts[i], slopes[i], fits[i, 0, max(chosen[i, 0], 0)], chosen[i, 0], sides[0], own[0],
            fits[i, 1, max(chosen[i, 1], 0)], chosen[i, 1], sides[1], own[1],
            (ytemp[y1:y2], ydays[d1:d2], ydegrees[d1:d2]), hold, confidence, tables,
        )  # fmt: skip
    return parts, slopes, why
