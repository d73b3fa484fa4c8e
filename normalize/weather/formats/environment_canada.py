"""Environment Canada's daily table: °C, mean of maximum and minimum, flags beside each value.

"M" missing, "E" estimated, "†" preliminary, "‡" a partner's data; older files begin with some
25 lines of metadata and legend.  The degree sign is mangled in some downloads.
"""

from __future__ import annotations

import csv
from typing import TYPE_CHECKING

import numpy as np

from normalize.errors import UnreadableWeather
from normalize.weather.degrees import read_numbers
from normalize.weather.formats import Format
from normalize.weather.formats.archive import days_of_archive, nothing_in
from normalize.weather.source import clean_name, decode
from normalize.weather.stamps import NO_DAY, read_stamps
from normalize.weather.words import counted, was

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from normalize.weather.options import WeatherOptions
    from normalize.weather.source import SourceFile
    from normalize.weather.temperature import DailyTemperature


def _recognises(head: bytes) -> bool:
    return all(
        name in head for name in (b"Date/Time", b"Max Temp Flag", b"Min Temp Flag", b"Data Quality")
    ) or all(name in head for name in (b"Climate ID", b"Max Temp Flag", b"Mean Temp Flag"))


def _read_days(source: SourceFile, options: WeatherOptions) -> DailyTemperature:
    del options
    lines = decode(source).splitlines()
    at = next(i for i, line in enumerate(lines) if "Max Temp Flag" in line)
    try:
        header = next(csv.reader([lines[at].lstrip("\ufeff")]))
        rows = [row for row in csv.reader(lines[at + 1 :]) if len(row) > 3]
    except csv.Error as error:
        raise UnreadableWeather(
            f"cannot be read as a table ({error})",
            where=source.name,
            next_step="Download the file again.",
        ) from None
    high_at, low_at = (_column(header, name, source.name) for name in ("Max Temp", "Min Temp"))
    date_at = _column(header, "Date/Time", source.name)
    notes: list[str] = []
    high = _values(rows, high_at, header, "Max Temp Flag", notes)
    low = _values(rows, low_at, header, "Min Temp Flag", notes)
    day = read_stamps([_cell(row, date_at) for row in rows], source.name).day
    dated = day != NO_DAY
    if not (dated & np.isfinite(high) & np.isfinite(low)).any():
        raise nothing_in(source.name)
    return days_of_archive(
        source,
        _station(lines[: at + 1], header, rows),
        day[dated],
        unit="C",
        high=high[dated],
        low=low[dated],
        notes=notes,
    )


def _column(header: list[str], start: str, where: str) -> int:
    for i, name in enumerate(header):
        if name.strip().startswith(start) and "Flag" not in name:
            return i
    raise UnreadableWeather(f"has no column {start!r}", where=where, wanted="a daily table")


def _cell(row: list[str], i: int) -> str:
    return row[i].strip() if i < len(row) else ""


def _values(
    rows: list[list[str]], at: int, header: list[str], flag: str, notes: list[str]
) -> NDArray[np.float64]:
    value = read_numbers([_cell(row, at) for row in rows]).value
    flags = [_cell(row, header.index(flag)) if flag in header else "" for row in rows]
    value[[f == "M" for f in flags]] = np.nan
    estimated = sum(f == "E" and bool(np.isfinite(v)) for f, v in zip(flags, value, strict=True))
    if estimated:
        kind = flag.removesuffix(" Temp Flag").lower()
        notes.append(
            f"{counted(estimated, f'{kind}imum')} {was(estimated)} estimated by the archive."
        )
    return value


def _station(preamble: list[str], header: list[str], rows: list[list[str]]) -> str:
    if "Station Name" in header:
        i = header.index("Station Name")
        return clean_name(next((row[i] for row in rows if len(row) > i and row[i].strip()), ""))
    for line in preamble:
        cells = next(csv.reader([line]), [])
        if len(cells) > 1 and cells[0].strip("\ufeff ") == "Station Name":
            return clean_name(cells[1])
    return ""


FORMAT = Format(name="Environment Canada daily table", recognises=_recognises, read_days=_read_days)
