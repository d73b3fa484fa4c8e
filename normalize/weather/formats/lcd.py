"""Local Climatological Data: local standard time, whole °F, hours and daily summaries mixed.

Daily values stand only on the rows of the summary of the day (SOD, 23:59); hours come in
several report types, of which FM-15 is the routine one.  "s" marks a suspect value, "*" an
estimated one, "M" or a blank a missing one (memory).
"""

from __future__ import annotations

import re
from typing import TYPE_CHECKING, Final

import numpy as np

from normalize.weather.degrees import read_numbers
from normalize.weather.formats import Format
from normalize.weather.formats.archive import (
    days_of_archive,
    hours_of_archive,
    nothing_in,
    one_station,
    table_of_archive,
)
from normalize.weather.stamps import read_stamps
from normalize.weather.words import counted, counts

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from normalize.weather.options import WeatherOptions
    from normalize.weather.source import SourceFile
    from normalize.weather.temperature import DailyTemperature

HIGH: Final = "DailyMaximumDryBulbTemperature"
LOW: Final = "DailyMinimumDryBulbTemperature"
HOURLY: Final = "HourlyDryBulbTemperature"
ROUTINE: Final = ("FM-15", "FM-12", "FM-16")  # which report of an hour is taken first
_VALUE: Final = re.compile(r"\s*(-?\d+(?:\.\d+)?)\s*([A-Za-z*]*)\s*$")


def _recognises(head: bytes) -> bool:
    line = head.decode("utf-8-sig", "replace").split("\n", 1)[0]
    return "REPORT_TYPE" in line and (HOURLY in line or HIGH in line)


def _read_days(source: SourceFile, options: WeatherOptions) -> DailyTemperature:
    rows = table_of_archive(source, ("STATION", "DATE", "REPORT_TYPE"))
    station = one_station(sorted({row["STATION"] for row in rows}), source.name, options)
    rows = [row for row in rows if row["STATION"] == station]
    daily = [
        row
        for row in rows
        if row["REPORT_TYPE"].strip() == "SOD" and (row.get(HIGH) or row.get(LOW))
    ]
    return _of_days(source, station, daily) if daily else _of_hours(source, station, rows, options)


def _of_days(source: SourceFile, station: str, rows: list[dict[str, str]]) -> DailyTemperature:
    notes: list[str] = []
    high, low = (_values([row.get(c) or "" for row in rows], notes) for c in (HIGH, LOW))
    day = read_stamps([row["DATE"][:10] for row in rows], source.name).day
    return days_of_archive(source, station, day, unit="F", high=high, low=low, notes=notes)


def _of_hours(
    source: SourceFile, station: str, rows: list[dict[str, str]], options: WeatherOptions
) -> DailyTemperature:
    notes: list[str] = []
    rows = [
        r for r in rows if r["REPORT_TYPE"].strip() in ROUTINE and (r.get(HOURLY) or "").strip()
    ]
    best: dict[str, dict[str, str]] = {}
    for row in rows:
        hour = row["DATE"][:13]
        held = best.get(hour)
        if held is None or _rank(row) < _rank(held):
            best[hour] = row
    if not best:
        raise nothing_in(source.name)
    if len(rows) > len(best):
        notes.append(
            f"{counted(len(rows) - len(best), 'further report')} of the same hour "
            f"{counts(len(rows) - len(best))} no second time."
        )
    kept = list(best.values())
    stamps = read_stamps([row["DATE"] for row in kept], source.name)
    temp = _values([row[HOURLY] for row in kept], notes)
    return hours_of_archive(
        source, station, stamps.day, stamps.minute, temp, unit="F", utc=False, options=options,
        notes=notes,
    )  # fmt: skip


def _rank(row: dict[str, str]) -> int:
    return ROUTINE.index(row["REPORT_TYPE"].strip())


def _values(cells: list[str], notes: list[str]) -> NDArray[np.float64]:
    """Numbers, suspect ones made missing and counted."""
    suspect, plain = 0, []
    for cell in cells:
        match = _VALUE.match(cell)
        if match and match[2] and "s" in match[2].lower():
            suspect += 1
            plain.append("")
        else:
            plain.append(match[1] if match else "")
    if suspect:
        notes.append(f"{counted(suspect, 'suspect value')} {counts(suspect)} as missing.")
    return read_numbers(plain).value


FORMAT = Format(name="local climatological data", recognises=_recognises, read_days=_read_days)
