"""What typical-year files have in common: 8760 hours of months from different years.

Hours are numbered 1 to 24 and each *ends* at its number, in local standard time all year.
The months' years differ and mean nothing to a normal year, so they are put aside.
"""

from __future__ import annotations

from datetime import date
from typing import TYPE_CHECKING, Final

import numpy as np

from normalize.days import date_of, day_of
from normalize.errors import UnreadableWeather
from normalize.weather.degrees import drop_absurd, to_fahrenheit
from normalize.weather.hours import MIN_HOURS, MINUTES_A_DAY, means_of_days
from normalize.weather.source import clean_name
from normalize.weather.words import counted, counts
from normalize.weather.year import MAX_MISSING_DAYS, LongTermYear, month_weights, year_from_sample

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from normalize.weather.source import SourceFile

_PLAIN_YEAR: Final = 2001  # a year without February 29, to hang the days on
_MONTH_LENGTHS: Final = (31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31)
METHOD: Final = "mean of hours, typical year"


def typical_year(
    source: SourceFile,
    station: str,
    when: list[tuple[int, int, int, int]],
    temp_c: NDArray[np.float64],
) -> LongTermYear:
    """A long-term year of a typical-year file's rows.

    when : month, day, hour (1 to 24, hour ending) and minute within the hour of each row.
    temp_c : (n,) dry bulb, °C, NaN where missing.
    """
    temp_f = to_fahrenheit(temp_c, "C")
    notes = ["A typical year is made of real months from different years: typical, not an average."]
    absurd = drop_absurd(temp_f, source.name, "C")
    if absurd:
        notes.append(
            f"{counted(absurd, 'hour')} with an impossible temperature {counts(absurd)} as missing."
        )
    stamp, kept = _stamps(source.name, when)
    if len(kept) < len(when):
        notes.append("February 29 was left out: a long-term year has 365 days.")
    means = means_of_days(stamp, temp_f[kept])
    known = np.isfinite(means.mean)
    n_missing = 365 - int(known.sum())
    if n_missing > MAX_MISSING_DAYS:
        raise UnreadableWeather(
            f"has {365 - n_missing} days with {MIN_HOURS} hours or more",
            where=source.name,
            wanted="a typical year of 8760 hours",
            next_step="Download the whole year.",
        )
    if n_missing:
        notes.append(f"{counted(n_missing, 'day')} missing; the month's other days stand for them.")
    day = means.first_day + np.flatnonzero(known)
    month = day.astype("datetime64[D]").astype("datetime64[M]").astype(np.int64) % 12
    weight = month_weights(month, _MONTH_LENGTHS)
    name = clean_name(station) or source.path.stem
    return year_from_sample(
        f"typical year of {name}",
        means.mean[known],
        weight,
        station=name,
        method=METHOD,
        source=source.fingerprint,
        notes=tuple(notes),
    )


def _stamps(
    where: str, when: list[tuple[int, int, int, int]]
) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Minutes at which each hour begins, and which rows they belong to (all but February 29)."""
    start = day_of(date(_PLAIN_YEAR, 1, 1))
    dates = (date_of(start + i) for i in range(365))
    days = {(d.month, d.day): start + i for i, d in enumerate(dates)}
    stamps, kept = [], []
    for i, (month, day, hour, minute) in enumerate(when):
        if (month, day) == (2, 29):
            continue
        number = days.get((month, day))
        if number is None or not 1 <= hour <= 24:
            raise UnreadableWeather(
                f"row {i + 1} is dated month {month}, day {day}, hour {hour}",
                where=where,
                wanted="hours 1 to 24 of the days of a year",
                next_step="Download the file again.",
            )
        stamps.append(number * MINUTES_A_DAY + (hour - 1) * 60 + minute)
        kept.append(i)
    return np.array(stamps, dtype=np.int64), np.array(kept, dtype=np.int64)
