"""Missing days: short gaps filled from the station's own seasons, long ones left and listed.

A short gap (3 days or fewer) is filled by interpolating the *departure* from the station's
day-of-year mean between the days on either side, so that a gap in spring climbs as spring
does (docs/method.md, weather gaps).  Longer gaps stay NaN: a period that touches one has no
degree-days.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Final

import numpy as np

from normalize.days import iso
from normalize.weather.words import counted, listed, was

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from normalize.weather.temperature import DailyTemperature

MAX_GAP_DAYS: Final = 3  # in a row; design's default
SMOOTHING_DAYS: Final = 31  # centred window over the days of the year; a season stays, weather goes
_CALENDAR_DAYS: Final = 366  # January 1 to December 31 with February 29


@dataclass(frozen=True, slots=True)
class Gap:
    """Days without a temperature, ``[start, end)``."""

    start: int
    end: int

    @property
    def days(self) -> int:
        """How many."""
        return self.end - self.start

    def __str__(self) -> str:
        if self.days == 1:
            return iso(self.start)
        return f"{iso(self.start)} to {iso(self.end - 1)} ({self.days} days)"


def gaps_of(weather: DailyTemperature, *, longer_than: int = 0) -> tuple[Gap, ...]:
    """Stretches of missing days inside a record, in order of time."""
    missing = np.isnan(weather.temp_f)
    edges = np.diff(np.concatenate(([False], missing, [False])).astype(np.int8))
    starts, ends = np.flatnonzero(edges == 1), np.flatnonzero(edges == -1)
    return tuple(
        Gap(weather.first_day + int(a), weather.first_day + int(b))
        for a, b in zip(starts, ends, strict=True)
        if b - a > longer_than
    )


def calendar_day(day: NDArray[np.int64]) -> NDArray[np.int64]:
    """Place of each day in a calendar that has a February 29: March 1 is 60 in every year.

    >>> import datetime as dt
    >>> days = [(dt.date(y, 3, 1) - dt.date(1970, 1, 1)).days for y in (2023, 2024)]
    >>> calendar_day(np.array(days)).tolist()
    [60, 60]
    """
    dates = day.astype("datetime64[D]")
    year = dates.astype("datetime64[Y]")
    of_year = (dates - year.astype("datetime64[D]")).astype(np.int64)
    number = year.astype(np.int64) + 1970
    leap = (number % 4 == 0) & ((number % 100 != 0) | (number % 400 == 0))
    shifted: NDArray[np.int64] = of_year + (~leap & (of_year >= 59))
    return shifted


def day_of_year_mean(weather: DailyTemperature) -> NDArray[np.float64]:
    """(366,) the station's mean for each day of the calendar, smoothed over 31 days. [°F]

    Every day of the record counts once, so February 29 is smoothed with its neighbours and
    cannot stand out.  NaN for days of the year from which the record is 15 days away.
    """
    day = np.arange(weather.first_day, weather.last_day, dtype=np.int64)
    ok = np.isfinite(weather.temp_f)
    place = calendar_day(day[ok])
    total = np.bincount(place, weights=weather.temp_f[ok], minlength=_CALENDAR_DAYS)
    count = np.bincount(place, minlength=_CALENDAR_DAYS).astype(np.float64)
    half = SMOOTHING_DAYS // 2
    window = np.arange(-half, half + 1)
    around = (np.arange(_CALENDAR_DAYS)[:, None] + window[None, :]) % _CALENDAR_DAYS
    sums, counts = total[around].sum(axis=1), count[around].sum(axis=1)
    return np.where(counts > 0, sums / np.maximum(counts, 1.0), np.nan)


def fill_gaps(weather: DailyTemperature, *, max_days: int = MAX_GAP_DAYS) -> DailyTemperature:
    """The same weather with gaps of at most max_days filled and marked, the rest listed.

    >>> from normalize.weather.temperature import DailyTemperature
    >>> w = DailyTemperature("S", 0, np.array([50.0, np.nan, 54.0]), np.zeros(3, bool))
    >>> fill_gaps(w).filled.tolist()
    [False, True, False]
    """
    gaps = gaps_of(weather)
    short = [g for g in gaps if g.days <= max_days and _is_inside(g, weather)]
    temp_f, filled = weather.temp_f.copy(), weather.filled.copy()
    if short:
        season = day_of_year_mean(weather)
        for gap in short:
            _fill(gap, weather.first_day, temp_f, season)
            filled[gap.start - weather.first_day : gap.end - weather.first_day] = True
    long = [g for g in gaps if g not in short]
    notes = (*weather.notes, *_notes(short, long, max_days))
    return replace(weather, temp_f=temp_f, filled=filled, notes=notes)


def _is_inside(gap: Gap, weather: DailyTemperature) -> bool:
    return gap.start > weather.first_day and gap.end < weather.last_day


def _fill(
    gap: Gap, first_day: int, temp_f: NDArray[np.float64], season: NDArray[np.float64]
) -> None:
    """Interpolate the departure from the season between the days on either side, in place."""
    day = np.arange(gap.start - 1, gap.end + 1, dtype=np.int64)
    normal = season[calendar_day(day)]
    left = temp_f[day[0] - first_day] - normal[0]
    right = temp_f[day[-1] - first_day] - normal[-1]
    share = (day[1:-1] - day[0]) / float(day[-1] - day[0])
    temp_f[day[1:-1] - first_day] = normal[1:-1] + left + share * (right - left)


def _notes(short: list[Gap], long: list[Gap], max_days: int) -> list[str]:
    notes = []
    if short:
        n = sum(g.days for g in short)
        notes.append(
            f"{counted(n, 'day')} in {counted(len(short), 'short gap')} {was(n)} filled by "
            "interpolating the departure from the day-of-year mean."
        )
    if long:
        n = sum(g.days for g in long)
        notes.append(
            f"{counted(n, 'day')} in {counted(len(long), 'gap')} longer than {max_days} days "
            f"stay missing: {listed(long)}."
        )
    return notes
