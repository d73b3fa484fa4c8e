"""How a period's error grows with its use, integrated over together with its correlation.

A big bill may err by more than a small one.  Nobody knows how much more, so two ways are
weighed by their restricted likelihood: errors of a day alike at any use, and in proportion to
it (docs/method.md §5).
"""

from __future__ import annotations

import numpy as np

from normalize.fitting.blocks import block_of, in_blocks
from normalize.fitting.correlation import signed_power, through_rho
from normalize.fitting.rho import RHO, RHO_ZERO
from normalize.jit import kernel

POWERS = np.array([0.0, 1.0])  # of the fitted use, in the error's standard deviation
LEAST_LEVEL = 0.1  # of mean use: no period is taken to err by less than one of this use


@kernel
def columns_of(rows, first, last):
    """(n, last − first) columns of a matrix, contiguous."""
    out = np.empty((rows.shape[0], last - first))
    for p in range(rows.shape[0]):
        for j in range(first, last):
            out[p, j - first] = rows[p, j]
    return out


@kernel
def levels(fitted, mean):
    """(n,) fitted use against its mean, not below the least level; 1 where there is no mean."""
    out = np.ones(fitted.shape[0])
    if mean > 0.0:
        for p in range(fitted.shape[0]):
            out[p] = max(fitted[p] / mean, LEAST_LEVEL)
    return out


@kernel
def sum_noise(error, place, rho):
    """Variance of summed AR(1) errors, error (n,) each one's size, in innovation variances."""
    total = 0.0
    carried = 0.0
    for p in range(error.shape[0]):
        if p > 0:
            steps = place[p] - place[p - 1]
            carried *= rho if steps == 1.0 else signed_power(rho, steps)
        total += error[p] * error[p] + 2.0 * error[p] * carried
        carried += error[p]
    return total / (1.0 - rho * rho)


@kernel
def rows_of(columns, d, w, start, end):
    """Rows that err as AR(1): (means of columns, days, weights, places), daily data in blocks."""
    which, place = block_of(start, end)
    count = place.shape[0]
    if count == d.shape[0]:
        return columns, d, w, place
    means, days = in_blocks(columns, d, which, count)
    weight = np.zeros(count)
    for p in range(d.shape[0]):
        weight[which[p]] += w[p]
    return means, days, weight, place


@kernel
def _weights_at(w, level, power):
    """(weights, their mean, ½ Σ log of their ratio to it) when errors grow with use."""
    out = w.copy()
    if power > 0.0:
        for p in range(w.shape[0]):
            out[p] = w[p] / level[p] ** (2.0 * power)
    mean = out.sum() / out.shape[0]
    log_scale = 0.0
    for p in range(w.shape[0]):
        log_scale += 0.5 * np.log(out[p] / mean)
    return out, mean, log_scale


@kernel
def through_errors(jac, resid, fitted, side, targets, rep, rep_fitted):
    """Evidence at every ρ, over the ways errors may grow: (like, shift, scale2, plain2).

    jac (n, k), resid, fitted (n,) of a side's periods; targets (t, k) gradients; rep,
    rep_fitted : reporting periods and their fitted use, whose own noise is added to the second
    target, or none.  side, rep : (ts, ps, y, d, w, start, end).
    shift, scale2 (27, t) as in ``through_rho``; plain2 (t,) the scale² with ρ = 0 and errors
    alike at any use.
    """
    _, _, _, d, w, s, e = side
    _, _, _, d2, w2, s2, e2 = rep
    n, k = jac.shape
    columns = np.empty((n, k + 2))
    for p in range(n):
        for j in range(k):
            columns[p, j] = jac[p, j]
        columns[p, k] = resid[p]
        columns[p, k + 1] = fitted[p]
    rows, days, weight, place = rows_of(columns, d, w, s, e)
    x = columns_of(rows, 0, k)
    y = columns_of(rows, k, k + 1).ravel()
    used = columns_of(rows, k + 1, k + 2).ravel()
    mean_use = (used * days).sum() / days.sum()
    level = levels(used, mean_use)
    has_rep = d2.shape[0] > 0
    rep_rows = rep_fitted.copy().reshape(d2.shape[0], 1)
    length, rep_weight, rep_place = d2, w2, d2
    if has_rep:
        rep_rows, length, rep_weight, rep_place = rows_of(rep_rows, d2, w2, s2, e2)
    rep_level = levels(rep_rows.ravel(), mean_use)
    m = POWERS.shape[0]
    like = np.empty((m, RHO.shape[0]))
    shift = np.empty((m, RHO.shape[0], targets.shape[0]))
    scale2 = np.empty((m, RHO.shape[0], targets.shape[0]))
    error = np.empty(length.shape[0])
    for i in range(m):
        own, mean, log_scale = _weights_at(weight, level, POWERS[i])
        found, moved, spread, innovation = through_rho(x, y, own, place, targets)
        for r in range(RHO.shape[0]):
            like[i, r] = found[r] + log_scale
            for t in range(targets.shape[0]):
                shift[i, r, t] = moved[r, t]
                scale2[i, r, t] = spread[r, t]
        if has_rep:
            for p in range(length.shape[0]):
                root = np.sqrt(mean / rep_weight[p])
                error[p] = length[p] * root * rep_level[p] ** POWERS[i]
            for r in range(RHO.shape[0]):
                scale2[i, r, 1] += innovation[r] * sum_noise(error, rep_place, RHO[r])
    plain2 = scale2[0, RHO_ZERO].copy()
    out_like, out_shift, out_scale2 = mixed(like, shift, scale2)
    return out_like, out_shift, out_scale2, plain2


@kernel
def mixed(like, centre, scale2):
    """Several ways (m, 27) made one: log-likelihoods added, centres and spreads averaged.

    centre, scale2 (m, 27, 2).  The spread between the centres is part of the result's.
    """
    m, n_rho, n_targets = centre.shape
    out_like = np.full(n_rho, -np.inf)
    out_centre = np.zeros((n_rho, n_targets))
    out_scale2 = np.zeros((n_rho, n_targets))
    top = like.max()
    if not top > -np.inf:
        return out_like, centre[0].copy(), scale2[0].copy()
    weight = np.empty(m)
    for r in range(n_rho):
        total = 0.0
        for i in range(m):
            weight[i] = np.exp(like[i, r] - top)
            total += weight[i]
        if not total > 0.0:
            continue
        out_like[r] = top + np.log(total)
        for t in range(n_targets):
            for i in range(m):
                out_centre[r, t] += weight[i] * centre[i, r, t] / total
            for i in range(m):
                apart = centre[i, r, t] - out_centre[r, t]
                out_scale2[r, t] += weight[i] * (scale2[i, r, t] + apart * apart) / total
    return out_like, out_centre, out_scale2
