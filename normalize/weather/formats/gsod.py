"""Global summaries of the day: °F, and days that run from midnight to midnight GMT.

STATION,DATE,…,TEMP,TEMP_ATTRIBUTES (number of observations),…,MAX,MAX_ATTRIBUTES,MIN,…;
missing is 9999.9; "*" beside MAX or MIN says that it was derived from the hours.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

import numpy as np

from normalize.weather.degrees import read_numbers
from normalize.weather.formats import Format
from normalize.weather.formats.archive import (
    days_of_archive,
    nothing_in,
    one_station,
    table_of_archive,
)
from normalize.weather.hours import MIN_HOURS
from normalize.weather.source import clean_name
from normalize.weather.stamps import read_stamps
from normalize.weather.words import counted, counts

if TYPE_CHECKING:
    from normalize.weather.options import WeatherOptions
    from normalize.weather.source import SourceFile
    from normalize.weather.temperature import DailyTemperature

METHOD: Final = "mean of the observations of a GMT day"
GMT_DAYS: Final = (
    "Its days are GMT days, which begin hours before local ones (at 19:00 the evening before in "
    "US Eastern time): bills' days and the station's do not quite match. GHCN-Daily has local days."
)


def _recognises(head: bytes) -> bool:
    line = head.decode("utf-8-sig", "replace").split("\n", 1)[0]
    return all(name in line for name in ("STATION", "DATE", "TEMP_ATTRIBUTES", "FRSHTT"))


def _read_days(source: SourceFile, options: WeatherOptions) -> DailyTemperature:
    rows = table_of_archive(source, _NEEDED)
    station = one_station(sorted({row["STATION"] for row in rows}), source.name, options)
    rows = [row for row in rows if row["STATION"] == station]
    notes = [GMT_DAYS]
    mean, high, low = (read_numbers([row[c] or "" for row in rows]).value for c in _COLUMNS)
    count = read_numbers([row["TEMP_ATTRIBUTES"] or "" for row in rows]).value
    few = np.isfinite(mean) & ~(count >= MIN_HOURS)
    if few.any():
        n = int(few.sum())
        notes.append(
            f"{counted(n, 'day')} with fewer than {MIN_HOURS} observations {counts(n)} as missing."
        )
        mean[few] = np.nan
    derived = sum("*" in f"{row['MAX_ATTRIBUTES']}{row['MIN_ATTRIBUTES']}" for row in rows)
    if derived:
        notes.append(f"On {counted(derived, 'day')} maximum or minimum was derived from the hours.")
    day = read_stamps([row["DATE"].strip() for row in rows], source.name).day
    if not np.isfinite(mean).any():
        raise nothing_in(source.name)
    name = clean_name(rows[0].get("NAME") or "")
    label = f"{name} ({station})" if name else station
    return days_of_archive(
        source, label, day, unit="F", mean=mean, high=high, low=low, given=METHOD, notes=notes
    )


_COLUMNS: Final = ("TEMP", "MAX", "MIN")
_NEEDED: Final = (
    "STATION", "DATE", *_COLUMNS, "TEMP_ATTRIBUTES", "MAX_ATTRIBUTES", "MIN_ATTRIBUTES"
)  # fmt: skip

FORMAT = Format(name="global summary of the day", recognises=_recognises, read_days=_read_days)
