"""Simulated homes with a known saving, as one ragged batch."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from normalize.fitting.batch import Batch, Stations, stations, wanted_mask
from normalize.fitting.columns import AFTER, BEFORE
from normalize.savings.compare import run_batch
from normalize.weather.year import LongTermYear, year_from_sample
from tests.fitting.accounts import weather

WORK_DAYS = 31
FIRST = 400  # day number of the first bill: the record begins earlier


@dataclass(frozen=True)
class Homes:
    batch: Batch
    table: Stations
    year: LongTermYear
    truth: float  # the normal year's saving
    nac_before: float

    def answers(self, confidence: float = 0.90) -> NDArray[np.float64]:
        return run_batch(self.batch, self.table, [self.year], confidence=confidence)[2]


def simulate(
    homes: int,
    *,
    bills: int,
    rho: float,
    noise: float,
    seed: int,
    effect: float = 0.15,
    base: float = 0.6,
    slope: float = 0.12,
    th: float = 61.0,
    cool: float = 0.0,
    tc: float = 70.0,
    forms: tuple[str, ...] = ("flat", "heating"),
    mean_f: float = 50.0,
) -> Homes:
    """Homes that share a station; each bill errs by AR(1) noise of the given share of mean use."""
    rng = np.random.default_rng(seed)
    days = FIRST + 2 * (bills + 2) * 34 + WORK_DAYS + 3700
    temp = weather(rng, days, mean=mean_f)
    after = (slope * (1 - effect), th - 4.0 * effect, cool * (1 - effect))

    def use_of(t: NDArray[np.float64], b: float, tau: float, c: float) -> NDArray[np.float64]:
        return base + b * np.maximum(tau - t, 0) + c * np.maximum(t - tc, 0)

    columns: list[list[float]] = [[], [], [], []]
    offsets = [0]
    daily = (use_of(temp, slope, th, cool), use_of(temp, *after))
    scale = noise * float(daily[0].mean())
    for _ in range(homes):
        at = FIRST + int(rng.integers(0, 365))
        for side in (BEFORE, AFTER):
            error = rng.normal()
            for _ in range(bills):
                error = rho * error + np.sqrt(1 - rho * rho) * rng.normal()
                length = int(rng.integers(28, 34))
                mean = float(daily[side][at : at + length].mean()) + scale * error
                for column, value in zip(
                    columns, (at, at + length, mean * length, side), strict=True
                ):
                    column.append(value)
                at += length
            at += WORK_DAYS
        offsets.append(len(columns[0]))
    year = year_from_sample("ten years", temp[-3650:], np.full(3650, 0.1))
    total = [365 * float(use_of(temp[-3650:], *p).mean()) for p in ((slope, th, cool), after)]
    batch = Batch(
        start=np.array(columns[0]),
        end=np.array(columns[1]),
        use=np.array(columns[2]),
        side=np.array(columns[3]),
        offsets=np.array(offsets),
        station=np.zeros(homes, int),
        wanted=np.tile(wanted_mask(forms), (homes, 1)),
        net=np.zeros(homes, bool),
    )
    table = stations([(0, temp)], int(min(columns[0])), int(max(columns[1])))
    return Homes(batch, table, year, total[0] - total[1], total[0])
