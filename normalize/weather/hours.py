"""From hourly readings to daily means, over the days of the local calendar."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray

MIN_HOURS: Final = 20  # of a day's hours; with fewer the day is missing (GSOD users ask the same)
MINUTES_A_DAY: Final = 1440
LATEST_CHANGE_HOUR: Final = 3  # clocks are put back within the first hours of a day
CHANGE_MONTHS: Final = (3, 4, 9, 10, 11)  # north and south


@dataclass(frozen=True, slots=True)
class DailyMeans:
    """Means over days. mean : (n_days,) NaN where too few hours; hours : (n_days,) found.

    short_days : days with some hours but too few.  repeated, conflicting : readings that
    stood twice in the file with the same and with different values.
    hour_day, hour_mean : (m,) each hour's day number and mean, in order of time.
    """

    first_day: int
    mean: NDArray[np.float64]
    hours: NDArray[np.int64]
    short_days: int
    repeated: int
    conflicting: int
    hour_day: NDArray[np.int64]
    hour_mean: NDArray[np.float64]


def means_of_days(stamp: NDArray[np.int64], temp_f: NDArray[np.float64]) -> DailyMeans:
    """Daily means of hourly (or more frequent) readings.

    stamp : (n,) minutes since 1970-01-01 00:00 of the local clock, in any order.
    temp_f : (n,) °F; NaN readings are passed over.

    Several readings within an hour are averaged first, so each hour counts once.  Where
    the clock was put back, the hour that comes twice counts twice: that day has 25 hours;
    the day it was put forward has 23.

    >>> means_of_days(np.arange(0, 2880, 60), np.repeat([50.0, 60.0], 24)).mean.tolist()
    [50.0, 60.0]
    """
    ok = np.isfinite(temp_f)
    stamp, temp_f = stamp[ok], temp_f[ok]
    if stamp.size == 0:
        empty = np.empty(0, dtype=np.float64)
        none = np.empty(0, dtype=np.int64)
        return DailyMeans(0, empty, none, 0, 0, 0, none, empty)
    order = np.argsort(stamp, kind="stable")
    stamp, temp_f = stamp[order], temp_f[order]
    bucket = stamp // 60 * 2  # two buckets an hour; the second for an hour that comes twice
    keep, repeated, conflicting = _resolve_repeats(stamp, temp_f, bucket)
    bucket, temp_f = bucket[keep], temp_f[keep]

    hour, inverse = np.unique(bucket, return_inverse=True)
    hour_mean = np.bincount(inverse, weights=temp_f) / np.bincount(inverse)
    day = hour // 48
    first = int(day[0])
    hours = np.bincount(day - first)
    total = np.bincount(day - first, weights=hour_mean)
    enough = hours >= MIN_HOURS
    mean = np.where(enough, total / np.maximum(hours, 1), np.nan)
    short = int(((hours > 0) & ~enough).sum())
    return DailyMeans(
        first, mean, hours.astype(np.int64), short, repeated, conflicting, day, hour_mean
    )


def _resolve_repeats(
    stamp: NDArray[np.int64], temp_f: NDArray[np.float64], bucket: NDArray[np.int64]
) -> tuple[NDArray[np.bool_], int, int]:
    """Which readings to keep where a stamp occurs more than once; edits buckets in place."""
    keep = np.ones(stamp.size, dtype=np.bool_)
    again = np.flatnonzero(stamp[1:] == stamp[:-1]) + 1
    if again.size == 0:
        return keep, 0, 0
    repeated = conflicting = 0
    for day in np.unique(stamp[again] // MINUTES_A_DAY):
        mine = again[stamp[again] // MINUTES_A_DAY == day]
        if _clock_put_back(int(day), stamp, mine):
            bucket[mine] += 1
            continue
        for i in mine:
            keep[i] = False
            repeated += 1
            if temp_f[i] != temp_f[i - 1]:
                conflicting += 1
                keep[stamp == stamp[i]] = False
    return keep, repeated, conflicting


def _clock_put_back(day: int, stamp: NDArray[np.int64], again: NDArray[np.int64]) -> bool:
    """Whether the repeated stamps of a day are one night hour come twice, in a month of change."""
    hours = np.unique(stamp[again] % MINUTES_A_DAY // 60)
    month = int(np.datetime64(day, "D").astype("datetime64[M]").astype(np.int64)) % 12 + 1
    twice_only = np.unique(stamp[again]).size == again.size
    return bool(
        hours.size == 1 and hours[0] <= LATEST_CHANGE_HOUR and month in CHANGE_MONTHS and twice_only
    )
