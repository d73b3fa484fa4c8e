"""TMY3, the typical meteorological year as CSV (1991-2005 archive and its kin).

Line 1 is the station (number, "name", state, time zone, latitude, longitude, elevation),
line 2 the header, then 8760 hours.  Source of the layout: files of the archive.
"""

from __future__ import annotations

import csv
import re
from typing import TYPE_CHECKING, Final

import numpy as np

from normalize.errors import UnreadableWeather
from normalize.weather.degrees import read_numbers
from normalize.weather.formats import Format
from normalize.weather.formats.typical import typical_year
from normalize.weather.source import decode

if TYPE_CHECKING:
    from normalize.weather.source import SourceFile
    from normalize.weather.year import LongTermYear

_DATE: Final = "Date (MM/DD/YYYY)"
_TIME: Final = "Time (HH:MM)"
_DRY_BULB: Final = "Dry-bulb (C)"
_DATE_TEXT: Final = re.compile(r"(\d{1,2})/(\d{1,2})/\d{2,4}$")
_TIME_TEXT: Final = re.compile(r"(\d{1,2}):(\d{2})$")
_MISSING: Final = -9900.0  # (memory)


def _recognises(head: bytes) -> bool:
    return all(name.encode() in head for name in (_DATE, _TIME, _DRY_BULB))


def _read_year(source: SourceFile) -> LongTermYear:
    rows = csv.reader(decode(source).splitlines())
    try:
        first, header = next(rows), next(rows)
        date, time, dry_bulb = (header.index(name) for name in (_DATE, _TIME, _DRY_BULB))
        body = [row for row in rows if row]
    except (StopIteration, ValueError, csv.Error):
        raise _torn(source.name, 2) from None
    when, cells = [], []
    for i, row in enumerate(body):
        day = _DATE_TEXT.match(row[date].strip()) if len(row) > date else None
        clock = _TIME_TEXT.match(row[time].strip()) if len(row) > time else None
        if day is None or clock is None or len(row) <= dry_bulb:
            raise _torn(source.name, i + 3)
        when.append((int(day[1]), int(day[2]), int(clock[1]), 0))
        cells.append(row[dry_bulb])
    temp_c = read_numbers(cells).value
    temp_c[temp_c <= _MISSING] = np.nan
    return typical_year(source, _station(first), when, temp_c)


def _station(first: list[str]) -> str:
    name = first[1].strip() if len(first) > 1 else ""
    state = first[2].strip() if len(first) > 2 else ""
    return f"{name.title()}, {state}" if name and state else name


def _torn(name: str, line: int) -> UnreadableWeather:
    return UnreadableWeather(
        "is not a whole TMY3 row",
        where=f"{name}:{line}",
        wanted=f"the columns {_DATE!r}, {_TIME!r} and {_DRY_BULB!r}",
        next_step="Download the file again.",
    )


FORMAT = Format(name="TMY3 file", recognises=_recognises, read_year=_read_year)
