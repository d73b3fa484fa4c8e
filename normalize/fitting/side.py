"""One side of the work: every form tried on the same periods, and one chosen."""

from __future__ import annotations

import numpy as np

from normalize.fitting.columns import (
    AICC,
    BASE,
    BIC,
    DAYS,
    HIGH_C,
    HIGH_H,
    LOW_C,
    LOW_H,
    MEAN,
    ON_BOUND,
    RSS,
    SE_BASE,
    SE_C,
    SE_H,
    SE_LINE,
    SLOPE_C,
    SLOPE_H,
    SLOPE_LINE,
    STATUS,
    TAU_C,
    TAU_H,
    TSS,
    WIDTH,
    WORST_T,
    N,
)
from normalize.fitting.forms import (
    COOLING,
    FITTED,
    FLAT,
    HEATING,
    HEATING_AND_COOLING,
    LINE,
    N_FORMS,
    NEGATIVE_BASE,
    NO_BALANCE,
    NOT_TRIED,
    SINGULAR,
    TOO_FEW,
    TWO_SLOPES,
    WEAK_SLOPE,
    WRONG_SIGN,
)
from normalize.fitting.least_squares import orthonormal, residual, weighted_fit
from normalize.fitting.pair import pair_search
from normalize.fitting.sweep import SHIFT_F, degree_days_per_day, polish, sweep
from normalize.jit import kernel, part

BOUND_F = 1e-6  # a balance temperature this close to the edge of its range lies on it
TINY = 1e-20  # share of Σw·y² below which a residual is rounding, not misfit

# Positions in the settings vector given to the kernels.
S_H_LOW, S_H_HIGH, S_C_LOW, S_C_HIGH, S_COLD, S_MILD, S_SPARE, S_MIN_T, S_BASE_T = range(9)


@kernel
def parameters_of(form):
    """Coefficients and balance temperatures of a form."""
    if form == FLAT:
        return 1
    if form == LINE:
        return 2
    if form in (HEATING, COOLING):
        return 3
    return 4 if form == TWO_SLOPES else 5


@kernel
def design(form, ts, ps, tn, pn, d, tbar, drivers, tau_h, tau_c):
    """Regressors of a form at given balance temperatures: [1, drivers…, T̄?, h?, c?]."""
    n = d.shape[0]
    k = drivers.shape[1]
    slopes = 0 if form == FLAT else (1 if form <= COOLING else 2)
    x = np.empty((n, 1 + k + slopes))
    x[:, 0] = 1.0
    x[:, 1 : 1 + k] = drivers
    h = np.empty(n)
    at = 1 + k
    if form == LINE:
        x[:, at] = tbar
    if form == HEATING or form >= TWO_SLOPES:
        degree_days_per_day(ts, ps, d, tau_h, h)
        x[:, at] = h
        at += 1
    if form == COOLING or form >= TWO_SLOPES:
        degree_days_per_day(tn, pn, d, -tau_c, h)
        x[:, at] = h
    return x


@kernel
def _write_slopes(row, form, coef, cov, scale, k):
    """Coefficients, standard errors with τ held and the smallest |t| of the slopes."""
    row[BASE] = coef[0]
    row[SE_BASE] = np.sqrt(cov[0, 0] * scale)
    at = 1 + k
    worst = np.inf
    for value, error, has in (
        (SLOPE_LINE, SE_LINE, form == LINE),
        (SLOPE_H, SE_H, form == HEATING or form >= TWO_SLOPES),
        (SLOPE_C, SE_C, form == COOLING or form >= TWO_SLOPES),
    ):
        if has:
            row[value] = coef[at]
            row[error] = np.sqrt(cov[at, at] * scale)
            t = np.inf if row[error] == 0.0 else abs(coef[at]) / row[error]
            worst = min(worst, t)
            at += 1
    row[WORST_T] = worst
    if form == LINE:
        # T̄ is held about SHIFT_F for conditioning; the line's value is told at 0 °F.
        row[BASE] = coef[0] - coef[1 + k] * SHIFT_F
        variance = cov[0, 0] - 2.0 * SHIFT_F * cov[0, 1 + k] + SHIFT_F**2 * cov[1 + k, 1 + k]
        row[SE_BASE] = np.sqrt(max(variance, 0.0) * scale)


@kernel
def _write_fit(row, form, x, y, w, k, settings, net):
    """Least squares at the balance temperatures already in the row; screens; criteria."""
    n = y.shape[0]
    coef, cov, rss, ok = weighted_fit(x, y, w)
    if not ok:
        row[STATUS] = SINGULAR
        return
    p = x.shape[1]
    row[RSS] = rss
    _write_slopes(row, form, coef, cov, rss / (n - p), k)
    total = 0.0
    for i in range(n):
        total += w[i] * y[i] * y[i]
    misfit = max(rss, TINY * total) / n
    parameters = parameters_of(form) + k + 1.0
    if misfit > 0.0:
        row[BIC] = n * np.log(misfit) + parameters * np.log(n)
        row[AICC] = n * np.log(misfit) + 2.0 * parameters
        row[AICC] += 2.0 * parameters * (parameters + 1.0) / (n - parameters - 1.0)
    else:  # no use at all: every form fits exactly, the simplest is right
        row[BIC] = parameters
        row[AICC] = parameters
    row[STATUS] = FITTED
    if form != FLAT and not row[WORST_T] >= settings[S_MIN_T]:
        row[STATUS] = WEAK_SLOPE
    if (
        form != LINE
        and not net
        and row[BASE] < 0.0
        and row[BASE] <= settings[S_BASE_T] * row[SE_BASE]
    ):
        row[STATUS] = NEGATIVE_BASE


@kernel
def _one_tau(row, form, ts, ps, r, q, d, z, settings, swap):
    """Sweep and polish for heating, or for cooling on −T (swap); writes τ and its range."""
    lo = settings[S_H_LOW] - SHIFT_F
    hi = settings[S_H_HIGH] - SHIFT_F
    if swap:
        lo = -(settings[S_C_HIGH] - SHIFT_F)
        hi = -(settings[S_C_LOW] - SHIFT_F)
    if form == TWO_SLOPES:
        hi = max(hi, settings[S_C_HIGH] - SHIFT_F)
    gain, tau, cell, first, last = sweep(
        ts, ps, r, q, d, z, 0.0, False, lo, hi, settings[S_COLD], settings[S_MILD]
    )
    if swap:
        row[LOW_C] = SHIFT_F - last
        row[HIGH_C] = SHIFT_F - first
    else:
        row[LOW_H] = SHIFT_F + first
        row[HIGH_H] = SHIFT_F + last
    if gain < 0.0:
        row[STATUS] = NO_BALANCE if np.isnan(first) else WRONG_SIGN
        return False
    _, best = polish(ts, ps, r, q, d, z, cell, tau, max(lo, first), min(hi, last))
    row[ON_BOUND] = 1.0 if best - first < BOUND_F or last - best < BOUND_F else 0.0
    if swap:
        row[TAU_C] = SHIFT_F - best
    else:
        row[TAU_H] = SHIFT_F + best
        if form == TWO_SLOPES:
            row[TAU_C] = row[TAU_H]
    return True


@part
def _two_taus(out, ts, ps, tn, pn, y, r, w, q, d, z, settings):
    """Heating and cooling together, within the ranges that each alone was allowed."""
    row = out[HEATING_AND_COOLING]
    row[LOW_H] = out[HEATING, LOW_H]
    row[HIGH_H] = out[HEATING, HIGH_H]
    row[LOW_C] = out[COOLING, LOW_C]
    row[HIGH_C] = out[COOLING, HIGH_C]
    if np.isnan(row[LOW_H]) or np.isnan(row[LOW_C]):
        row[STATUS] = NO_BALANCE
        return False
    box = row[LOW_H : HIGH_C + 1] - SHIFT_F
    gain, th, tc = pair_search(
        ts, ps, tn, pn, y, r, w, q, d, z, box, settings[S_COLD], settings[S_MILD]
    )
    total = 0.0
    for p in range(y.shape[0]):
        total += w[p] * r[p] * r[p]
    # With slopes >= 0 the best lies on the edge (one slope zero) whenever one slope alone
    # explains as much: then there is no heating-and-cooling fit to speak of.
    alone = total - max(gain, 0.0)
    if gain < 0.0 or alone >= out[HEATING, RSS] or alone >= out[COOLING, RSS]:
        row[STATUS] = WRONG_SIGN
        return False
    row[TAU_H] = th + SHIFT_F
    row[TAU_C] = tc + SHIFT_F
    edge = min(min(th - box[0], box[1] - th), min(tc - box[2], box[3] - tc))
    row[ON_BOUND] = 1.0 if edge < BOUND_F else 0.0
    return True


@kernel
def fit_side(ts, ps, y, d, w, drivers, wanted, net, settings):
    """All forms on one side: (N_FORMS, WIDTH) rows as in columns.py.

    ts, ps : the side's days in order of temperature (about SHIFT_F) and their period.
    y (n,) use per day, d (n,) days, w (n,) weights, drivers (n, k).
    wanted (N_FORMS,) bool; net : the base load may be negative.
    """
    n = y.shape[0]
    k = drivers.shape[1]
    out = np.full((N_FORMS, WIDTH), np.nan)
    q = w / d
    tn = -ts[::-1].copy()
    pn = ps[::-1].copy()
    tbar = np.zeros(n)
    for i in range(ts.shape[0]):
        tbar[ps[i]] += ts[i]
    tbar /= d
    x0 = np.empty((n, 1 + k))
    x0[:, 0] = 1.0
    x0[:, 1:] = drivers
    z = orthonormal(x0, w)
    r, _ = residual(y, w, z)
    weight = 0.0
    mean = 0.0
    for p in range(n):
        weight += w[p]
        mean += w[p] * y[p]
    mean /= weight
    total = 0.0
    for p in range(n):
        total += w[p] * (y[p] - mean) ** 2
    for form in range(N_FORMS):
        row = out[form]
        row[N] = n
        row[DAYS] = d.sum()
        row[MEAN] = mean
        row[TSS] = total
        both = wanted[HEATING_AND_COOLING] and form in (HEATING, COOLING)
        if not wanted[form] and not both:
            row[STATUS] = NOT_TRIED
            continue
        if n < parameters_of(form) + k + settings[S_SPARE]:
            row[STATUS] = TOO_FEW
            continue
        found = True
        if form == HEATING:
            found = _one_tau(row, form, ts, ps, r, q, d, z, settings, False)
        elif form == COOLING:
            found = _one_tau(row, form, tn, pn, r, q, d, z, settings, True)
        elif form == TWO_SLOPES:
            x1 = np.empty((n, 2 + k))
            x1[:, : 1 + k] = x0
            x1[:, 1 + k] = tbar
            z1 = orthonormal(x1, w)
            r1, _ = residual(y, w, z1)
            found = _one_tau(row, form, ts, ps, r1, q, d, z1, settings, False)
        elif form == HEATING_AND_COOLING:
            found = _two_taus(out, ts, ps, tn, pn, y, r, w, q, d, z, settings)
        if found:
            x = design(
                form, ts, ps, tn, pn, d, tbar, drivers, row[TAU_H] - SHIFT_F, row[TAU_C] - SHIFT_F
            )
            _write_fit(row, form, x, y, w, k, settings, net)
        if not wanted[form]:
            row[STATUS] = NOT_TRIED
    return out


@kernel
def choose(rows, allowed, criterion):
    """The form with the least criterion among those that passed; −1 when none did.

    criterion : AICC or BIC (columns.py).  Ties go to the simpler form.
    """
    best = -1
    for form in range(N_FORMS):
        if not allowed[form] or rows[form, STATUS] != FITTED:
            continue
        if best < 0 or rows[form, criterion] < rows[best, criterion] - 1e-9:
            best = form
    return best
