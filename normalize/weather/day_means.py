"""Conventions that work from a day's maximum and minimum.

The weather service's rounding, the four-case formulas of British practice, and growing
degree-days.  All are per day, elementwise, NaN where either temperature is NaN.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import ArrayLike, NDArray


def exact_mean(max_f: ArrayLike, min_f: ArrayLike) -> NDArray[np.float64]:
    """Mean of maximum and minimum, unrounded.

    >>> exact_mean([68.0], [53.0]).tolist()
    [60.5]
    """
    return (np.asarray(max_f, dtype=np.float64) + np.asarray(min_f, dtype=np.float64)) / 2


def whole_degree_mean(max_f: ArrayLike, min_f: ArrayLike) -> NDArray[np.float64]:
    """Mean as the weather service counts it: whole °F each, their mean rounded half up. [°F]

    Source: NWS climate summaries (Burlington: 68 and 53 °F have the mean 61, hence 4 HDD).

    >>> whole_degree_mean([68.0, 72.0], [53.0, 62.0]).tolist()
    [61.0, 67.0]
    """
    high = _half_up(np.asarray(max_f, dtype=np.float64))
    low = _half_up(np.asarray(min_f, dtype=np.float64))
    return _half_up((high + low) / 2)


def _half_up(value: NDArray[np.float64]) -> NDArray[np.float64]:
    return np.floor(value + 0.5)


def four_case_heating(maximum: ArrayLike, minimum: ArrayLike, base: float) -> NDArray[np.float64]:
    """Heating degree-days from maximum and minimum; the base may fall between them.

    All in one unit, °C or °F.  Source: the four formulas as published in CIBSE TM41 (memory).

    >>> four_case_heating([10, 18, 22, 20], [4, 8, 12, 16], 15.5).tolist()
    [8.5, 3.125, 0.875, 0.0]
    """
    high = np.asarray(maximum, dtype=np.float64)
    low = np.asarray(minimum, dtype=np.float64)
    above, below = high - base, base - low
    mostly_cold = 0.5 * below - 0.25 * above
    mostly_warm = 0.25 * below
    dd = np.where(above < below, mostly_cold, mostly_warm)
    dd = np.where(above <= 0, base - (high + low) / 2, dd)
    dd = np.where(below <= 0, 0.0, dd)
    missing = np.isnan(high) | np.isnan(low)
    return np.where(missing, np.nan, dd)


def four_case_cooling(maximum: ArrayLike, minimum: ArrayLike, base: float) -> NDArray[np.float64]:
    """Cooling degree-days, the mirror image of ``four_case_heating``.

    >>> four_case_cooling([27, 15], [19, 10], 15.5).tolist()
    [7.5, 0.0]
    """
    return four_case_heating(
        -np.asarray(minimum, dtype=np.float64), -np.asarray(maximum, dtype=np.float64), -base
    )


def growing_degree_days(
    max_f: ArrayLike, min_f: ArrayLike, base_f: float = 50.0, *, ceiling_f: float | None = None
) -> NDArray[np.float64]:
    """Growing degree-days of each day: (mean of maximum and minimum − base)⁺. [°F·day]

    ceiling_f : where given, maximum and minimum are first brought inside [base, ceiling];
    86 °F with base 50 is the corn rule (memory).  Without it a day with 65 and 31 °F counts
    none (mean 48), as in WRCC's monthly summaries, where it counts 2 *heating* degree-days.

    >>> growing_degree_days([65.0], [31.0]).tolist()
    [0.0]
    >>> growing_degree_days([65.0], [31.0], ceiling_f=86.0).tolist()
    [7.5]
    """
    high = np.asarray(max_f, dtype=np.float64)
    low = np.asarray(min_f, dtype=np.float64)
    if ceiling_f is not None:
        high, low = np.clip(high, base_f, ceiling_f), np.clip(low, base_f, ceiling_f)
    return np.maximum((high + low) / 2 - base_f, 0.0)
