"""The supremum-F test for a change at an unknown date, with bills that err together.

At every admissible date the regression is given its own coefficients from there on, and its
likelihood set against that of the regression without a change, the lag-1 correlation fitted
anew in each of the two (a change left out looks like correlation, and the other way round).
The largest F over the dates has no tabulated distribution in short series with correlated
errors, so it is compared with the same statistic of series drawn without a change
(docs/method.md §6.4).  Sources: Andrews 1993, Econometrica 61:821-856; Bai & Perron 1998,
Econometrica 66:47-78; Hansen 2000, Econometrica 68:575-603 (memory), for the range of dates.

Plain numpy: the regressors are the same for all draws, so each date costs one projection.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

GRID: Final = (-0.3, -0.15, 0.0, 0.15, 0.3, 0.45, 0.6, 0.75, 0.9)  # of ρ
DRAWS: Final = 499  # with (1 + count)/(1 + draws): Monte Carlo error 0.01 at 0.05
FIRST_DRAWS: Final = 99
ENOUGH_ABOVE: Final = 15  # of the first draws: p is far above 0.05 and no more are needed
SEED: Final = 1993  # of every scan's draws: the same bytes each run
TRIM: Final = 0.15  # of the periods, on either side of a candidate date (Andrews 1993)
ROUNDING: Final = 1e-20  # share of Σy² below which a residual is rounding
POORLY_TOLD: Final = 1e-3  # share of a column's length that must survive the others


@dataclass(frozen=True, slots=True)
class Scan:
    """A scan's outcome over its candidate dates, in their order.

    f : (dates,) F at each, NaN where it cannot be formed; lr : the same as a likelihood
    ratio.  best : position of the largest.  p : share of draws without a change that reach
    it.  rho : plausible lag-1 correlation without a change (posterior mean).
    threshold : F that 5 % of the draws exceed.
    """

    f: Array
    lr: Array
    best: int
    p: float
    rho: float
    threshold: float

    def not_told_apart(self, confidence: float = 0.90) -> NDArray[np.bool_]:
        """(dates,) those whose likelihood is not far below the best one's.

        The limit −2·ln(1 − √confidence) is Hansen's (2000): 5.94 at 90 %.
        """
        limit = -2.0 * math.log(1.0 - math.sqrt(confidence))
        with np.errstate(invalid="ignore"):
            near: NDArray[np.bool_] = self.lr >= self.lr[self.best] - limit
        return near


def trimmed(n: int, parameters: int) -> int:
    """Fewest periods on either side of a candidate date.

    >>> trimmed(24, 3), trimmed(60, 3)
    (5, 9)
    """
    return max(parameters + 2, math.ceil(TRIM * n))


def candidates(first: int, last: int, parameters: int) -> list[int]:
    """Positions of the first period after each admissible date, in the periods first..last-1.

    >>> candidates(0, 12, 3)
    [5, 6, 7]
    """
    least = trimmed(last - first, parameters)
    return list(range(first + least, last - least + 1))


def changing(columns: Array, at: list[int], last: int) -> Array:
    """(dates, n, q) the columns that start anew at each position and end before ``last``."""
    out = np.zeros((len(at), *columns.shape))
    for i, k in enumerate(at):
        out[i, k:last] = columns[k:last]
    return out


def whitened(rows: Array, place: Array, rho: Array) -> tuple[Array, Array]:
    """Rows (n, m) made independent under AR(1) at every ρ (k,), gaps respected.

    Returns (k, n, m) and (k,) ½·log of the scalings.
    """
    r, steps = rho[:, None], np.diff(place)[None, :]
    phi = np.sign(r) ** steps * np.abs(r) ** steps
    left = 1.0 - rho * rho
    scale = np.sqrt(left[:, None] / (1.0 - phi * phi))
    out = np.empty((rho.shape[0], *rows.shape))
    out[:, 0] = rows[0] * np.sqrt(left)[:, None]
    out[:, 1:] = (rows[1:] - phi[:, :, None] * rows[:-1]) * scale[:, :, None]
    return out, 0.5 * np.log(left) + np.log(scale).sum(axis=1)


def drawn(normals: Array, place: Array, rho: Array) -> Array:
    """(n, draws) AR(1) errors from standard normals (n, draws), each draw with its own ρ."""
    out = np.empty_like(normals)
    out[0] = normals[0]
    for i, step in enumerate(np.diff(place), start=1):
        phi = np.sign(rho) ** step * np.abs(rho) ** step
        out[i] = phi * out[i - 1] + np.sqrt(1.0 - phi * phi) * normals[i]
    return out


def independent(x: Array) -> NDArray[np.intp]:
    """Positions of the columns that the ones before them do not already tell."""
    size = np.sqrt((x * x).sum(axis=0))
    left = np.abs(np.diagonal(np.linalg.qr(x, mode="r")))
    if left.shape == size.shape and (left > POORLY_TOLD * size).all():
        return np.arange(x.shape[1])
    kept: list[int] = []
    basis: list[Array] = []
    for j in range(x.shape[1]):
        v = x[:, j].copy()
        for q in basis:
            v -= (q @ v) * q
        rest = float(np.sqrt(v @ v))
        if rest > POORLY_TOLD * size[j]:
            kept.append(j)
            basis.append(v / rest)
    return np.array(kept, dtype=np.intp)


class Prepared:
    """Regressors prepared for any number of series, at every ρ of a grid.

    x : (n, p) without a change, independent columns.  blocks : (dates, n, q) what each date
    adds.  place : (n,) places in the sequence of bills.  Rows carry their weights already.
    """

    def __init__(self, x: Array, blocks: Array, place: Array, grid: tuple[float, ...]) -> None:
        self.n, self.p = x.shape
        self.dates, _, self.q = blocks.shape
        self.place, self.rho = place, np.array(grid)
        white, self.log_scale = whitened(x, place, self.rho)
        self.q0, r0 = np.linalg.qr(white)
        self.log_det = np.log(np.abs(np.diagonal(r0, axis1=1, axis2=2))).sum(axis=1)
        # (q, n, dates): each column of all dates side by side.
        self.known = np.ones(self.dates, dtype=np.bool_)
        added: list[Array] = []
        for column in blocks.transpose(2, 1, 0):
            v, _ = whitened(np.ascontiguousarray(column), place, self.rho)
            size = (v * v).sum(axis=1)
            v = v - self.q0 @ (self.q0.transpose(0, 2, 1) @ v)
            for other in added:
                v -= (other * v).sum(axis=1, keepdims=True) * other
            left = (v * v).sum(axis=1)
            told = (left > POORLY_TOLD**2 * size).all(axis=0)
            self.known &= told
            added.append(np.where(told, v / np.sqrt(np.where(left > 0.0, left, 1.0))[:, None], 0.0))
        self.added = np.ascontiguousarray(np.concatenate(added, axis=2).transpose(0, 2, 1))

    def likelihoods(self, series: Array) -> tuple[Array, Array, Array]:
        """Of (n, m) series: 2·log-likelihood without a change (m,) and with one at each date
        (dates, m), both at their best ρ; restricted log-likelihood of every ρ (grid, m).
        """
        m = series.shape[1]
        without, with_one = np.full(m, np.inf), np.full((self.dates, m), np.inf)
        restricted = np.empty((self.rho.shape[0], m))
        white, _ = whitened(series, self.place, self.rho)
        for i, (q0, added) in enumerate(zip(self.q0, self.added, strict=True)):
            y = white[i] - q0 @ (q0.T @ white[i])  # residuals first: close fits keep digits
            rss = np.maximum((y * y).sum(axis=0), 1e-300)
            gain = added @ y
            gain *= gain
            left = np.maximum(rss - gain.reshape(self.q, self.dates, m).sum(axis=0), 1e-12 * rss)
            # −2·log-likelihood is n·log of this: one logarithm after the best ρ is known.
            factor = float(np.exp(-2.0 * self.log_scale[i] / self.n))
            np.minimum(without, factor * rss, out=without)
            np.minimum(with_one, factor * left, out=with_one)
            restricted[i] = (
                self.log_scale[i] - self.log_det[i] - 0.5 * (self.n - self.p) * np.log(rss)
            )
        log_one = -self.n * np.log(with_one)
        log_one[~self.known] = -np.inf
        return -self.n * np.log(without), log_one, restricted

    def f_of(self, lr: Array) -> Array:
        """A likelihood ratio as an F: at one given ρ it is the textbook's, exactly."""
        free = self.n - self.p - self.q
        with np.errstate(over="ignore"):
            f: Array = np.expm1(lr / self.n) * free / self.q
        return np.where(np.isfinite(lr), f, np.nan)


def scan(
    x: Array, y: Array, blocks: Array, place: Array, *, grid: tuple[float, ...] = GRID
) -> Scan | None:
    """Is there a change at any of the dates?  None where no date can be tried or all fits exactly.

    x (n, p), y (n,), blocks (dates, n, q), place (n,): see ``Prepared``.
    """
    x = x[:, independent(x)]
    if blocks.shape[0] == 0 or x.shape[0] <= x.shape[1] + blocks.shape[2] + 1:
        return None
    left = y - x @ np.linalg.lstsq(x, y, rcond=None)[0]
    if not float(left @ left) > ROUNDING * float(y @ y):
        return None  # an exact fit: what is left is rounding
    ready = Prepared(x, blocks, place, grid)
    if not ready.known.any():
        return None
    without, with_one, restricted = ready.likelihoods(y[:, None])
    lr = with_one[:, 0] - without[0]
    best = int(np.argmax(lr))
    weight = np.exp(restricted[:, 0] - restricted[:, 0].max())
    weight /= weight.sum()
    largest = _null(ready, weight, np.array(grid), float(lr[best]))
    above = int((largest >= lr[best]).sum())
    return Scan(
        f=ready.f_of(lr),
        lr=lr,
        best=best,
        p=(1 + above) / (1 + largest.shape[0]),
        rho=float((weight * np.array(grid)).sum()),
        threshold=float(ready.f_of(np.array([np.quantile(largest, 0.95)]))[0]),
    )


def _null(ready: Prepared, weight: Array, grid: Array, observed: float) -> Array:
    """The statistic of series without a change, ρ drawn from what the bills say of it.

    ρ by its quantiles, evenly, so that a few hundred draws carry its whole distribution.
    """
    random = np.random.Generator(np.random.PCG64(SEED))
    quantiles = (random.permutation(DRAWS) + 0.5) / DRAWS
    total = np.cumsum(weight)
    rho = grid[np.searchsorted(total, quantiles * total[-1])]
    normals = random.standard_normal((DRAWS, ready.n)).T
    first = _largest(ready, drawn(normals[:, :FIRST_DRAWS], ready.place, rho[:FIRST_DRAWS]))
    if int((first >= observed).sum()) >= ENOUGH_ABOVE:
        return first
    rest = _largest(ready, drawn(normals[:, FIRST_DRAWS:], ready.place, rho[FIRST_DRAWS:]))
    return np.concatenate([first, rest])


def _largest(ready: Prepared, series: Array) -> Array:
    without, with_one, _ = ready.likelihoods(np.ascontiguousarray(series))
    top: Array = with_one.max(axis=0) - without
    return top


def null_likelihood(x: Array, y: Array, place: Array) -> tuple[float, float]:
    """Best 2·log-likelihood of a regression over every second ρ of the grid, and that ρ."""
    x = x[:, independent(x)]
    n, p = x.shape
    rho = np.array(GRID[::2])
    white, log_scale = whitened(np.column_stack([x, y]), place, rho)
    r = np.asarray(np.linalg.qr(white, mode="r"))
    rss = np.maximum(r[:, p, p] ** 2, 1e-300)
    value = 2.0 * log_scale - n * np.log(rss)
    best = int(np.argmax(value))
    return float(value[best]), float(rho[best])


def odd_ones(x: Array, y: Array) -> tuple[Array, Array]:
    """Externally studentised residuals (n,) and their Bonferroni p (n,), at most 1.

    As statsmodels' OLSInfluence.outlier_test; NaN where a row fits by construction.
    """
    from normalize.fitting.student import t_cdf

    x = x[:, independent(x)]
    n, p = x.shape
    df = n - p - 1
    if df < 1:
        return np.full(n, np.nan), np.ones(n)
    q, _ = np.linalg.qr(x)
    resid = y - q @ (q.T @ y)
    free = 1.0 - (q * q).sum(axis=1)
    rss = float(resid @ resid)
    if not rss > ROUNDING * float(y @ y):
        return np.full(n, np.nan), np.ones(n)
    with np.errstate(divide="ignore", invalid="ignore"):
        without = (rss - resid * resid / free) / df
        t = np.where(free > POORLY_TOLD, resid / np.sqrt(without * free), np.nan)
    chance = [2.0 * t_cdf(-abs(float(v)), df) if np.isfinite(v) else 1.0 for v in t]
    return t, np.minimum(n * np.array(chance), 1.0)
