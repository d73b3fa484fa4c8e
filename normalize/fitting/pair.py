"""Two balance temperatures at once: grid, exact alternating sweeps, then a look around.

The sum of squares over (τ_heating, τ_cooling) is not convex.  All pairs of a ½ °F grid are
computed from inner products; every local optimum of that grid starts an alternation of exact
one-sided sweeps; because alternation stalls in slanted valleys, each place it stops at is
searched with τ_cooling (and then τ_heating) set to every observed temperature nearby, the
other swept exactly; and inside the final cells the model is linear in its five coefficients,
so Newton steps in both temperatures finish the search (Hudson 1966, JASA 61:1097-1129, memory).
Measured against an exhaustive search in tests/fitting/test_twins.py and `make prove`.
"""

from __future__ import annotations

import numpy as np

from normalize.fitting.least_squares import orthonormal, residual, weighted_fit
from normalize.fitting.sweep import degree_days_per_day, sweep
from normalize.jit import kernel

GRID_F = 0.5  # coarse enough to be cheap, fine enough that no valley lies between its points
NEAR_F = 1.25  # how far around a stall the other temperature is stepped
MAX_STARTS = 8
MAX_ROUNDS = 30
SAME_F = 0.05  # two searches that end this close have found the same valley
LOOK_FROM = 2  # how many of the best valleys are searched around


@kernel
def _grid(lo, hi):
    count = int(np.floor((hi - lo) / GRID_F + 1e-9)) + 1
    taus = np.empty(count + 1)
    for i in range(count):
        taus[i] = lo + GRID_F * i
    if taus[count - 1] < hi:
        taus[count] = hi
        count += 1
    return taus[:count].copy()


@kernel
def _columns(ts, ps, d, z, root, taus):
    """Degree-days a day at each τ, z projected out, rows scaled by √w: (len(taus), n)."""
    n, k = z.shape
    out = np.empty((taus.shape[0], n))
    below = np.zeros(n)
    degrees = np.zeros(n)
    i = 0
    for g in range(taus.shape[0]):
        while i < ts.shape[0] and ts[i] < taus[g]:
            below[ps[i]] += 1.0
            degrees[ps[i]] += ts[i]
            i += 1
        for p in range(n):
            out[g, p] = (taus[g] * below[p] - degrees[p]) / d[p] * root[p]
        for j in range(k):
            dot = 0.0
            for p in range(n):
                dot += z[p, j] * root[p] * out[g, p]
            for p in range(n):
                out[g, p] -= dot * z[p, j] * root[p]
    return out


@kernel
def _gains(h, c, r, th, tc):
    """Explained sum of squares of every pair; −1 where a slope is not positive."""
    nh, n = h.shape
    nc = c.shape[0]
    ct = np.ascontiguousarray(c.T)
    scc = np.zeros(nc)
    scy = np.zeros(nc)
    for p in range(n):
        for j in range(nc):
            scc[j] += ct[p, j] * ct[p, j]
            scy[j] += ct[p, j] * r[p]
    gain = np.full((nh, nc), -1.0)
    shc = np.empty(nc)
    for i in range(nh):
        shh = 0.0
        shy = 0.0
        for j in range(nc):
            shc[j] = 0.0
        for p in range(n):
            x = h[i, p]
            shh += x * x
            shy += x * r[p]
            # Inner loop over j: independent sums, so the compiler may use wide registers.
            for j in range(nc):
                shc[j] += x * ct[p, j]
        for j in range(nc):
            if tc[j] < th[i]:
                continue
            det = shh * scc[j] - shc[j] * shc[j]
            if det <= 1e-9 * shh * scc[j]:
                continue
            b = (scc[j] * shy - shc[j] * scy[j]) / det
            cool = (shh * scy[j] - shc[j] * shy) / det
            if b > 0.0 and cool > 0.0:
                gain[i, j] = b * shy + cool * scy[j]
    return gain


@kernel
def _starts(gain):
    """Local optima of the grid, best first: (MAX_STARTS, 2) indices and how many."""
    nh, nc = gain.shape
    found = np.empty((MAX_STARTS, 2), dtype=np.int64)
    value = np.full(MAX_STARTS, -1.0)
    count = 0
    for i in range(nh):
        for j in range(nc):
            g = gain[i, j]
            if g <= 0.0:
                continue
            top = True
            for di in range(-1, 2):
                for dj in range(-1, 2):
                    ii = i + di
                    jj = j + dj
                    if 0 <= ii < nh and 0 <= jj < nc and gain[ii, jj] > g:
                        top = False
            if not top:
                continue
            at = min(count, MAX_STARTS - 1)
            if count == MAX_STARTS and value[at] >= g:
                continue
            while at > 0 and value[at - 1] < g:
                value[at] = value[at - 1]
                found[at, 0] = found[at - 1, 0]
                found[at, 1] = found[at - 1, 1]
                at -= 1
            value[at] = g
            found[at, 0] = i
            found[at, 1] = j
            count = min(count + 1, MAX_STARTS)
    return found, count


@kernel
def other_side(ts, ps, tn, pn, y, w, q, d, z, tau, heating_held, lo, hi, cold, mild):
    """With one temperature held, the exact best of the other: (explained in all, τ).

    heating_held : hold τ_heating and sweep τ_cooling in [lo, hi], or the reverse.  The result
    explains more than z alone by both columns together; −1 when none qualifies.
    """
    n, k = z.shape
    h = np.empty(n)
    if heating_held:
        degree_days_per_day(ts, ps, d, tau, h)
    else:
        degree_days_per_day(tn, pn, d, -tau, h)
    x = np.empty((n, k + 1))
    x[:, :k] = z
    x[:, k] = h
    zz = orthonormal(x, w)
    if zz.shape[1] <= k:
        return -1.0, np.nan
    r, s = residual(y, w, zz)
    if heating_held:
        gain, best, _, _, _ = sweep(tn, pn, r, q, d, zz, s[k], True, -hi, -lo, cold, mild)
        best = -best
    else:
        gain, best, _, _, _ = sweep(ts, ps, r, q, d, zz, s[k], True, lo, hi, cold, mild)
    if gain < 0.0:
        return -1.0, np.nan
    return gain + s[k] * s[k], best


@kernel
def _alternate(ts, ps, tn, pn, y, w, q, d, z, box, th, tc, gain, cold, mild):
    """Exact sweeps in turn until neither improves."""
    for _ in range(MAX_ROUNDS):
        before = gain
        g, x = other_side(
            ts, ps, tn, pn, y, w, q, d, z, th, True, max(box[2], th), box[3], cold, mild
        )
        if g > gain:
            gain = g
            tc = x
        g, x = other_side(
            ts, ps, tn, pn, y, w, q, d, z, tc, False, box[0], min(box[1], tc), cold, mild
        )
        if g > gain:
            gain = g
            th = x
        if gain <= before * (1.0 + 1e-13):
            break
    return gain, th, tc


@kernel
def _look_around(ts, ps, tn, pn, y, w, q, d, z, box, th, tc, gain, cold, mild):
    """Step one temperature over the observed ones nearby, sweep the other; then swap."""
    best = gain
    best_th = th
    best_tc = tc
    for i in range(ts.shape[0]):
        t = ts[i]
        if i > 0 and t <= ts[i - 1]:
            continue
        if abs(t - th) <= NEAR_F and box[0] <= t <= box[1]:
            g, x = other_side(
                ts, ps, tn, pn, y, w, q, d, z, t, True, max(box[2], t), box[3], cold, mild
            )
            if g > best:
                best = g
                best_th = t
                best_tc = x
        if abs(t - tc) <= NEAR_F and box[2] <= t <= box[3]:
            g, x = other_side(
                ts, ps, tn, pn, y, w, q, d, z, t, False, box[0], min(box[1], t), cold, mild
            )
            if g > best:
                best = g
                best_th = x
                best_tc = t
    return best, best_th, best_tc


@kernel
def cell_point(ts, ps, y, w, d, z, th, tc, box):
    """Where RSS would be stationary if both sets of days stayed as they are at (th, tc).

    There y = z·… + b·τh·n/d − b·S/d + … is linear in (…, b, bτh, c, cτc).  The point may lie
    outside its cell: it is a Newton step then.  (nan, nan) when a slope is not positive.
    """
    n, k = z.shape
    x = np.zeros((n, k + 4))
    x[:, :k] = z
    for i in range(ts.shape[0]):
        t = ts[i]
        p = ps[i]
        if t < th:
            x[p, k] -= t / d[p]
            x[p, k + 1] += 1.0 / d[p]
        if t > tc:
            x[p, k + 2] += t / d[p]
            x[p, k + 3] -= 1.0 / d[p]
    coef, _, _, ok = weighted_fit(x, y, w)
    if not ok or coef[k] <= 0.0 or coef[k + 2] <= 0.0:
        return np.nan, np.nan
    new_h = min(max(coef[k + 1] / coef[k], box[0]), box[1])
    new_c = min(max(coef[k + 3] / coef[k + 2], box[2]), box[3])
    return new_h, max(new_c, new_h)


@kernel
def _finish(ts, ps, tn, pn, y, r, w, d, z, box, gain, th, tc):
    """Newton steps in both temperatures at once, halved when one overshoots.

    Judged by residuals, not by explained sums: noise-free bills need every digit.
    """
    rss = rss_at(ts, ps, tn, pn, y, w, d, z, th, tc)
    for _ in range(MAX_ROUNDS):
        a, b = cell_point(ts, ps, y, w, d, z, th, tc, box)
        if np.isnan(a):
            break
        step_h = a - th
        step_c = b - tc
        moved = False
        for _ in range(6):
            lower = rss_at(ts, ps, tn, pn, y, w, d, z, th + step_h, tc + step_c)
            if lower < rss:
                rss = lower
                th += step_h
                tc += step_c
                moved = True
                break
            step_h *= 0.5
            step_c *= 0.5
        if not moved:
            break
    return max(gain, _sum_of_squares(r, w) - rss), th, tc


@kernel
def rss_at(ts, ps, tn, pn, y, w, d, z, th, tc):
    """Residual sum of squares at a given pair, from residuals; inf if a slope is not positive."""
    n, k = z.shape
    h = np.empty(n)
    x = np.empty((n, k + 2))
    x[:, :k] = z
    degree_days_per_day(ts, ps, d, th, h)
    x[:, k] = h
    degree_days_per_day(tn, pn, d, -tc, h)
    x[:, k + 1] = h
    coef, _, rss, ok = weighted_fit(x, y, w)
    if not ok or coef[k] <= 0.0 or coef[k + 1] <= 0.0:
        return np.inf
    return rss


@kernel
def _sum_of_squares(r, w):
    total = 0.0
    for p in range(r.shape[0]):
        total += w[p] * r[p] * r[p]
    return total


@kernel
def _diagonal(ts, ps, tn, pn, y, r0, w, q, d, z, box, cold, mild):
    """Best point with both temperatures equal, where alternation cannot go: one exact sweep."""
    n, k = z.shape
    lo = max(box[0], box[2])
    hi = min(box[1], box[3])
    if lo > hi:
        return -1.0, np.nan
    x = np.zeros((n, k + 1))
    x[:, :k] = z
    for i in range(ts.shape[0]):
        x[ps[i], k] += ts[i] / d[ps[i]]
    zz = orthonormal(x, w)
    if zz.shape[1] <= k:
        return -1.0, np.nan
    r, s = residual(y, w, zz)
    gain, tau, _, _, _ = sweep(ts, ps, r, q, d, zz, s[k], True, lo, hi, cold, mild)
    if gain < 0.0:
        return -1.0, np.nan
    return _sum_of_squares(r0, w) - rss_at(ts, ps, tn, pn, y, w, d, z, tau, tau), tau


@kernel
def _settled(ts, ps, tn, pn, y, r, w, q, d, z, box, cold, mild):
    """Where alternation stops from every start, best first: (MAX_STARTS + 1, 3), how many.

    Rows are (explained, τh, τc); starts that end in the same place count once.
    """
    th = _grid(box[0], box[1])
    tc = _grid(box[2], box[3])
    root = np.sqrt(w)
    h = _columns(ts, ps, d, z, root, th)
    c = _columns(tn, pn, d, z, root, -tc[::-1])[::-1]
    gains = _gains(h, c, r * root, th, tc)
    starts, count = _starts(gains)
    found = np.full((MAX_STARTS + 1, 3), -1.0)
    kept = 0
    for s in range(count + 1):
        if s < count:
            g, a, b = _alternate(
                ts, ps, tn, pn, y, w, q, d, z, box, th[starts[s, 0]], tc[starts[s, 1]],
                gains[starts[s, 0], starts[s, 1]], cold, mild,
            )  # fmt: skip
        else:
            g, a = _diagonal(ts, ps, tn, pn, y, r, w, q, d, z, box, cold, mild)
            b = a
        if g <= 0.0:
            continue
        known = False
        for i in range(kept):
            if abs(found[i, 1] - a) < SAME_F and abs(found[i, 2] - b) < SAME_F:
                known = True
        if known:
            continue
        at = kept
        while at > 0 and found[at - 1, 0] < g:
            found[at] = found[at - 1]
            at -= 1
        found[at, 0] = g
        found[at, 1] = a
        found[at, 2] = b
        kept += 1
    return found, kept


@kernel
def pair_search(ts, ps, tn, pn, y, r, w, q, d, z, box, cold, mild):
    """Best (τh, τc) with both slopes positive, τh ≤ τc: (explained, τh, τc).

    box : [τh lowest, highest, τc lowest, highest] as the one-sided sweeps allow.
    explained < 0 when no pair qualifies.
    """
    best = -1.0
    best_th = np.nan
    best_tc = np.nan
    found, count = _settled(ts, ps, tn, pn, y, r, w, q, d, z, box, cold, mild)
    for s in range(min(count, LOOK_FROM)):
        g, a, b = found[s]
        for _ in range(MAX_ROUNDS):
            before = g
            g, a, b = _look_around(ts, ps, tn, pn, y, w, q, d, z, box, a, b, g, cold, mild)
            g, a, b = _finish(ts, ps, tn, pn, y, r, w, d, z, box, g, a, b)
            if g <= before * (1.0 + 1e-13):
                break
        if g > best:
            best = g
            best_th = a
            best_tc = b
    return best, best_th, best_tc
