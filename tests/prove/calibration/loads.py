"""What homes truly use: parameters drawn for each, and the expected use they make."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from normalize.weather.year import LongTermYear
from tests.prove.calibration.climates import Station

MEAN_USE = 1.0  # a day in the long-term year before the work: every home's NAC is 365
MOST_EFFECT = 0.30  # the work takes up to this share of a slope
BASE_EFFECT = 1.0 / 3.0  # of the effect reaches the base load
TAU_EFFECT_F = 4.0  # °F that a balance temperature moves at an effect of one

WHOLE = ("flat", "line")  # forms whose use shrinks as a whole

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Loads:
    """(homes,) parameters; slopes per °F·day, balance temperatures in °F, the line about 0 °F."""

    base: Array
    heating: Array
    cooling: Array
    line: Array
    tau_h: Array
    tau_c: Array

    def use(self, temp: Array) -> Array:
        """(homes, days) expected use a day at (homes, days) temperatures."""
        out = self.base[:, None] + self.line[:, None] * temp
        if self.heating.any():
            out += self.heating[:, None] * np.maximum(self.tau_h[:, None] - temp, 0.0)
        if self.cooling.any():
            out += self.cooling[:, None] * np.maximum(temp - self.tau_c[:, None], 0.0)
        return out

    def nac(self, years: list[LongTermYear], station: NDArray[np.int64]) -> Array:
        """(homes,) expected use of the long-term year of each home's station."""
        out = 365.0 * self.base
        for i, year in enumerate(years):
            here = np.flatnonzero(station == i)
            out[here] += 365.0 * year.mean_f * self.line[here]
            for h in here:
                out[h] += self.heating[h] * year.heating(float(self.tau_h[h]))
                out[h] += self.cooling[h] * year.cooling(float(self.tau_c[h]))
        return out

    def after(self, effect: Array, form: str) -> Loads:
        """The same homes after work of that effect."""
        left = 1.0 - effect
        tau_h = self.tau_h - TAU_EFFECT_F * effect
        return replace(
            self,
            base=self.base * (left if form in WHOLE else 1.0 - BASE_EFFECT * effect),
            heating=self.heating * left,
            cooling=self.cooling * left,
            line=self.line * left,
            tau_h=tau_h,
            tau_c=tau_h if form == "two slopes" else self.tau_c + TAU_EFFECT_F * effect,
        )


# Shares of NAC that answer to cold and to heat, and where: (low, high) of uniform draws.
SHARES = {
    "heating": ((0.40, 0.75), (55.0, 65.0), (0.0, 0.0), (70.0, 70.0)),
    "cooling": ((0.0, 0.0), (60.0, 60.0), (0.30, 0.60), (64.0, 74.0)),
    "two slopes": ((0.30, 0.50), (60.0, 66.0), (0.15, 0.35), (60.0, 66.0)),
    "heating and cooling": ((0.30, 0.50), (55.0, 62.0), (0.15, 0.35), (66.0, 73.0)),
}
REACH_F = 3.0  # °F
LINE_SWING = (0.20, 0.40)  # of mean use, for one standard deviation of daily temperature


def draw(
    rng: np.random.Generator,
    form: str,
    stations: tuple[Station, ...],
    station: NDArray[np.int64],
    seasons: tuple[float, float],
) -> Loads:
    """Parameters of homes of a form, each with NAC 365 at its own station.

    seasons : usual temperatures of the climate's coldest and warmest time, °F; a balance
    temperature lies at least REACH_F inside them, or bills could not show it.
    """
    n = station.shape[0]
    zero = np.zeros(n)
    out = Loads(np.full(n, MEAN_USE), zero, zero, zero, np.full(n, 60.0), np.full(n, 70.0))
    if form == "flat":
        return out
    years = [s.year for s in stations]
    if form == "line":
        spread = np.array([np.sqrt(np.average((y.temp_f - y.mean_f) ** 2)) for y in years])
        mean = np.array([y.mean_f for y in years])
        slope = -rng.uniform(*LINE_SWING, n) / spread[station]
        return replace(out, base=out.base - slope * mean[station], line=slope)
    cold, at_h, hot, at_c = SHARES[form]
    share_h, share_c = rng.uniform(*cold, n), rng.uniform(*hot, n)
    tau_h = np.maximum(rng.uniform(*at_h, n), seasons[0] + REACH_F)
    tau_c = np.minimum(rng.uniform(*at_c, n), seasons[1] - REACH_F)
    if form == "two slopes":
        tau_c = tau_h
    heating = np.array([years[s].heating(float(t)) for s, t in zip(station, tau_h, strict=True)])
    cooling = np.array([years[s].cooling(float(t)) for s, t in zip(station, tau_c, strict=True)])
    return replace(
        out,
        base=MEAN_USE * (1.0 - share_h - share_c),
        heating=365.0 * MEAN_USE * share_h / heating,
        cooling=365.0 * MEAN_USE * share_c / cooling,
        tau_h=tau_h,
        tau_c=tau_c,
    )
