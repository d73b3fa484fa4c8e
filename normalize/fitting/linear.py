"""A fit as a straight line about its solution: design, Jacobian, residuals."""

from __future__ import annotations

import numpy as np

from normalize.fitting.columns import BASE, SLOPE_C, SLOPE_H, SLOPE_LINE, TAU_C, TAU_H
from normalize.fitting.correlation import jacobian, well_determined
from normalize.fitting.forms import COOLING, HEATING, LINE, TWO_SLOPES
from normalize.fitting.side import design
from normalize.fitting.sweep import SHIFT_F
from normalize.jit import kernel


@kernel
def design_and_jacobian(row, form, ts, ps, d, with_tau):
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
    x = design(form, ts, ps, tn, pn, d, tbar, np.empty((n, 0)), th, tc)
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
def linearise(row, form, ts, ps, y, d, w, hold):
    """The fit linearised: (Jacobian, residuals, τ held?)."""
    x, jac = design_and_jacobian(row, form, ts, ps, d, not hold)
    resid = y - times(x, coefficients_of(row, form))
    if hold:
        return x, resid, True
    n_tau = jac.shape[1] - x.shape[1]
    if n_tau > 0 and not well_determined(jac, w, n_tau):
        return x, resid, True
    return jac, resid, False
