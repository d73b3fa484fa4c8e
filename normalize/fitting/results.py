"""What a fit is: numbers only, small enough to keep a million of.

Use is in the account's own unit; temperatures are °F; slopes are per °F·day (the line's
slope per °F and day).  Everything is per day unless it says "a year".
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

    from normalize.weather.year import LongTermYear


@dataclass(frozen=True, slots=True)
class Fit:
    """How use answers to outdoor temperature on one side of the work.

    form : one of ``normalize.fitting.forms.FORMS``.
    balance_heating_f, balance_cooling_f : °F; None where the form has none; equal for the
        form "two slopes".
    base_load : use per day that does not answer to weather (the line's value at 0 °F for
        the form "line").
    heating_slope, cooling_slope : use per °F·day; line_slope : use per day and °F.
    rss : Σ d·r² of use per day.  r2, cv_rmse : fractions.  bias : Σ(E−Ê)/ΣE.
    se : standard errors with the balance temperature taken as found, in the order of
        ``terms``; se_full : the same with its uncertainty included (None where singular).
    t : coefficient ÷ se.
    balance_heating_range_f, balance_cooling_range_f : profile range of τ (method.md §5).
    on_bound : the balance temperature ended on the edge of its allowed range.
    rho : restricted-likelihood estimate of the lag-1 correlation; durbin_watson.
    set_aside : periods of this side that did not take part.
    driver_effects : use a day for one more of each driver a day, in the drivers' order; the
        base load, ``predict`` and ``nac`` belong to their normal levels.
    """

    form: str
    balance_heating_f: float | None
    balance_cooling_f: float | None
    base_load: float
    heating_slope: float | None
    cooling_slope: float | None
    line_slope: float | None
    n_periods: int
    n_days: int
    rss: float
    r2: float
    cv_rmse: float
    bias: float
    terms: tuple[str, ...]
    se: tuple[float, ...]
    se_full: tuple[float, ...] | None
    t: tuple[float, ...]
    aicc: float
    bic: float
    mean_use: float
    balance_heating_range_f: tuple[float, float] | None = None
    balance_cooling_range_f: tuple[float, float] | None = None
    on_bound: bool = False
    rho: float = 0.0
    durbin_watson: float = float("nan")
    set_aside: int = 0
    driver_effects: tuple[float, ...] = ()

    def predict(self, temp_f: NDArray[np.float64]) -> NDArray[np.float64]:
        """Expected use of each day. temp_f : (n_days,) daily mean, °F; returns (n_days,)."""
        import numpy as np

        t = np.asarray(temp_f, dtype=np.float64)
        use = np.full(t.shape, self.base_load)
        if self.line_slope is not None:
            use = use + self.line_slope * t
        if self.heating_slope is not None and self.balance_heating_f is not None:
            use = use + self.heating_slope * np.maximum(self.balance_heating_f - t, 0.0)
        if self.cooling_slope is not None and self.balance_cooling_f is not None:
            use = use + self.cooling_slope * np.maximum(t - self.balance_cooling_f, 0.0)
        return use

    def nac(self, year: LongTermYear) -> float:
        """Normalized annual consumption in that long-term year. [account's unit a year]"""
        total = 365.0 * self.base_load
        if self.line_slope is not None:
            total += 365.0 * self.line_slope * year.mean_f
        if self.heating_slope is not None and self.balance_heating_f is not None:
            total += self.heating_slope * year.heating(self.balance_heating_f)
        if self.cooling_slope is not None and self.balance_cooling_f is not None:
            total += self.cooling_slope * year.cooling(self.balance_cooling_f)
        return total


@dataclass(frozen=True, slots=True)
class FormTried:
    """One form on one side: its fit, and whether it was chosen or why it was set aside.

    fit : None when the form could not be fitted at all.
    chosen : exactly one form of a side is chosen, or none.
    reason : why this one was set aside; empty for the chosen one.
    """

    form: str
    fit: Fit | None
    chosen: bool
    reason: str = ""
