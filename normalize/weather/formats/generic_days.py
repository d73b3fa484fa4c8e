"""The rows of a generic table put in the order of the calendar, one value a day."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING, Final

import numpy as np

from normalize.errors import AmbiguousWeather, UnreadableWeather
from normalize.weather.hours import MIN_HOURS, MINUTES_A_DAY, means_of_days
from normalize.weather.options import WeatherOptions, ask
from normalize.weather.stamps import NO_DAY, NO_OFFSET, Stamps
from normalize.weather.temperature import DailyTemperature
from normalize.weather.words import counted, counts, listed

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from normalize.weather.formats.generic_csv import Readings

METHOD_GIVEN: Final = "as given"
METHOD_MAX_MIN: Final = "mean of daily maximum and minimum"
METHOD_HOURS: Final = "mean of hours"
MAX_CONFLICTS: Final = 0.1  # of days or hours given twice with different values; else a few typos
MAX_LOST_SHARE: Final = 0.5  # of the days with max and min, that a mean column may leave empty


def assemble_days(
    readings: Readings, station: str, utc: bool, options: WeatherOptions
) -> DailyTemperature:
    """One row a day: sorted, repeated days resolved, holes in the calendar NaN."""
    ok = readings.stamps.day != NO_DAY
    day = readings.stamps.day[ok]
    columns = [
        c[ok] if c is not None else None for c in (readings.mean, readings.high, readings.low)
    ]
    mean, high, low = columns
    if high is not None and low is not None:
        _drop_crossed(high, low, readings.notes)
    temp, method = _daily_mean(mean, high, low, readings.notes)
    first, temp, high, low = _lay_out(day, temp, high, low, readings)
    if not np.isfinite(temp).any():
        raise _no_temperature(readings.where)
    if utc:
        readings.notes.append("The file's days are UTC days, which begin hours before local days.")
    return _trimmed(station, first, temp, high, low, method, readings.notes)


def _drop_crossed(high: NDArray[np.float64], low: NDArray[np.float64], notes: list[str]) -> None:
    crossed = high < low
    n = int(crossed.sum())
    if n:
        high[crossed] = low[crossed] = np.nan
        notes.append(
            f"{counted(n, 'day')} with a maximum below the minimum {counts(n)} as missing."
        )


def _daily_mean(
    mean: NDArray[np.float64] | None,
    high: NDArray[np.float64] | None,
    low: NDArray[np.float64] | None,
    notes: list[str],
) -> tuple[NDArray[np.float64], str]:
    """The mean as given where there is a column of it, else the mean of maximum and minimum.

    The two are never mixed in one record: they differ systematically.
    """
    if high is None or low is None:
        if mean is None:  # find_columns asks for one or the other
            raise _no_temperature("the table")
        return mean, METHOD_GIVEN
    middle = (high + low) / 2
    if mean is None:
        return middle, METHOD_MAX_MIN
    if np.isfinite(mean).sum() < MAX_LOST_SHARE * np.isfinite(middle).sum():
        notes.append(
            "The column of means is mostly empty, so the mean of maximum and minimum is used "
            "on every day."
        )
        return middle, METHOD_MAX_MIN
    return mean, METHOD_GIVEN


def _lay_out(
    day: NDArray[np.int64],
    temp: NDArray[np.float64],
    high: NDArray[np.float64] | None,
    low: NDArray[np.float64] | None,
    readings: Readings,
) -> tuple[int, NDArray[np.float64], NDArray[np.float64] | None, NDArray[np.float64] | None]:
    """Values at their places in the calendar; days given twice resolved, or made missing."""
    first, n_days = int(day.min()), int(day.max() - day.min()) + 1
    place = day - first
    differing = _resolve_doubles(first, place, temp, readings)

    def laid(column: NDArray[np.float64]) -> NDArray[np.float64]:
        out = np.full(n_days, np.nan)
        known = np.isfinite(column)
        out[place[known]] = column[known]
        out[differing] = np.nan
        return out

    if high is None or low is None:
        return first, laid(temp), None, None
    return first, laid(temp), laid(high), laid(low)


def _resolve_doubles(
    first: int, place: NDArray[np.int64], temp: NDArray[np.float64], readings: Readings
) -> NDArray[np.int64]:
    """Places of days that were given more than once with different temperatures."""
    given = np.isfinite(temp)
    place, temp = place[given], temp[given]
    order = np.lexsort((temp, place))
    same_day = np.diff(place[order]) == 0
    same_value = np.diff(temp[order]) == 0
    if not same_day.any():
        return np.empty(0, dtype=np.int64)
    doubled = np.unique(place[order][1:][same_day])
    differing = np.unique(place[order][1:][same_day & ~same_value])
    same = doubled.size - differing.size
    if differing.size > MAX_CONFLICTS * len(set(place.tolist())):
        raise _several_stations(f"{differing.size} days", readings.where)
    if same:
        readings.notes.append(
            f"{counted(same, 'day')} given more than once with one value {counts(same)} once."
        )
    if differing.size:
        dates = listed((first + differing).astype("datetime64[D]"))
        readings.notes.append(
            f"{counted(differing.size, 'day')} given more than once with different temperatures "
            f"{counts(differing.size)} as missing: {dates}."
        )
    return differing


def assemble_hours(
    readings: Readings, station: str, utc: bool, options: WeatherOptions
) -> DailyTemperature:
    """Hourly rows averaged over the days of the local calendar."""
    if readings.mean is None:
        raise UnreadableWeather(
            "has several rows a day and no column of temperatures, only maximum and minimum",
            where=readings.where,
            wanted="one row a day, or a column of hourly temperatures",
            next_step='Write temperature_column = "…" under [weather] in site.toml.',
        )
    ok = readings.stamps.day != NO_DAY
    stamp = _local_minutes(readings.stamps, utc, readings.where, options, readings.notes)[ok]
    means = means_of_days(stamp, readings.mean[ok])
    if means.conflicting > MAX_CONFLICTS * int(means.hours.sum() + means.conflicting):
        raise _several_stations(f"{means.conflicting} readings", readings.where)
    if not np.isfinite(means.mean).any():
        most = int(means.hours.max()) if means.hours.size else 0
        raise UnreadableWeather(
            f"no day has {MIN_HOURS} of its hours; the fullest has {most}",
            where=readings.where,
            wanted="hourly temperatures",
            next_step="Use a daily file of this station.",
        )
    temp = means.mean
    notes = readings.notes
    if means.repeated:
        notes.append(
            f"{counted(means.repeated, 'reading')} repeated the time of another; where the two "
            f"differ ({means.conflicting}) both are left out, else one is."
        )
    short = int(np.isnan(temp[means.hours > 0]).sum())
    if short:
        notes.append(
            f"{counted(short, 'day')} with fewer than {MIN_HOURS} hours {counts(short)} as missing."
        )
    daily = _trimmed(station, means.first_day, temp, None, None, METHOD_HOURS, notes)
    return replace(daily, hour_day=means.hour_day, hour_f=means.hour_mean)


def _local_minutes(
    stamps: Stamps, utc: bool, where: str, options: WeatherOptions, notes: list[str]
) -> NDArray[np.int64]:
    """Minutes since 1970-01-01 of local standard time, or of the clock as written."""
    minute = stamps.day * MINUTES_A_DAY + stamps.minute
    read = stamps.day != NO_DAY
    if bool((stamps.minute[read] == MINUTES_A_DAY).any()):
        minute = minute - 60
        notes.append("Hours run to 24:00, so each is taken as the hour that ends then.")
    stated = stamps.offset[read] != NO_OFFSET
    if stated.any() and not stated.all():
        raise AmbiguousWeather(
            f"{int(stated.sum())} of {stated.size} times state a time zone",
            where=where,
            wanted="all of them or none",
            next_step="Write all times in local time.",
        )
    if stated.any():
        is_utc = not stamps.offset[read].any()
        if options.time_zone_offset is None and not is_utc:
            return minute  # each time is written in its own local clock already
        minute = minute - np.where(read, stamps.offset, 0)
        utc = True
    if not utc and options.time_zone_offset is None:
        return minute
    if options.time_zone_offset is None:
        raise ask(
            "hours are in UTC, and days begin at local midnight",
            where=where,
            key="time_zone_offset",
            choices="-5 (hours from UTC to local standard time: US Eastern -5, Pacific -8)",
        )
    notes.append(
        f"UTC hours were moved to local standard time, {options.time_zone_offset:+g} hours."
    )
    return minute + round(options.time_zone_offset * 60)


def _trimmed(
    station: str,
    first: int,
    temp: NDArray[np.float64],
    high: NDArray[np.float64] | None,
    low: NDArray[np.float64] | None,
    method: str,
    notes: list[str],
) -> DailyTemperature:
    """From the first day with a temperature to the last."""
    known = np.flatnonzero(np.isfinite(temp))
    cut = slice(int(known[0]), int(known[-1]) + 1)
    return DailyTemperature(
        station=station,
        first_day=first + int(known[0]),
        temp_f=temp[cut].copy(),
        filled=np.zeros(cut.stop - cut.start, dtype=np.bool_),
        method=method,
        notes=tuple(notes),
        max_f=high[cut].copy() if high is not None else None,
        min_f=low[cut].copy() if low is not None else None,
    )


def _several_stations(what: str, where: str) -> UnreadableWeather:
    return UnreadableWeather(
        f"{what} stand in the file more than once with different temperatures",
        where=where,
        wanted="one station, each day or hour once",
        next_step="If the file holds several stations, keep the rows of one.",
    )


def _no_temperature(where: str) -> UnreadableWeather:
    return UnreadableWeather(
        "no day has a temperature",
        where=where,
        wanted="a number for most days",
        next_step="Check the column: temperature_column under [weather] in site.toml.",
    )
