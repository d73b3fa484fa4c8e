"""Gaps filled from a neighbouring station, by regression of one on the other.

For each gap the station's days are regressed on the neighbour's over the same season of every
year that both have, because two places differ in winter otherwise than in summer.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Final

import numpy as np

from normalize.weather.gaps import Gap, calendar_day, gaps_of
from normalize.weather.words import counted, listed, was

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from normalize.weather.temperature import DailyTemperature

MAX_DAYS: Final = 30  # in a row; a longer gap is the neighbour's weather and not the station's
SEASON_DAYS: Final = 45  # on either side of the gap, of every year
MIN_COMMON_DAYS: Final = 60
MIN_R2: Final = 0.8  # of the regression; less, and the neighbour is another climate
_CALENDAR_DAYS: Final = 366


@dataclass(frozen=True, slots=True)
class Line:
    """Station = intercept + slope × neighbour, °F. spread : standard deviation about it."""

    intercept: float
    slope: float
    r2: float
    spread: float
    n_days: int


def fill_from_neighbour(
    weather: DailyTemperature, neighbour: DailyTemperature, *, max_days: int = MAX_DAYS
) -> DailyTemperature:
    """The same weather with gaps of at most max_days filled from the neighbour and marked.

    Days that were filled at the neighbour are not used.  A gap stays where the neighbour lacks
    a day, has too few days in common or does not follow the station; notes say how many.
    """
    theirs = _laid_beside(weather, neighbour)
    temp_f, filled = weather.temp_f.copy(), weather.filled.copy()
    lines: list[Line] = []
    left: list[Gap] = []
    n_filled = 0
    for gap in gaps_of(weather):
        cut = slice(gap.start - weather.first_day, gap.end - weather.first_day)
        line = _line(weather, theirs, gap) if gap.days <= max_days else None
        if line is None or not np.isfinite(theirs[cut]).all():
            left.append(gap)
            continue
        temp_f[cut] = line.intercept + line.slope * theirs[cut]
        filled[cut] = True
        lines.append(line)
        n_filled += gap.days
    notes = (*weather.notes, *_notes(neighbour, lines, n_filled, left, max_days))
    shift = _shift(weather, theirs)
    if shift and (n_filled or left):
        notes = (*notes, shift)
    source = (*weather.source, *neighbour.source)
    return replace(weather, temp_f=temp_f, filled=filled, notes=notes, source=source)


def _laid_beside(weather: DailyTemperature, neighbour: DailyTemperature) -> NDArray[np.float64]:
    """(n_days,) the neighbour's measured temperature on the station's days."""
    theirs = np.full(weather.n_days, np.nan)
    first = max(weather.first_day, neighbour.first_day)
    last = min(weather.last_day, neighbour.last_day)
    if first < last:
        mine = slice(first - weather.first_day, last - weather.first_day)
        its = slice(first - neighbour.first_day, last - neighbour.first_day)
        theirs[mine] = np.where(neighbour.filled[its], np.nan, neighbour.temp_f[its])
    return theirs


def _line(weather: DailyTemperature, theirs: NDArray[np.float64], gap: Gap) -> Line | None:
    """The regression for a gap, or None where it cannot be trusted."""
    day = np.arange(weather.first_day, weather.last_day, dtype=np.int64)
    middle = calendar_day(np.array([(gap.start + gap.end) // 2]))[0]
    away = np.abs(calendar_day(day) - middle)
    away = np.minimum(away, _CALENDAR_DAYS - away)
    both = np.isfinite(weather.temp_f) & ~weather.filled & np.isfinite(theirs)
    use = both & (away <= SEASON_DAYS + gap.days // 2)
    n = int(use.sum())
    if n < MIN_COMMON_DAYS:
        return None
    x, y = theirs[use], weather.temp_f[use]
    dx, dy = x - x.mean(), y - y.mean()
    sxx, syy, sxy = float(dx @ dx), float(dy @ dy), float(dx @ dy)
    if sxx <= 0 or syy <= 0:
        return None
    slope, r2 = sxy / sxx, sxy * sxy / (sxx * syy)
    if r2 < MIN_R2 or slope <= 0:
        return None
    spread = float(np.sqrt(max(syy - slope * sxy, 0.0) / (n - 2)))
    return Line(float(y.mean() - slope * x.mean()), slope, r2, spread, n)


def _shift(weather: DailyTemperature, theirs: NDArray[np.float64]) -> str:
    """A sentence when the neighbour follows the station better a day apart than on the day."""
    mine = np.where(weather.filled, np.nan, weather.temp_f)
    change_mine, change_theirs = np.diff(mine), np.diff(theirs)

    def together(a: NDArray[np.float64], b: NDArray[np.float64]) -> float:
        ok = np.isfinite(a) & np.isfinite(b)
        if ok.sum() < MIN_COMMON_DAYS:
            return 0.0
        x, y = a[ok] - a[ok].mean(), b[ok] - b[ok].mean()
        size = float(np.sqrt((x @ x) * (y @ y)))
        return float(x @ y) / size if size > 0 else 0.0

    same = together(change_mine, change_theirs)
    apart = max(
        together(change_mine[1:], change_theirs[:-1]), together(change_mine[:-1], change_theirs[1:])
    )
    if apart <= same:
        return ""
    return (
        "The neighbour follows the station better a day apart than on the same day: one of the "
        "two is read in the morning, or has GMT days."
    )


def _notes(
    neighbour: DailyTemperature, lines: list[Line], n: int, left: list[Gap], max_days: int
) -> list[str]:
    notes = []
    if lines:
        worst = min(lines, key=lambda line: line.r2)
        notes.append(
            f"{counted(n, 'day')} in {counted(len(lines), 'gap')} {was(n)} filled from "
            f"{neighbour.station} by regression over the season (at least {worst.n_days} days in "
            f"common, R² {worst.r2:.2f} or more, typical error "
            f"{max(line.spread for line in lines):.1f} °F)."
        )
    if left:
        notes.append(
            f"{counted(len(left), 'gap')} {was(len(left))} not filled from {neighbour.station}: "
            f"longer than {max_days} days, missing there too, or too unlike (R² under {MIN_R2}, "
            f"or fewer than {MIN_COMMON_DAYS} days in common): {listed(left)}."
        )
    return notes
