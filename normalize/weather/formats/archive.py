"""What the readers of public archives share: columns of numbers put in the calendar's order.

Each archive's own module knows its layout, units and flags; from there on its days take the
same way as those of any table.
"""

from __future__ import annotations

import csv
from collections.abc import Sequence
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from normalize.errors import UnreadableWeather
from normalize.weather.degrees import drop_absurd, to_fahrenheit
from normalize.weather.formats.generic_csv import Readings
from normalize.weather.formats.generic_days import METHOD_GIVEN, assemble_days, assemble_hours
from normalize.weather.options import WeatherOptions, ask
from normalize.weather.source import clean_name, decode
from normalize.weather.stamps import NO_DAY, NO_OFFSET, Stamps
from normalize.weather.words import counted, counts, listed

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from normalize.weather.source import SourceFile
    from normalize.weather.temperature import DailyTemperature


def days_of_archive(
    source: SourceFile,
    station: str,
    day: NDArray[np.int64],
    *,
    unit: str,
    mean: NDArray[np.float64] | None = None,
    high: NDArray[np.float64] | None = None,
    low: NDArray[np.float64] | None = None,
    given: str = METHOD_GIVEN,
    notes: Sequence[str] = (),
) -> DailyTemperature:
    """Daily temperature of rows that hold a day each, in any order.

    day : (n,) day numbers.  mean, high, low : (n,) in unit "F" or "C", NaN where missing.
    given : what the archive's own mean is, where that is used.
    """
    said = list(notes)
    columns = [_fahrenheit(c, unit, source.name, said) for c in (mean, high, low)]
    readings = _readings(source.name, day, np.zeros_like(day), columns, said)
    made = assemble_days(readings, station, False, WeatherOptions())
    return replace(made, method=given) if made.method == METHOD_GIVEN else made


def hours_of_archive(
    source: SourceFile,
    station: str,
    day: NDArray[np.int64],
    minute: NDArray[np.int64],
    temp: NDArray[np.float64],
    *,
    unit: str,
    utc: bool,
    options: WeatherOptions,
    notes: Sequence[str] = (),
) -> DailyTemperature:
    """Daily means of rows that hold an hour each. minute : (n,) of the day; temp : (n,)."""
    said = list(notes)
    mean = _fahrenheit(temp, unit, source.name, said)
    readings = _readings(source.name, day, minute, [mean, None, None], said)
    return assemble_hours(readings, station, utc, options)


def _readings(
    where: str,
    day: NDArray[np.int64],
    minute: NDArray[np.int64],
    columns: Sequence[NDArray[np.float64] | None],
    notes: list[str],
) -> Readings:
    if not (day != NO_DAY).any():
        raise nothing_in(where)
    offset = np.full_like(day, NO_OFFSET)
    mean, high, low = columns
    line = np.arange(1, day.size + 1, dtype=np.int64)
    return Readings(where, line, Stamps(day, minute, offset), mean, high, low, notes)


def _fahrenheit(
    value: NDArray[np.float64] | None, unit: str, where: str, notes: list[str]
) -> NDArray[np.float64] | None:
    if value is None:
        return None
    temp_f = to_fahrenheit(value.astype(np.float64), unit)
    absurd = drop_absurd(temp_f, where, unit)
    if absurd:
        notes.append(
            f"{counted(absurd, 'temperature')} outside -90 to 60 °C (-130 to 140 °F) "
            f"{counts(absurd)} as missing."
        )
    return temp_f


def table_of_archive(source: SourceFile, needed: Sequence[str]) -> list[dict[str, str]]:
    """The rows of a delimited archive file under its header, each with every needed column.

    Repeated headers (files put on end) are passed over; a short row's cells are empty.
    """
    reader = csv.DictReader(decode(source).splitlines(), restval="", restkey="")
    try:
        names = [name.strip() for name in reader.fieldnames or ()]
        reader.fieldnames = names
        lacking = [name for name in needed if name not in names]
        if lacking:
            raise UnreadableWeather(
                f"has no column {' and no column '.join(map(repr, lacking[:3]))}",
                where=source.name,
                wanted="the archive's own file, all of its columns",
                next_step="Download the file again.",
            )
        rows = [row for row in reader if row[needed[0]].strip() not in ("", needed[0])]
    except csv.Error as error:
        raise UnreadableWeather(
            f"cannot be read as a table ({error})",
            where=source.name,
            next_step="Download the file again.",
        ) from None
    if not rows:
        raise nothing_in(source.name)
    return rows


def nothing_in(where: str) -> UnreadableWeather:
    """The error of a file in a known layout that has no temperature at all."""
    return UnreadableWeather(
        "holds no daily temperatures",
        where=where,
        wanted="maximum and minimum, or the mean, of a station's days",
        next_step="Choose another station: this one measures no temperature.",
    )


def one_station(stations: Sequence[str], where: str, options: WeatherOptions) -> str:
    """Which of a file's stations is meant; asks where there are several.

    stations : the different ones, in order.
    """
    if len(stations) == 1:
        return stations[0]
    if options.station in stations:
        return options.station or ""
    raise ask(
        f"holds {len(stations)} stations: {listed(clean_name(n) for n in stations)}",
        where=where,
        key="station",
        choices=" or ".join(f'"{clean_name(n)}"' for n in stations[:3]),
    )
