"""ISD-Lite: hours in UTC, fixed width, no header, missing hours left out.

Year 1-4, month 6-7, day 9-11, hour 12-13, air temperature 14-19 in tenths of °C, -9999 missing.
UTC hours are moved to local standard time before days are formed.
"""

from __future__ import annotations

import re
from typing import TYPE_CHECKING, Final

import numpy as np

from normalize.days import FIRST_SANE_DAY, LAST_SANE_DAY
from normalize.errors import UnreadableWeather
from normalize.weather.formats import Format
from normalize.weather.formats.archive import hours_of_archive
from normalize.weather.words import at_lines, counted, was

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from normalize.weather.options import WeatherOptions
    from normalize.weather.source import SourceFile
    from normalize.weather.temperature import DailyTemperature

_LINE: Final = re.compile(rb"(\d{4}) (\d\d) ([ \d]\d) ([ \d]\d)([ \-\d]{5}\d)[ \-\d]{6}[ \-\d]{6}")
MISSING: Final = -9999


def _recognises(head: bytes) -> bool:
    lines = head.splitlines()
    return bool(lines) and all(_hour(line) for line in lines[:2])


def _hour(line: bytes) -> tuple[int, int, int, int, int] | None:
    """Year, month, day, hour and temperature of a line, or None where it is none."""
    match = _LINE.match(line)
    if match is None:
        return None
    try:
        year, month, day, hour, temp = (int(part) for part in match.groups())
    except ValueError:
        return None
    if not (1 <= month <= 12 and 1 <= day <= 31 and hour <= 23):
        return None
    return year, month, day, hour, temp


def _read_days(source: SourceFile, options: WeatherOptions) -> DailyTemperature:
    text, hours, temps, bad = [], [], [], []
    for number, line in enumerate(source.data.splitlines(), start=1):
        found = _hour(line)
        if found is None:
            if line.strip():
                bad.append(number)
            continue
        year, month, day, hour, temp = found
        text.append((year, month, day))
        hours.append(hour)
        temps.append(temp)
    notes = []
    if bad:
        notes.append(
            f"{counted(len(bad), 'line')} that {was(len(bad))} no hour {was(len(bad))} left out "
            f"{at_lines(bad)}."
        )
    if not temps:
        raise UnreadableWeather("has no hour in it", where=source.name, wanted="ISD-Lite lines")
    day_number = _day_numbers(np.array(text, dtype=np.int64))
    sane = (day_number >= FIRST_SANE_DAY) & (day_number < LAST_SANE_DAY)
    value = np.array(temps, dtype=np.float64)
    value[value == MISSING] = np.nan
    return hours_of_archive(
        source,
        source.path.name.split(".", 1)[0],
        day_number[sane],
        np.array(hours, dtype=np.int64)[sane] * 60,
        value[sane] / 10,
        unit="C",
        utc=True,
        options=options,
        notes=notes,
    )


def _day_numbers(dates: NDArray[np.int64]) -> NDArray[np.int64]:
    """Day numbers of (n, 3) years, months and days."""
    months = (dates[:, 0] - 1970) * 12 + dates[:, 1] - 1
    first = months.astype("datetime64[M]").astype("datetime64[D]").astype(np.int64)
    number: NDArray[np.int64] = first + dates[:, 2] - 1
    return number


FORMAT = Format(name="ISD-Lite file", recognises=_recognises, read_days=_read_days)
