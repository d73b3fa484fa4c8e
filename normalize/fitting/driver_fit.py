"""One side's fit with drivers: the form it takes, and what each driver adds.

Forms and balance temperatures come from the same exact sweep as ever (fitting/side.py); the
drivers' coefficients are weighted least squares at the τ found, as the fit's own are.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from normalize.fitting.batch import Batch, Stations, settings
from normalize.fitting.blocks import block_of, in_blocks
from normalize.fitting.columns import BIC, TAU_C, TAU_H
from normalize.fitting.describe import SideData
from normalize.fitting.fit import side_data
from normalize.fitting.forms import BY_CODE
from normalize.fitting.least_squares import weighted_fit
from normalize.fitting.side import choose, design, fit_side
from normalize.fitting.sweep import SHIFT_F


@dataclass(frozen=True, slots=True)
class DriverFit:
    """One side, fitted with k drivers.

    form : of the fit chosen.  bic : its criterion.  coef, se, t : (k,) use for one more of
    each driver, its standard error with τ held and errors taken as independent, and coef ÷ se.
    coefficients : (k + 1 + slopes,) all of them, in the order of the design's columns: base
    load, drivers, slopes.  weather : (n, slopes) the regressors of the weather beside them.
    """

    form: str
    bic: float
    coef: tuple[float, ...]
    se: tuple[float, ...]
    t: tuple[float, ...]
    coefficients: tuple[float, ...]
    weather: NDArray[np.float64]
    balance_heating_f: float | None
    balance_cooling_f: float | None


def fit_with(
    batch: Batch,
    table: Stations,
    code: int,
    drivers: NDArray[np.float64],
    *,
    by_blocks: bool = False,
) -> DriverFit | None:
    """The side's best form with these drivers, or None where none can be fitted.

    batch : of one account.  drivers : (rows, k) of all its periods.  by_blocks : daily
    data are put into blocks first (fitting/blocks.py), where errors are less alike.
    """
    side = side_data(batch, table, code)
    mine = np.ascontiguousarray(drivers[batch.side == code], dtype=np.float64)
    if mine.shape[0] == 0:
        return None
    if by_blocks:
        side, mine = _by_blocks(side, mine)
    rows = fit_side(
        side.ts, side.ps, side.y, side.d, side.w, mine, batch.wanted[0],
        bool(batch.net[0]), settings(),
    )  # fmt: skip
    form = int(choose(rows, batch.wanted[0], BIC))
    if form < 0:
        return None
    return _described(rows[form], form, side, mine)


def block_means(side: SideData, columns: NDArray[np.float64]) -> NDArray[np.float64]:
    """Means of columns (n, k) over blocks; the columns themselves where data are no days."""
    which, place = block_of(side.start, side.end)
    means: NDArray[np.float64] = in_blocks(
        np.ascontiguousarray(columns), side.d, which, place.shape[0]
    )[0]
    return means


def block_lengths(side: SideData) -> NDArray[np.float64]:
    """Days of each block, or of each period where data are no days."""
    which, place = block_of(side.start, side.end)
    return np.bincount(which, side.d, place.shape[0]).astype(np.float64)


def _by_blocks(
    side: SideData, drivers: NDArray[np.float64]
) -> tuple[SideData, NDArray[np.float64]]:
    which, place = block_of(side.start, side.end)
    if place.shape[0] == side.y.shape[0]:
        return side, drivers
    means, days = in_blocks(
        np.ascontiguousarray(np.column_stack([side.y, drivers])), side.d, which, place.shape[0]
    )
    weight = np.bincount(which, side.w, place.shape[0]).astype(np.float64)
    joined = SideData(
        side.ts, which[side.ps].astype(np.int32), np.ascontiguousarray(means[:, 0]), days,
        weight, side.start, side.end,
    )  # fmt: skip
    return joined, np.ascontiguousarray(means[:, 1:])


def _described(
    row: NDArray[np.float64], form: int, side: SideData, drivers: NDArray[np.float64]
) -> DriverFit:
    k = drivers.shape[1]
    x = _design(row, form, side, drivers)
    coef, cov, rss, _ = weighted_fit(x, side.y, side.w)
    spread = rss / max(x.shape[0] - x.shape[1], 1)
    se = np.sqrt(np.maximum(np.diag(cov), 0.0) * spread)[1 : 1 + k]
    own = coef[1 : 1 + k]
    return DriverFit(
        form=BY_CODE[form].name,
        bic=float(row[BIC]),
        coef=tuple(own.tolist()),
        se=tuple(se.tolist()),
        t=tuple(float(c / e) if e > 0.0 else float("inf") for c, e in zip(own, se, strict=True)),
        coefficients=tuple(coef.tolist()),
        weather=x[:, 1 + k :],
        balance_heating_f=None if np.isnan(row[TAU_H]) else float(row[TAU_H]),
        balance_cooling_f=None if np.isnan(row[TAU_C]) else float(row[TAU_C]),
    )


def _design(
    row: NDArray[np.float64], form: int, side: SideData, drivers: NDArray[np.float64]
) -> NDArray[np.float64]:
    """[1, drivers…, T̄?, h?, c?] at the row's balance temperatures."""
    tbar = np.bincount(side.ps, side.ts, side.d.shape[0]) / side.d
    x: NDArray[np.float64] = design(
        form, side.ts, side.ps, -side.ts[::-1], side.ps[::-1].copy(), side.d, tbar, drivers,
        row[TAU_H] - SHIFT_F, row[TAU_C] - SHIFT_F,
    )  # fmt: skip
    return x


def shared_with(
    column: NDArray[np.float64], others: NDArray[np.float64], weight: NDArray[np.float64]
) -> float:
    """Share of a column's variation that other columns (and a constant) account for, 0 to 1.

    column (n,), others (n, m), weight (n,).  1 for a column that does not vary at all.

    >>> x = np.array([0.0, 1.0, 2.0, 3.0])
    >>> round(shared_with(x, np.array([[0.0], [1.0], [2.0], [3.1]]), np.ones(4)), 3)
    0.999
    """
    root = np.sqrt(weight)
    mean = float((weight * column).sum() / weight.sum())
    about = column - mean
    total = float((weight * about * about).sum())
    size = float((weight * column * column).sum())
    if total <= 1e-12 * max(size, 1e-300):
        return 1.0
    x = np.column_stack([np.ones_like(column), others]) * root[:, None]
    scale = np.sqrt((x * x).sum(axis=0))
    x = x / np.where(scale > 0.0, scale, 1.0)
    coef = np.linalg.lstsq(x, about * root, rcond=None)[0]
    left = about * root - x @ coef
    return 1.0 - float(left @ left) / total
