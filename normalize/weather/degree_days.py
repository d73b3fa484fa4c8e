"""Degree-days: by day, by period, by month, by year, at any base.

A period, month or year with a missing day has no degree-days, rather than too few.  Degree-days
at one base are never rescaled to another: they are summed anew (Ephrata's five published bases
in docs/method.md show why).
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date
from typing import TYPE_CHECKING, Final

import numpy as np

from normalize.days import date_of, day_of, iso
from normalize.errors import MissingWeather, WeatherError
from normalize.weather.methods import daily_degree_days

if TYPE_CHECKING:
    from numpy.typing import ArrayLike, NDArray

    from normalize.weather.temperature import DailyTemperature

BASE_RANGE_F: Final = (-40.0, 140.0)  # outside it a base is a typing error
_BASE: Final = re.compile(r"\s*([-+]?\d+(?:\.\d+)?)\s*(?:°|º|deg)?\s*([FfCc])\s*$")


@dataclass(frozen=True, slots=True)
class Base:
    """A base temperature as the user gave it. unit : "F" or "C"."""

    degrees: float
    unit: str

    @property
    def base_f(self) -> float:
        """The base in °F."""
        return self.degrees * 9 / 5 + 32 if self.unit == "C" else self.degrees

    @property
    def per_f_day(self) -> float:
        """What one °F·day is in this base's own unit of degree-days."""
        return 5 / 9 if self.unit == "C" else 1.0

    def __str__(self) -> str:
        return f"{self.degrees:g} °{self.unit}"


def parse_base(text: str) -> Base:
    """A base such as "65F" or "18C".

    >>> parse_base("65F").base_f, parse_base("18 °C").base_f
    (65.0, 64.4)
    """
    match = _BASE.match(text)
    if not match:
        raise WeatherError(
            f"{text!r} is not a base temperature",
            where="base",
            wanted="a number with its unit, such as 65F or 18C",
        )
    base = Base(float(match[1]), match[2].upper())
    if not BASE_RANGE_F[0] <= base.base_f <= BASE_RANGE_F[1]:
        raise WeatherError(
            f"{base} is no base temperature for a building",
            where="base",
            wanted=f"{BASE_RANGE_F[0]:.0f}F to {BASE_RANGE_F[1]:.0f}F",
        )
    return base


def daily_heating(temp_f: ArrayLike, base_f: float) -> NDArray[np.float64]:
    """(n_days,) heating degree-days of each day, NaN where the day is missing. [°F·day]

    >>> daily_heating([23.0, 67.0], 65.0).tolist()  # 12 and 34 °F; a mild day
    [42.0, 0.0]
    """
    return np.maximum(base_f - np.asarray(temp_f, dtype=np.float64), 0.0)


def daily_cooling(temp_f: ArrayLike, base_f: float) -> NDArray[np.float64]:
    """(n_days,) cooling degree-days of each day, NaN where the day is missing. [°F·day]

    >>> daily_cooling([78.0, 61.0], 65.0).tolist()  # 68 and 88 °F; a cool day
    [13.0, 0.0]
    """
    return np.maximum(np.asarray(temp_f, dtype=np.float64) - base_f, 0.0)


def heating_degree_days(temp_f: ArrayLike, base_f: float) -> float:
    """Heating degree-days of some days together. [°F·day] MissingWeather if any is NaN.

    >>> heating_degree_days([50.0, 60.0, 70.0], base_f=65.0)
    20.0
    """
    return _total(daily_heating(temp_f, base_f))


def cooling_degree_days(temp_f: ArrayLike, base_f: float) -> float:
    """Cooling degree-days of some days together. [°F·day] MissingWeather if any is NaN.

    >>> cooling_degree_days([50.0, 60.0, 70.0], base_f=65.0)
    5.0
    """
    return _total(daily_cooling(temp_f, base_f))


def _total(by_day: NDArray[np.float64]) -> float:
    missing = int(np.isnan(by_day).sum())
    if missing:
        raise MissingWeather(
            f"{missing} of {by_day.size} days have no temperature",
            wanted="every day of the period",
            next_step="Fill the gap from a neighbouring station, or leave the period out.",
        )
    return float(by_day.sum())


@dataclass(frozen=True, slots=True)
class PeriodDegreeDays:
    """Degree-days of periods, in the base's own unit.

    heating, cooling : (n,) float64, NaN where a day is missing.
    days_missing, days_filled : (n,) int64.
    """

    heating: NDArray[np.float64]
    cooling: NDArray[np.float64]
    days_missing: NDArray[np.int64]
    days_filled: NDArray[np.int64]


def by_period(
    weather: DailyTemperature,
    start: ArrayLike,
    end: ArrayLike,
    base: Base,
    *,
    method: str = "mean",
) -> PeriodDegreeDays:
    """Degree-days over each period's own days.

    start, end : (n,) day numbers, half-open; they may reach outside the record, whose days
    there are missing.  method : one of ``methods.METHODS``.

    >>> from normalize.weather.temperature import DailyTemperature
    >>> w = DailyTemperature("S", 0, np.array([50.0, 60.0, 70.0]), np.zeros(3, bool))
    >>> by_period(w, [0, 1], [2, 4], parse_base("65F")).heating.tolist()
    [20.0, nan]
    """
    starts, ends = np.asarray(start, dtype=np.int64), np.asarray(end, dtype=np.int64)
    if (ends < starts).any():
        raise WeatherError("a period ends before it starts", wanted="start before end")
    n = starts.size
    daily = daily_degree_days(weather, base, method)
    known = np.isfinite(daily.heating)
    heating, cooling = np.empty(n), np.empty(n)
    missing, filled = np.empty(n, dtype=np.int64), np.empty(n, dtype=np.int64)
    for i, (a, b) in enumerate(zip(starts.tolist(), ends.tolist(), strict=True)):
        cut = slice(max(a - weather.first_day, 0), max(b - weather.first_day, 0))
        missing[i] = b - a - int(known[cut].sum())
        filled[i] = int((weather.filled[cut] & known[cut]).sum())
        heating[i] = daily.heating[cut].sum() if missing[i] == 0 else np.nan
        cooling[i] = daily.cooling[cut].sum() if missing[i] == 0 else np.nan
    return PeriodDegreeDays(heating, cooling, missing, filled)


@dataclass(frozen=True, slots=True)
class DegreeDayRow:
    """One month, year or bill of a table. start, end : day numbers, half-open.

    heating, cooling : in the base's own unit; None where a day is missing ("incomplete").
    heating_so_far, cooling_so_far : over the days that are present.
    mean_f : of the days that are present; None where there are none.
    growing : growing degree-days without a ceiling, (mean − base)⁺; None where a day is missing.
    """

    label: str
    start: int
    end: int
    heating: float | None
    cooling: float | None
    heating_so_far: float
    cooling_so_far: float
    mean_f: float | None
    days_present: int
    days_missing: int
    days_filled: int
    growing: float | None = None

    @property
    def complete(self) -> bool:
        """Whether every day of the calendar is there."""
        return self.days_missing == 0


@dataclass(frozen=True, slots=True)
class DegreeDayTable:
    """Degree-days of a station by month, by year or by bill.

    by : "month", "year" or "bill".  method : how each day's mean was formed.
    """

    station: str
    by: str
    base: Base
    method: str
    rows: tuple[DegreeDayRow, ...]

    @property
    def unit(self) -> str:
        """Unit of heating and cooling: "°F·day" or "°C·day"."""
        return f"°{self.base.unit}·day"

    @property
    def incomplete(self) -> tuple[str, ...]:
        """Labels of the rows with missing days."""
        return tuple(row.label for row in self.rows if not row.complete)


def monthly_degree_days(
    weather: DailyTemperature, base: Base, *, method: str = "mean"
) -> DegreeDayTable:
    """Degree-days of every calendar month that the record touches.

    method : one of ``methods.METHODS``; "whole-degrees" counts as the weather service does.
    """
    first, last = date_of(weather.first_day), date_of(weather.last_day - 1)
    n = (last.year - first.year) * 12 + last.month - first.month + 1
    months = [divmod(first.year * 12 + first.month - 1 + i, 12) for i in range(n + 1)]
    edges = [day_of(date(year, month + 1, 1)) for year, month in months]
    spans = list(zip([iso(e)[:7] for e in edges], edges[:-1], edges[1:], strict=False))
    return _table(weather, base, "month", spans, method)


def annual_degree_days(
    weather: DailyTemperature, base: Base, *, method: str = "mean"
) -> DegreeDayTable:
    """Degree-days of every calendar year that the record touches; see monthly_degree_days."""
    years = range(date_of(weather.first_day).year, date_of(weather.last_day - 1).year + 2)
    edges = [day_of(date(year, 1, 1)) for year in years]
    spans = list(zip([iso(e)[:4] for e in edges], edges[:-1], edges[1:], strict=False))
    return _table(weather, base, "year", spans, method)


def bill_degree_days(
    weather: DailyTemperature, start: ArrayLike, end: ArrayLike, base: Base, *, method: str = "mean"
) -> DegreeDayTable:
    """Degree-days of each bill's own days; start, end : (n,) day numbers, half-open."""
    starts, ends = np.asarray(start, dtype=np.int64), np.asarray(end, dtype=np.int64)
    spans = [
        (f"{iso(a)} to {iso(b - 1)}", a, b)
        for a, b in zip(starts.tolist(), ends.tolist(), strict=True)
    ]
    return _table(weather, base, "bill", spans, method)


def _table(
    weather: DailyTemperature,
    base: Base,
    by: str,
    spans: Sequence[tuple[str, int, int]],
    method: str,
) -> DegreeDayTable:
    daily = daily_degree_days(weather, base, method)
    temp_f, known = daily.temp_f, np.isfinite(daily.heating)
    growing = np.maximum(temp_f - base.base_f, 0.0) * base.per_f_day
    rows = []
    for label, a, b in spans:
        cut = slice(max(a - weather.first_day, 0), max(b - weather.first_day, 0))
        present = int(known[cut].sum())
        hdd, cdd = float(np.nansum(daily.heating[cut])), float(np.nansum(daily.cooling[cut]))
        whole = present == b - a
        rows.append(
            DegreeDayRow(
                label=label,
                start=a,
                end=b,
                heating=hdd if whole else None,
                cooling=cdd if whole else None,
                heating_so_far=hdd,
                cooling_so_far=cdd,
                mean_f=float(np.nansum(temp_f[cut])) / present if present else None,
                days_present=present,
                days_missing=b - a - present,
                days_filled=int((weather.filled[cut] & known[cut]).sum()),
                growing=float(np.nansum(growing[cut])) if whole else None,
            )
        )
    return DegreeDayTable(weather.station, by, base, daily.method, tuple(rows))
