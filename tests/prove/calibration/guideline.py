"""What ASHRAE Guideline 14's formula would claim for the same homes.

Avoided use ± ΔS with ΔS/S of Reddy & Claridge 2000 (normalize/savings/guideline.py), as it is
customarily used: t for 90 % with n − parameters, k = 1.26, n′ from the lag-1
autocorrelation of the account's own baseline residuals, not below zero; and with n′ = n.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from normalize.fitting.batch import Batch
from normalize.fitting.columns import (
    AFTER,
    BASE,
    BEFORE,
    MEAN,
    RSS,
    SLOPE_C,
    SLOPE_H,
    SLOPE_LINE,
    TAU_C,
    TAU_H,
)
from normalize.fitting.forms import BY_CODE
from normalize.fitting.student import t_quantile
from normalize.savings.guideline import fractional_uncertainty
from tests.prove.calibration.homes import Homes

MOST_RHO = 0.9  # n′ would vanish beyond

Array = NDArray[np.float64]


def half_widths(homes: Homes, rows: Array, form: NDArray[np.int8], predicted: Array) -> Array:
    """(homes, 2) ΔS at 90 % by each home's own lag-1 correlation, and taking it for zero.

    rows (homes, columns) : the fit chosen before the work; form (homes,) its code, −1 where
    there is none (NaN comes back); predicted (homes,) use that it predicts after the work.
    """
    side = np.asarray(homes.batch.side)
    accounts = homes.nac.shape[0]
    n = np.bincount(homes.home, side == BEFORE, minlength=accounts).astype(int)
    m = np.bincount(homes.home, side == AFTER, minlength=accounts).astype(int)
    days = np.bincount(homes.home, _days(homes.batch) * (side == BEFORE), minlength=accounts)
    rho = lag_one(homes, residuals(homes, rows))
    out = np.full((accounts, 2), np.nan)
    for i in np.flatnonzero(form >= 0):
        df = int(n[i]) - BY_CODE[int(form[i])].parameters
        if df < 1 or m[i] < 1:
            continue
        cv = np.sqrt(rows[i, RSS] / (days[i] / n[i]) / df) / rows[i, MEAN]
        t = t_quantile(0.95, df)
        for j, r in enumerate((min(max(rho[i], 0.0), MOST_RHO), 0.0)):
            share = fractional_uncertainty(
                n=int(n[i]), m=int(m[i]), rho=float(r), cv=float(cv), fraction=1.0, t=t
            )
            out[i, j] = share * predicted[i]
    return out


def _days(batch: Batch) -> Array:
    return (np.asarray(batch.end) - np.asarray(batch.start)).astype(float)


def residuals(homes: Homes, rows: Array) -> Array:
    """(rows,) use per day less what the given fits say, in the bills' order. [use/day]"""
    batch, table = homes.batch, homes.table
    station = np.asarray(batch.station)[homes.home]
    days = _days(batch)
    lo = np.asarray(batch.start) - table.first_day[station]
    hi = np.asarray(batch.end) - table.first_day[station]
    said = np.empty(days.shape[0])
    for i in range(homes.nac.shape[0]):
        own = slice(int(batch.offsets[i]), int(batch.offsets[i + 1]))
        at = int(batch.station[i])
        temp = table.temp[table.offsets[at] : table.offsets[at + 1]]
        a, b = int(lo[own.start]), int(hi[own.stop - 1])
        total = np.concatenate([[0.0], np.cumsum(_use(rows[i], temp[a:b]))])
        said[own] = total[hi[own] - a] - total[lo[own] - a]
    return np.asarray(batch.use) / days - said / days


def _use(row: Array, temp: Array) -> Array:
    out = np.full(temp.shape[0], row[BASE])
    if np.isfinite(row[SLOPE_LINE]):
        out += row[SLOPE_LINE] * temp
    if np.isfinite(row[SLOPE_H]):
        out += row[SLOPE_H] * np.maximum(row[TAU_H] - temp, 0.0)
    if np.isfinite(row[SLOPE_C]):
        out += row[SLOPE_C] * np.maximum(temp - row[TAU_C], 0.0)
    return out


def lag_one(homes: Homes, resid: Array) -> Array:
    """(homes,) lag-1 autocorrelation of the baseline's residuals, Σ eᵢeᵢ₊₁ / Σ eᵢ²."""
    before = np.asarray(homes.batch.side) == BEFORE
    e = np.where(before, resid, 0.0)
    pair = np.zeros(e.shape[0])
    pair[:-1] = e[:-1] * e[1:] * (homes.home[:-1] == homes.home[1:])
    accounts = homes.nac.shape[0]
    square = np.bincount(homes.home, e * e, minlength=accounts)
    product = np.bincount(homes.home, pair, minlength=accounts)
    with np.errstate(invalid="ignore", divide="ignore"):
        rho: Array = np.where(square > 0.0, product / square, 0.0)
    return rho
