"""Student's t for whole degrees of freedom, compiled: distribution, density, quantile.

Up to 40 degrees of freedom the finite series of Abramowitz & Stegun 1964, 26.7.3-26.7.4
(exact); above, the normalising expansion of Hill 1970, Communications of the ACM 13:617-619
(Algorithm 395), good to about 1e-10 there.  Checked against scipy in the tests.
"""

from __future__ import annotations

import math
from typing import Final

import numpy as np

from normalize.jit import kernel

SERIES_UP_TO = 40


@kernel
def t_cdf(x, df):
    """P(T ≤ x) for whole df ≥ 1."""
    if df > SERIES_UP_TO:
        return 0.5 * math.erfc(-_hill(x, df) / math.sqrt(2.0))
    cos2 = 1.0 / (1.0 + x * x / df)
    sin = x / math.sqrt(df) * math.sqrt(cos2)
    even = df % 2 == 0
    term = 1.0 if even else math.sqrt(cos2)
    total = term if (even or df > 1) else 0.0
    # A&S 26.7.3 (odd) and 26.7.4 (even): products of (j−1)/j from 2 or 3 upward.
    j = 2 if even else 3
    while j <= df - 2:
        term *= cos2 * (j - 1.0) / j
        total += term
        j += 2
    if even:
        return 0.5 + 0.5 * sin * total
    angle = math.atan(x / math.sqrt(df))
    return 0.5 + (angle + sin * total) / math.pi


@kernel
def _hill(x, df):
    """The normal deviate with the same tail as t = x."""
    a = df - 0.5
    b = 48.0 * a * a
    z = math.sqrt(a * math.log1p(x * x / df))
    z3 = z * z * z
    top = 4.0 * z3 * z3 * z + 33.0 * z3 * z * z + 240.0 * z3 + 855.0 * z
    u = z + (z3 + 3.0 * z) / b - top / (10.0 * b * (b + 0.8 * z3 * z + 100.0))
    return u if x >= 0.0 else -u


@kernel
def t_log_norm(df):
    """Logarithm of the density at 0."""
    return math.lgamma(0.5 * (df + 1.0)) - math.lgamma(0.5 * df) - 0.5 * math.log(df * math.pi)


@kernel
def t_quantile(u, df):
    """x with P(T ≤ x) = u, by bracketing and Newton; 0 < u < 1."""
    if u == 0.5:
        return 0.0
    if u < 0.5:
        return -t_quantile_upper(1.0 - u, df)
    return t_quantile_upper(u, df)


@kernel
def t_quantile_upper(u, df):
    """The same for u > ½."""
    lo = 0.0
    hi = 1.0
    while t_cdf(hi, df) < u and hi < 1e12:
        lo = hi
        hi *= 2.0
    norm = t_log_norm(df)
    x = 0.5 * (lo + hi)
    for _ in range(100):
        f = t_cdf(x, df) - u
        if f > 0.0:
            hi = x
        else:
            lo = x
        slope = math.exp(norm - 0.5 * (df + 1.0) * math.log1p(x * x / df))
        step = x - f / slope if slope > 0.0 else 0.5 * (lo + hi)
        if not (lo < step < hi):
            step = 0.5 * (lo + hi)
        if abs(step - x) <= 1e-13 * max(1.0, abs(x)):
            return step
        x = step
    return x


def _rule(count: int) -> tuple[np.ndarray, np.ndarray]:
    """Gauss-Legendre on (0, 1), stretched: how one t is integrated against the other.

    The substitution u = s³(10 − 15s + 6s²) crowds nodes into the tails, where few degrees of
    freedom need them.
    """
    nodes, weights = np.polynomial.legendre.leggauss(count)
    s = 0.5 * (nodes + 1.0)
    return (
        np.ascontiguousarray(s**3 * (10.0 - 15.0 * s + 6.0 * s**2)),
        np.ascontiguousarray(0.5 * weights * 30.0 * s**2 * (1.0 - s) ** 2),
    )


FEW_DF: Final = 8  # from here on the tails are thin enough for half the nodes
NODES, WEIGHTS = _rule(32)
NODES_HALF, WEIGHTS_HALF = _rule(16)


@kernel
def t_nodes(df, nodes):
    """Quantiles of t at the nodes of a rule, which are symmetric about ½."""
    count = nodes.shape[0]
    out = np.empty(count)
    for i in range(count // 2):
        out[count - 1 - i] = t_quantile_upper(nodes[count - 1 - i], df)
        out[i] = -out[count - 1 - i]
    return out


# A table of the distribution, for the many values that a difference of two t needs.  In
# s = x/√(df + x²) it is a polynomial (even df) or nearly one, so that cubic pieces through
# values and slopes are exact to about 1e-9 (tested).
CELLS: Final = 512
TABLES_FROM: Final = 5  # with fewer degrees of freedom the slope has a corner at s = 1
TABLES_UP_TO: Final = 128  # above, two t differ by nearly a t (mixture.py)


@kernel
def no_tables():
    """Space for tables of every df, none made yet.

    (values (df, cell, [value, slope × cell]), nodes (df, 32), nodes of the short rule (df, 16)).
    """
    return (
        np.full((TABLES_UP_TO + 1, CELLS + 1, 2), np.nan),
        np.full((TABLES_UP_TO + 1, NODES.shape[0]), np.nan),
        np.full((TABLES_UP_TO + 1, NODES_HALF.shape[0]), np.nan),
    )


@kernel
def make_table(tables, df):
    """Makes the tables of df unless they are there or are not needed."""
    values, nodes, half = tables
    if df > TABLES_UP_TO or nodes[df, 0] < 0.0:
        return
    long, short = t_nodes(df, NODES), t_nodes(df, NODES_HALF)
    for i in range(NODES.shape[0]):
        nodes[df, i] = long[i]
    for i in range(NODES_HALF.shape[0]):
        half[df, i] = short[i]
    height = math.exp(t_log_norm(df)) * math.sqrt(df)
    for i in range(CELLS + 1):
        s = i / CELLS
        left = 1.0 - s * s
        values[df, i, 0] = 1.0
        values[df, i, 1] = 0.0
        if left > 0.0:
            values[df, i, 0] = t_cdf(s * math.sqrt(df / left), df)
            values[df, i, 1] = height * left ** (0.5 * df - 1.0) / CELLS


@kernel
def t_from(table, x, df):
    """P(T ≤ x) from the table of df."""
    s = x / math.sqrt(df + x * x) * CELLS
    z = abs(s)
    i = min(int(z), CELLS - 1)
    f = z - i
    g = 1.0 - f
    value = g * g * ((1.0 + 2.0 * f) * table[i, 0] + f * table[i, 1])
    value += f * f * ((1.0 + 2.0 * g) * table[i + 1, 0] - g * table[i + 1, 1])
    return value if s >= 0.0 else 1.0 - value


@kernel
def t_both(values, x, df):
    """(P(T ≤ x), density at x) for any whole df; from the table where there is one."""
    if df < TABLES_FROM or df > TABLES_UP_TO:
        density = math.exp(t_log_norm(df) - 0.5 * (df + 1.0) * math.log1p(x * x / df))
        return t_cdf(x, df), density
    root = math.sqrt(df + x * x)
    s = x / root * CELLS
    z = abs(s)
    i = min(int(z), CELLS - 1)
    f = z - i
    g = 1.0 - f
    low, slope_low = values[df, i, 0], values[df, i, 1]
    high, slope_high = values[df, i + 1, 0], values[df, i + 1, 1]
    value = g * g * ((1.0 + 2.0 * f) * low + f * slope_low)
    value += f * f * ((1.0 + 2.0 * g) * high - g * slope_high)
    slope = 6.0 * f * g * (high - low) + g * (1.0 - 3.0 * f) * slope_low
    slope += f * (1.0 - 3.0 * g) * slope_high
    density = slope * CELLS * df / (root * root * root)
    return value if s >= 0.0 else 1.0 - value, density
