"""Quantiles of mixtures of t, and of differences of two t, without random draws.

The difference of two t variables has no closed form and a single Welch t is too narrow, so
one is integrated against the other by a 32-node Gauss-Legendre rule, mixed over ρ, and the
quantile found by bracketing (docs/method.md §5).
"""

from __future__ import annotations

import numpy as np

from normalize.fitting.student import WEIGHTS, t_cdf, t_nodes
from normalize.jit import kernel

NEGLIGIBLE = 1e-7  # weight of a ρ, as a share of the largest, below which it is left out
EXACT = 1e-10  # of the spread: how exactly a quantile is found


@kernel
def _mixed_cdf(x, weight, centre, scale, df, centre2, scale2, df2, nodes, two):
    """P(X ≤ x), X = t of df, or the difference of t of df and t of df2 (two)."""
    total = 0.0
    top = weight.max() * NEGLIGIBLE
    for i in range(weight.shape[0]):
        if weight[i] <= top:
            continue
        if not two:
            total += weight[i] * _step_cdf(x - centre[i], scale[i], df)
            continue
        wide = scale[i]
        narrow = scale2[i]
        wide_df = df
        # The narrower one is integrated over, so that the wider one's curve is smooth there.
        if narrow > wide:
            wide, narrow = narrow, wide
            wide_df = df2
        side = 1 if scale2[i] > scale[i] else 0
        inner = 0.0
        at = x - (centre[i] - centre2[i])
        for q in range(WEIGHTS.shape[0]):
            inner += WEIGHTS[q] * _step_cdf(at + narrow * nodes[side, q], wide, wide_df)
        total += weight[i] * inner
    return total


@kernel
def _step_cdf(x, scale, df):
    if scale > 0.0:
        return t_cdf(x / scale, df)
    if x == 0.0:
        return 0.5
    return 1.0 if x > 0.0 else 0.0


@kernel
def _find(u, weight, centre, scale, df, centre2, scale2, df2, nodes, two, lo, hi):
    """The quantile u by regula falsi (Illinois), bracket [lo, hi] widened as needed."""
    spread = hi - lo
    if not spread > 0.0:
        return lo
    f_lo = _mixed_cdf(lo, weight, centre, scale, df, centre2, scale2, df2, nodes, two) - u
    f_hi = _mixed_cdf(hi, weight, centre, scale, df, centre2, scale2, df2, nodes, two) - u
    for _ in range(60):
        if f_lo <= 0.0:
            break
        lo -= spread
        spread *= 2.0
        f_lo = _mixed_cdf(lo, weight, centre, scale, df, centre2, scale2, df2, nodes, two) - u
    spread = hi - lo
    for _ in range(60):
        if f_hi >= 0.0:
            break
        hi += spread
        spread *= 2.0
        f_hi = _mixed_cdf(hi, weight, centre, scale, df, centre2, scale2, df2, nodes, two) - u
    tolerance = EXACT * (hi - lo)
    x = 0.5 * (lo + hi)
    kept = 0
    for _ in range(200):
        if hi - lo <= tolerance:
            break
        x = lo - f_lo * (hi - lo) / (f_hi - f_lo)
        if not (lo < x < hi):
            x = 0.5 * (lo + hi)
        f = _mixed_cdf(x, weight, centre, scale, df, centre2, scale2, df2, nodes, two) - u
        if abs(f) <= 1e-12:
            break
        if f > 0.0:
            hi = x
            f_hi = f
            if kept == 1:
                f_lo *= 0.5
            kept = 1
        else:
            lo = x
            f_lo = f
            if kept == -1:
                f_hi *= 0.5
            kept = -1
    return x


@kernel
def mixture_range(weight, centre, scale, df, confidence):
    """Two-sided range of a mixture over ρ of t with df: (low, high)."""
    none = np.zeros((2, WEIGHTS.shape[0]))
    tail = 0.5 * (1.0 - confidence)
    lo, hi = _bracket(weight, centre, scale)
    low = _find(tail, weight, centre, scale, df, centre, scale, df, none, False, lo, hi)
    high = _find(1.0 - tail, weight, centre, scale, df, centre, scale, df, none, False, lo, hi)
    return low, high


@kernel
def difference_range(weight, centre, scale, df, centre2, scale2, df2, confidence):
    """Two-sided range of the difference of two t, mixed over a shared ρ: (low, high)."""
    nodes = np.empty((2, WEIGHTS.shape[0]))
    nodes[0] = t_nodes(df2)
    nodes[1] = t_nodes(df)
    tail = 0.5 * (1.0 - confidence)
    lo, hi = _bracket(weight, centre - centre2, np.sqrt(scale * scale + scale2 * scale2))
    low = _find(tail, weight, centre, scale, df, centre2, scale2, df2, nodes, True, lo, hi)
    high = _find(1.0 - tail, weight, centre, scale, df, centre2, scale2, df2, nodes, True, lo, hi)
    return low, high


@kernel
def _bracket(weight, centre, scale):
    """A first bracket: three scales either side of every plausible centre."""
    lo = np.inf
    hi = -np.inf
    top = weight.max() * 1e-3
    for i in range(weight.shape[0]):
        if weight[i] > top:
            lo = min(lo, centre[i] - 3.0 * scale[i])
            hi = max(hi, centre[i] + 3.0 * scale[i])
    return lo, hi
