"""EPW, the weather file of building simulation: eight header lines, then hours.

Columns: year, month, day, hour (1-24, hour ending), minute, flags, dry bulb in °C, …
Missing dry bulb is 99.9 or more (memory).  The years of the months differ and are not used.
"""

from __future__ import annotations

import csv
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

MAX_HEADER: Final = 20  # lines; the format has 8
_MISSING_C: Final = 99.9
_DRY_BULB: Final = 6


def _recognises(head: bytes) -> bool:
    start = head.removeprefix(b"\xef\xbb\xbf").lstrip()[:9].upper()
    return start == b"LOCATION," and b"DATA PERIODS" in head.upper()


def _read_year(source: SourceFile) -> LongTermYear:
    lines = decode(source).splitlines()
    marks = [
        i for i, line in enumerate(lines[:MAX_HEADER]) if line.upper().startswith("DATA PERIODS")
    ]
    if not marks:
        raise _torn(source.name, 8)
    location = next(csv.reader([lines[0]]))
    when, cells = [], []
    for i, row in enumerate(csv.reader(lines[marks[0] + 1 :])):
        if not row:
            continue
        try:
            month, day, hour = int(row[1]), int(row[2]), int(row[3])
            minute = int(row[4]) % 60  # a whole hour is written 0 or 60
            cells.append(row[_DRY_BULB])
        except (ValueError, IndexError):
            raise _torn(source.name, marks[0] + 2 + i) from None
        when.append((month, day, hour, minute))
    temp_c = read_numbers(cells).value
    temp_c[temp_c >= _MISSING_C] = np.nan
    place = [part.strip() for part in location[1:4] if part.strip() not in ("", "-")]
    return typical_year(source, ", ".join(place), when, temp_c)


def _torn(name: str, line: int) -> UnreadableWeather:
    return UnreadableWeather(
        "is not a whole EPW row",
        where=f"{name}:{line}",
        wanted="year, month, day, hour, minute, flags, dry bulb …",
        next_step="Download the file again.",
    )


FORMAT = Format(name="EPW file", recognises=_recognises, read_year=_read_year)
