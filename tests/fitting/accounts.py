"""Invented accounts with known parameters, for checks of the fit."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from normalize.bills.periods import Periods
from normalize.fitting.align import Aligned, align
from normalize.weather.temperature import DailyTemperature

TRUTH = {
    "flat": {},
    "line": {"line": -0.21},
    "heating": {"b": 1.3},
    "cooling": {"c": 0.8},
    "two slopes": {"b": 1.3, "c": 0.4, "tc": 58.37},
    "heating and cooling": {"b": 1.3, "c": 0.8},
}


@dataclass(frozen=True)
class Account:
    """Periods over weather, with what made them."""

    start: NDArray[np.int64]
    end: NDArray[np.int64]
    use: NDArray[np.float64]
    temp: NDArray[np.float64]

    @property
    def weather(self) -> DailyTemperature:
        return DailyTemperature("made up", 0, self.temp, np.zeros(self.temp.shape[0], bool))

    def scaled(self, k: float) -> Account:
        return Account(self.start, self.end, self.use * k, self.temp)

    @property
    def aligned(self) -> Aligned:
        n = self.start.shape[0]
        return align(
            Periods(
                self.start.astype(np.int32),
                self.end.astype(np.int32),
                self.use,
                np.full(n, np.nan),
                np.zeros(n, bool),
                np.ones(n, np.int32),
            ),
            self.weather,
        )


def days_of(a: Account) -> list[NDArray[np.float64]]:
    """Each period's own daily temperatures."""
    return [a.temp[s:e] for s, e in zip(a.start, a.end, strict=True)]


def weather(rng: np.random.Generator, days: int, mean: float = 54.0, swing: float = 23.0):
    """Daily temperature with season and day-to-day persistence, in tenths of °F."""
    day = np.arange(days) + rng.integers(0, 365)
    noise = np.zeros(days)
    for i in range(1, days):
        noise[i] = 0.7 * noise[i - 1] + 5.0 * rng.normal()
    return np.round(mean - swing * np.cos(2 * np.pi * day / 365.25) + noise, 1)


def make(
    rng: np.random.Generator,
    *,
    n: int = 24,
    base: float = 11.0,
    b: float = 0.0,
    c: float = 0.0,
    line: float = 0.0,
    th: float = 58.37,
    tc: float = 67.14,
    noise: float = 0.0,
    lengths: tuple[int, int] = (26, 36),
    temp: NDArray[np.float64] | None = None,
) -> Account:
    """An account whose expected use follows the given parameters exactly."""
    size = rng.integers(*lengths, n)
    end = np.cumsum(size)
    start = end - size
    t = weather(rng, int(end[-1])) if temp is None else temp
    day = base + b * np.maximum(th - t, 0) + c * np.maximum(t - tc, 0) + line * t
    total = np.concatenate([[0.0], np.cumsum(day)])
    use = total[end] - total[start]
    use = use * (1.0 + noise * rng.normal(size=n))
    return Account(start, end, use, t)


def rough(rng: np.random.Generator, n: int = 24) -> Account:
    """An account with heavy noise, odd lengths, an outlier or two, sometimes no signal."""
    low, high = (20, 75) if rng.random() < 0.3 else (26, 36)
    made = make(
        rng,
        n=n,
        base=float(rng.uniform(1, 30)),
        b=float(rng.uniform(0, 1.5)),
        c=float(rng.uniform(0, 1.5)),
        th=float(rng.uniform(48, 66)),
        tc=float(rng.uniform(60, 75)),
        noise=float(rng.uniform(0.02, 0.5)),
        lengths=(low, high),
        temp=None,
    )
    use = made.use.copy()
    for _ in range(int(rng.integers(0, 3))):
        use[rng.integers(0, n)] *= float(rng.uniform(0.2, 3.0))
    return Account(made.start, made.end, use, made.temp)
