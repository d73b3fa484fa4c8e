"""GHCN-Daily as a wide table: the access files, and what the daily-summaries service returns.

STATION,DATE,…,TMAX,TMAX_ATTRIBUTES,… with attributes "measurement,quality,source[,time]" in
one cell.  Access files hold tenths of a °C; the service returns what it was asked for, and
tenths of a °C when it was asked for nothing (memory): the values decide, or the user.
"""

from __future__ import annotations

import csv
import re
from typing import TYPE_CHECKING, Final

import numpy as np

from normalize.weather.degrees import HOTTEST_C, HOTTEST_F, read_numbers
from normalize.weather.formats import Format
from normalize.weather.formats.archive import nothing_in, one_station, table_of_archive
from normalize.weather.formats.ghcn_days import (
    ELEMENTS,
    FROM_GSOD,
    LAGGED,
    MORNING,
    Element,
    Tally,
    ghcn_days,
)
from normalize.weather.options import WeatherOptions, ask
from normalize.weather.source import clean_name
from normalize.weather.stamps import NO_DAY, read_stamps
from normalize.weather.words import counted, was

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from normalize.weather.source import SourceFile
    from normalize.weather.temperature import DailyTemperature

_FIRST_ID: Final = re.compile(r'"?[A-Z]{2}[A-Z0-9_\-]{9}"?,')
WHOLE_YEAR: Final = 330  # days from which the values can tell tenths of °C from whole °F


def _recognises(head: bytes) -> bool:
    lines = head.decode("utf-8-sig", "replace").splitlines()[:2]
    if len(lines) < 2 or not _FIRST_ID.match(lines[1]):
        return False
    names = next(csv.reader([lines[0]]), [])
    return names[:2] == ["STATION", "DATE"] and bool(set(ELEMENTS) & set(names))


def _read_days(source: SourceFile, options: WeatherOptions) -> DailyTemperature:
    rows = table_of_archive(source, ("STATION", "DATE"))
    station = one_station(sorted({row["STATION"] for row in rows}), source.name, options)
    rows = [row for row in rows if row["STATION"] == station]
    tally = Tally()
    stamps = read_stamps([row["DATE"].strip() for row in rows], source.name)
    dated = stamps.day != NO_DAY
    if not dated.all():
        n = int((~dated).sum())
        tally.notes.append(
            f"{counted(n, 'row')} {was(n)} left out because the date cannot be read."
        )
    columns: dict[str, NDArray[np.float64]] = {}
    for name in ELEMENTS:
        if name in rows[0]:
            value = read_numbers([row[name] or "" for row in rows]).value
            _apply_flags(value, [row.get(f"{name}_ATTRIBUTES") or "" for row in rows], tally)
            if np.isfinite(value[dated]).any():
                columns[name] = value
    if not columns:
        raise nothing_in(source.name)
    tenths = _in_tenths(columns, stamps.day[dated], source.name, options, tally)
    elements = {
        name: Element(stamps.day[dated & np.isfinite(v)], tenths(v[dated & np.isfinite(v)]))
        for name, v in columns.items()
    }
    name = clean_name(rows[0].get("NAME") or "")
    return ghcn_days(source, station, elements, tally, name=name)


def _apply_flags(value: NDArray[np.float64], cells: list[str], tally: Tally) -> None:
    """Values that failed a check become missing; the rest of the flags are counted."""
    for i in np.flatnonzero(np.isfinite(value)).tolist():
        flags = [f.strip() for f in cells[i].split(",")] + [""] * 4
        if flags[1]:
            tally.failed += 1
            value[i] = np.nan
            continue
        tally.lagged += flags[0] == LAGGED
        tally.from_gsod += flags[2] == FROM_GSOD
        if flags[3].isdecimal():
            tally.timed += 1
            tally.morning += MORNING[0] <= int(flags[3]) <= MORNING[1]


class _Tenths:
    """Turns a file's values into tenths of a °C."""

    def __init__(self, unit: str) -> None:
        self.unit = unit

    def __call__(self, value: NDArray[np.float64]) -> NDArray[np.float64]:
        if self.unit == "tenths":
            return value
        return value * 10 if self.unit == "C" else (value - 32) * 50 / 9


def _in_tenths(
    columns: dict[str, NDArray[np.float64]],
    day: NDArray[np.int64],
    where: str,
    options: WeatherOptions,
    tally: Tally,
) -> _Tenths:
    values = np.concatenate([v[np.isfinite(v)] for v in columns.values()])
    if np.abs(values).max() > HOTTEST_F:
        return _Tenths("tenths")  # as the archive stores them; no °F or °C is so high
    if options.unit is not None:
        return _Tenths(options.unit)
    if (values != np.floor(values)).any():
        unit = "F" if values.max() > HOTTEST_C else "C"
        tally.notes.append(f"Values have decimals, so they are degrees and not tenths: °{unit}.")
        return _Tenths(unit)
    if day.size and int(day.max() - day.min()) >= WHOLE_YEAR:
        tally.notes.append(
            f"No value is above {HOTTEST_F:.0f} in most of a year, which tenths of a °C would be: "
            "temperatures are read as °F."
        )
        return _Tenths("F")
    raise ask(
        "nothing says whether temperatures are °F, °C or tenths of a °C, and the values fit all",
        where=where,
        key="unit",
        choices='"F" or "C"',
    )


FORMAT = Format(name="GHCN-Daily table", recognises=_recognises, read_days=_read_days)
