"""GHCN-Daily as .dly: one line for each station, month and element, 269 characters wide.

ID 1-11, year 12-15, month 16-17, element 18-21, then 31 times value (5), measurement flag,
quality flag, source flag (memory).
"""

from __future__ import annotations

import re
from typing import TYPE_CHECKING, Final

import numpy as np

from normalize.days import FIRST_SANE_DAY, LAST_SANE_DAY
from normalize.errors import UnreadableWeather
from normalize.weather.formats import Format
from normalize.weather.formats.archive import nothing_in, one_station
from normalize.weather.formats.ghcn_days import (
    ELEMENTS,
    FROM_GSOD,
    LAGGED,
    MISSING,
    Element,
    Tally,
    ghcn_days,
)
from normalize.weather.words import counted, counts

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from normalize.weather.options import WeatherOptions
    from normalize.weather.source import SourceFile
    from normalize.weather.temperature import DailyTemperature

WIDTH: Final = 269
_LINE: Final = re.compile(rb"[A-Z]{2}[A-Z0-9_\-]{9}\d{6}[A-Z0-9]{4}[ \-\d]{4}\d")
_KEPT: Final = tuple(name.encode() for name in ELEMENTS)
_SPACE, _MINUS, _ZERO, _NINE = 32, 45, 48, 57


def _recognises(head: bytes) -> bool:
    return _LINE.match(head) is not None


def _read_days(source: SourceFile, options: WeatherOptions) -> DailyTemperature:
    lines = [line for line in source.data.splitlines() if line[17:21] in _KEPT]
    stations = sorted({line[:11].decode("ascii", "replace") for line in lines})
    if not lines:
        raise nothing_in(source.name)
    station = one_station(stations, source.name, options)
    if len(stations) > 1:
        lines = [line for line in lines if line[:11] == station.encode()]
    tally = Tally()
    text = np.frombuffer(b"".join(line.ljust(WIDTH)[:WIDTH] for line in lines), np.uint8)
    rows = text.reshape(len(lines), WIDTH)
    day, real = _days_of(lines, source.name)
    cells = rows[:, 21:].reshape(len(lines), 31, 8)
    value = _values(cells[:, :, :5], real, tally)
    failed = real & np.isfinite(value) & (cells[:, :, 6] != _SPACE)
    value[failed] = np.nan
    known = real & np.isfinite(value)
    tally.failed = int(failed.sum())
    tally.from_gsod = int((known & (cells[:, :, 7] == ord(FROM_GSOD))).sum())
    tally.lagged = int((known & (cells[:, :, 5] == ord(LAGGED))).sum())
    of_line = np.array([_KEPT.index(line[17:21]) for line in lines])
    elements = {}
    for i, name in enumerate(ELEMENTS):
        mine = known & (of_line == i)[:, None]
        if mine.any():
            elements[name] = Element(day[mine], value[mine])
    return ghcn_days(source, station, elements, tally)


def _days_of(lines: list[bytes], where: str) -> tuple[NDArray[np.int64], NDArray[np.bool_]]:
    """(n, 31) day numbers, and which of them exist: April has no 31st."""
    try:
        text = [f"{line[11:15].decode()}-{line[15:17].decode()}" for line in lines]
        month = np.array(text, dtype="datetime64[M]")
    except (ValueError, UnicodeDecodeError):
        raise UnreadableWeather(
            "a line has no year and month in its columns 12 to 17",
            where=where,
            wanted="GHCN-Daily .dly lines",
            next_step="Download the file again.",
        ) from None
    first = month.astype("datetime64[D]").astype(np.int64)
    following = (month + 1).astype("datetime64[D]").astype(np.int64)
    day = first[:, None] + np.arange(31)
    sane = (day >= FIRST_SANE_DAY) & (day < LAST_SANE_DAY)
    return day, (day < following[:, None]) & sane


def _values(text: NDArray[np.uint8], real: NDArray[np.bool_], tally: Tally) -> NDArray[np.float64]:
    """(n, 31) numbers of five characters each, NaN where missing or no number."""
    digit = (text >= _ZERO) & (text <= _NINE)
    plain = (digit | (text == _SPACE) | (text == _MINUS)).all(axis=2) & digit[:, :, -1]
    size = np.where(digit, text - _ZERO, 0).astype(np.int64)
    number = size @ np.array([10000, 1000, 100, 10, 1])
    number = np.where((text == _MINUS).any(axis=2), -number, number)
    odd = int((real & ~plain & (text != _SPACE).any(axis=2)).sum())
    if odd:
        tally.notes.append(f"{counted(odd, 'value')} that are no number {counts(odd)} as missing.")
    return np.where(plain & (number != MISSING), number, np.nan).astype(np.float64)


FORMAT = Format(name="GHCN-Daily file (.dly)", recognises=_recognises, read_days=_read_days)
