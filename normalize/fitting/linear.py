"""A fit as a straight line about its solution: design, Jacobian, residuals."""

from __future__ import annotations

import numpy as np

from normalize.fitting.columns import BASE, SLOPE_C, SLOPE_H, SLOPE_LINE, TAU_C, TAU_H
from normalize.fitting.correlation import jacobian, well_determined
from normalize.fitting.forms import COOLING, HEATING, LINE, TWO_SLOPES
from normalize.fitting.least_squares import weighted_fit
from normalize.fitting.side import design
from normalize.fitting.sweep import SHIFT_F
from normalize.jit import kernel


@kernel
def design_and_jacobian(row, form, ts, ps, d, drivers, with_tau):
    """(design, Jacobian) of a side's periods at the row's balance temperatures."""
    n = d.shape[0]
    tn = -ts[::-1].copy()
    pn = ps[::-1].copy()
    tbar = np.zeros(n)
    for i in range(ts.shape[0]):
        tbar[ps[i]] += ts[i]
    tbar /= d
    th = row[TAU_H] - SHIFT_F
    tc = row[TAU_C] - SHIFT_F
    x = design(form, ts, ps, tn, pn, d, tbar, drivers, th, tc)
    jac = jacobian(form, x, ts, ps, tn, pn, d, row[SLOPE_H], row[SLOPE_C], th, tc, with_tau)
    return x, jac


@kernel
def coefficients_of(row, form):
    """Coefficients in the order of the design's columns (the line about SHIFT_F)."""
    if form == LINE:
        return np.array([row[BASE] + SHIFT_F * row[SLOPE_LINE], row[SLOPE_LINE]])
    if form == HEATING:
        return np.array([row[BASE], row[SLOPE_H]])
    if form == COOLING:
        return np.array([row[BASE], row[SLOPE_C]])
    if form >= TWO_SLOPES:
        return np.array([row[BASE], row[SLOPE_H], row[SLOPE_C]])
    return np.array([row[BASE]])


@kernel
def times(x, coef):
    """x @ coef in a fixed order, without BLAS."""
    n, k = x.shape
    out = np.zeros(n)
    for p in range(n):
        for j in range(k):
            out[p] += x[p, j] * coef[j]
    return out


@kernel
def linearise_with(row, form, ts, ps, y, d, w, drivers, hold):
    """The fit linearised: (Jacobian, residuals, coefficients of the design, τ held?).

    Columns: base load, drivers (n, k), slopes, balance temperatures.
    """
    x, jac = design_and_jacobian(row, form, ts, ps, d, drivers, not hold)
    coef = coefficients_of(row, form)
    if drivers.shape[1] > 0:
        coef, _, _, _ = weighted_fit(x, y, w)
    resid = y - times(x, coef)
    n_tau = jac.shape[1] - x.shape[1]
    if hold or (n_tau > 0 and not well_determined(jac, w, n_tau)):
        return x, resid, coef, True
    return jac, resid, coef, False


@kernel
def linearise(row, form, ts, ps, y, d, w, hold):
    """The same without drivers: (Jacobian, residuals, τ held?)."""
    none = np.empty((y.shape[0], 0))
    jac, resid, _, held = linearise_with(row, form, ts, ps, y, d, w, none, hold)
    return jac, resid, held
