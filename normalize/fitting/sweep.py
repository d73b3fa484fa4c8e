"""The exact sweep: the globally best balance temperature in one pass over the days.

Between two neighbouring daily temperatures the days below τ do not change, so a period's
degree-days a day are (τ·n_p − S_p)/d_p: a straight line in τ.  The explained sum of squares
is then a ratio of quadratics with a single stationary point in the interval, and passing one
day changes one n_p and one S_p.  Sweeping the days in order of temperature therefore visits
every interval in O(1) and finds the optimum itself, not the best of a grid
(docs/method.md §2).

Conventions of every kernel here: temperatures are shifted by ``SHIFT_F`` (conditioning);
``ts``/``ps`` are the account's days in order of temperature and the period each belongs to;
cooling is heating on −T, so there is only one sweep.  ``r`` is use per day with the columns
of ``z`` taken out; ``z`` (n, k) is orthonormal under the weights w = q·d.
"""

from __future__ import annotations

import numpy as np

from normalize.jit import kernel

SHIFT_F = 60.0  # temperatures are summed about this
SINGULAR = 1e-9  # share of a column's own sum of squares that must survive projection


@kernel
def gather(order, temp, pid, ts, ps):
    """The account's days in order of temperature: fills ts, ps; returns how many.

    order : station days by temperature; pid : period of each station day, −1 for none.
    """
    k = 0
    for i in range(order.shape[0]):
        day = order[i]
        p = pid[day]
        # Written always, kept only if it belongs: no branch to mispredict.
        ts[k] = temp[day] - SHIFT_F
        ps[k] = p
        k += 1 if p >= 0 else 0
    return k


@kernel
def sweep(ts, ps, r, q, d, z, s_last, signed, lo, hi, min_cold, min_mild):
    """Best τ in [lo, hi]: (explained, τ, cell, first τ allowed, last τ allowed).

    explained < 0 when no τ qualifies.  With ``signed`` the last column of z is another
    slope, whose total coefficient (s_last before this regressor) must stay positive too.
    A τ qualifies with at least min_cold periods that have more than half their days below
    it and min_mild that have fewer than half.
    """
    n_days = ts.shape[0]
    n, k = z.shape
    below = np.zeros(n)
    degrees = np.zeros(n)
    az = np.zeros(k)
    bz = np.zeros(k)
    a = 0.0
    b = 0.0
    cc = 0.0
    dd = 0.0
    ee = 0.0
    cold = 0
    mild = n
    best = -1.0
    best_tau = np.nan
    best_cell = -1
    first = np.nan
    last = np.nan
    started = False
    for i in range(n_days):
        p = ps[i]
        t = ts[i]
        m = below[p]
        s = degrees[p]
        w = q[p] / d[p]
        cc += w * (2.0 * m + 1.0)
        dd += w * (s + (m + 1.0) * t)
        ee += w * t * (2.0 * s + t)
        a += q[p] * r[p]
        b += q[p] * t * r[p]
        for j in range(k):
            az[j] += q[p] * z[p, j]
            bz[j] += q[p] * t * z[p, j]
        below[p] = m + 1.0
        degrees[p] = s + t
        if 2.0 * m <= d[p] < 2.0 * (m + 1.0):
            cold += 1
        if 2.0 * m < d[p] <= 2.0 * (m + 1.0):
            mild -= 1
        if i + 1 == n_days or ts[i + 1] <= t or cold < min_cold or ts[i + 1] < lo:
            continue
        if mild < min_mild or t > hi:
            break
        c_lo = max(t, lo)
        c_hi = min(ts[i + 1], hi)
        c = cc
        dm = dd
        e = ee
        for j in range(k):
            c -= az[j] * az[j]
            dm -= az[j] * bz[j]
            e -= bz[j] * bz[j]
        last = c_hi
        # The upper knot, the lower one only for the first cell, and the stationary point.
        tau = c_hi
        for candidate in range(3):
            if candidate == 1:
                if started:
                    continue
                tau = c_lo
                first = c_lo
                started = True
            elif candidate == 2:
                num = b * dm - a * e
                den = b * c - a * dm
                if den < 0.0:
                    num = -num
                    den = -den
                if not (c_lo * den < num < c_hi * den):
                    continue
                tau = num / den
            g = tau * a - b
            shh = tau * (c * tau - 2.0 * dm) + e
            if g <= 0.0 or shh <= SINGULAR * (tau * (cc * tau - 2.0 * dd) + ee):
                continue
            gain = g * g / shh
            if gain <= best:
                continue
            if signed and s_last - (g / shh) * (tau * az[k - 1] - bz[k - 1]) <= 0.0:
                continue
            best = gain
            best_tau = tau
            best_cell = i
    return best, best_tau, best_cell, first, last


@kernel
def cell_optimum(ts, ps, r, q, d, z, cell, tau, lo, hi):
    """Best τ inside one cell, from fresh sums about τ: (rss, τ).

    The sweep's running sums lose digits; here they are formed anew close to the answer, and
    RSS is summed from residuals, so that noise-free bills return their parameters exactly.
    """
    n, k = z.shape
    below = np.zeros(n)
    degrees = np.zeros(n)
    for i in range(cell + 1):
        below[ps[i]] += 1.0
        degrees[ps[i]] += ts[i] - tau
    a = 0.0
    b = 0.0
    c = 0.0
    dm = 0.0
    e = 0.0
    for p in range(n):
        a += q[p] * below[p] * r[p]
        b += q[p] * degrees[p] * r[p]
        c += q[p] * below[p] * below[p] / d[p]
        dm += q[p] * below[p] * degrees[p] / d[p]
        e += q[p] * degrees[p] * degrees[p] / d[p]
    for j in range(k):
        aj = 0.0
        bj = 0.0
        for p in range(n):
            aj += q[p] * below[p] * z[p, j]
            bj += q[p] * degrees[p] * z[p, j]
        c -= aj * aj
        dm -= aj * bj
        e -= bj * bj
    den = b * c - a * dm
    step = 0.0
    if den != 0.0:
        step = (b * dm - a * e) / den
    c_lo = max(ts[cell], lo) - tau
    c_hi = min(ts[cell + 1], hi) - tau
    best = np.inf
    best_step = 0.0
    for candidate in range(3):
        x = c_lo if candidate == 0 else (c_hi if candidate == 1 else step)
        if not (c_lo <= x <= c_hi):
            continue
        rss = _rss_at(below, degrees, r, q, d, z, x)
        if rss < best:
            best = rss
            best_step = x
    return best, tau + best_step


@kernel
def _rss_at(below, degrees, r, q, d, z, x):
    """Residual sum of squares with h = (x·n − S)/d, z projected out; inf if not positive."""
    n, k = z.shape
    h = np.empty(n)
    for p in range(n):
        h[p] = (x * below[p] - degrees[p]) / d[p]
    for j in range(k):
        dot = 0.0
        for p in range(n):
            dot += q[p] * d[p] * z[p, j] * h[p]
        for p in range(n):
            h[p] -= dot * z[p, j]
    hr = 0.0
    hh = 0.0
    for p in range(n):
        hr += q[p] * d[p] * h[p] * r[p]
        hh += q[p] * d[p] * h[p] * h[p]
    if hr <= 0.0 or hh <= 0.0:
        return np.inf
    slope = hr / hh
    rss = 0.0
    for p in range(n):
        rss += q[p] * d[p] * (r[p] - slope * h[p]) ** 2
    return rss


@kernel
def polish(ts, ps, r, q, d, z, cell, tau, lo, hi):
    """The sweep's answer to the last digit: looks into its cell and both neighbours."""
    best, best_tau = cell_optimum(ts, ps, r, q, d, z, cell, tau, lo, hi)
    n_days = ts.shape[0]
    for direction in (-1, 1):
        j = cell + direction
        # Equal temperatures make empty cells: step over them.
        while 0 <= j < n_days - 1 and ts[j + 1] <= ts[j]:
            j += direction
        if j < 0 or j >= n_days - 1 or ts[j + 1] < lo or ts[j] > hi:
            continue
        rss, x = cell_optimum(ts, ps, r, q, d, z, j, tau, lo, hi)
        if rss < best:
            best = rss
            best_tau = x
    return best, best_tau


@kernel
def degree_days_per_day(ts, ps, d, tau, h):
    """Mean degree-days a day below τ in each period; fills h and returns nothing else."""
    for p in range(d.shape[0]):
        h[p] = 0.0
    for i in range(ts.shape[0]):
        if ts[i] >= tau:
            break
        h[ps[i]] += tau - ts[i]
    for p in range(d.shape[0]):
        h[p] /= d[p]


@kernel
def days_below(ts, ps, n, tau):
    """(n,) days below τ in each period."""
    count = np.zeros(n)
    for i in range(ts.shape[0]):
        if ts[i] >= tau:
            break
        count[ps[i]] += 1.0
    return count
