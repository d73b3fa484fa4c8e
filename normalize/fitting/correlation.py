"""Bills err together: the fit seen through every plausible serial correlation.

The fit is linearised at its solution, balance temperatures included; for each lag-1
correlation ρ on a grid the rows are whitened as a first-order autoregression that respects
gaps in time, and the restricted likelihood says how plausible that ρ is
(docs/method.md §5).
"""

from __future__ import annotations

import numpy as np

from normalize.defaults import RHO_HIGH, RHO_LOW, RHO_POINTS
from normalize.fitting.forms import COOLING, HEATING, LINE, TWO_SLOPES
from normalize.fitting.least_squares import weighted_fit
from normalize.fitting.sweep import days_below
from normalize.jit import kernel

RHO = np.round(np.linspace(RHO_LOW, RHO_HIGH, RHO_POINTS), 10)
RHO_ZERO = int(np.argmin(np.abs(RHO)))  # index of ρ = 0
WEAK = 1e-5  # a τ column that keeps less than this of its length cannot be told from the rest


@kernel
def jacobian(form, x, ts, ps, tn, pn, d, slope_h, slope_c, tau_h, tau_c, with_tau):
    """Derivatives of use per day by every parameter, balance temperatures last."""
    n, k = x.shape
    heating = form == HEATING or form >= TWO_SLOPES
    cooling = form == COOLING or form >= TWO_SLOPES
    extra = 0
    if with_tau and form > LINE:
        extra = 2 if form > TWO_SLOPES else 1
    out = np.empty((n, k + extra))
    out[:, :k] = x
    if extra == 0:
        return out
    column = np.zeros(n)
    at = k
    if heating:
        column = slope_h * days_below(ts, ps, n, tau_h) / d
        if form != TWO_SLOPES:
            out[:, at] = column
            at += 1
    if cooling:
        above = days_below(tn, pn, n, -tau_c)
        if form == TWO_SLOPES:
            out[:, at] = column - slope_c * above / d
        else:
            out[:, at] = -slope_c * above / d
    return out


@kernel
def positions(start, end):
    """(n,) places in the sequence of bills, gaps counted in median period lengths."""
    n = start.shape[0]
    length = np.empty(n)
    for p in range(n):
        length[p] = end[p] - start[p]
    typical = np.median(length)
    place = np.zeros(n)
    for p in range(1, n):
        gap = (start[p] - end[p - 1]) / typical
        place[p] = place[p - 1] + 1.0 + np.floor(gap + 0.5)
    return place


@kernel
def signed_power(rho, steps):
    """ρ to the power of whole steps ≥ 1."""
    size = abs(rho) ** steps
    if rho < 0.0 and steps % 2.0 == 1.0:
        return -size
    return size


@kernel
def whiten(rows, place, rho):
    """Rows made independent under AR(1) at ρ; returns them and ½·log of the scalings."""
    n, k = rows.shape
    out = np.empty((n, k))
    left = 1.0 - rho * rho
    log_scale = 0.5 * np.log(left)
    first = np.sqrt(left)
    for j in range(k):
        out[0, j] = rows[0, j] * first
    for i in range(1, n):
        steps = place[i] - place[i - 1]
        phi = rho
        scale = 1.0
        if steps > 1.0:
            phi = signed_power(rho, steps)
            ratio = left / (1.0 - phi * phi)
            scale = np.sqrt(ratio)
            log_scale += 0.5 * np.log(ratio)
        for j in range(k):
            out[i, j] = (rows[i, j] - phi * rows[i - 1, j]) * scale
    return out, log_scale


@kernel
def well_determined(jac, w, n_tau):
    """Whether the τ columns (the last n_tau) stand clear of all others."""
    n, k = jac.shape
    for c in range(k - n_tau, k):
        x = np.empty((n, k - 1))
        at = 0
        for j in range(k):
            if j != c:
                x[:, at] = jac[:, j]
                at += 1
        y = jac[:, c].copy()
        length = 0.0
        for p in range(n):
            length += w[p] * y[p] * y[p]
        _, _, rss, ok = weighted_fit(x, y, w)
        if not ok or not rss > WEAK * length:
            return False
    return True


@kernel
def through_rho(jac, resid, w, place, targets):
    """At every ρ: (log-likelihood, shift of each target, its scale², innovation variance).

    jac (n, k), resid (n,) residuals of use per day, w (n,) weights, targets (m, k)
    gradients.  shift (27, m) is added to the least-squares value; scale2 (27, m) is
    g'(J'V⁻¹J)⁻¹g times the innovation variance.
    """
    n, k = jac.shape
    m = targets.shape[0]
    rows = np.empty((n, k + 1))
    mean = 0.0
    for p in range(n):
        mean += w[p]
    mean /= n
    for p in range(n):
        root = np.sqrt(w[p] / mean)
        for j in range(k):
            rows[p, j] = jac[p, j] * root
        rows[p, k] = resid[p] * root
    one = np.ones(n)
    like = np.full(RHO.shape[0], -np.inf)
    shift = np.zeros((RHO.shape[0], m))
    scale2 = np.zeros((RHO.shape[0], m))
    innovation = np.zeros(RHO.shape[0])
    floor = 1e-300  # bills without any noise: no logarithm of zero
    for i in range(RHO.shape[0]):
        white, log_scale = whiten(rows, place, RHO[i])
        x = np.ascontiguousarray(white[:, :k])
        y = np.ascontiguousarray(white[:, k])
        coef, cov, rss, ok = weighted_fit(x, y, one)
        if not ok:
            continue
        s = max(rss, floor)
        innovation[i] = s / (n - k)
        like[i] = log_scale + 0.5 * _log_det(cov) - 0.5 * (n - k) * np.log(s)
        for t in range(m):
            for j in range(k):
                shift[i, t] += targets[t, j] * coef[j]
                for q in range(k):
                    scale2[i, t] += targets[t, j] * cov[j, q] * targets[t, q]
            scale2[i, t] *= innovation[i]
    return like, shift, scale2, innovation


@kernel
def _log_det(a):
    """Logarithm of the determinant of a small positive definite matrix (Cholesky)."""
    k = a.shape[0]
    c = a.copy()
    total = 0.0
    for j in range(k):
        for i in range(j):
            c[j, j] -= c[j, i] * c[j, i]
        if not c[j, j] > 0.0:
            return -np.inf
        total += np.log(c[j, j])
        c[j, j] = np.sqrt(c[j, j])
        for r in range(j + 1, k):
            for i in range(j):
                c[r, j] -= c[r, i] * c[j, i]
            c[r, j] /= c[j, j]
    return total


@kernel
def weights_of(like):
    """Posterior weights of the grid under a flat prior; all on ρ = 0 where nothing is plausible."""
    top = like.max()
    out = np.zeros(like.shape[0])
    if not top > -np.inf:
        out[RHO_ZERO] = 1.0
        return out
    total = 0.0
    for i in range(like.shape[0]):
        out[i] = np.exp(like[i] - top)
        total += out[i]
    for i in range(like.shape[0]):
        out[i] /= total
    return out
