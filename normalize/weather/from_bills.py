"""Weather from the bills themselves, where each carries the mean temperature of its days."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

import numpy as np

from normalize.days import iso
from normalize.errors import MissingWeather, WeatherError
from normalize.weather.degrees import COLDEST_F, HOTTEST_F
from normalize.weather.temperature import DailyTemperature
from normalize.weather.words import counted

if TYPE_CHECKING:
    from numpy.typing import ArrayLike

METHOD_BILLS: Final = "mean temperature printed on the bills"
HIDES: Final = (
    "A bill's mean temperature hides its days on either side of the balance temperature, so "
    "use in mild months is explained less well than with a station's days."
)


def temperature_of_bills(
    start: ArrayLike,
    end: ArrayLike,
    mean_temp_f: ArrayLike,
    *,
    station: str = "temperatures printed on the bills",
    source: tuple[tuple[str, str], ...] = (),
) -> DailyTemperature:
    """Each bill's mean temperature laid over its days; days between bills NaN. [°F]

    start, end : (n,) day numbers, half-open, not overlapping, in any order.
    mean_temp_f : (n,) °F, NaN where the bill does not say.
    Raises MissingWeather when no bill says, WeatherError when bills overlap.

    >>> temperature_of_bills([0, 3], [2, 4], [30.0, 40.0]).temp_f.tolist()
    [30.0, 30.0, nan, 40.0]
    """
    starts, ends = np.asarray(start, dtype=np.int64), np.asarray(end, dtype=np.int64)
    means = np.asarray(mean_temp_f, dtype=np.float64).copy()
    _check(starts, ends, means)
    absurd = (means < COLDEST_F) | (means > HOTTEST_F)
    means[absurd] = np.nan
    said = np.isfinite(means)
    if not said.any():
        raise MissingWeather(
            "no bill carries a mean temperature",
            wanted="a column of mean temperatures, or a station's file",
            next_step='Give a station\'s file as observed = "…" under [weather] in site.toml.',
        )
    first, last = int(starts[said].min()), int(ends[said].max())
    temp = np.full(last - first, np.nan)
    for a, b, mean in zip(starts[said].tolist(), ends[said].tolist(), means[said], strict=True):
        temp[a - first : b - first] = mean
    notes = [f"{counted(int(said.sum()), 'bill')} carry their own mean temperature.", HIDES]
    if absurd.any():
        notes.append(
            f"{counted(int(absurd.sum()), 'bill')} with an impossible one were passed over."
        )
    return DailyTemperature(
        station=station,
        first_day=first,
        temp_f=temp,
        filled=np.zeros(last - first, dtype=np.bool_),
        method=METHOD_BILLS,
        source=source,
        notes=tuple(notes),
        by_bill=True,
    )


def _check(
    starts: np.ndarray[tuple[int, ...], np.dtype[np.int64]],
    ends: np.ndarray[tuple[int, ...], np.dtype[np.int64]],
    means: np.ndarray[tuple[int, ...], np.dtype[np.float64]],
) -> None:
    if not starts.shape == ends.shape == means.shape or starts.ndim != 1:
        raise WeatherError("start, end and mean temperature differ in length")
    if (ends <= starts).any():
        raise WeatherError("a bill ends before it starts", wanted="start before end")
    order = np.argsort(starts, kind="stable")
    overlap = starts[order][1:] < ends[order][:-1]
    if overlap.any():
        day = iso(int(starts[order][1:][overlap][0]))
        raise WeatherError(
            "two bills share days, so their temperatures cannot be laid over them",
            where=day,
            wanted="cleaned periods that do not overlap",
        )
