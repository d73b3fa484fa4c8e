"""The long-term year: the weather that results are normalized to.

Whatever its source, a long-term year is a weighted sample of daily mean temperatures whose
weights sum to 365 days, sorted, with running sums; so yearly degree-days at any base, and
the days below it, cost one binary search (method.md §4).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from datetime import date
from typing import TYPE_CHECKING, Final

import numpy as np

from normalize.days import date_of, day_of, iso
from normalize.errors import MissingWeather, UnreadableWeather, WeatherError
from normalize.weather.words import counted, listed, was

if TYPE_CHECKING:
    from pathlib import Path

    from numpy.typing import ArrayLike, NDArray

    from normalize.weather.temperature import DailyTemperature

DAYS_PER_YEAR = 365.0  # every long-term year; leap days are averaged over, not added
YEARS: Final = 10  # whole calendar years averaged, by default
MIN_TREND_YEARS: Final = 10  # fewer, and a trend is the weather of its ends
MAX_MISSING_DAYS: Final = 15  # of a calendar year, measured days; more and it is left out


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
    trend_f_per_decade, trend_error_f : how fast the record's whole years warmed (negative:
        cooled) and the standard error of that, °F a decade; None with fewer than 10 of them.
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
    trend_f_per_decade: float | None = None
    trend_error_f: float | None = None

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


def year_from_sample(
    name: str,
    temp_f: ArrayLike,
    weight: ArrayLike,
    *,
    station: str = "",
    method: str = "",
    years: tuple[int, ...] = (),
    left_out: tuple[tuple[int, str], ...] = (),
    source: tuple[tuple[str, str], ...] = (),
    notes: tuple[str, ...] = (),
) -> LongTermYear:
    """A long-term year of a weighted sample of daily temperatures, in any order.

    temp_f : (m,) °F, finite.  weight : (m,) days a year each stands for; they sum to 365.
    Raises WeatherError when they do not.

    >>> year_from_sample("half and half", [70.0, 50.0], [182.5, 182.5]).heating(65.0)
    2737.5
    """
    temp = np.asarray(temp_f, dtype=np.float64)
    share = np.asarray(weight, dtype=np.float64)
    if temp.ndim != 1 or temp.shape != share.shape or temp.size == 0:
        raise WeatherError("a long-term year needs as many weights as temperatures", where=name)
    if not np.isfinite(temp).all() or not (share >= 0).all():
        raise WeatherError("a long-term year has a temperature or weight that is none", where=name)
    if abs(float(share.sum()) - DAYS_PER_YEAR) > 1e-6:
        raise WeatherError(f"weights sum to {share.sum():.6f}", where=name, wanted="365 days")
    order = np.argsort(temp, kind="stable")
    temp, share = temp[order], share[order]
    return LongTermYear(
        name=name,
        temp_f=temp,
        weight=share,
        cum_days=_running_sum(share),
        cum_degrees=_running_sum(share * temp),
        station=station,
        method=method,
        years=years,
        left_out=left_out,
        source=source,
        notes=notes,
    )


def _running_sum(values: NDArray[np.float64]) -> NDArray[np.float64]:
    total = np.zeros(values.size + 1, dtype=np.float64)
    np.cumsum(values, out=total[1:])
    return total


def long_term_year(
    weather: DailyTemperature,
    *,
    years: int = YEARS,
    max_missing: int = MAX_MISSING_DAYS,
    last: int | None = None,
) -> LongTermYear:
    """The mean of the last whole calendar years of a station.

    years : how many; where fewer are usable, those are used and a note says so.
    max_missing : days of a calendar year without a measurement (short gaps that were filled
        count too); a year with more is left out and the one before it is taken instead.
    last : the last calendar year that may be used; None for the record's last.

    Every year weighs the same and has 365 days: H0(τ) = 365 × the mean over its days of
    (τ−T)⁺.  Where days are missing, the other days of the same month stand for them, so
    that a gap in January does not make the year milder.

    Raises MissingWeather when no year can be used.
    """
    if years < 1:
        raise WeatherError(f"{years} years cannot be averaged", wanted="1 or more")
    samples: list[_YearSample] = []
    passed: list[tuple[int, str]] = []
    final = date_of(weather.last_day - 1).year
    newest = final if last is None else min(last, final)
    for number in range(newest, date_of(weather.first_day).year - 1, -1):
        if len(samples) == years:
            break
        sample, reason = _calendar_year(weather, number, max_missing)
        if sample is None:
            passed.append((number, reason))
        else:
            samples.append(sample)
    if not samples:
        raise _no_whole_year(weather, passed, max_missing)
    samples.reverse()
    trend = _trend(weather, newest, max_missing)
    used = tuple(s.year for s in samples)
    left_out = tuple(p for p in reversed(passed) if p[0] > used[0] or len(used) < years)
    made = year_from_sample(
        _name(used),
        np.concatenate([s.temp_f for s in samples]),
        np.concatenate([s.weight for s in samples]) / len(samples),
        station=weather.station,
        method=weather.method,
        years=used,
        left_out=left_out,
        source=weather.source,
        notes=(*_year_notes(weather, samples, left_out, years), *_trend_note(trend)),
    )
    if trend is None:
        return made
    return replace(made, trend_f_per_decade=trend.per_decade, trend_error_f=trend.error)


@dataclass(frozen=True, slots=True)
class _Trend:
    """Warming of the yearly means, °F a decade, with its standard error."""

    per_decade: float
    error: float
    n_years: int
    first: int
    last: int


def _trend(weather: DailyTemperature, newest: int, max_missing: int) -> _Trend | None:
    """Least squares through the means of all whole years of the record, not only those averaged."""
    number, mean = [], []
    for year in range(date_of(weather.first_day).year, newest + 1):
        sample, _ = _calendar_year(weather, year, max_missing)
        if sample is not None:
            number.append(year)
            mean.append(float(sample.temp_f @ sample.weight) / DAYS_PER_YEAR)
    if len(number) < MIN_TREND_YEARS:
        return None
    x = np.array(number) - float(np.mean(number))
    y = np.array(mean) - float(np.mean(mean))
    slope = float(x @ y) / float(x @ x)
    left = y - slope * x
    error = float(np.sqrt(float(left @ left) / (len(number) - 2) / float(x @ x)))
    return _Trend(10 * slope, 10 * error, len(number), number[0], number[-1])


def _trend_note(trend: _Trend | None) -> tuple[str, ...]:
    if trend is None:
        return ()
    which = f"The record's {trend.n_years} whole years {trend.first}-{trend.last}"
    error = f"(standard error {trend.error:.1f})"
    if abs(trend.per_decade) < 2 * trend.error:
        return (
            f"{which} show no clear warming or cooling: "
            f"{trend.per_decade:+.1f} °F a decade {error}.".replace("-0.0 ", "+0.0 "),
        )
    moved = "warmed" if trend.per_decade > 0 else "cooled"
    return (
        f"{which} {moved} by {abs(trend.per_decade):.1f} °F a decade {error}, so a mean of past "
        "years is likely to be colder than the years to come."
        if moved == "warmed"
        else f"{which} {moved} by {abs(trend.per_decade):.1f} °F a decade {error}.",
    )


@dataclass(frozen=True, slots=True)
class _YearSample:
    """One calendar year's days; weights sum to 365."""

    year: int
    temp_f: NDArray[np.float64]
    weight: NDArray[np.float64]
    n_filled: int
    n_missing: int


def _calendar_year(
    weather: DailyTemperature, year: int, max_missing: int
) -> tuple[_YearSample | None, str]:
    """A year's days with their weights, or why it cannot be used."""
    start, end = day_of(date(year, 1, 1)), day_of(date(year + 1, 1, 1))
    day = np.arange(max(start, weather.first_day), min(end, weather.last_day), dtype=np.int64)
    temp = weather.temp_f[day - weather.first_day]
    known = np.isfinite(temp)
    n_filled = int(weather.filled[day - weather.first_day].sum())
    n_missing = end - start - int(known.sum())
    lacking = n_missing + n_filled
    if lacking > max_missing:
        if weather.last_day < end and end - weather.last_day > max_missing:
            return None, f"the record ends on {iso(weather.last_day - 1)}"
        if weather.first_day - start > max_missing:
            return None, f"the record begins on {iso(weather.first_day)}"
        return None, f"{counted(lacking, 'day')} missing; at most {max_missing} may be"
    month = day[known].astype("datetime64[D]").astype("datetime64[M]").astype(np.int64) % 12
    if (np.bincount(month, minlength=12) == 0).any():
        return None, "a whole month is missing"
    weight = month_weights(month, [_days_in_month(year, m) for m in range(1, 13)])
    return _YearSample(year, temp[known], weight, n_filled, n_missing), ""


def month_weights(month: NDArray[np.int64], days_in_month: Sequence[int]) -> NDArray[np.float64]:
    """Weights, summing to 365, in which the days present of a month stand for all of it.

    month : (m,) 0 to 11 of each day present.  MissingWeather where a month has no day at all.
    """
    present = np.bincount(month, minlength=12)
    if (present == 0).any():
        raise MissingWeather("a whole month is missing", wanted="days in every month of a year")
    length = np.asarray(days_in_month, dtype=np.float64)
    share: NDArray[np.float64] = (length / present)[month] * (DAYS_PER_YEAR / length.sum())
    return share


def _days_in_month(year: int, month: int) -> int:
    following = date(year + month // 12, month % 12 + 1, 1)
    return (following - date(year, month, 1)).days


def _name(used: tuple[int, ...]) -> str:
    if len(used) == 1:
        return f"the year {used[0]}"
    span = f"{used[0]}-{used[-1]}"
    joiner = ", " if used[-1] - used[0] + 1 == len(used) else " of "
    return f"mean of {len(used)} years{joiner}{span}"


def _year_notes(
    weather: DailyTemperature,
    samples: list[_YearSample],
    left_out: tuple[tuple[int, str], ...],
    wanted: int,
) -> tuple[str, ...]:
    notes = []
    if len(samples) < wanted:
        notes.append(
            f"{counted(wanted, 'year')} were asked for and {len(samples)} could be used; "
            "a mean of few years carries the weather of those years."
        )
    if left_out:
        notes.append(f"Left out: {listed(f'{y} ({why})' for y, why in left_out)}.")
    n_filled = sum(s.n_filled for s in samples)
    if n_filled:
        notes.append(
            f"{counted(n_filled, 'day')} of these years {was(n_filled)} filled in short gaps."
        )
    n_missing = sum(s.n_missing for s in samples)
    if n_missing:
        notes.append(
            f"{counted(n_missing, 'day')} of these years {was(n_missing)} missing; the other days "
            "of the same month stand for them."
        )
    if weather.by_bill:
        notes.append("Its days are the bills' mean temperatures, which makes mild months milder.")
    return tuple(notes)


def _no_whole_year(
    weather: DailyTemperature, passed: list[tuple[int, str]], max_missing: int
) -> MissingWeather:
    reasons = listed(f"{year}: {why}" for year, why in passed)
    return MissingWeather(
        f"no calendar year can be used for a long-term year ({reasons or 'none in the record'})",
        where=weather.station,
        wanted=f"at least one whole year with at most {max_missing} days missing; ten are better",
        next_step="Give a longer file of this station, or a typical-year file as "
        'long_term = { file = "…" } under [weather] in site.toml.',
    )


def read_long_term_year(path: str | Path) -> LongTermYear:
    """The long-term year of a file, recognised by its content.

    Typical years (TMY3, TMY2, EPW), published normals (annual, monthly or daily) and tables
    of twelve monthly means.

    Raises UnreadableWeather when the file holds none.
    """
    from normalize.weather.formats import format_of
    from normalize.weather.source import read_source

    source = read_source(path)
    found = format_of(source.head)
    if found is None or found.read_year is None:
        raise UnreadableWeather(
            "is not a typical-year or normals file",
            where=source.name,
            wanted="TMY3 (CSV), TMY2, EPW, or 1991-2020 normals",
            next_step='Observed years belong in observed = "…" under [weather], and '
            "long_term = { years = 10 } averages them.",
        )
    return found.read_year(source)
