"""GHCN-Daily values, however they are laid out: quality flags, times of observation, days.

Temperatures are tenths of a °C; -9999 is missing; a quality flag other than blank means that
the value failed one of the archive's checks and is not used.  Layout, flags and sources of
data: the archive's readme (memory).
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Final

import numpy as np

from normalize.weather.formats.archive import days_of_archive, nothing_in
from normalize.weather.words import counted, counts

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from normalize.weather.source import SourceFile
    from normalize.weather.temperature import DailyTemperature

ELEMENTS: Final = ("TMAX", "TMIN", "TAVG")
MISSING: Final = -9999
FROM_GSOD: Final = "S"  # source flag: taken from summaries whose days are GMT days (memory)
LAGGED: Final = "L"  # measurement flag: lags behind the hour of observation (memory)
METHOD_TAVG: Final = "the archive's daily mean (TAVG)"
MORNING: Final = (400, 1100)  # HHMM: readings at such hours belong mostly to the day before
MAX_MORNING_SHARE: Final = 0.1


@dataclass(slots=True)
class Element:
    """One element's values. day : (n,) day numbers; value : (n,) tenths of °C, checked."""

    day: NDArray[np.int64]
    value: NDArray[np.float64]


@dataclass(slots=True)
class Tally:
    """What the flags said. morning, timed : values with a time of observation."""

    failed: int = 0
    from_gsod: int = 0
    lagged: int = 0
    morning: int = 0
    timed: int = 0
    used: int = 0
    notes: list[str] = field(default_factory=list)


def ghcn_days(
    source: SourceFile, station: str, elements: dict[str, Element], tally: Tally, *, name: str = ""
) -> DailyTemperature:
    """Daily temperature of a station's elements; the mean of maximum and minimum if it can.

    station : its 11-character id.  name : what the file calls it, if it does.
    """
    known = {
        k: _each_day_once(e, k, tally)
        for k, e in elements.items()
        if k in ELEMENTS and np.isfinite(e.value).any()
    }
    notes = [*tally.notes, *_notes(station, tally)]
    label = f"{name} ({station})" if name and station else name or station
    if "TMAX" in known and "TMIN" in known:
        day, high, low = _together(known["TMAX"], known["TMIN"])
        return days_of_archive(source, label, day, unit="C", high=high, low=low, notes=notes)
    if "TAVG" in known:
        notes.append(
            "The station has no daily maximum and minimum; its mean (TAVG) is formed in ways "
            "that differ from one source to another."
        )
        mean = known["TAVG"].value / 10
        return days_of_archive(
            source, label, known["TAVG"].day, unit="C", mean=mean, given=METHOD_TAVG, notes=notes
        )
    raise nothing_in(source.name)


def _each_day_once(element: Element, name: str, tally: Tally) -> Element:
    """Days given twice with one value count once; with different values they are missing."""
    order = np.lexsort((element.value, element.day))
    day, value = element.day[order], element.value[order].copy()
    again = day[1:] == day[:-1]
    if not again.any():
        return Element(day, value)
    differing = np.unique(day[1:][again & (value[1:] != value[:-1])])
    if differing.size:
        tally.notes.append(
            f"{counted(differing.size, 'day')} given more than once with different {name} "
            f"{counts(differing.size)} as missing."
        )
        value[np.isin(day, differing)] = np.nan
    first = np.concatenate(([True], ~again))
    return Element(day[first], value[first])


def _together(
    high: Element, low: Element
) -> tuple[NDArray[np.int64], NDArray[np.float64], NDArray[np.float64]]:
    """Maximum and minimum of the same days, °C, the days that have both or either."""
    first = int(min(high.day.min(), low.day.min()))
    n = int(max(high.day.max(), low.day.max())) - first + 1
    columns = []
    for element in (high, low):
        column = np.full(n, np.nan)
        ok = np.isfinite(element.value)
        column[element.day[ok] - first] = element.value[ok] / 10
        columns.append(column)
    some = np.isfinite(columns[0]) | np.isfinite(columns[1])
    day = first + np.flatnonzero(some)
    return day.astype(np.int64), columns[0][some], columns[1][some]


def _notes(station: str, tally: Tally) -> list[str]:
    notes = []
    if tally.failed:
        notes.append(
            f"{counted(tally.failed, 'value')} failed the archive's quality checks and "
            f"{counts(tally.failed)} as missing."
        )
    if tally.from_gsod:
        come = "comes" if tally.from_gsod == 1 else "come"
        notes.append(
            f"{counted(tally.from_gsod, 'value')} {come} from summaries of GMT days, which begin "
            "hours before local days."
        )
    if tally.lagged:
        lag = "lags" if tally.lagged == 1 else "lag"
        notes.append(f"{counted(tally.lagged, 'value')} {lag} behind the hour of observation.")
    if tally.timed and tally.morning > MAX_MORNING_SHARE * tally.timed:
        notes.append(
            f"{100 * tally.morning / tally.timed:.0f} % of the readings were made in the morning, "
            "so that a day's maximum is mostly that of the day before: bills' days and the "
            "station's do not quite match. An airport's station (USW…) has days from midnight "
            "to midnight."
        )
    elif not tally.timed and station.startswith("USC"):
        notes.append(
            "A volunteer observer's station (USC…): many are read in the morning, so that a "
            "day's maximum is mostly that of the day before. The file does not say when; an "
            "airport's station (USW…) has days from midnight to midnight."
        )
    return notes
