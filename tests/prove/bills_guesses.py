"""Guessed readings that nobody marked: how often the caution speaks, rightly and wrongly.

``python -m tests.prove.bills_guesses [homes]`` prints tables for docs/evidence-bills.md.  The homes
are those of bills_faults.py (a fifth less use after the work, 24 bills on each side), with 4, 8 and
15 % noise; each side is fitted by the program's own fit.  Own invented homes and weather.
"""

from __future__ import annotations

import platform
import sys
import time
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from normalize.bills.flags import flag_batch
from normalize.bills.rules import ALTERNATING
from normalize.days import day_of_iso
from normalize.fitting.batch import Batch, fit_batch, stations, wanted_mask
from normalize.fitting.columns import AFTER, BASE, BEFORE, SLOPE_C, SLOPE_H, TAU_C, TAU_H, UNUSED
from normalize.fitting.forms import BY_CODE
from normalize.savings.guesses import SideOfWork, Sway, sway_of
from normalize.savings.offer import forms_offered
from tests.prove.bills_faults import BEGIN, FIRST, WORK, weather_of

NOISES = (0.04, 0.08, 0.15)
END = day_of_iso("2023-01-20")
OFF = 0.15  # spread of a guess about the truth, of the bill
Float = NDArray[np.float64]
Rng = np.random.Generator


def clean_home(rng: Rng, temp: Float) -> tuple[NDArray[np.int64], NDArray[np.int64], Float]:
    """Start, end and use without noise, as bills_faults.home_of makes them."""
    base, slope, tau = rng.uniform(0.3, 1.0), rng.uniform(0.08, 0.2), rng.uniform(57.0, 65.0)
    start, end, use = [], [], []
    day = BEGIN
    while day < END:
        last = day + int(rng.integers(28, 34))
        heat = np.maximum(0.0, tau - temp[day - FIRST : last - FIRST])
        start.append(day)
        end.append(last)
        use.append(float((base + slope * heat).sum()) * (0.8 if day >= WORK[0] else 1.0))
        day = last
    return np.array(start), np.array(end), np.array(use)


def in_proportion(rng: Rng, use: Float, noise: float) -> Float:
    """Noise in proportion to the bill, lognormal with mean one."""
    return np.asarray(use * np.exp(rng.normal(0.0, noise, use.shape) - noise**2 / 2))


def the_same_all_year(rng: Rng, use: Float, noise: float) -> Float:
    """Noise of the same size in every bill: the share of the mean bill."""
    return np.asarray(np.maximum(0.0, use + rng.normal(0.0, noise * use.mean(), use.shape)))


def heavy(rng: Rng, use: Float, noise: float) -> Float:
    """Noise with heavy tails (Student, 4 degrees of freedom) of the same standard deviation."""
    return np.asarray(use * np.maximum(0.1, 1 + noise * rng.standard_t(4, use.shape) / 2**0.5))


def persistent(rng: Rng, use: Float, noise: float) -> Float:
    """Noise with a memory of 0.4 from bill to bill."""
    out, last = np.empty(use.shape), 0.0
    for k in range(use.shape[0]):
        last = 0.4 * last + rng.normal(0.0, noise * (1 - 0.4**2) ** 0.5)
        out[k] = use[k] * np.exp(last - noise**2 / 2)
    return out


def _guessed(use: Float, places: NDArray[np.int64], error: Float) -> Float:
    for k, e in zip(places.tolist(), error.tolist(), strict=True):
        use[k] += e
        use[k + 1] -= e
    return use


def a_fifth(rng: Rng, use: Float) -> Float:
    """A fifth of the readings are guesses."""
    at = np.flatnonzero(rng.random(use.shape[0] - 1) < 0.2)
    return _guessed(use, at, use[at] * rng.normal(0.0, OFF, at.shape))


def every_other(rng: Rng, use: Float) -> Float:
    """Every other reading is a guess, as where meters are read every second month."""
    at = np.arange(0, use.shape[0] - 1, 2)
    return _guessed(use, at, use[at] * rng.normal(0.0, OFF, at.shape))


def last_years(rng: Rng, use: Float) -> Float:
    """Two fifths of the readings are guessed to use what the same bill of last year did."""
    at = np.flatnonzero(rng.random(use.shape[0] - 1) < 0.4)
    for k in at[at >= 12].tolist():
        error = use[k - 12] - use[k]
        use[k] += error
        use[k + 1] -= error
    return use


Noise = Callable[[Rng, Float, float], Float]
ROWS: dict[str, tuple[Noise, Callable[[Rng, Float], Float] | None]] = {
    "no guesses, noise in proportion to use": (in_proportion, None),
    "no guesses, the same noise all year": (the_same_all_year, None),
    "no guesses, heavy tails": (heavy, None),
    "no guesses, noise with a memory of 0.4": (persistent, None),
    "a fifth of the readings guessed": (in_proportion, a_fifth),
    "every other reading guessed": (in_proportion, every_other),
    "guessed from last year's bills": (in_proportion, last_years),
    "a fifth guessed, the same noise all year": (the_same_all_year, a_fifth),
}


@dataclass(frozen=True)
class Histories:
    """Many homes' bills as one ragged batch. temp : daily, from FIRST.  use : with noise."""

    start: NDArray[np.int64]
    end: NDArray[np.int64]
    use: Float
    offsets: NDArray[np.int64]
    temp: Float

    def sways(self) -> list[Sway | None]:
        """The sway of each home about the program's own fits of either side."""
        side = np.full(self.start.shape, UNUSED, np.uint8)
        side[self.end <= WORK[0]] = BEFORE
        side[self.start >= WORK[1]] = AFTER
        homes = self.offsets.shape[0] - 1
        wanted = np.tile(wanted_mask(forms_offered("natural gas")), (homes, 1))
        start, end = self.start.astype(np.int32), self.end.astype(np.int32)
        batch = Batch(start, end, self.use, side, self.offsets, np.zeros(homes, np.int32),
                      wanted, np.zeros(homes, bool))  # fmt: skip
        table = stations([(FIRST, self.temp)], int(self.start.min()), int(self.end.max()))
        fits = {code: fit_batch(batch, table, code) for code in (BEFORE, AFTER)}
        found = []
        for home in range(homes):
            own = slice(int(self.offsets[home]), int(self.offsets[home + 1]))
            sides = [self._side(own, side, code, *fits[code], home) for code in (BEFORE, AFTER)]
            found.append(sway_of([s for s in sides if s is not None]))
        return found

    def _side(
        self, own: slice, side: NDArray[np.uint8], code: int, fits: Float,
        chosen: NDArray[np.int8], home: int,
    ) -> SideOfWork | None:  # fmt: skip
        form = int(chosen[home])
        if form < 0:
            return None
        mine = side[own] == code
        s, e, u = self.start[own][mine], self.end[own][mine], self.use[own][mine]
        row = np.nan_to_num(fits[home, form])  # what a form has not counts nothing
        days = self.temp[int(s[0]) - FIRST : int(e[-1]) - FIRST]
        daily = np.full(days.shape, row[BASE])
        daily += row[SLOPE_H] * np.maximum(row[TAU_H] - days, 0.0)
        daily += row[SLOPE_C] * np.maximum(days - row[TAU_C], 0.0)
        fitted = np.add.reduceat(daily, s - s[0]) / (e - s)
        parameters = BY_CODE[form].parameters
        return SideOfWork(s, e, u / (e - s), fitted, parameters)


def prove(homes: int = 1000) -> str:
    """The table, as Markdown."""
    began = time.perf_counter()
    weather = weather_of(np.random.default_rng(20261201))
    clean = [clean_home(np.random.default_rng(1000 + k), weather.temp_f) for k in range(homes)]
    lines = [
        "| history | 4 % noise | 8 % | 15 % | season only, 8 % |",
        "| --- | --: | --: | --: | --: |",
    ]
    start, end = (np.concatenate([home[k] for home in clean]) for k in (0, 1))
    offsets = np.concatenate([[0], np.cumsum([home[0].shape[0] for home in clean])])
    for name, (noisy, guess) in ROWS.items():
        cells, season = [], 0.0
        for noise in NOISES:
            seen = []
            for k, home in enumerate(clean):
                rng = np.random.default_rng(7777 + k)
                use = noisy(rng, home[2], noise)
                seen.append(np.round(guess(rng, use) if guess is not None else use, 1))
            every = Histories(start, end, np.concatenate(seen), offsets, weather.temp_f)
            share = float(np.mean([s is not None and s.suspicious for s in every.sways()]))
            cells.append(f"{share:.3f} ± {(share * (1 - share) / homes) ** 0.5:.3f}")
            if noise == NOISES[1]:
                bits = flag_batch(start, end, every.use, offsets) & ALTERNATING
                season = float(np.mean(np.maximum.reduceat(bits, offsets[:-1]) > 0))
        lines.append(f"| {name} | {' | '.join(cells)} | {season:.3f} |")
    took = time.perf_counter() - began
    version = f"Python {platform.python_version()}, numpy {np.__version__}"
    return "\n".join([f"{homes} homes a cell, {took:.0f} s; {version}.", "", *lines])


if __name__ == "__main__":
    print(prove(int(sys.argv[1]) if len(sys.argv) > 1 else 1000))
