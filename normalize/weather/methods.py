"""How a day's degree-days are formed, and whether two records were formed alike.

The conventions differ by a few per cent, so a baseline and its long-term year must follow the
same one, or the result must say that they do not.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np

from normalize.errors import MissingWeather, WeatherError
from normalize.weather.day_means import (
    exact_mean,
    four_case_cooling,
    four_case_heating,
    whole_degree_mean,
)

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from normalize.weather.degree_days import Base
    from normalize.weather.temperature import DailyTemperature
    from normalize.weather.year import LongTermYear

METHODS: Final = {
    "mean": "the day's mean as the file gives it",
    "max-min": "mean of daily maximum and minimum",
    "whole-degrees": "mean of maximum and minimum in whole °F, rounded half up",
    "four-case": "four-case formulas on maximum and minimum",
    "hourly": "hour by hour, then averaged over the day",
}

# What the methods of records and years amount to; anything else is not known.
_KINDS: Final = (
    ("hour", "means of hours"),
    ("observations", "means of hours"),
    ("maximum and minimum", "means of maximum and minimum"),
    ("monthly means", "an estimate from monthly means"),
    ("printed on the bills", "the bills' own means"),
)


@dataclass(frozen=True, slots=True)
class DailyDegreeDays:
    """Degree-days of each day in the base's own unit, (n_days,), NaN where missing.

    temp_f : the mean behind them.  method : in words.
    """

    heating: NDArray[np.float64]
    cooling: NDArray[np.float64]
    temp_f: NDArray[np.float64]
    method: str


def daily_degree_days(
    weather: DailyTemperature, base: Base, method: str = "mean"
) -> DailyDegreeDays:
    """Degree-days of every day of a record.

    method : one of METHODS.  Filled days have a mean only: with any method but "mean" they
    are missing.  Raises MissingWeather when the file lacks what the method needs.
    """
    if method not in METHODS:
        raise WeatherError(f"{method!r} is no method", where="method", wanted=" or ".join(METHODS))
    if method == "hourly":
        return _hourly(weather, base)
    if method == "four-case":
        high, low = _max_min(weather)
        heating = four_case_heating(high, low, base.base_f)
        cooling = four_case_cooling(high, low, base.base_f)
        mean = exact_mean(high, low)
        return _in_unit(heating, cooling, mean, base, METHODS[method])
    mean, label = weather.temp_f, weather.method
    if method == "max-min":
        mean, label = exact_mean(*_max_min(weather)), METHODS[method]
    elif method == "whole-degrees":
        if base.unit != "F":
            raise WeatherError(
                "whole degrees are counted in °F", where="base", wanted="a base in °F"
            )
        mean, label = whole_degree_mean(*_max_min(weather)), METHODS[method]
    heating, cooling = np.maximum(base.base_f - mean, 0.0), np.maximum(mean - base.base_f, 0.0)
    return _in_unit(heating, cooling, mean, base, label)


def _in_unit(
    heating: NDArray[np.float64],
    cooling: NDArray[np.float64],
    mean: NDArray[np.float64],
    base: Base,
    label: str,
) -> DailyDegreeDays:
    return DailyDegreeDays(heating * base.per_f_day, cooling * base.per_f_day, mean, label)


def _max_min(weather: DailyTemperature) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    if weather.max_f is None or weather.min_f is None:
        raise MissingWeather(
            f"the file of {weather.station} has no daily maximum and minimum",
            wanted="both, for this method",
            next_step="Choose another method, or use a file with maximum and minimum.",
        )
    return weather.max_f, weather.min_f


def _hourly(weather: DailyTemperature, base: Base) -> DailyDegreeDays:
    """Each hour's departure from the base, averaged over the hours that the day has.

    A day of 23 or 25 hours counts as one day.
    """
    if weather.hour_day is None or weather.hour_f is None:
        raise MissingWeather(
            f"the file of {weather.station} has no hours",
            wanted="hourly temperatures, for this method",
            next_step="Choose another method, or use an hourly file.",
        )
    place = weather.hour_day - weather.first_day
    inside = (place >= 0) & (place < weather.n_days)
    place, hour_f = place[inside], weather.hour_f[inside]
    hours = np.bincount(place, minlength=weather.n_days)
    measured = np.isfinite(weather.temp_f) & ~weather.filled & (hours > 0)

    def by_day(value: NDArray[np.float64]) -> NDArray[np.float64]:
        total = np.bincount(place, weights=value, minlength=weather.n_days)
        return np.where(measured, total / np.maximum(hours, 1), np.nan)

    heating = by_day(np.maximum(base.base_f - hour_f, 0.0))
    cooling = by_day(np.maximum(hour_f - base.base_f, 0.0))
    mean = np.where(measured, weather.temp_f, np.nan)
    return _in_unit(heating, cooling, mean, base, METHODS["hourly"])


def kind_of(method: str) -> str:
    """What a record's method amounts to, or "" where that is not known.

    >>> kind_of("mean of hours, typical year"), kind_of("as given")
    ('means of hours', '')
    """
    return next((kind for mark, kind in _KINDS if mark in method), "")


def mismatch(weather: DailyTemperature, year: LongTermYear) -> str:
    """A sentence when a record and its long-term year form a day's mean differently, else "".

    A report prints it among the cautions.
    """
    if not year.method or weather.method == year.method:
        return ""
    ours, theirs = kind_of(weather.method), kind_of(year.method)
    if ours and ours == theirs:
        return ""
    if ours and theirs:
        return (
            f"The bills were fitted to {ours} and the long-term year is made of {theirs}: the "
            "two differ by up to a few per cent of a year's degree-days, and so may the answer."
        )
    which = "long-term year" if ours else "station's file"
    return (
        f"How the {which} forms a day's mean is not said, so it may differ from the other "
        "record's way by a few per cent of a year's degree-days."
    )
