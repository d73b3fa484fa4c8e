"""Do neighbouring bills err alike?  Lag-1 correlation and a portmanteau test."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray

MOST_LAGS = 10  # lags looked at: a fifth of the bills, at most this (common practice)
LAGS_SHARE = 5


@dataclass(frozen=True, slots=True)
class Alike:
    """Correlation of a side's errors from bill to bill, gaps in time not regarded.

    lag1 : of neighbours.  q : Ljung & Box's statistic over ``lags`` lags; p : its chance
    if bills erred independently (Ljung & Box 1978 (memory)).
    """

    lag1: float
    q: float
    p: float
    lags: int


def alike(errors: NDArray[np.float64]) -> Alike | None:
    """errors : (n,) residuals of use per day times the roots of their weights, in order of time.

    None with fewer than five bills or without any error.

    >>> alike(np.array([1.0, -1.0, 1.0, -1.0, 1.0, -1.0])).lag1
    -0.8333
    """
    n = errors.shape[0]
    lags = min(MOST_LAGS, n // LAGS_SHARE)
    centred = errors - errors.mean()
    total = float((centred * centred).sum())
    if lags < 1 or not total > 0.0:
        return None
    r = [float((centred[k:] * centred[:-k]).sum()) / total for k in range(1, lags + 1)]
    q = n * (n + 2.0) * sum(x * x / (n - k) for k, x in enumerate(r, start=1))
    return Alike(r[0], q, chi_square_tail(q, lags), lags)


def chi_square_tail(x: float, df: int) -> float:
    """P(χ² > x) for whole df ≥ 1, by the finite series (Abramowitz & Stegun 1964, 26.4.4-5).

    >>> round(chi_square_tail(3.841458820694124, 1), 6), round(chi_square_tail(9.0, 4), 6)
    (0.05, 0.061099)
    """
    half = 0.5 * x
    if half <= 0.0:
        return 1.0
    if df % 2 == 1:
        tail = math.erfc(math.sqrt(half))
        term, at = math.exp(-half) * math.sqrt(half) / math.gamma(1.5), 1.5
    else:
        tail, term, at = 0.0, math.exp(-half), 1.0
    while at <= 0.5 * df + 1e-9:
        tail += term
        term *= half / at
        at += 1.0
    return tail
