"""The long-term year: the weather that results are normalized to.

Whatever its source, a long-term year is a weighted sample of daily mean temperatures whose
weights sum to 365 days, sorted, with running sums; so yearly degree-days at any base, and
the days below it, cost one binary search (method.md §4).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

DAYS_PER_YEAR = 365.0  # every long-term year; leap days are averaged over, not added


@dataclass(frozen=True, slots=True)
class LongTermYear:
    """A year of weather as a sorted, weighted sample of daily temperatures.

    name : what a report calls it, e.g. "mean of 10 years, 2014-2023".
    temp_f : (m,) float64 ascending, °F.
    weight : (m,) float64, days a year that each stands for; sums to 365.
    cum_days : (m+1,) float64, running sum of weight, from 0.
    cum_degrees : (m+1,) float64, running sum of weight·temp_f, from 0.
    station : whose weather; source : (file, SHA-256) pairs; notes : sentences.
    years : the calendar years averaged; empty for a typical year.
    left_out : (year, reason) of the years that could not be used.
    """

    name: str
    temp_f: NDArray[np.float64]
    weight: NDArray[np.float64]
    cum_days: NDArray[np.float64]
    cum_degrees: NDArray[np.float64]
    station: str = ""
    method: str = ""
    years: tuple[int, ...] = ()
    left_out: tuple[tuple[int, str], ...] = ()
    source: tuple[tuple[str, str], ...] = ()
    notes: tuple[str, ...] = ()

    def days_below(self, base_f: float) -> float:
        """Days a year colder than the base. [days]"""
        k = int(self.temp_f.searchsorted(base_f, side="left"))
        return float(self.cum_days[k])

    def heating(self, base_f: float) -> float:
        """H0: heating degree-days a year at the base. [°F·day]"""
        k = int(self.temp_f.searchsorted(base_f, side="left"))
        return float(base_f * self.cum_days[k] - self.cum_degrees[k])

    def cooling(self, base_f: float) -> float:
        """C0: cooling degree-days a year at the base. [°F·day]"""
        k = int(self.temp_f.searchsorted(base_f, side="left"))
        days = self.cum_days[-1] - self.cum_days[k]
        return float(self.cum_degrees[-1] - self.cum_degrees[k] - base_f * days)

    @property
    def mean_f(self) -> float:
        """Mean temperature of the year. [°F]"""
        return float(self.cum_degrees[-1] / self.cum_days[-1])
