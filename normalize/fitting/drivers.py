"""What drives use beside the weather: known amounts for each period, about a normal level.

Occupied units, production, school days, weekends: anything whose amount is known on every
day that was billed.  A driver enters a fit as one more regressor, the mean of its days in
each period less its level in a normal year,

    use a day = a + b·h(τ) + Σ γ (x̄ − x₀),

so that the base load *a* and with it NAC belong to a normal amount of the driver, and every
formula for a normal year stays as it is.  The exact sweep projects the regressor out
(docs/method.md §2), so τ is still the global optimum.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    from normalize.bills.driver_rows import DriverRows

YEAR: Final = 365  # days of a long-term year
NEARLY_A_YEAR: Final = 360  # days of a side that stand for one
KNOWN_SHARE: Final = 0.95  # of the days that a normal level is the mean of


@dataclass(frozen=True, slots=True)
class DailyAmounts:
    """One driver, day by day.

    amount : (m,) float64 from ``first_day`` on, NaN where unknown.  kind : "total" (an amount
    made or spent in a day), "level" (an amount that holds on a day) or "day type" (0 or 1).
    normal : its mean in a normal year, an amount a day, where it was said; normal_from : how.
    """

    name: str
    first_day: int
    amount: NDArray[np.float64]
    kind: str
    source: str
    reading: tuple[str, ...] = ()
    normal: float | None = None
    normal_from: str = ""

    def between(self, first: int, last: int) -> NDArray[np.float64]:
        """(last − first,) amounts, NaN outside what is known."""
        out = np.full(max(last - first, 0), np.nan)
        lo, hi = max(first, self.first_day), min(last, self.first_day + self.amount.shape[0])
        if lo < hi:
            out[lo - first : hi - first] = self.amount[lo - self.first_day : hi - self.first_day]
        return out


def by_day(
    name: str, rows: DriverRows, *, normal: float | None = None, normal_from: str = ""
) -> DailyAmounts:
    """Rows laid out over their days: a total evenly over them, a level on each.

    >>> from normalize.bills.driver_rows import DriverRows
    >>> rows = DriverRows((0, 2), (2, 3), (10.0, 4.0), "total", ("x.csv", ""))
    >>> by_day("tonnes", rows).amount.tolist()
    [5.0, 5.0, 4.0]
    """
    first, last = min(rows.start), max(rows.end)
    amount = np.full(last - first, np.nan)
    for start, end, value in zip(rows.start, rows.end, rows.value, strict=True):
        amount[start - first : end - first] = (
            value / (end - start) if rows.values == "total" else value
        )
    return DailyAmounts(
        name, first, amount, rows.values, rows.source[0], rows.reading, normal, normal_from
    )


def period_means(
    driver: DailyAmounts, start: NDArray[np.int32], end: NDArray[np.int32]
) -> tuple[NDArray[np.float64], NDArray[np.int64]]:
    """(n,) mean amount a day of each period, NaN where a day is unknown; (n,) unknown days."""
    if start.shape[0] == 0:
        return np.empty(0), np.empty(0, dtype=np.int64)
    first, last = int(start.min()), int(end.max())
    daily = driver.between(first, last)
    unknown = np.isnan(daily)
    total = np.concatenate([[0.0], np.cumsum(np.where(unknown, 0.0, daily))])
    holes = np.concatenate([[0], np.cumsum(unknown)]).astype(np.int64)
    a, b = start - first, end - first
    missing = holes[b] - holes[a]
    mean = (total[b] - total[a]) / (end - start)
    return np.where(missing > 0, np.nan, mean), missing


def normal_level(
    driver: DailyAmounts, before: tuple[int, int] | None, after: tuple[int, int] | None
) -> tuple[float, str]:
    """The driver's amount a day in a normal year, and where it comes from.

    What site.toml says; else the mean of the reporting period's last 365 days; else of the
    baseline's; else of the days of either that are known.  before, after : ``[first, last)``
    of the bills of either side, None where there are none.
    """
    if driver.normal is not None:
        return driver.normal, driver.normal_from
    for span, name in ((after, "reporting period"), (before, "baseline period")):
        if span is None or span[1] - span[0] < NEARLY_A_YEAR:
            continue
        days = driver.between(max(span[1] - YEAR, span[0]), span[1])
        known = days[~np.isnan(days)]
        if known.shape[0] >= KNOWN_SHARE * days.shape[0]:
            return float(known.mean()), f"mean of the last year of the {name}"
    for span, name in ((before, "baseline period"), (after, "reporting period")):
        days = driver.between(*span) if span is not None else np.empty(0)
        known = days[~np.isnan(days)]
        if known.shape[0]:
            return float(known.mean()), f"mean of the {known.shape[0]} days known in the {name}"
    return 0.0, "unknown"


@dataclass(frozen=True, slots=True)
class Drivers:
    """Drivers of one account's periods, ready for a fit.

    names : (k,) as reports call them.
    values : (n, k) float64, C-contiguous: the period's mean of the driver's daily amount, less
        its normal level; one row for each period of the account, usable or not.  Finite
        everywhere: the rows of periods that no fit may use hold 0.
    normals : (k,) the level taken off, an amount a day.
    sources : (k,) the file or list each came from.
    """

    names: tuple[str, ...]
    values: NDArray[np.float64]
    normals: tuple[float, ...]
    sources: tuple[str, ...]

    @property
    def k(self) -> int:
        """How many drivers."""
        return len(self.names)

    def only(self, keep: Sequence[int]) -> Drivers:
        """Some of them, by position.

        >>> both = Drivers(("a", "b"), np.array([[1.0, 2.0]]), (0.0, 5.0), ("", "x.csv"))
        >>> both.only([1]).names, both.only([1]).values.tolist(), both.only([]).k
        (('b',), [[2.0]], 0)
        """
        at = list(keep)
        return Drivers(
            names=tuple(self.names[i] for i in at),
            values=np.ascontiguousarray(self.values[:, at], dtype=np.float64),
            normals=tuple(self.normals[i] for i in at),
            sources=tuple(self.sources[i] for i in at),
        )


def no_drivers(n: int) -> NDArray[np.float64]:
    """(n, 0): the matrix of an account without drivers."""
    return np.empty((n, 0), dtype=np.float64)


def unknown_reason(driver: DailyAmounts, missing: int, days: int) -> str:
    """Why a period cannot be used with this driver; "" when it can."""
    if missing == 0:
        return ""
    what = "all" if missing == days else f"{missing}"
    return f"{what} of its {days} days have no amount of {driver.name}"


def as_drivers(
    drivers: Sequence[DailyAmounts],
    start: NDArray[np.int32],
    end: NDArray[np.int32],
    normals: Sequence[float],
) -> tuple[Drivers, tuple[str, ...]]:
    """The drivers of an account's periods, and each period's reason against being used."""
    values = np.zeros((start.shape[0], len(drivers)))
    reasons = [""] * start.shape[0]
    for j, driver in enumerate(drivers):
        mean, missing = period_means(driver, start, end)
        values[:, j] = np.where(missing > 0, 0.0, mean - normals[j])
        for i in np.flatnonzero(missing).tolist():
            days = int(end[i] - start[i])
            reasons[i] = reasons[i] or unknown_reason(driver, int(missing[i]), days)
    found = Drivers(
        names=tuple(d.name for d in drivers),
        values=values,
        normals=tuple(float(x) for x in normals),
        sources=tuple(d.source for d in drivers),
    )
    return found, tuple(reasons)
