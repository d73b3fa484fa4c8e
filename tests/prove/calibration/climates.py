"""Invented stations: daily temperatures of four climates, and each one's long-term year."""

from __future__ import annotations

import zlib
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from normalize.weather.year import LongTermYear, year_from_sample
from tests.prove.calibration.errors import autoregression

STATIONS = 8  # a climate; homes of a cell are spread over them
PAST_DAYS = 3650  # the ten years that make the long-term year; bills come later
RECORD_DAYS = PAST_DAYS + 5600

# Mean of the year, half the seasonal swing, standard deviation of daily weather, of spells. °F
CLIMATES = {
    "cold": (45.0, 25.0, 7.5, 3.0),
    "temperate": (54.0, 20.0, 7.0, 2.5),
    "mild": (57.0, 11.0, 5.5, 2.0),
    "hot": (69.0, 15.0, 6.0, 2.0),
}
DAILY_RHO, SPELL_RHO = 0.7, 0.93  # a day: memories of three days and two weeks


@dataclass(frozen=True)
class Station:
    """Daily temperatures from day 0 and the long-term year of the days before the bills."""

    temp_f: NDArray[np.float64]
    year: LongTermYear


@lru_cache(maxsize=4)
def stations_of(climate: str) -> tuple[Station, ...]:
    """The climate's stations, the same in every cell.

    >>> len(stations_of("cold"))
    8
    """
    mean, swing, daily, spell = CLIMATES[climate]
    rng = np.random.default_rng(zlib.crc32(climate.encode()))
    shape = (STATIONS, RECORD_DAYS)
    day = np.arange(RECORD_DAYS)
    season = -swing * np.cos(2 * np.pi * (day - 20) / 365.25)
    temp = mean + season + daily * autoregression(rng, shape, DAILY_RHO)
    temp = np.round(temp + spell * autoregression(rng, shape, SPELL_RHO), 1)
    weight = np.full(PAST_DAYS, 365.0 / PAST_DAYS)
    return tuple(
        Station(row, year_from_sample(f"{climate} {i}", row[:PAST_DAYS], weight))
        for i, row in enumerate(temp)
    )


def seasons_of(climate: str) -> tuple[float, float]:
    """Usual temperatures of the coldest and the warmest time of year. [°F]

    >>> seasons_of("mild")
    (46.0, 68.0)
    """
    mean, swing, _, _ = CLIMATES[climate]
    return mean - swing, mean + swing
