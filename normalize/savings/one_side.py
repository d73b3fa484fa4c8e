"""What one side's bills say about NAC and about the reporting period, at every correlation.

Usually the fit linearised at its solution, balance temperature and all.  Where the bills do
not place the balance temperature, a tangent promises too much: then the fit is made anew at
balance temperatures all over their range, each as plausible as its own restricted likelihood
(docs/method.md §5).
"""

from __future__ import annotations

from typing import Final

import numpy as np

from normalize.fitting.blocks import block_of
from normalize.fitting.columns import (
    BASE,
    HIGH_C,
    HIGH_H,
    LOW_C,
    LOW_H,
    ON_BOUND,
    RSS,
    SLOPE_C,
    SLOPE_H,
    TAU_C,
    TAU_H,
)
from normalize.fitting.forms import COOLING, HEATING_AND_COOLING, LINE, TWO_SLOPES
from normalize.fitting.least_squares import weighted_fit
from normalize.fitting.linear import design_and_jacobian, linearise_with, times
from normalize.fitting.rho import RHO
from normalize.fitting.spread import mixed, through_errors
from normalize.fitting.student import t_quantile
from normalize.jit import kernel, part
from normalize.savings.normal_year import nac_gradient, nac_of

NODES_ONE: Final = 21  # balance temperatures tried over the range, one of them in the form
NODES_TWO: Final = 9  # and each of two
UNSURE_CONFIDENCE: Final = 0.90  # of the profile that must end inside the range
IMPLAUSIBLE: Final = 1e-4  # likelihood, as a share of the best, of a node not worth its time


@kernel
def _rss_at(row, form, side, drivers, tau_h, tau_c):
    """(weighted sum of squares at given balance temperatures, slopes above zero?)."""
    ts, ps, y, d, w, _, _ = side
    there = row.copy()
    there[TAU_H] = tau_h
    there[TAU_C] = tau_c
    x, _ = design_and_jacobian(there, form, ts, ps, d, drivers, False)
    coef, _, rss, ok = weighted_fit(x, y, w)
    first = 1 + drivers.shape[1]
    if form != TWO_SLOPES:
        for j in range(first, coef.shape[0]):
            ok = ok and coef[j] > 0.0
    return rss, ok


@part
def unsure(row, form, side, drivers, df):
    """Whether the bills fail to place a balance temperature inside its range."""
    if form <= LINE:
        return False
    if row[ON_BOUND] == 1.0:
        return True
    t = t_quantile(0.5 + 0.5 * UNSURE_CONFIDENCE, df)
    limit = row[RSS] * (1.0 + t * t / df)
    if form != COOLING:
        for tau in (row[LOW_H], row[HIGH_H]):
            cool = tau if form == TWO_SLOPES else max(tau, row[TAU_C])
            rss, ok = _rss_at(row, form, side, drivers, tau, cool)
            if ok and rss <= limit:
                return True
    if form in (COOLING, HEATING_AND_COOLING):
        for tau in (row[LOW_C], row[HIGH_C]):
            rss, ok = _rss_at(row, form, side, drivers, min(row[TAU_H], tau), tau)
            if ok and rss <= limit:
                return True
    return False


@kernel
def _nodes(row, form):
    """(m, 2) balance temperatures spread evenly over the range of each."""
    if form != HEATING_AND_COOLING:
        out = np.empty((NODES_ONE, 2))
        low, high = row[LOW_H], row[HIGH_H]
        if form == COOLING:
            low, high = row[LOW_C], row[HIGH_C]
        for i in range(NODES_ONE):
            out[i, 0] = low + (high - low) * i / (NODES_ONE - 1.0)
            out[i, 1] = out[i, 0]
        return out
    out = np.empty((NODES_TWO * NODES_TWO, 2))
    count = 0
    for i in range(NODES_TWO):
        heat = row[LOW_H] + (row[HIGH_H] - row[LOW_H]) * i / (NODES_TWO - 1.0)
        for j in range(NODES_TWO):
            cool = row[LOW_C] + (row[HIGH_C] - row[LOW_C]) * j / (NODES_TWO - 1.0)
            if heat <= cool:
                out[count, 0] = heat
                out[count, 1] = cool
                count += 1
    return out[:count].copy()


@kernel
def _fitted_at(row, form, coef, drivers):
    """The row with the coefficients of another balance temperature."""
    there = row.copy()
    there[BASE] = coef[0]
    at = 1 + drivers
    if form != COOLING:
        there[SLOPE_H] = coef[at]
        at += 1
    if form >= COOLING:
        there[SLOPE_C] = coef[at]
    return there


@kernel
def _into(rows, at, values):
    """Values into one row: numba compiles a loop far sooner than a slice."""
    for j in range(values.shape[0]):
        rows[at, j] = values[j]


@kernel
def _totals(rows, d):
    """(k,) Σ days·row: the gradient of a predicted total."""
    out = np.zeros(rows.shape[1])
    for p in range(d.shape[0]):
        for j in range(rows.shape[1]):
            out[j] += d[p] * rows[p, j]
    return out


@kernel
def _half_log_det(cov):
    """½ log |cov| of a small positive definite matrix (Cholesky)."""
    k = cov.shape[0]
    c = cov.copy()
    total = 0.0
    for j in range(k):
        for i in range(j):
            c[j, j] -= c[j, i] * c[j, i]
        if not c[j, j] > 0.0:
            return -np.inf
        c[j, j] = np.sqrt(c[j, j])
        total += np.log(c[j, j])
        for r in range(j + 1, k):
            for i in range(j):
                c[r, j] -= c[r, i] * c[j, i]
            c[r, j] /= c[j, j]
    return total


@part
def _at_node(row, form, side, drivers, rep, rep_drivers, year, taus):
    """One balance temperature: (like, centres, scale2) of both targets through ρ."""
    ts, ps, y, d, w, _, _ = side
    ts2, ps2, _, d2, _, _, _ = rep
    temp, days, degrees = year
    there = row.copy()
    there[TAU_H] = taus[0]
    there[TAU_C] = taus[1]
    x, _ = design_and_jacobian(there, form, ts, ps, d, drivers, False)
    coef, cov, _, _ = weighted_fit(x, y, w)
    there = _fitted_at(there, form, coef, drivers.shape[1])
    k = x.shape[1]
    targets = np.zeros((2, k))
    values = np.zeros(2)
    if temp.shape[0] > 0:
        _into(targets, 0, nac_gradient(there, form, k, drivers.shape[1], temp, days, degrees))
        values[0] = nac_of(there, form, temp, days, degrees)
    rep_fitted = np.empty(d2.shape[0])
    if d2.shape[0] > 0:
        x2, _ = design_and_jacobian(there, form, ts2, ps2, d2, rep_drivers, False)
        rep_fitted = times(x2, coef)
        _into(targets, 1, _totals(x2, d2))
        values[1] = (rep_fitted * d2).sum()
    fitted = times(x, coef)
    like, shift, scale2, _ = through_errors(x, y - fitted, fitted, side, targets, rep, rep_fitted)
    # A slope's unit changes with τ: without this a τ would be favoured by its unit alone.
    like -= _half_log_det(cov)
    return like, shift + values, scale2


@part
def _over_range(row, form, side, drivers, rep, rep_drivers, year):
    """(like, centre, scale2) of both targets, mixed over balance temperatures."""
    nodes = _nodes(row, form)
    m = nodes.shape[0]
    like = np.full((m, RHO.shape[0]), -np.inf)
    centre = np.zeros((m, RHO.shape[0], 2))
    scale2 = np.zeros((m, RHO.shape[0], 2))
    n = side[2].shape[0]
    for i in range(m):
        rss, ok = _rss_at(row, form, side, drivers, nodes[i, 0], nodes[i, 1])
        if ok and (rss / row[RSS]) ** (-0.5 * n) > IMPLAUSIBLE:
            found, middle, spread = _at_node(
                row, form, side, drivers, rep, rep_drivers, year, nodes[i]
            )
            for r in range(RHO.shape[0]):
                like[i, r] = found[r]
                for t in range(2):
                    centre[i, r, t] = middle[r, t]
                    scale2[i, r, t] = spread[r, t]
    return mixed(like, centre, scale2)


@kernel
def side_evidence(row, form, side, drivers, rep, rep_drivers, year, hold):
    """One side's say on NAC (target 0) and on a reporting period's use (target 1).

    side, rep : (ts, ps, y, d, w, start, end); rep without periods: no reporting period.
    drivers (n, k), rep_drivers (n2, k) : measured from their normal level.
    hold : balance temperatures are stated, not found.
    Returns (values (2,), like (27,), shift (27, 2), scale2 (27, 2), plain2 (2,), degrees of
    freedom, held?, unsure?); the second target's spread contains the reporting noise.
    """
    ts, ps, y, d, w, s, e = side
    ts2, ps2, _, d2, _, _, _ = rep
    temp, days, degrees = year
    jac, resid, coef, held = linearise_with(row, form, ts, ps, y, d, w, drivers, hold)
    k = jac.shape[1]
    targets = np.zeros((2, k))
    values = np.zeros(2)
    if temp.shape[0] > 0:
        _into(targets, 0, nac_gradient(row, form, k, drivers.shape[1], temp, days, degrees))
        values[0] = nac_of(row, form, temp, days, degrees)
    rep_fitted = np.empty(d2.shape[0])
    if d2.shape[0] > 0:
        x2, jac2 = design_and_jacobian(row, form, ts2, ps2, d2, rep_drivers, not held)
        rep_fitted = times(x2, coef)
        _into(targets, 1, _totals(jac2, d2))
        values[1] = (rep_fitted * d2).sum()
    like, shift, scale2, plain2 = through_errors(
        jac, resid, y - resid, side, targets, rep, rep_fitted
    )
    _, place = block_of(s, e)
    df = place.shape[0] - k
    wide = not hold and (held or unsure(row, form, side, drivers, df))
    if wide and row[RSS] > 0.0:
        found, centre, spread = _over_range(row, form, side, drivers, rep, rep_drivers, year)
        if found.max() > -np.inf:
            like, shift, scale2 = found, centre - values, spread
    return values, like, shift, scale2, plain2, df, held, wide
