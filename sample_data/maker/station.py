"""Invented stations: daily maximum and minimum temperature with weather's persistence."""

from __future__ import annotations

import math
from dataclasses import dataclass
from datetime import date, timedelta
from typing import TYPE_CHECKING

from maker.chance import Chance, persistent

if TYPE_CHECKING:
    from collections.abc import Mapping

FIRST = date(2012, 1, 1)
LAST = date(2026, 6, 30)
N_DAYS = (LAST - FIRST).days + 1
LONG_TERM_YEARS = tuple(range(2016, 2026))  # the last ten whole years
COLDEST_DAY_OF_YEAR = 21

# Degrees by which a winter, named by its December, departs from the usual one.  The last
# winter before the works is cold, the first after them mild: comparing bills would flatter.
WINTERS = {2013: -2.5, 2015: 3.0, 2018: -1.5, 2020: 1.0, 2021: 0.5, 2022: -3.5, 2023: 4.0}


@dataclass(frozen=True, slots=True)
class Station:
    """A station. high_f, low_f : whole °F for every day from FIRST to LAST, none missing.

    gaps : first day → days, where its file has no temperatures.
    """

    name: str
    high_f: tuple[int, ...]
    low_f: tuple[int, ...]
    gaps: Mapping[date, int]

    def missing(self, low: int, high: int) -> frozenset[date]:
        """Days without temperatures, of gaps from low to high days long."""
        return frozenset(
            first + timedelta(n)
            for first, count in self.gaps.items()
            if low <= count <= high
            for n in range(count)
        )

    def mean_f(self, day: date) -> float:
        """Mean of the day's maximum and minimum. [°F]"""
        i = (day - FIRST).days
        return (self.high_f[i] + self.low_f[i]) / 2

    def heating_65(self, year: int) -> float:
        """Degree-days below 65 °F of a calendar year. [°F·day]"""
        return sum(max(65.0 - self.mean_f(day), 0.0) for day in days_of_year(year))


def days_of_year(year: int) -> list[date]:
    """Every day of a calendar year."""
    first = date(year, 1, 1)
    return [first + timedelta(n) for n in range((date(year + 1, 1, 1) - first).days)]


def days_between(first: date, last: date) -> list[date]:
    """Every day from first to last, both included."""
    return [first + timedelta(n) for n in range((last - first).days + 1)]


def anomalies(seed: str) -> list[float]:
    """(N_DAYS,) departures of unit variance: a few days' weather upon a month's."""
    fast = persistent(Chance(f"{seed} days"), N_DAYS, 0.70)
    slow = persistent(Chance(f"{seed} months"), N_DAYS, 0.97)
    return [0.94 * f + 0.34 * s for f, s in zip(fast, slow, strict=True)]


def mixed(common: list[float], own: list[float], share: float) -> list[float]:
    """Departures of a station that has most of its weather in common with its neighbour."""
    rest = (1.0 - share * share) ** 0.5
    return [share * c + rest * o for c, o in zip(common, own, strict=True)]


def make_station(
    name: str,
    departures: list[float],
    *,
    mean_f: float,
    swing_f: float,
    daily_swing_f: float,
    gaps: Mapping[date, int],
) -> Station:
    """A station. swing_f : half the difference of summer and winter; gaps : as of Station."""
    chance = Chance(f"{name} daily swing")
    high, low = [], []
    for i, departure in enumerate(departures):
        day = FIRST + timedelta(i)
        # 1 in the middle of winter, -1 in the middle of summer
        season = math.cos(2.0 * math.pi * (day.timetuple().tm_yday - COLDEST_DAY_OF_YEAR) / 365.25)
        middle = mean_f - swing_f * season + (6.8 + 1.9 * season) * departure
        middle += WINTERS.get(day.year if day.month > 6 else day.year - 1, 0.0) * max(season, 0.0)
        half = max(daily_swing_f * (1.0 - 0.15 * season) + 2.4 * chance.normal(), 2.0)
        high.append(round(middle + half))
        low.append(round(middle - half))
    return Station(name, tuple(high), tuple(low), gaps)
