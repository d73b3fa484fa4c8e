"""A long-term year estimated from twelve monthly mean temperatures alone.

Daily temperatures of a month scatter about its mean; their spread is estimated from the mean
and from the spread of the twelve means, and their distribution taken as logistic (Erbs, Klein
& Beckman 1983, ASHRAE Journal 25(6):60-65; formulas as in the ASHRAE Handbook of Fundamentals;
both memory).  It is an estimate, and is called one.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

import numpy as np

from normalize.errors import WeatherError
from normalize.weather.year import DAYS_PER_YEAR, LongTermYear, year_from_sample

if TYPE_CHECKING:
    from numpy.typing import ArrayLike, NDArray

MONTH_DAYS: Final = (31.0, 28.25, 31.0, 30.0, 31.0, 30.0, 31.0, 31.0, 30.0, 31.0, 30.0, 31.0)
SHAPE: Final = 1.698  # a of the logistic distribution
STEP_F: Final = 0.5
REACH_F: Final = 60.0  # either side of the coldest and warmest month
METHOD: Final = "estimated from monthly means (ASHRAE/Erbs)"
ESTIMATE: Final = (
    "An estimate: only the twelve monthly means are known, and the spread of the days about "
    "them is inferred."
)


def monthly_spread(mean_f: NDArray[np.float64]) -> NDArray[np.float64]:
    """(12,) σm, the standard deviation of daily means that the months' means imply. [°F]"""
    spread: NDArray[np.float64] = 3.54 - 0.0290 * mean_f + 0.0664 * mean_f.std(ddof=1)
    return spread


def estimated_heating(mean_f: ArrayLike, base_f: float) -> NDArray[np.float64]:
    """(12,) heating degree-days of each month. [°F·day]

    >>> urbana = [24.8, 29.0, 40.0, 51.9, 62.5, 72.2, 74.9, 73.4, 66.2, 53.9, 41.3, 28.9]
    >>> round(float(estimated_heating(urbana, 65.0).sum()), 1)  # published: 5878
    5922.9
    """
    mean = np.asarray(mean_f, dtype=np.float64)
    days = np.asarray(MONTH_DAYS)
    spread = monthly_spread(mean)
    phi = (base_f - mean) / (spread * np.sqrt(days))
    bend = np.logaddexp(-SHAPE * phi, SHAPE * phi) / (2 * SHAPE)
    total: NDArray[np.float64] = spread * days**1.5 * (phi / 2 + bend)
    return total


def estimated_year(
    mean_f: ArrayLike,
    *,
    station: str = "",
    source: tuple[tuple[str, str], ...] = (),
    notes: tuple[str, ...] = (),
) -> LongTermYear:
    """A long-term year whose degree-days are those of ``estimated_heating`` at any base.

    mean_f : (12,) January to December, °F.  Raises WeatherError for anything else.
    """
    mean = np.asarray(mean_f, dtype=np.float64)
    if mean.shape != (12,) or not np.isfinite(mean).all():
        raise WeatherError("a year has twelve monthly means", wanted="12 temperatures")
    low, high = np.floor(mean.min()) - REACH_F, np.ceil(mean.max()) + REACH_F
    temp = np.arange(low, high + STEP_F / 2, STEP_F)
    heating = np.array([estimated_heating(mean, t).sum() for t in temp])
    # A sample on a grid whose degree-days equal these at each point of it: second differences.
    slope = np.concatenate(([0.0], np.diff(heating) / STEP_F, [sum(MONTH_DAYS)]))
    weight = np.maximum(np.diff(slope), 0.0)
    return year_from_sample(
        f"estimate from monthly means of {station}" if station else "estimate from monthly means",
        temp,
        weight * (DAYS_PER_YEAR / weight.sum()),
        station=station,
        method=METHOD,
        source=source,
        notes=(ESTIMATE, *notes),
    )
