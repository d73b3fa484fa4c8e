"""How much of the long-term year lies in weather that a fit has not seen."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from normalize.fitting.results import Fit
    from normalize.weather.year import LongTermYear


@dataclass(frozen=True, slots=True)
class Extrapolation:
    """Shares of a long-term year that come from days colder or warmer than any day seen.

    low_f, high_f : coldest and warmest day of the bills, °F.
    days : share of the year's days; heating, cooling : of H0(τ) and C0(τ), None where the
    fit has no such slope or the year no such degree-days.
    """

    low_f: float
    high_f: float
    days: float
    heating: float | None
    cooling: float | None


def extrapolation_of(
    fit: Fit, year: LongTermYear, seen_temp_f: NDArray[np.float64]
) -> Extrapolation | None:
    """What the fit is stretched over. seen_temp_f : daily means of its bills, °F.

    None without days.  A day at the very edge counts as seen.

    >>> from normalize.weather.year import year_from_sample
    >>> from normalize.fitting.results import Fit
    >>> fit = Fit("heating", 60.0, None, 1.0, 0.1, None, None, 12, 365, 0, 0, 0, 0,
    ...     ("base load", "heating slope"), (1, 1), None, (1, 1), 0, 0, 2.0)
    >>> made = year_from_sample("x", [10.0, 30.0, 70.0], [65.0, 150.0, 150.0])
    >>> found = extrapolation_of(fit, made, np.array([20.0, 80.0]))
    >>> round(found.days, 4), round(found.heating, 4)  # 65/365; 3250 of 7750 °F·day
    (0.1781, 0.4194)
    """
    if seen_temp_f.shape[0] == 0:
        return None
    low, high = float(seen_temp_f.min()), float(seen_temp_f.max())
    temp, weight = year.temp_f, year.weight
    outside = (temp < low) | (temp > high)

    def share(amount: NDArray[np.float64]) -> float | None:
        total = float(amount.sum())
        return float(amount[outside].sum()) / total if total > 0.0 else None

    heating = cooling = None
    if fit.balance_heating_f is not None and fit.heating_slope is not None:
        heating = share(weight * np.maximum(fit.balance_heating_f - temp, 0.0))
    if fit.balance_cooling_f is not None and fit.cooling_slope is not None:
        cooling = share(weight * np.maximum(temp - fit.balance_cooling_f, 0.0))
    return Extrapolation(low, high, share(weight) or 0.0, heating, cooling)
