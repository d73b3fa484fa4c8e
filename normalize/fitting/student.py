"""Student's t for whole degrees of freedom, compiled: distribution, density, quantile.

Up to 40 degrees of freedom the finite series of Abramowitz & Stegun 1964, 26.7.3-26.7.4
(exact); above, the normalising expansion of Hill 1970, Communications of the ACM 13:617-619
(Algorithm 395), good to about 1e-10 there.  Checked against scipy in the tests.
"""

from __future__ import annotations

import math

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


# Gauss-Legendre nodes on (0, 1): how one t is integrated against the other.  The substitution
# u = s³(10 − 15s + 6s²) crowds nodes into the tails, where few degrees of freedom need them.
_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(32)
_S = 0.5 * (_NODES + 1.0)
NODES = np.ascontiguousarray(_S**3 * (10.0 - 15.0 * _S + 6.0 * _S**2))
WEIGHTS = np.ascontiguousarray(0.5 * _WEIGHTS * 30.0 * _S**2 * (1.0 - _S) ** 2)


@kernel
def t_nodes(df):
    """(32,) quantiles of t at the Gauss-Legendre nodes."""
    out = np.empty(NODES.shape[0])
    half = NODES.shape[0] // 2
    for i in range(half):
        out[NODES.shape[0] - 1 - i] = t_quantile_upper(NODES[NODES.shape[0] - 1 - i], df)
        out[i] = -out[NODES.shape[0] - 1 - i]
    return out
