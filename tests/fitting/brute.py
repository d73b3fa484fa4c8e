"""Slow, obvious twins of the compiled fit: exhaustive searches in plain numpy.

They share no code with the program.  The constraints are those of docs/method.md §2: slopes
positive; at least 3 periods with more than half their days on the slope's side of τ and 2
with fewer; heating 40-80 °F, cooling 50-85 °F; τ within the observed days.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from tests.fitting.accounts import Account, days_of

Vector = NDArray[np.float64]


def allowed(a: Account, low: float, high: float) -> tuple[float, float]:
    """Where τ of a heating slope may lie, from order statistics of each period's days."""
    more, fewer = [], []
    for t in days_of(a):
        s = np.sort(t)
        d = len(s)
        more.append(s[d // 2])  # τ at or above this: more than half the days at or below it
        fewer.append(s[-(-d // 2) - 1])  # τ at or below this: fewer than half below it
    temps = np.concatenate(days_of(a))
    first = max(np.sort(more)[2], low, temps.min())
    last = min(np.sort(fewer)[::-1][1], high, temps.max())
    return float(first), float(last)


def allowed_cooling(a: Account, low: float, high: float) -> tuple[float, float]:
    mirrored = Account(a.start, a.end, a.use, -a.temp)
    first, last = allowed(mirrored, -high, -low)
    return -last, -first


def heating_columns(a: Account, taus: Vector) -> Vector:
    """(len(taus), n) degree-days a day."""
    return np.stack([np.maximum(taus[:, None] - t, 0).mean(1) for t in days_of(a)], axis=1)


def one_tau_rss(a: Account, taus: Vector) -> Vector:
    """Weighted RSS of a heating form at each τ; inf where the slope is not positive."""
    d = (a.end - a.start).astype(float)
    y = a.use / d
    h = heating_columns(a, taus)
    ybar = (d * y).sum() / d.sum()
    hbar = (h * d).sum(1) / d.sum()
    hh = ((h - hbar[:, None]) ** 2 * d).sum(1)
    hy = ((h - hbar[:, None]) * (y - ybar) * d).sum(1)
    slope = hy / np.where(hh > 0, hh, np.nan)
    rss = ((y - ybar - slope[:, None] * (h - hbar[:, None])) ** 2 * d).sum(1)
    return np.where(slope > 0, rss, np.inf)


class Cells:
    """All intervals between neighbouring observed temperatures within [first, last]."""

    def __init__(self, a: Account, first: float, last: float, *, below: bool) -> None:
        temps = np.unique(np.concatenate(days_of(a)))
        inner = temps[(temps > first) & (temps < last)]
        self.knots = np.concatenate([[first], inner, [last]])
        middle = 0.5 * (self.knots[1:] + self.knots[:-1])
        count, total = [], []
        for t in days_of(a):
            s = np.sort(t)
            cum = np.concatenate([[0.0], np.cumsum(s)])
            k = np.searchsorted(s, middle)
            count.append(k / len(s) if below else (len(s) - k) / len(s))
            total.append(cum[k] / len(s) if below else (cum[-1] - cum[k]) / len(s))
        sign = 1.0 if below else -1.0
        self.n = sign * np.array(count).T  # column = τ·n − s inside the cell
        self.s = sign * np.array(total).T
        cells = len(middle)
        where = np.minimum(np.arange(cells + 1), cells - 1)
        self.at_knots = self.knots[:, None] * self.n[where] - self.s[where]


def _evaluate(h: Vector, c: Vector, y: Vector, d: Vector) -> Vector:
    """RSS of y on 1, h, c for rows of h and c together; inf unless both slopes > 0."""
    w = d / d.sum()
    h = h - (h * w).sum(-1, keepdims=True)
    c = c - (c * w).sum(-1, keepdims=True)
    y = y - (y * w).sum()
    hh, cc, hc = (h * h * d).sum(-1), (c * c * d).sum(-1), (h * c * d).sum(-1)
    hy, cy = (h * y * d).sum(-1), (c * y * d).sum(-1)
    det = hh * cc - hc * hc
    with np.errstate(all="ignore"):
        b = (cc * hy - hc * cy) / det
        k = (hh * cy - hc * hy) / det
        rss = ((y - b[..., None] * h - k[..., None] * c) ** 2 * d).sum(-1)
    ok = (b > 0) & (k > 0) & (det > 1e-10 * hh * cc)
    return np.where(ok, rss, np.inf)


def _edge(held: Vector, moving: Cells, y: Vector, d: Vector, lo: float, hi: float) -> float:
    """Least RSS with one column held and the other's τ at the stationary point of a cell."""
    w = np.sqrt(d)
    z = np.column_stack([np.ones_like(d), held]) * w[:, None]
    q, r = np.linalg.qr(z)
    if abs(r[1, 1]) < 1e-9:
        return np.inf
    project = np.eye(len(d)) - q @ q.T
    yy = project @ (y * w)
    n = (moving.n * w) @ project
    s = (moving.s * w) @ project
    a, b = n @ yy, s @ yy
    cc, dd, ee = (n * n).sum(1), (n * s).sum(1), (s * s).sum(1)
    with np.errstate(all="ignore"):
        tau = (b * dd - a * ee) / (b * cc - a * dd)
    left, right = np.maximum(moving.knots[:-1], lo), np.minimum(moving.knots[1:], hi)
    inside = (tau > left) & (tau < right)
    if not inside.any():
        return np.inf
    column = tau[inside, None] * moving.n[inside] - moving.s[inside]
    return float(_evaluate(np.broadcast_to(held, column.shape), column, y, d).min())


def _corners(hot: Cells, cold: Cells, y: Vector, d: Vector) -> float:
    best = np.inf
    for i, tau in enumerate(hot.knots):
        later = cold.knots >= tau
        if later.any():
            c = cold.at_knots[later]
            best = min(best, _evaluate(np.broadcast_to(hot.at_knots[i], c.shape), c, y, d).min())
    return float(best)


def _interiors(hot: Cells, cold: Cells, y: Vector, d: Vector) -> float:
    """Stationary points of pairs of cells, where the model is linear in five coefficients."""
    w = d / d.sum()
    yc = (y - (y * w).sum()) * np.sqrt(d)

    def centred(x: Vector) -> Vector:
        return (x - (x * w).sum(-1, keepdims=True)) * np.sqrt(d)

    hn, hs, cn, cs = centred(hot.n), centred(hot.s), centred(cold.n), centred(cold.s)
    best = np.inf
    for i in range(hn.shape[0]):
        keep = cold.knots[1:] >= hot.knots[i]
        if not keep.any():
            continue
        x = np.empty((int(keep.sum()), 4, len(d)))
        x[:, 0], x[:, 1], x[:, 2], x[:, 3] = hn[i], -hs[i], cn[keep], -cs[keep]
        gram = x @ x.transpose(0, 2, 1)
        scale = np.sqrt(np.maximum(np.diagonal(gram, axis1=1, axis2=2), 1e-300))
        gram = gram / scale[:, :, None] / scale[:, None, :]
        right = (x @ yc) / scale
        good = np.linalg.det(gram) > 1e-13  # unit diagonal: the product of what each adds
        if not good.any():
            continue
        coef = np.linalg.solve(gram[good], right[good][..., None])[..., 0] / scale[good]
        with np.errstate(all="ignore"):
            th, tc = coef[:, 0] / coef[:, 1], coef[:, 2] / coef[:, 3]
        cells = np.flatnonzero(keep)[good]
        ok = (coef[:, 1] > 0) & (coef[:, 3] > 0) & (th <= tc)
        ok &= (th >= hot.knots[i]) & (th <= hot.knots[i + 1])
        ok &= (tc >= cold.knots[cells]) & (tc <= cold.knots[cells + 1])
        for j in np.flatnonzero(ok):
            h = th[j] * hot.n[i] - hot.s[i]
            c = tc[j] * cold.n[cells[j]] - cold.s[cells[j]]
            best = min(best, float(_evaluate(h[None], c[None], y, d)[0]))
    return best


def two_tau_rss(a: Account) -> float:
    """Least RSS over every pair of cells, their edges, their corners and the diagonal."""
    d = (a.end - a.start).astype(float)
    y = a.use / d
    h_lo, h_hi = allowed(a, 40.0, 80.0)
    c_lo, c_hi = allowed_cooling(a, 50.0, 85.0)
    if not (h_lo < h_hi and c_lo < c_hi):
        return np.inf
    hot = Cells(a, h_lo, h_hi, below=True)
    cold = Cells(a, c_lo, c_hi, below=False)
    best = min(_corners(hot, cold, y, d), _interiors(hot, cold, y, d))
    for i, tau in enumerate(hot.knots):
        best = min(best, _edge(hot.at_knots[i], cold, y, d, max(c_lo, tau), c_hi))
    for j, tau in enumerate(cold.knots):
        best = min(best, _edge(cold.at_knots[j], hot, y, d, h_lo, min(h_hi, tau)))
    lo, hi = max(h_lo, c_lo), min(h_hi, c_hi)
    if lo < hi:
        mean = np.array([t.mean() for t in days_of(a)])
        fine = np.unique(np.concatenate([np.arange(lo, hi, 0.01), hot.knots]))
        fine = fine[(fine >= lo) & (fine <= hi)]
        h = heating_columns(a, fine)
        best = min(best, float(_evaluate(h, h + mean - fine[:, None], y, d).min()))
    return best


def one_slope_rss(a: Account) -> float:
    """Least RSS of heating alone and cooling alone, on a 0.01 °F grid and all knots."""
    best = np.inf
    mirrored = Account(a.start, a.end, a.use, -a.temp)
    for side, (low, high) in ((a, (40.0, 80.0)), (mirrored, (-85.0, -50.0))):
        lo, hi = allowed(side, low, high)
        if lo < hi:
            best = min(best, float(one_tau_rss(side, np.arange(lo, hi, 0.01)).min()))
    return best
