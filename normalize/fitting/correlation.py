"""Bills err together: the fit seen through every plausible serial correlation.

The fit is linearised at its solution, balance temperatures included; for each lag-1
correlation ρ on a grid the rows are whitened as a first-order autoregression that respects
gaps in time, and the restricted likelihood says how plausible that ρ is
(docs/method.md §5).
"""

from __future__ import annotations

import numpy as np

from normalize.fitting.forms import COOLING, HEATING, LINE, TWO_SLOPES
from normalize.fitting.least_squares import RANK, weighted_fit
from normalize.fitting.rho import RHO, RHO_ZERO
from normalize.fitting.sweep import days_below
from normalize.jit import kernel

WEAK = 1e-5  # a τ column that keeps less than this of its length cannot be told from the rest
FLOOR = 1e-300  # bills without any noise: no logarithm of zero


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
    for p in range(n):
        for j in range(k):
            out[p, j] = x[p, j]
    if extra == 0:
        return out
    column = np.zeros(n)
    at = k
    if heating:
        column = slope_h * days_below(ts, ps, n, tau_h) / d
        if form != TWO_SLOPES:
            for p in range(n):
                out[p, at] = column[p]
            at += 1
    if cooling:
        above = days_below(tn, pn, n, -tau_c)
        for p in range(n):
            out[p, at] = -slope_c * above[p] / d[p]
            if form == TWO_SLOPES:
                out[p, at] += column[p]
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
def _upright(jac, resid, w):
    """Rows scaled by √(w/w̄), columns made orthonormal: (rows, R, length of the residual, ok).

    rows (n, k+1): Q with J = QR, and the residual at length 1, so that sums of products are
    well conditioned whatever the units.
    """
    n, k = jac.shape
    v = np.empty((n, k + 1))
    r = np.zeros((k, k))
    mean = w.sum() / n
    length = 0.0
    for p in range(n):
        root = np.sqrt(w[p] / mean)
        for j in range(k):
            v[p, j] = jac[p, j] * root
        v[p, k] = resid[p] * root
        length += v[p, k] * v[p, k]
    length = np.sqrt(length)
    for j in range(k):
        before = 0.0
        for p in range(n):
            before += v[p, j] * v[p, j]
        for _ in range(2):
            for i in range(j):
                dot = 0.0
                for p in range(n):
                    dot += v[p, i] * v[p, j]
                r[i, j] += dot
                for p in range(n):
                    v[p, j] -= dot * v[p, i]
        left = 0.0
        for p in range(n):
            left += v[p, j] * v[p, j]
        if not left > RANK * RANK * before:
            return v, r, length, False
        r[j, j] = np.sqrt(left)
        for p in range(n):
            v[p, j] /= r[j, j]
    if length > 0.0:
        for p in range(n):
            v[p, k] /= length
    return v, r, length, True


@kernel
def _products(v, place):
    """Sums of products from which X'V⁻¹X at any ρ follows: (a, b, c, rows after a gap).

    Without gaps (1−ρ²)·X'V⁻¹X = a − ρ·b + ρ²·c, since each row stands against the one before.
    """
    n, k = v.shape
    a = np.zeros((k, k))
    b = np.zeros((k, k))
    c = np.zeros((k, k))
    gaps = np.empty(n, dtype=np.int64)
    count = 0
    for p in range(n):
        if p > 0 and place[p] - place[p - 1] > 1.0:
            gaps[count] = p
            count += 1
            continue
        for i in range(k):
            for j in range(i + 1):
                a[i, j] += v[p, i] * v[p, j]
                if p == 0:
                    c[i, j] -= v[p, i] * v[p, j]
                else:
                    b[i, j] += v[p, i] * v[p - 1, j] + v[p - 1, i] * v[p, j]
                    c[i, j] += v[p - 1, i] * v[p - 1, j]
    return a, b, c, gaps[:count]


@kernel
def _at_rho(v, place, products, rho, out):
    """Lower triangle of (1−ρ²)·X'V⁻¹X into ``out``; returns ½·log of the scalings."""
    a, b, c, gaps = products
    k = v.shape[1]
    for i in range(k):
        for j in range(i + 1):
            out[i, j] = a[i, j] - rho * b[i, j] + rho * rho * c[i, j]
    left = 1.0 - rho * rho
    log_scale = 0.5 * np.log(left)
    for g in range(gaps.shape[0]):
        p = gaps[g]
        phi = signed_power(rho, place[p] - place[p - 1])
        ratio = left / (1.0 - phi * phi)
        log_scale += 0.5 * np.log(ratio)
        for i in range(k):
            u = v[p, i] - phi * v[p - 1, i]
            for j in range(i + 1):
                out[i, j] += ratio * u * (v[p, j] - phi * v[p - 1, j])
    return log_scale


@kernel
def _cholesky(m, k):
    """Lower factor of the leading k×k, in place; the rows below follow.  False if singular."""
    rows = m.shape[0]
    for j in range(k):
        total = m[j, j]
        for i in range(j):
            total -= m[j, i] * m[j, i]
        if not total > 0.0:
            return False
        m[j, j] = np.sqrt(total)
        for r in range(j + 1, rows):
            total = m[r, j]
            for i in range(j):
                total -= m[r, i] * m[j, i]
            m[r, j] = total / m[j, j]
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
    like = np.full(RHO.shape[0], -np.inf)
    shift = np.zeros((RHO.shape[0], m))
    scale2 = np.zeros((RHO.shape[0], m))
    innovation = np.zeros(RHO.shape[0])
    v, r, length, ok = _upright(jac, resid, w)
    if not ok:
        return like, shift, scale2, innovation
    # Gradients in the orthonormal coordinates: u = R⁻ᵀ g.
    u = np.zeros((m, k))
    for t in range(m):
        for j in range(k):
            total = targets[t, j]
            for i in range(j):
                total -= r[i, j] * u[t, i]
            u[t, j] = total / r[j, j]
    log_r = 0.0
    for j in range(k):
        log_r += np.log(r[j, j])
    products = _products(v, place)
    low = np.empty((k + 1, k + 1))
    z = np.empty(k)
    for at in range(RHO.shape[0]):
        log_scale = _at_rho(v, place, products, RHO[at], low)
        if not _cholesky(low, k):
            continue
        rss = low[k, k]
        half_log = 0.0
        for j in range(k):
            rss -= low[k, j] * low[k, j]
            half_log += np.log(low[j, j])
        s = max(rss * length * length, FLOOR)
        innovation[at] = s / (n - k)
        like[at] = log_scale - half_log - log_r - 0.5 * (n - k) * np.log(s)
        for t in range(m):
            square = 0.0
            dot = 0.0
            for j in range(k):
                total = u[t, j]
                for i in range(j):
                    total -= low[j, i] * z[i]
                z[j] = total / low[j, j]
                square += z[j] * z[j]
                dot += z[j] * low[k, j]
            shift[at, t] = dot * length
            scale2[at, t] = square * innovation[at]
    return like, shift, scale2, innovation


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
