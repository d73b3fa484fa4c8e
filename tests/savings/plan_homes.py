"""Simulated homes that save exactly what `normalize plan` called the smallest that shows.

Each home has bills before and after the work about one truth; its own baseline says how small
a saving would show; bills after the work are then drawn with just that saving.  How often the
default range excludes zero is what the plan promised.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from normalize.bills.periods import Periods
from normalize.fitting.align import align
from normalize.fitting.batch import Batch, stations, wanted_mask
from normalize.fitting.columns import AFTER, BEFORE
from normalize.savings.compare import compare, run_batch
from normalize.savings.kernel import AVOIDED, NORMALIZED
from normalize.savings.planning import Ahead, Baseline, prospects
from normalize.savings.sides import Work
from normalize.weather.temperature import DailyTemperature
from normalize.weather.year import LongTermYear, year_from_sample
from tests.fitting.accounts import weather

DAYS = 365 * 16
TEN_YEARS = 3650
WORK_DAYS = 31
KINDS = (
    ("avoided", "even"),
    ("avoided", "likely"),
    ("normalized", "even"),
    ("normalized", "likely"),
)
GAS = ("flat", "heating")
BOTH = ("flat", "heating", "cooling", "heating and cooling")


@dataclass(frozen=True)
class Place:
    """One invented climate and one truth: use a day of every day."""

    temp: NDArray[np.float64]
    use: NDArray[np.float64]
    year: LongTermYear
    station: DailyTemperature

    @classmethod
    def of(cls, rng: np.random.Generator, *, cooling: float, mean_f: float) -> Place:
        temp = weather(rng, DAYS, mean=mean_f)
        use = 0.6 + 0.12 * np.maximum(61 - temp, 0) + cooling * np.maximum(temp - 70, 0)
        year = year_from_sample("ten years", temp[-TEN_YEARS:], np.full(TEN_YEARS, 0.1))
        return cls(temp, use, year, DailyTemperature("made up", 0, temp, np.zeros(DAYS, bool)))

    def to_come(self, first: int, days: int) -> NDArray[np.float64]:
        """(10, days) the same days of the last ten years."""
        at = (first + np.arange(days) - (DAYS - TEN_YEARS)) % 365
        return np.stack([self.temp[DAYS - TEN_YEARS + 365 * y + at] for y in range(10)])


def errors(rng: np.random.Generator, n: int, rho: float) -> NDArray[np.float64]:
    """(n,) AR(1) of unit variance."""
    out = np.empty(n)
    out[0] = rng.normal()
    for i in range(1, n):
        out[i] = rho * out[i - 1] + np.sqrt(1 - rho * rho) * rng.normal()
    return out


def shows(
    homes: int,
    *,
    before: int,
    after: int,
    rho: float | tuple[float, float],
    seed: int,
    noise: float = 0.10,
    cooling: float = 0.0,
    mean_f: float = 50.0,
    length: int = 31,
) -> dict[tuple[str, str], tuple[float, int, float]]:
    """For each kind and odds: (share of ranges that show the saving, homes, median saving).

    rho : one, or a pair between which every home draws its own.  length : mean days of a bill.
    """
    rng = np.random.default_rng(seed)
    place = Place.of(rng, cooling=cooling, mean_f=mean_f)
    forms = BOTH if cooling else GAS
    scale = noise * float(place.use.mean())
    nac = 365 * float(place.use[-TEN_YEARS:].mean())
    rows: list[tuple[NDArray[np.float64], ...]] = []
    kinds: list[tuple[str, str]] = []
    shares: list[float] = []
    for _ in range(homes):
        own = rng.uniform(*rho) if isinstance(rho, tuple) else rho
        start, end, mean = bills(rng, place, 400 + int(rng.integers(0, 365)), before, length)
        use = (mean + scale * errors(rng, before, own)) * (end - start)
        work = Work(int(end[-1]), int(end[-1]) + WORK_DAYS)
        s2, e2, m2 = bills(rng, place, work.end, after, length)
        noise2 = scale * errors(rng, after, own)
        smallest = promised(place, start, end, use, work, after, forms)
        for kind, odds in KINDS:
            if (kind, odds) not in smallest:
                continue
            over = nac if kind == "normalized" else float((m2 * (e2 - s2)).sum())
            share = smallest[kind, odds] / over
            use2 = (m2 * (1 - share) + noise2) * (e2 - s2)
            side = np.repeat([BEFORE, AFTER], [before, after])
            rows.append((np.append(start, s2), np.append(end, e2), np.append(use, use2), side))
            kinds.append((kind, odds))
            shares.append(share)
    answers = answered(place, rows, forms)
    out = {}
    for kind, odds in KINDS:
        mine = [i for i, k in enumerate(kinds) if k == (kind, odds)]
        at = NORMALIZED if kind == "normalized" else AVOIDED
        low = answers[mine, at + 1] if mine else np.empty(0)
        low = low[np.isfinite(low)]
        if low.size:
            median = float(np.median(np.array(shares)[mine]))
            out[kind, odds] = (float((low > 0).mean()), int(low.size), median)
    return out


def bills(
    rng: np.random.Generator, place: Place, first: int, n: int, length: int
) -> tuple[NDArray[np.int64], NDArray[np.int64], NDArray[np.float64]]:
    """Starts, ends and true use a day of n bills from a day on."""
    end = first + np.cumsum(rng.integers(length - 3, length + 3, n))
    start = np.append(first, end[:-1])
    mean = np.array([place.use[a:b].mean() for a, b in zip(start, end, strict=True)])
    return start, end, mean


def promised(
    place: Place,
    start: NDArray[np.int64],
    end: NDArray[np.int64],
    use: NDArray[np.float64],
    work: Work,
    after: int,
    forms: tuple[str, ...],
) -> dict[tuple[str, str], float]:
    """What the plan made from this baseline calls the smallest saving, in units."""
    n = start.shape[0]
    periods = Periods(
        start.astype(np.int32), end.astype(np.int32), use, np.full(n, np.nan),
        np.zeros(n, bool), np.ones(n, np.int32),
    )  # fmt: skip
    aligned = align(periods, place.station)
    found = compare(aligned, work, place.year, forms=forms)
    if found.savings.before is None:
        return {}
    mine = np.flatnonzero(np.array([label == "before" for label in found.labels]))
    baseline = Baseline.of(aligned, mine, found.savings.before, held=found.held[0])
    length = int(np.median(end - start))
    ahead = Ahead(work.end, length, place.to_come(work.end, after * length), tuple(range(10)))
    (one,) = prospects(baseline, ahead, place.year, counts=(after,))
    out = {("avoided", "even"): one.avoided.even, ("avoided", "likely"): one.avoided.likely}
    if one.normalized is not None:
        out["normalized", "even"] = one.normalized.even
        out["normalized", "likely"] = one.normalized.likely
    return out


def answered(
    place: Place, rows: list[tuple[NDArray[np.float64], ...]], forms: tuple[str, ...]
) -> NDArray[np.float64]:
    """The default answers of all homes, one batch."""
    start, end, use, side = (np.concatenate([r[i] for r in rows]) for i in range(4))
    n = len(rows)
    batch = Batch(
        start=start, end=end, use=use, side=side,
        offsets=np.cumsum([0, *(r[0].shape[0] for r in rows)]), station=np.zeros(n, int),
        wanted=np.tile(wanted_mask(forms), (n, 1)), net=np.zeros(n, bool),
    )  # fmt: skip
    table = stations([(0, place.temp)], int(start.min()), int(end.max()))
    return run_batch(batch, table, [place.year], confidence=0.90)[2]
