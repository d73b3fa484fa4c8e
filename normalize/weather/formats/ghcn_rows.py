"""GHCN-Daily as rows, one for each station, day and element: the by-year and by-station files.

ID,YYYYMMDD,ELEMENT,VALUE,M-FLAG,Q-FLAG,S-FLAG,OBS-TIME; no header as published, but extracts
have one, and some drop the station.
"""

from __future__ import annotations

import csv
import re
from collections.abc import Iterator
from typing import TYPE_CHECKING, Final

import numpy as np

from normalize.errors import UnreadableWeather
from normalize.weather.formats import Format
from normalize.weather.formats.archive import nothing_in, one_station
from normalize.weather.formats.ghcn_days import (
    ELEMENTS,
    FROM_GSOD,
    LAGGED,
    MISSING,
    MORNING,
    Element,
    Tally,
    ghcn_days,
)
from normalize.weather.source import decode
from normalize.weather.stamps import NO_DAY, read_stamps
from normalize.weather.words import at_lines, counted, was

if TYPE_CHECKING:
    from normalize.weather.options import WeatherOptions
    from normalize.weather.source import SourceFile
    from normalize.weather.temperature import DailyTemperature

_ROW: Final = re.compile(
    r'"?(?:[A-Z]{2}[A-Z0-9_\-]{9}"?,"?)?\d{8}"?,"?[A-Z][A-Z0-9]{3}"?,"?\s*-?\d{1,5}"?(?:,|$)'
)
_ID: Final = re.compile(r"[A-Z]{2}[A-Z0-9_\-]{9}$")


def _recognises(head: bytes) -> bool:
    lines = head[:2000].decode("utf-8-sig", "replace").splitlines()[:3]
    if lines and _ROW.match(lines[0]):
        return True
    # With a header of any wording: the rows below it show what it is.
    return len(lines) > 1 and "," in lines[0] and _ROW.match(lines[1]) is not None


def _rows(source: SourceFile) -> Iterator[tuple[int, list[str]]]:
    """(line number, [station, date, element, value, m, q, s, time]) of the temperature rows."""
    reader = csv.reader(decode(source).splitlines())
    try:
        for number, row in enumerate(reader, start=1):
            if len(row) < 3:
                continue
            if not _ID.match(row[0]):
                row = ["", *row]  # the station was dropped
            if row[2] in ELEMENTS:
                yield number, [*row, *[""] * (8 - len(row))]
    except csv.Error as error:
        raise UnreadableWeather(
            f"cannot be read as rows ({error})",
            where=source.name,
            next_step="Download the file again.",
        ) from None


def _read_days(source: SourceFile, options: WeatherOptions) -> DailyTemperature:
    rows = list(_rows(source))
    if not rows:
        raise nothing_in(source.name)
    station = one_station(sorted({row[0] for _, row in rows}), source.name, options)
    tally, bad = Tally(), []
    found: dict[str, tuple[list[str], list[float]]] = {name: ([], []) for name in ELEMENTS}
    for number, row in rows:
        if row[0] != station:
            continue
        try:
            value = float(int(row[3]))
        except ValueError:
            bad.append(number)
            continue
        if value == MISSING or _fails(row, tally):
            continue
        days, values = found[row[2]]
        days.append(row[1])
        values.append(value)
    if bad:
        tally.notes.append(
            f"{counted(len(bad), 'row')} {was(len(bad))} left out for want of a value "
            f"{at_lines(bad)}."
        )
    elements = {
        name: _element(days, values, source.name, tally)
        for name, (days, values) in found.items()
        if days
    }
    return ghcn_days(source, station, elements, tally)


def _fails(row: list[str], tally: Tally) -> bool:
    """Whether the archive's checks failed a value; what else its flags say is counted."""
    if row[5].strip():
        tally.failed += 1
        return True
    tally.lagged += row[4].strip() == LAGGED
    tally.from_gsod += row[6].strip() == FROM_GSOD
    time = row[7].strip()
    if time.isdecimal():
        tally.timed += 1
        tally.morning += MORNING[0] <= int(time) <= MORNING[1]
    return False


def _element(days: list[str], values: list[float], where: str, tally: Tally) -> Element:
    day = read_stamps(days, where).day
    sane = day != NO_DAY
    if not sane.all():
        n = int((~sane).sum())
        tally.notes.append(
            f"{counted(n, 'row')} {was(n)} left out because the date cannot be read."
        )
    return Element(day[sane], np.array(values)[sane])


FORMAT = Format(name="GHCN-Daily rows", recognises=_recognises, read_days=_read_days)
