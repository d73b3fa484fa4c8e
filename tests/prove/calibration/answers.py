"""The program's answers for simulated homes, by the same path as a program run takes."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from normalize.defaults import CONFIDENCE, MIN_DAYS_A_SIDE
from normalize.fitting import forms as f
from normalize.fitting.batch import Batch, Stations, stations, take_side, wanted_mask
from normalize.fitting.columns import AFTER, BASE, BEFORE, BIC, HIGH_H, LOW_H, RSS, TAU_H, TSS, N
from normalize.fitting.describe import PROFILE_CONFIDENCE, SideData, as_fit
from normalize.fitting.profile import profile_gains
from normalize.fitting.results import FormTried
from normalize.fitting.student import t_quantile
from normalize.fitting.sweep import SHIFT_F
from normalize.savings.compare import run_batch
from normalize.savings.kernel import HELD_AFTER, HELD_BEFORE, NORMALIZED
from normalize.savings.placebo import believed
from normalize.savings.stated import (
    FLAT_PROFILE_F,
    STATED_F,
    STATED_RANGE_F,
    held_at,
    needs_stated,
    widen,
)
from tests.prove.calibration.homes import Homes

Array = NDArray[np.float64]
LINE_TOO = wanted_mask(("line",))[None, :]  # fitted to see whether a flat load hides an answer


@dataclass(frozen=True)
class Answers:
    """fits (homes, 2, forms, columns), chosen (homes, 2), rows (homes, answer columns).

    known (homes,) : the program would give normalized savings.  stated (homes,) : at a stated
    balance temperature.
    """

    fits: Array
    chosen: NDArray[np.int8]
    rows: Array
    known: NDArray[np.bool_]
    stated: NDArray[np.bool_]

    def before(self) -> Array:
        """(homes, columns) of the fit chosen before the work; NaN where there is none."""
        form = np.maximum(self.chosen[:, 0], 0).astype(int)
        rows: Array = self.fits[np.arange(form.shape[0]), 0, form].copy()
        rows[self.chosen[:, 0] < 0] = np.nan
        return rows


def answers_of(homes: Homes, *, criterion: int = BIC, confidence: float = CONFIDENCE) -> Answers:
    """What ``normalize`` says of each home, with the reasons it has for saying nothing."""
    fits, chosen, rows = run_batch(
        homes.batch, homes.table, homes.years, confidence=confidence, tried=LINE_TOO,
        criterion=criterion,
    )  # fmt: skip
    stated = np.zeros(rows.shape[0], bool)
    if homes.cell.schedule == "delivered":
        stated = _at_stated(homes, fits, chosen, rows, confidence)
    known = np.isfinite(rows[:, NORMALIZED]) & _enough(homes, fits, chosen)
    return Answers(fits, chosen, rows, known, stated)


def _enough(homes: Homes, fits: Array, chosen: NDArray[np.int8]) -> NDArray[np.bool_]:
    """As savings/enough.py asks: days a side, a form, and no flat load that hides an answer."""
    days = (np.asarray(homes.batch.end) - np.asarray(homes.batch.start)).astype(float)
    out: NDArray[np.bool_] = believed(fits, chosen, homes.batch.wanted)
    for code in (BEFORE, AFTER):
        mine = np.asarray(homes.batch.side) == code
        out &= np.bincount(homes.home, days * mine, minlength=out.shape[0]) >= MIN_DAYS_A_SIDE
    return out


def _at_stated(
    homes: Homes, fits: Array, chosen: NDArray[np.int8], rows: Array, confidence: float
) -> NDArray[np.bool_]:
    """Deliveries that place no balance temperature: answered at a stated one, in place."""
    need = np.array(
        [
            any(_open(homes, i, which, fits[i, which], chosen[i, which]) or rows[i, held] == 1.0
                for which, held in ((BEFORE, HELD_BEFORE), (AFTER, HELD_AFTER)))
            for i in range(rows.shape[0])
        ]
    )  # fmt: skip
    stated = np.zeros(rows.shape[0], bool)
    station = np.asarray(homes.batch.station)
    for at, year in enumerate(homes.years):
        mine = need & (station == at)
        if not mine.any():
            continue
        part, table = _only(homes, mine, at)
        middle = held_at(part, table, year, STATED_F, confidence)
        hull = middle[2].copy()
        for tau in STATED_RANGE_F:
            widen(hull.T, held_at(part, table, year, tau, confidence)[2].T)
        able = np.isfinite(middle[0][:, 0, f.HEATING, BASE])
        to = np.flatnonzero(mine)[able]
        fits[to, :, f.HEATING] = middle[0][able][:, :, f.HEATING]
        chosen[to] = middle[1][able]
        rows[to] = hull[able]
        stated[to] = True
    return stated


def _only(homes: Homes, mine: NDArray[np.bool_], at: int) -> tuple[Batch, Stations]:
    """Some homes of one station as a batch of their own."""
    batch, table = homes.batch, homes.table
    rows = mine[homes.home]
    part = Batch(
        start=np.asarray(batch.start)[rows],
        end=np.asarray(batch.end)[rows],
        use=np.asarray(batch.use)[rows],
        side=np.asarray(batch.side)[rows],
        offsets=np.concatenate([[0], np.cumsum(np.diff(batch.offsets)[mine])]),
        station=np.zeros(int(mine.sum()), int),
        wanted=batch.wanted[mine],
        net=batch.net[mine],
    )
    own = slice(int(table.offsets[at]), int(table.offsets[at + 1]))
    single = stations(
        [(int(table.first_day[at]), table.temp[own])], int(part.start.min()), int(part.end.max())
    )
    return part, single


def _open(homes: Homes, i: int, code: int, rows: Array, chosen: int) -> bool:
    """As savings/stated.py asks of one side."""
    if np.isnan(rows[f.HEATING, BASE]):
        return True
    if chosen != f.HEATING:
        return False
    batch, table = homes.batch, homes.table
    own = slice(int(batch.offsets[i]), int(batch.offsets[i + 1]))
    at = int(batch.station[i])
    days = slice(int(table.offsets[at]), int(table.offsets[at + 1]))
    side = SideData(
        *take_side(
            np.ascontiguousarray(batch.start[own], np.int32),
            np.ascontiguousarray(batch.end[own], np.int32),
            np.ascontiguousarray(batch.use[own], np.float64),
            np.ascontiguousarray(batch.side[own], np.uint8),
            code, table.temp[days], table.first_day[at], table.order[days], False,
        )
    )  # fmt: skip
    if not _may_be_flat(rows[f.HEATING], side):
        return False
    fit = as_fit(f.HEATING, rows[f.HEATING], side)
    return needs_stated((FormTried("heating", fit, True, ""),), False)


def _may_be_flat(row: Array, side: SideData) -> bool:
    """A quick look along τ, a degree apart, that spares most homes the fine one."""
    taus = np.append(np.arange(row[LOW_H], row[HIGH_H], 1.0), row[[HIGH_H, TAU_H]])
    gains = profile_gains(
        f.HEATING, side.ts, side.ps, side.y, side.d, side.w, taus - SHIFT_F, False, np.zeros(4)
    )
    df = int(row[N]) - f.BY_CODE[f.HEATING].parameters
    t = t_quantile(0.5 + 0.5 * PROFILE_CONFIDENCE, df)
    inside = taus[row[TSS] - gains <= row[RSS] * (1.0 + t * t / df)]
    return bool(np.ptp(inside) > FLAT_PROFILE_F - 2.0) if inside.size else False
