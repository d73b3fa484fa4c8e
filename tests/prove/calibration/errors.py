"""Errors of bills: serially correlated, of several tails, standard deviation one."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from tests.prove.calibration.cells import Cell

T_DF = 3  # heavy tails: Student's t
OUTLIER_SHARE = 0.05  # of bills
OUTLIER_SIZE = 4.0  # standard deviations of the others
SLOW_RHO = 0.95  # a day: memory of three weeks
SLOW_SHARE = 0.5  # of the variance
WEEKEND = 1.0  # weekly pattern: root mean square, in standard deviations of the error


def autoregression(
    rng: np.random.Generator, shape: tuple[int, int], rho: float, *, df: int = 0
) -> NDArray[np.float64]:
    """(rows, steps) stationary AR(1) of variance one; df > 0: innovations are Student's t.

    With heavy innovations the first value is drawn like an innovation, so the series forgets
    its start within a few steps.
    """
    from scipy.signal import lfilter

    fresh = rng.standard_t(df, shape) / np.sqrt(df / (df - 2)) if df else rng.normal(size=shape)
    if rho == 0.0:
        return fresh
    fresh[:, 1:] *= np.sqrt(1.0 - rho * rho)
    out: NDArray[np.float64] = lfilter([1.0], [1.0, -rho], fresh, axis=1)
    return out


def errors(rng: np.random.Generator, cell: Cell, homes: int, steps: int) -> NDArray[np.float64]:
    """(homes, steps) errors of a cell in units of its noise, in order of time.

    Outliers come on top of it, and so does a weekly pattern.
    """
    df = T_DF if cell.tails == "t3" else 0
    out = autoregression(rng, (homes, steps), cell.rho, df=df)
    if cell.tails == "outliers":
        hit = rng.random(out.shape) < OUTLIER_SHARE
        out = out + hit * rng.choice((-OUTLIER_SIZE, OUTLIER_SIZE), out.shape)
    if cell.pattern == "slow":
        slow = autoregression(rng, (homes, steps), SLOW_RHO)
        out = np.sqrt(1.0 - SLOW_SHARE) * out + np.sqrt(SLOW_SHARE) * slow
    if cell.pattern == "weekly":
        out = out + weekly(rng, homes, steps)
    return out


def weekly(rng: np.random.Generator, homes: int, steps: int) -> NDArray[np.float64]:
    """A pattern of the home's own that sums to nothing over its week: two days apart."""
    week = np.array([2.0, 2.0, 2.0, 2.0, 2.0, -5.0, -5.0])
    week *= WEEKEND / np.sqrt((week**2).mean())
    phase = rng.integers(0, 7, (homes, 1))
    sign = rng.choice((-1.0, 1.0), (homes, 1))
    return sign * week[(np.arange(steps)[None, :] + phase) % 7]
