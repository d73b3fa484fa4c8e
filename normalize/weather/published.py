"""A long-term year from published degree-days at a few bases.

Published normals give yearly degree-days at some bases; a fit needs them at its own balance
temperature.  Scaling one base to another is wrong, and so are degree-days of normal mean
temperatures (they lose a third of cooling in cool climates: docs/weather.md).  What is sought
is a year of daily temperatures, a distribution, whose degree-days at the published bases are
the published ones.  Degree-days of a distribution are monotone and convex in the base whatever
the distribution, so the interpolation is too.

Of all such distributions the one nearest to a plain year is taken, nearest in the sense of
minimum relative entropy (Kullback 1959, Information Theory and Statistics; memory).  The plain
year is a sinusoid of the seasons with normal day-to-day departures whose spread changes with
the season, three numbers fitted to the same degree-days.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np

from normalize.errors import UnreadableWeather
from normalize.weather.year import DAYS_PER_YEAR, LongTermYear, year_from_sample

if TYPE_CHECKING:
    from numpy.typing import NDArray

STEP_F: Final = 0.25  # of the sample; bases published in whole °F lie on it
LOWEST_F: Final = -60.0
HIGHEST_F: Final = 125.0
MIN_BASES: Final = 3  # fewer, and the three numbers of the plain year are a guess
NEGLIGIBLE: Final = 0.5  # °F·day a year: published with one decimal, below it mostly rounding
MAX_ERROR: Final = 1.0  # °F·day a year between the result and a published number
_SLACK: Final = 1e-9  # lets published roundings contradict convexity by a hair
_ITERATIONS: Final = 100


@dataclass(frozen=True, slots=True)
class Published:
    """Yearly degree-days as published, °F and °F·day.

    heating, cooling : base → degree-days a year.  mean_f : the year's mean temperature,
    used only where no base has both heating and cooling.
    """

    heating: Mapping[float, float]
    cooling: Mapping[float, float]
    mean_f: float | None = None

    def degrees(self, where: str) -> float:
        """365 × mean temperature: heating minus cooling is 365·base minus this, at any base."""
        both = sorted(set(self.heating) & set(self.cooling))
        if both:
            found = [DAYS_PER_YEAR * b - self.heating[b] + self.cooling[b] for b in both]
            return float(np.mean(found))
        if self.mean_f is None:
            raise UnreadableWeather(
                "gives heating or cooling degree-days but not both, and no mean temperature",
                where=where,
                wanted="both at one base at least",
            )
        return DAYS_PER_YEAR * self.mean_f


def year_of_published(
    name: str,
    published: Published,
    *,
    where: str,
    station: str = "",
    method: str = "",
    source: tuple[tuple[str, str], ...] = (),
    notes: tuple[str, ...] = (),
) -> LongTermYear:
    """A long-term year with exactly the published degree-days at the published bases.

    Raises UnreadableWeather for fewer than three bases, or numbers that no year can have.

    >>> lebanon = Published({50.0: 3761.0, 55.0: 4806.6, 60.0: 5991.6, 65.0: 7333.4},
    ...     {65.0: 461.1, 70.0: 160.1})  # NOAA 1991-2020 normals, USW00094765
    >>> round(year_of_published("Lebanon", lebanon, where="").heating(57.0), 0)  # 5264.1
    5263.0
    """
    degrees = published.degrees(where)
    base, heating = _at_all_bases(published, degrees)
    cooling = heating - DAYS_PER_YEAR * base + degrees
    _check(base, heating, cooling, where)
    temp = np.arange(LOWEST_F, HIGHEST_F + STEP_F / 2, STEP_F)
    plain = _plain_year(temp, base, heating, cooling, degrees / DAYS_PER_YEAR)
    weight = _tilted(plain, temp, base, heating, cooling, degrees, where)
    kept = weight > 0
    return year_from_sample(
        name,
        temp[kept],
        weight[kept] * (DAYS_PER_YEAR / weight.sum()),
        station=station,
        method=method,
        source=source,
        notes=notes,
    )


def _at_all_bases(
    published: Published, degrees: float
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Bases in order and heating at each; where only cooling is given, by the identity."""
    heating = {b: c + DAYS_PER_YEAR * b - degrees for b, c in published.cooling.items()} | dict(
        published.heating
    )
    bases = sorted(heating)
    return np.array(bases, dtype=np.float64), np.array([heating[b] for b in bases])


def _check(
    base: NDArray[np.float64],
    heating: NDArray[np.float64],
    cooling: NDArray[np.float64],
    where: str,
) -> None:
    if base.size < MIN_BASES:
        raise UnreadableWeather(
            f"gives degree-days at {base.size} bases",
            where=where,
            wanted=f"at least {MIN_BASES}, to find those between",
            next_step="Degree-days at one base cannot be scaled to another. Use the annual "
            "normals file, or a typical-year file.",
        )
    slope = np.diff(heating) / np.diff(base)
    bent = (np.diff(slope) < -MAX_ERROR / 2).any()
    if bent or (slope < -1e-6).any() or (slope > DAYS_PER_YEAR + 1).any():
        raise UnreadableWeather(
            "gives degree-days that no year of weather can have: they do not rise ever faster "
            "with the base",
            where=where,
            wanted="published normals, unchanged",
            next_step="Download the file again.",
        )
    if (heating < -MAX_ERROR).any() or (cooling < -MAX_ERROR).any():
        raise UnreadableWeather("gives negative degree-days", where=where, wanted="0 or more")


def _plain_year(
    temp: NDArray[np.float64],
    base: NDArray[np.float64],
    heating: NDArray[np.float64],
    cooling: NDArray[np.float64],
    mean_f: float,
) -> NDArray[np.float64]:
    """Days a year in each step of temperature, of the sinusoid that fits best."""
    from scipy.optimize import least_squares
    from scipy.special import ndtr

    season = np.cos(2 * np.pi * (np.arange(DAYS_PER_YEAR) + 0.5) / DAYS_PER_YEAR)
    scale = np.sqrt(np.maximum(np.minimum(heating, cooling), 50.0))

    def days(p: NDArray[np.float64]) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        return mean_f - p[0] * season, np.maximum(p[1] + p[2] * season, 1.0)

    def misfit(p: NDArray[np.float64]) -> NDArray[np.float64]:
        mean, spread = days(p)
        z = (base[:, None] - mean) / spread
        below = spread * (z * ndtr(z) + np.exp(-z * z / 2) / np.sqrt(2 * np.pi))
        gap: NDArray[np.float64] = (below.sum(axis=1) - heating) / scale
        return gap

    fit = least_squares(misfit, [20.0, 7.0, 1.0], bounds=([0, 2, -6], [70, 20, 6]))
    mean, spread = days(fit.x)
    edges = np.concatenate((temp - STEP_F / 2, [temp[-1] + STEP_F / 2]))
    share = np.diff(ndtr((edges[:, None] - mean) / spread).sum(axis=1))
    floor: NDArray[np.float64] = np.maximum(share, 1e-12)
    return floor


def _tilted(
    plain: NDArray[np.float64],
    temp: NDArray[np.float64],
    base: NDArray[np.float64],
    heating: NDArray[np.float64],
    cooling: NDArray[np.float64],
    degrees: float,
    where: str,
) -> NDArray[np.float64]:
    """The plain year with weights plain·exp(A'λ), the λ that give the published numbers.

    The dual problem, Σ plain·exp(A'λ) − b'λ, is convex: damped Newton steps find its one
    minimum.
    """
    rows, wanted = [np.ones(temp.size), (temp - 60.0) / 20], [DAYS_PER_YEAR, 0.0]
    wanted[1] = (degrees - 60.0 * DAYS_PER_YEAR) / 20
    for tau, h, c in zip(base, heating, cooling, strict=True):
        small = min(h, c)
        if small < NEGLIGIBLE:
            continue
        row = np.maximum(tau - temp, 0.0) if h < c else np.maximum(temp - tau, 0.0)
        unit = max(small, 50.0) / DAYS_PER_YEAR
        rows.append(row / unit)
        wanted.append(small / unit)
    a, b = np.array(rows), np.array(wanted)
    weight = _newton(plain, a, b)
    made = np.array([weight @ np.maximum(tau - temp, 0.0) for tau in base])
    if not np.isfinite(made).all() or np.abs(made - heating).max() > MAX_ERROR:
        raise UnreadableWeather(
            "gives degree-days that do not go together",
            where=where,
            wanted="published normals, unchanged",
            next_step="Download the file again.",
        )
    return weight


def _newton(
    plain: NDArray[np.float64], a: NDArray[np.float64], b: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Weights plain·exp(a'λ) with a·weights = b, up to the slack."""

    def value(lam: NDArray[np.float64]) -> float:
        power = np.minimum(lam @ a, 200.0)
        return float(plain @ np.exp(power) - b @ lam + _SLACK / 2 * lam @ lam)

    lam = np.zeros(b.size)
    for _ in range(_ITERATIONS):
        weight = plain * np.exp(np.minimum(lam @ a, 200.0))
        gradient = a @ weight - b + _SLACK * lam
        hessian = (a * weight) @ a.T + _SLACK * np.eye(b.size)
        step = np.linalg.solve(hessian, gradient)
        if float(gradient @ step) < 1e-18:
            break
        size, before = 1.0, value(lam)
        while value(lam - size * step) > before and size > 1e-10:
            size /= 2
        lam = lam - size * step
    result: NDArray[np.float64] = plain * np.exp(np.minimum(lam @ a, 200.0))
    return result
