"""TMY2, the older typical year: fixed width, dry bulb in tenths of °C in columns 68 to 71.

Line 1: station number, city, state, time zone, latitude, longitude, elevation; then 8760 lines
that begin with year, month, day and hour (1 to 24, hour ending), two characters each (memory).
"""

from __future__ import annotations

import re
from typing import TYPE_CHECKING, Final

import numpy as np

from normalize.errors import UnreadableWeather
from normalize.weather.formats import Format
from normalize.weather.formats.typical import typical_year
from normalize.weather.source import decode

if TYPE_CHECKING:
    from normalize.weather.source import SourceFile
    from normalize.weather.year import LongTermYear

_FIRST: Final = re.compile(r"\s*\d{5}\s+(\S.*?)\s+([A-Z]{2})\s+-?\d+\s+[NS]\s")
_HOUR: Final = re.compile(r" ?(\d\d)([ \d]\d)([ \d]\d)([ \d]\d)")
_DRY_BULB: Final = slice(67, 71)
_MIN_WIDTH: Final = 71
_MISSING: Final = 9999


def _recognises(head: bytes) -> bool:
    lines = head.decode("latin-1").splitlines()
    if len(lines) < 2 or not _FIRST.match(lines[0]) or len(lines[1]) < _MIN_WIDTH:
        return False
    return _HOUR.match(lines[1]) is not None and "," not in lines[1]


def _read_year(source: SourceFile) -> LongTermYear:
    lines = decode(source).splitlines()
    first = _FIRST.match(lines[0])
    place = f"{first[1].title()}, {first[2]}" if first else ""
    when, temps = [], []
    for i, line in enumerate(lines[1:], start=2):
        if not line.strip():
            continue
        hour = _HOUR.match(line)
        dry_bulb = line[_DRY_BULB].strip()
        if hour is None or not dry_bulb.lstrip("-").isdecimal():
            raise UnreadableWeather(
                "is not a whole TMY2 line",
                where=f"{source.name}:{i}",
                wanted="year, month, day, hour and 71 or more characters",
                next_step="Download the file again.",
            )
        temps.append(int(dry_bulb))
        when.append((int(hour[2]), int(hour[3]), int(hour[4]), 0))
    temp_c = np.array(temps, dtype=np.float64)
    temp_c[temp_c == _MISSING] = np.nan
    return typical_year(source, place, when, temp_c / 10)


FORMAT = Format(name="TMY2 file", recognises=_recognises, read_year=_read_year)
