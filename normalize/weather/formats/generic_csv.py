"""A table of daily or hourly temperatures with a header, however it is delimited.

Which of the two it is shows in the rows: several times of day on one date make it hourly.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np

from normalize.errors import UnreadableWeather
from normalize.weather.columns import Columns, find_columns, stated_unit, unit_in
from normalize.weather.degrees import drop_absurd, read_numbers, settle_unit, to_fahrenheit
from normalize.weather.formats import Format
from normalize.weather.formats.generic_days import assemble_days, assemble_hours
from normalize.weather.options import WeatherOptions, ask
from normalize.weather.source import clean_name, decode
from normalize.weather.stamps import NO_DAY, Stamps, read_stamps
from normalize.weather.table import Table, read_table
from normalize.weather.words import at_lines, counted, counts, listed, was

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from normalize.weather.source import SourceFile
    from normalize.weather.temperature import DailyTemperature

MIN_READINGS_A_DAY: Final = 3  # at different times, for a file to count as hourly
_PREAMBLE_UNIT: Final = re.compile(r"\b(units?|temperature)\b.*", re.IGNORECASE)
_PREAMBLE_UTC: Final = re.compile(r"\b(UTC|GMT)\b(?!\s*[-+]\s*\d)")  # as gridded exports state it
_PREAMBLE_GRID: Final = re.compile(
    r"\b(lat|latitude)\b.*\b(lon|lng|longitude)\b.*\b(elevation|utc_offset_seconds|timezone)\b"
    r"|\bgrid(ded)?\b|\breanalysis\b",
    re.IGNORECASE | re.DOTALL,
)
_GRID_COLUMN: Final = re.compile(r"(temperature_2m|t2m|2m_temperature)", re.IGNORECASE)
GRIDDED: Final = (
    "Gridded weather: temperatures computed for a cell of a map, not measured at a station. "
    "They can differ from the place's own, most of all in valleys and by water."
)
_PREAMBLE_STATION: Final = re.compile(
    r"^[#\s\"]*station(?:[ _]name)?\"?\s*[:=,;\t]\s*\"?([^\",;\t]+)", re.I
)


@dataclass(slots=True)
class Readings:
    """The rows of a file, coerced: mean, high and low are (n,) °F or None.

    line : (n,) line numbers.  notes : sentences, added to as the reader goes on.
    """

    where: str
    line: NDArray[np.int64]
    stamps: Stamps
    mean: NDArray[np.float64] | None
    high: NDArray[np.float64] | None
    low: NDArray[np.float64] | None
    notes: list[str]


def _recognises(head: bytes) -> bool:
    return any(mark in head for mark in (b",", b";", b"\t", b"|")) or b"\n" in head or bool(head)


def _read_days(source: SourceFile, options: WeatherOptions) -> DailyTemperature:
    table = read_table(decode(source), source.name, options)
    columns = find_columns(table.header, source.name, options)
    station, table, kept = _one_station(table, columns, source.name, options)
    readings = _coerce(table, columns, kept, source.name, options)
    hourly = _is_hourly(readings.stamps)
    assemble = assemble_hours if hourly else assemble_days
    _label_gridded(table, columns, readings.notes)
    utc = columns.utc or any(_PREAMBLE_UTC.search(text) for text in table.preamble)
    return assemble(readings, station, utc, options)


FORMAT = Format(name="table of temperatures", recognises=_recognises, read_days=_read_days)


def _label_gridded(table: Table, columns: Columns, notes: list[str]) -> None:
    """Say so when the table is an export of a gridded data set and not of a station."""
    above = " ".join(table.preamble)
    used = [table.header[i] for i in (columns.mean, columns.high, columns.low) if i is not None]
    if _PREAMBLE_GRID.search(above) or any(_GRID_COLUMN.match(name.strip()) for name in used):
        notes.append(GRIDDED)


def _one_station(
    table: Table, columns: Columns, where: str, options: WeatherOptions
) -> tuple[str, Table, NDArray[np.int64]]:
    """The station's name, its rows and their line numbers; asks when there are several."""
    blank = [_is_blank(row) for row in table.rows]
    lines = np.flatnonzero(~np.array(blank, dtype=np.bool_)) + table.first_line
    rows = [row for row, empty in zip(table.rows, blank, strict=True) if not empty]
    name = next((m[1] for line in table.preamble if (m := _PREAMBLE_STATION.match(line))), "")
    if columns.station is not None:
        cells = [row[columns.station].strip() if columns.station < len(row) else "" for row in rows]
        names = sorted(set(cells) - {""})
        if len(names) > 1:
            if options.station not in names:
                raise ask(
                    f"holds {len(names)} stations: {listed(clean_name(n) for n in names)}",
                    where=where,
                    key="station",
                    choices=" or ".join(f'"{clean_name(n)}"' for n in names[:3]),
                )
            mine = [cell == options.station for cell in cells]
            lines = lines[np.array(mine, dtype=np.bool_)]
            rows = [row for row, is_mine in zip(rows, mine, strict=True) if is_mine]
            name = options.station or ""
        elif names:
            name = names[0]
    if not rows:
        raise UnreadableWeather(
            "has a header and no rows below it",
            where=where,
            wanted="a row a day",
            next_step="Download it again.",
        )
    kept = Table(table.header, rows, table.first_line, table.preamble)
    return clean_name(name), kept, lines.astype(np.int64)


def _is_blank(row: list[str]) -> bool:
    return not row or not (row[0].strip() or any(cell.strip() for cell in row))


def _coerce(
    table: Table, columns: Columns, line: NDArray[np.int64], where: str, options: WeatherOptions
) -> Readings:
    """Text to day numbers and °F, with a note for whatever could not be read."""
    stamps = read_stamps(_stamp_cells(table, columns), where, options.dates)
    notes: list[str] = []
    lost = stamps.day == NO_DAY
    if lost.all():
        raise UnreadableWeather(
            f"no row has a date that can be read; the first is {_first_cell(table, columns)!r}",
            where=f"{where}:{line[0]}",
            wanted="dates from 1900 to 2099, such as 2023-01-31",
            next_step="Write dates as YYYY-MM-DD, or name the column with date_column.",
        )
    if lost.any():
        n = int(lost.sum())
        notes.append(
            f"{counted(n, 'row')} {was(n)} left out because the date cannot be read or is outside "
            f"1900 to 2099 {at_lines(line[lost].tolist())}."
        )
    if stamps.two_digit_years:
        notes.append("Two-digit years are read as 1970 to 2069.")
    used = [i for i in (columns.mean, columns.high, columns.low) if i is not None]
    temps = _temperatures(table, used, stamps, line, where, options, notes)
    by_column = dict(zip(used, temps, strict=True))
    return Readings(
        where=where,
        line=line,
        stamps=stamps,
        mean=by_column.get(columns.mean) if columns.mean is not None else None,
        high=by_column.get(columns.high) if columns.high is not None else None,
        low=by_column.get(columns.low) if columns.low is not None else None,
        notes=notes,
    )


def _stamp_cells(table: Table, columns: Columns) -> list[str]:
    """One text a row for date and time, wherever the table keeps them."""
    if columns.date is not None:
        cells = table.column(columns.date)
        if columns.time is None:
            return cells
        times = table.column(columns.time)
        return [f"{c.strip()} {t.strip()}" for c, t in zip(cells, times, strict=True)]
    parts = [table.column(i) for i in columns.parts]
    dates = [
        f"{y.strip()}-{m.strip():0>2}-{d.strip():0>2}" for y, m, d in zip(*parts[:3], strict=True)
    ]
    if len(parts) == 3:
        return dates
    return [f"{date} {hour.strip()}" for date, hour in zip(dates, parts[3], strict=True)]


def _first_cell(table: Table, columns: Columns) -> str:
    return next(iter(_stamp_cells(table, columns)), "")[:30]


def _temperatures(
    table: Table,
    used: list[int],
    stamps: Stamps,
    line: NDArray[np.int64],
    where: str,
    options: WeatherOptions,
    notes: list[str],
) -> list[NDArray[np.float64]]:
    """The used columns in °F, absurd values made missing."""
    numbers = [read_numbers(table.column(i)) for i in used]
    odd = sorted({i for column in numbers for i in column.odd})
    if odd:
        at = next(i for i, column in zip(used, numbers, strict=True) if odd[0] in column.odd)
        example = clean_name(table.column(at)[odd[0]])[:20]
        notes.append(
            f"{counted(len(odd), 'row')} with text for a temperature (such as {example!r}) "
            f"{counts(len(odd))} as missing {at_lines(line[odd].tolist())}."
        )
    values = np.array([column.value for column in numbers])
    highest = np.fmax.reduce(values, axis=0)
    cell_unit = next((c.unit for c in numbers if c.unit is not None), None)
    stated = stated_unit(table.header, used, where) or cell_unit or _preamble_unit(table)
    unit, note = settle_unit(
        option=options.unit, stated=stated, highest=highest, day=stamps.day, where=where
    )
    if note:
        notes.append(note)
    temps = to_fahrenheit(values, unit)
    absurd = sum(drop_absurd(column, where, unit) for column in temps)
    if absurd:
        notes.append(
            f"{counted(absurd, 'temperature')} outside -90 to 60 °C (-130 to 140 °F) "
            f"{counts(absurd)} as missing."
        )
    return list(temps)


def _preamble_unit(table: Table) -> str | None:
    """A unit stated in the lines above the header ("units: degC"), when they state just one."""
    found = {
        unit
        for line in table.preamble
        if (match := _PREAMBLE_UNIT.search(line)) and (unit := unit_in(match[0].strip(" \"'#,;")))
    }
    return found.pop() if len(found) == 1 else None


def _is_hourly(stamps: Stamps) -> bool:
    ok = stamps.day != NO_DAY
    days = len(set(stamps.day[ok].tolist()))  # np.unique would load numpy.ma, 15 ms
    times = len(set(stamps.minute[ok].tolist()))
    return bool(ok.sum() >= MIN_READINGS_A_DAY * days and times >= MIN_READINGS_A_DAY)
