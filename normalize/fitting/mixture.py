"""Quantiles of mixtures of t, and of differences of two t, without random draws.

The difference of two t variables has no closed form and a single Welch t is too narrow, so
one is integrated against the other by a 32-node Gauss-Legendre rule, mixed over ρ, and the
quantile found by secants from a single-t guess (docs/method.md §5).
"""

from __future__ import annotations

import numpy as np

from normalize.fitting.student import WEIGHTS, t_cdf, t_nodes
from normalize.jit import kernel

NEGLIGIBLE = 1e-5  # weight of a ρ, as a share of the largest, below which it is left out
EXACT = 1e-9  # of probability, or of the spread: how exactly a quantile is found


@kernel
def _worth_keeping(weight):
    """The weights without the implausible ones, adding up to 1 again."""
    top = weight.max() * NEGLIGIBLE
    kept = np.where(weight > top, weight, 0.0)
    return kept / kept.sum()


@kernel
def _mixed_cdf(x, weight, centre, scale, df, centre2, scale2, df2, nodes, two):
    """P(X ≤ x), X = t of df, or the difference of t of df and t of df2 (two)."""
    total = 0.0
    for i in range(weight.shape[0]):
        if weight[i] == 0.0:
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
def _one_t_cdf(x, weight, centre, scale, df):
    """The mixture with each component a single t: cheap, and close enough to start from."""
    total = 0.0
    for i in range(weight.shape[0]):
        if weight[i] > 0.0:
            total += weight[i] * _step_cdf(x - centre[i], scale[i], df)
    return total


@kernel
def _first_guess(u, weight, centre, scale, df):
    """Quantile u of the mixture of single t, by bisection to a thousandth of the spread."""
    lo = np.inf
    hi = -np.inf
    for i in range(weight.shape[0]):
        if weight[i] > 0.0:
            lo = min(lo, centre[i] - 3.0 * scale[i])
            hi = max(hi, centre[i] + 3.0 * scale[i])
    spread = hi - lo
    if not spread > 0.0:
        return lo, 0.0
    for _ in range(60):
        if _one_t_cdf(lo, weight, centre, scale, df) <= u:
            break
        lo -= spread
    for _ in range(60):
        if _one_t_cdf(hi, weight, centre, scale, df) >= u:
            break
        hi += spread
    for _ in range(12):
        x = 0.5 * (lo + hi)
        if _one_t_cdf(x, weight, centre, scale, df) > u:
            hi = x
        else:
            lo = x
    return 0.5 * (lo + hi), spread


@kernel
def _find(u, weight, centre, scale, df, centre2, scale2, df2, nodes, two):
    """The quantile u: a first guess from single t, then secants on the exact mixture."""
    joint = np.sqrt(scale * scale + scale2 * scale2) if two else scale
    middle = centre - centre2 if two else centre
    x0, spread = _first_guess(u, weight, middle, joint, min(df, df2))
    if not spread > 0.0:
        return x0
    f0 = _mixed_cdf(x0, weight, centre, scale, df, centre2, scale2, df2, nodes, two) - u
    # A step along the density of the guess, then secants.
    delta = 1e-3 * spread
    density = _one_t_cdf(x0 + delta, weight, middle, joint, min(df, df2))
    density = (density - _one_t_cdf(x0 - delta, weight, middle, joint, min(df, df2))) / (2 * delta)
    x1 = x0 - f0 / density if density > 0.0 else x0 + delta
    x1 = min(max(x1, x0 - spread), x0 + spread)
    for _ in range(50):
        f1 = _mixed_cdf(x1, weight, centre, scale, df, centre2, scale2, df2, nodes, two) - u
        if abs(f1) <= EXACT or f1 == f0:
            break
        step = -f1 * (x1 - x0) / (f1 - f0)
        step = min(max(step, -spread), spread)
        x0 = x1
        f0 = f1
        x1 = x1 + step
        if abs(step) <= EXACT * spread:
            break
    return x1


@kernel
def mixture_range(weight, centre, scale, df, confidence):
    """Two-sided range of a mixture over ρ of t with df: (low, high)."""
    none = np.zeros((2, WEIGHTS.shape[0]))
    tail = 0.5 * (1.0 - confidence)
    kept = _worth_keeping(weight)
    low = _find(tail, kept, centre, scale, df, centre, scale, df, none, False)
    high = _find(1.0 - tail, kept, centre, scale, df, centre, scale, df, none, False)
    return low, high


@kernel
def difference_range(weight, centre, scale, df, centre2, scale2, df2, confidence):
    """Two-sided range of the difference of two t, mixed over a shared ρ: (low, high)."""
    nodes = np.empty((2, WEIGHTS.shape[0]))
    nodes[0] = t_nodes(df2)
    nodes[1] = t_nodes(df)
    tail = 0.5 * (1.0 - confidence)
    kept = _worth_keeping(weight)
    low = _find(tail, kept, centre, scale, df, centre2, scale2, df2, nodes, True)
    high = _find(1.0 - tail, kept, centre, scale, df, centre2, scale2, df2, nodes, True)
    return low, high
