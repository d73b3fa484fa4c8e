"""Daily outdoor temperature: the one form in which weather travels through the program.

Temperatures are °F; days are integers counted from 1970-01-01.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray


@dataclass(frozen=True, slots=True)
class DailyTemperature:
    """A station's daily mean temperature, one value a day without holes in the calendar.

    station : its name, as its file gives it.
    first_day : day number of ``temp_f[0]``.
    temp_f : (n_days,) float64, daily mean, °F, NaN where missing (after filling).
    filled : (n_days,) bool, true where a short gap was filled.
    method : how the day's mean was formed, e.g. "mean of daily maximum and minimum",
        "mean of hours", "as given", "mean temperature printed on the bills".
    source : (file name, SHA-256) pairs.
    notes : what the reader had to do, as sentences.
    by_bill : true when the temperatures are the bills' own means, laid over their days.
    max_f, min_f : (n_days,) float64, daily maximum and minimum, °F, as given and never
        filled; None where the file has none.
    hour_day, hour_f : (m,) int64 day numbers and float64 °F, one mean for each hour that an
        hourly file has, in order of time; None for daily files.
    """

    station: str
    first_day: int
    temp_f: NDArray[np.float64]
    filled: NDArray[np.bool_]
    method: str = "as given"
    source: tuple[tuple[str, str], ...] = ()
    notes: tuple[str, ...] = ()
    by_bill: bool = False
    max_f: NDArray[np.float64] | None = None
    min_f: NDArray[np.float64] | None = None
    hour_day: NDArray[np.int64] | None = None
    hour_f: NDArray[np.float64] | None = None

    @property
    def n_days(self) -> int:
        """Days from the first to the last, missing ones included."""
        return int(self.temp_f.shape[0])

    @property
    def last_day(self) -> int:
        """Day number one past the last day."""
        return self.first_day + self.n_days

    @property
    def days_filled(self) -> int:
        """How many days were filled."""
        return int(self.filled.sum())
