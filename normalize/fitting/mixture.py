"""Quantiles of mixtures of t, and of differences of two t, without random draws.

The difference of two t variables has no closed form and a single Welch t is too narrow, so
one is integrated against the other by a Gauss-Legendre rule, mixed over ρ.  The quantile is
first found for a t with the difference's variance and kurtosis, which is cheap and close, and
then corrected on the exact mixture (docs/method.md §5).
"""

from __future__ import annotations

from typing import Final

import numpy as np

from normalize.fitting.student import (
    FEW_DF,
    TABLES_FROM,
    TABLES_UP_TO,
    WEIGHTS,
    WEIGHTS_HALF,
    make_table,
    no_tables,
    t_both,
    t_from,
)
from normalize.jit import kernel

NEGLIGIBLE: Final = 1e-5  # weight of a ρ, as a share of the largest, below which it is left out
EXACT: Final = 1e-9  # of probability: how exactly a quantile of single t is found
EXACT_DIFFERENCE: Final = 1e-6  # and of a difference, whose integral is no better
NARROW: Final = 1e-12  # a step this small a share of the spread changes nothing


@kernel
def _worth_keeping(weight):
    """Positions of the weights that matter, and those weights adding up to 1 again."""
    top = weight.max() * NEGLIGIBLE
    at = np.empty(weight.shape[0], dtype=np.int64)
    n = 0
    total = 0.0
    for i in range(weight.shape[0]):
        if weight[i] > top:
            at[n] = i
            total += weight[i]
            n += 1
    kept = np.empty(n)
    for i in range(n):
        kept[i] = weight[at[i]] / total
    return at[:n], kept


@kernel
def _picked(values, at):
    """Values at positions: numba compiles a loop far sooner than an array index."""
    out = np.empty(at.shape[0])
    for i in range(at.shape[0]):
        out[i] = values[at[i]]
    return out


@kernel
def _cdf(x, scale, df, values):
    """(P(scale·T ≤ x), density)."""
    if not scale > 0.0:
        if x == 0.0:
            return 0.5, 0.0
        return (1.0 if x > 0.0 else 0.0), 0.0
    p, density = t_both(values, x / scale, df)
    return p, density / scale


@kernel
def _mixed(x, weight, centre, scale, df, values):
    """(P(X ≤ x), density) of a mixture of single t, each with its own df."""
    total = 0.0
    slope = 0.0
    for i in range(weight.shape[0]):
        p, density = _cdf(x - centre[i], scale[i], df[i], values)
        total += weight[i] * p
        slope += weight[i] * density
    return total, slope


@kernel
def _quantile(u, weight, centre, scale, df, values):
    """(quantile u, spread, density there) of a mixture of single t: Newton in a bracket."""
    lo = np.inf
    hi = -np.inf
    mean = 0.0
    for i in range(weight.shape[0]):
        lo = min(lo, centre[i] - 3.0 * scale[i])
        hi = max(hi, centre[i] + 3.0 * scale[i])
        mean += weight[i] * centre[i]
    spread = hi - lo
    if not spread > 0.0:
        return lo, 0.0, 0.0
    variance = 0.0
    for i in range(weight.shape[0]):
        variance += weight[i] * (scale[i] * scale[i] + (centre[i] - mean) ** 2)
    # Where a normal curve of that spread has its quantile, roughly (Tukey's lambda).
    x = mean + np.sqrt(variance) * 5.0633 * (u**0.135 - (1.0 - u) ** 0.135)
    lo = -np.inf
    hi = np.inf
    density = 0.0
    for _ in range(100):
        p, density = _mixed(x, weight, centre, scale, df, values)
        f = p - u
        if abs(f) <= EXACT:
            break
        if f > 0.0:
            hi = x
        else:
            lo = x
        step = -f / density if density > 0.0 else (-spread if f > 0.0 else spread)
        ahead = x + min(max(step, -spread), spread)
        if ahead <= lo or ahead >= hi:
            ahead = 0.5 * (lo + hi)
        # The second: a spread smaller than the rounding of x, as of bills without noise.
        if abs(ahead - x) <= NARROW * spread or not np.isfinite(ahead):
            break
        x = ahead
    return x, spread, density


@kernel
def _difference(x, weight, centre, wide, df, narrow, nodes, rule, values):
    """P(X ≤ x) of a mixture of differences: the wider t's curve averaged over the narrower.

    nodes (2, m) : quantiles of the narrower one's t at the rule's nodes, for either case.
    """
    total = 0.0
    for i in range(weight.shape[0]):
        inner = 0.0
        at = x - centre[i]
        which = 0 if narrow[i] >= 0.0 else 1
        step = abs(narrow[i])
        if TABLES_FROM <= df[i] <= TABLES_UP_TO and wide[i] > 0.0:
            table = values[df[i]]
            step /= wide[i]
            at /= wide[i]
            for q in range(rule.shape[0]):
                inner += rule[q] * t_from(table, at + step * nodes[which, q], df[i])
        else:
            for q in range(rule.shape[0]):
                inner += rule[q] * _cdf(at + step * nodes[which, q], wide[i], df[i], values)[0]
        total += weight[i] * inner
    return total


@kernel
def _corrected(u, guess, weight, centre, wide, df, narrow, nodes, rule, values):
    """The quantile u of the mixture of differences, from a close guess."""
    x0, spread, density = guess
    if not spread > 0.0:
        return x0
    f0 = _difference(x0, weight, centre, wide, df, narrow, nodes, rule, values) - u
    if abs(f0) <= EXACT_DIFFERENCE:
        return x0
    step = -f0 / density if density > 0.0 else 1e-3 * spread
    x1 = x0 + min(max(step, -spread), spread)
    for _ in range(50):
        f1 = _difference(x1, weight, centre, wide, df, narrow, nodes, rule, values) - u
        if f1 == f0:
            break
        step = -f1 * (x1 - x0) / (f1 - f0)
        x0, f0 = x1, f1
        x1 += min(max(step, -spread), spread)
        if abs(f1) <= EXACT_DIFFERENCE or abs(step) <= NARROW * spread:
            break
    return x1


@kernel
def _alike(scale, df, scale2, df2):
    """(scale, df) of the t with the variance and kurtosis of a difference of two."""
    if df <= 4 or df2 <= 4:
        return np.sqrt(scale * scale + scale2 * scale2), min(df, df2)
    v1 = scale * scale * df / (df - 2.0)
    v2 = scale2 * scale2 * df2 / (df2 - 2.0)
    v = v1 + v2
    if not v > 0.0:
        return 0.0, min(df, df2)
    kurtosis = (v1 * v1 * 6.0 / (df - 4.0) + v2 * v2 * 6.0 / (df2 - 4.0)) / (v * v)
    joint = int(min(4.0 + 6.0 / kurtosis, 1e6) + 0.5)
    return np.sqrt(v * (joint - 2.0) / joint), joint


@kernel
def mixture_range_with(weight, centre, scale, df, confidence, tables):
    """Two-sided range of a mixture over ρ of t with df: (low, high).  tables : student.py."""
    tail = 0.5 * (1.0 - confidence)
    at, kept = _worth_keeping(weight)
    make_table(tables, df)
    dfs = np.full(at.shape[0], df)
    middle, width = _picked(centre, at), _picked(scale, at)
    low, _, _ = _quantile(tail, kept, middle, width, dfs, tables[0])
    high, _, _ = _quantile(1.0 - tail, kept, middle, width, dfs, tables[0])
    return low, high


@kernel
def _nodes_of(df, df2, tables):
    """(2, m) nodes for the second one narrower, and for the first; and the rule's weights."""
    short = df >= FEW_DF and df2 >= FEW_DF
    rule = WEIGHTS_HALF if short else WEIGHTS
    out = np.empty((2, rule.shape[0]))
    full = tables[2] if short else tables[1]
    for i in range(rule.shape[0]):
        out[0, i] = full[df2, i]
        out[1, i] = full[df, i]
    return out, rule


@kernel
def difference_range_with(
    weight, centre, scale, df, centre2, scale2, df2, confidence, tables
):  # fmt: skip
    """Two-sided range of the difference of two t, mixed over a shared ρ: (low, high)."""
    tail = 0.5 * (1.0 - confidence)
    at, kept = _worth_keeping(weight)
    n = at.shape[0]
    # Above the largest table a t is its normal limit's near neighbour: that table serves.
    df, df2 = min(df, TABLES_UP_TO), min(df2, TABLES_UP_TO)
    make_table(tables, df)
    make_table(tables, df2)
    values = tables[0]
    middle = _picked(centre - centre2, at)
    joint = np.empty(n)
    joint_df = np.empty(n, dtype=np.int64)
    wide = np.empty(n)
    narrow = np.empty(n)
    wide_df = np.empty(n, dtype=np.int64)
    for i in range(n):
        a, b = scale[at[i]], scale2[at[i]]
        joint[i], joint_df[i] = _alike(a, df, b, df2)
        make_table(tables, joint_df[i])
        # The narrower one is integrated over, so that the wider one's curve is smooth there;
        # its sign tells which of the two it is.
        wide[i], narrow[i], wide_df[i] = (b, -a, df2) if b > a else (a, b, df)
    low = _quantile(tail, kept, middle, joint, joint_df, values)
    high = _quantile(1.0 - tail, kept, middle, joint, joint_df, values)
    if df == TABLES_UP_TO and df2 == TABLES_UP_TO:
        # Both are nearly normal: a t with the same variance and kurtosis is exact enough.
        return low[0], high[0]
    nodes, rule = _nodes_of(df, df2, tables)
    return (
        _corrected(tail, low, kept, middle, wide, wide_df, narrow, nodes, rule, values),
        _corrected(1.0 - tail, high, kept, middle, wide, wide_df, narrow, nodes, rule, values),
    )


@kernel
def mixture_range(weight, centre, scale, df, confidence):
    """``mixture_range_with`` for a single range."""
    return mixture_range_with(weight, centre, scale, df, confidence, no_tables())


@kernel
def difference_range(weight, centre, scale, df, centre2, scale2, df2, confidence):
    """``difference_range_with`` for a single range."""
    return difference_range_with(
        weight, centre, scale, df, centre2, scale2, df2, confidence, no_tables()
    )
