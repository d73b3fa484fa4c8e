"""Delivered fuel: few, long intervals, with the truth that made them."""

from __future__ import annotations

import numpy as np
import pytest

from normalize.bills.periods import Periods
from normalize.fitting.align import align
from normalize.savings.compare import Comparison, compare
from normalize.savings.sides import Work
from normalize.weather.temperature import DailyTemperature
from normalize.weather.year import year_from_sample
from tests.fitting.accounts import weather

pytestmark = pytest.mark.kernel


def oil(lengths: list[int], *, seed: int, noise: float = 0.0) -> tuple[Comparison, float]:
    """A house with intervals of the given lengths on either side; and its true saving."""
    rng = np.random.default_rng(seed)
    temp = weather(rng, 4200, mean=46.0)
    ends, start = [], 200
    for _ in range(2):
        ends.append(start + np.cumsum(lengths))
        start = int(ends[-1][-1]) + 20
    work = Work(int(ends[0][-1]), int(ends[0][-1]) + 20)
    starts = np.concatenate([np.r_[200, ends[0][:-1]], np.r_[work.end, ends[1][:-1]]])
    stops = np.concatenate(ends)
    use = []
    for a, b in zip(starts, stops, strict=True):
        slope, tau = (0.09, 61.0) if b <= work.start else (0.07, 60.0)
        day = 0.3 + slope * np.maximum(tau - temp[a:b], 0)
        use.append(day.sum() * (1 + noise * rng.normal()))
    n = len(use)
    periods = Periods(
        starts.astype(np.int32), stops.astype(np.int32), np.array(use), np.full(n, np.nan),
        np.zeros(n, bool), np.ones(n, np.int32),
    )  # fmt: skip
    station = DailyTemperature("made up", 0, temp, np.zeros(temp.shape[0], bool))
    year = year_from_sample("ten years", temp[:3650], np.full(3650, 0.1))
    found = compare(align(periods, station), work, year, forms=("flat", "heating"), delivered=True)
    truth = 0.09 * year.heating(61.0) - 0.07 * year.heating(60.0)
    return found, truth


def test_few_long_intervals_get_a_stated_balance_temperature_and_a_range_that_holds() -> None:
    """Five deliveries a side, none of them mild: nothing places τ, and the result says so."""
    found, truth = oil([70, 75, 80, 150, 65], seed=3)
    assert found.stated_f == 60.0
    saved = found.savings.normalized
    assert saved.low is not None
    assert saved.high is not None
    assert saved.low < truth < saved.high
    assert found.savings.before is not None
    assert found.savings.before.balance_heating_f == 60.0


def test_enough_deliveries_place_their_own() -> None:
    found, truth = oil([25, 22, 20, 30, 60, 90, 40, 28] * 2, seed=4, noise=0.02)
    assert found.stated_f is None
    saved = found.savings.normalized
    assert saved.value == pytest.approx(truth, rel=0.25)


def test_too_few_deliveries_say_how_many_more() -> None:
    found, _ = oil([120, 150, 120], seed=5)
    reason = found.savings.normalized.unavailable
    assert reason is not None
    assert "two more full fills" in reason
