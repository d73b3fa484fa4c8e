"""Usage periods, each with its own days of weather; the first of the four hops."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from normalize.bills.periods import Periods
from normalize.days import iso
from normalize.defaults import MAX_FILLED_SHARE
from normalize.fitting.drivers import Drivers
from normalize.weather.temperature import DailyTemperature


@dataclass(frozen=True, slots=True)
class Aligned:
    """Periods laid over weather.

    start, end (n,) int32 day numbers; use (n,) float64; mean_temp_f (n,) float64, NaN where
    weather is missing; reason (n,) why a period cannot be used, "" when it can.
    drivers : of every period, where use answers to more than the weather.
    """

    start: NDArray[np.int32]
    end: NDArray[np.int32]
    use: NDArray[np.float64]
    mean_temp_f: NDArray[np.float64]
    reason: tuple[str, ...]
    weather: DailyTemperature
    drivers: Drivers | None = None

    @property
    def n(self) -> int:
        """How many periods, usable or not."""
        return int(self.start.shape[0])

    @property
    def days(self) -> NDArray[np.int32]:
        """(n,) days of each period."""
        return self.end - self.start

    @property
    def usable(self) -> NDArray[np.bool_]:
        """(n,) whether a period may take part in a fit."""
        return np.array([not reason for reason in self.reason], dtype=np.bool_)

    def only(self, keep: NDArray[np.bool_], reason: str) -> Aligned:
        """The same, with the usable periods outside ``keep`` set aside for that reason."""
        why = tuple(
            old or ("" if inside else reason)
            for old, inside in zip(self.reason, keep.tolist(), strict=True)
        )
        return replace(self, reason=why)


def align(periods: Periods, weather: DailyTemperature) -> Aligned:
    """Lay usage periods over daily weather.

    A period whose weather has a hole, or more than a tenth of its days filled, is set aside
    with that reason; degree-days later come from each period's own days, never from
    calendar months.

    >>> from normalize.weather.temperature import DailyTemperature
    >>> w = DailyTemperature("x", 0, np.full(60, 50.0), np.zeros(60, bool))
    >>> p = Periods(np.array([0, 30], np.int32), np.array([30, 61], np.int32),
    ...     np.array([9.0, 8.0]), np.full(2, np.nan), np.zeros(2, bool), np.ones(2, np.int32))
    >>> align(p, w).reason[1]
    'the weather record ends on 1970-03-01, before this period does'
    """
    means = np.full(periods.n, np.nan)
    reasons = []
    for i in range(periods.n):
        start, end = int(periods.start[i]), int(periods.end[i])
        reason = _outside(start, end, weather)
        if not reason:
            days = slice(start - weather.first_day, end - weather.first_day)
            reason = _holes(weather, days)
            if not np.isnan(weather.temp_f[days]).any():
                means[i] = float(weather.temp_f[days].mean())
        reasons.append(reason)
    return Aligned(
        start=np.ascontiguousarray(periods.start, dtype=np.int32),
        end=np.ascontiguousarray(periods.end, dtype=np.int32),
        use=np.ascontiguousarray(periods.use, dtype=np.float64),
        mean_temp_f=means,
        reason=tuple(reasons),
        weather=weather,
    )


def _outside(start: int, end: int, weather: DailyTemperature) -> str:
    if start < weather.first_day:
        return f"the weather record begins on {iso(weather.first_day)}, after this period does"
    if end > weather.last_day:
        return f"the weather record ends on {iso(weather.last_day - 1)}, before this period does"
    return ""


def _holes(weather: DailyTemperature, days: slice) -> str:
    temp = weather.temp_f[days]
    missing = int(np.isnan(temp).sum())
    if missing:
        return f"{missing} of its {temp.shape[0]} days have no temperature"
    filled = int(weather.filled[days].sum())
    if filled > MAX_FILLED_SHARE * temp.shape[0]:
        return f"{filled} of its {temp.shape[0]} days of temperature had to be filled in"
    return ""
