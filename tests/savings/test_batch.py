"""One account and the same account among a thousand: the same bits."""

from __future__ import annotations

import numpy as np
import pytest

from normalize.bills.periods import Bills, Periods
from normalize.fitting.batch import Batch
from normalize.fitting.columns import AFTER, BEFORE
from normalize.fitting.fit import also_tried
from normalize.savings import kernel
from normalize.savings.compare import measure_savings, run_batch
from normalize.weather.temperature import DailyTemperature
from tests.fitting.accounts import weather
from tests.savings.homes import FIRST, WORK_DAYS, Homes, simulate

pytestmark = pytest.mark.kernel
FORMS = ("flat", "heating", "cooling", "heating and cooling")


def one_of(homes: Homes, i: int) -> Batch:
    b = homes.batch
    lo, hi = int(b.offsets[i]), int(b.offsets[i + 1])
    return Batch(
        b.start[lo:hi], b.end[lo:hi], b.use[lo:hi], b.side[lo:hi], np.array([0, hi - lo]),
        b.station[i : i + 1], b.wanted[i : i + 1], b.net[i : i + 1],
    )  # fmt: skip


def test_an_account_alone_and_among_a_thousand_are_the_same_bits() -> None:
    homes = simulate(1000, bills=14, rho=0.3, noise=0.1, seed=5, cool=0.15, forms=FORMS)
    fits, chosen, answers = run_batch(homes.batch, homes.table, [homes.year], confidence=0.9)
    assert len(set(chosen.ravel().tolist())) > 1
    for i in range(0, 1000, 97):
        alone = run_batch(one_of(homes, i), homes.table, [homes.year], confidence=0.9)
        assert alone[0][0].tobytes() == fits[i].tobytes()
        assert alone[1][0].tobytes() == chosen[i].tobytes()
        assert alone[2][0].tobytes() == answers[i].tobytes()


def test_a_site_answers_with_the_bits_of_its_row() -> None:
    """measure_savings cuts the station to its own days; the batch cuts it to everybody's."""
    rng = np.random.default_rng(5)
    homes = simulate(20, bills=14, rho=0.3, noise=0.1, seed=5)
    temp = weather(np.random.default_rng(5), FIRST + 2 * 16 * 34 + WORK_DAYS + 3700, mean=50.0)
    observed = DailyTemperature("made up", 0, temp, np.zeros(temp.shape[0], bool))
    rows = run_batch(homes.batch, homes.table, [homes.year], confidence=0.9, tried=also_tried())[2]
    for i in map(int, rng.integers(0, 20, 5)):
        one = one_of(homes, i)
        before, after = one.side == BEFORE, one.side == AFTER
        n = one.start.shape[0]
        periods = Periods(
            one.start.astype(np.int32), one.end.astype(np.int32), one.use, np.full(n, np.nan),
            np.zeros(n, bool), np.ones(n, np.int32),
        )  # fmt: skip
        bills = Bills("gas", "natural gas", "therm", (), periods, ())
        found = measure_savings(
            bills,
            observed,
            upgrade=(int(one.end[before].max()), int(one.start[after].min())),
            long_term=homes.year,
            forms=("flat", "heating"),
        )
        row = rows[i]
        for estimate, at in (
            (found.normalized, kernel.NORMALIZED),
            (found.avoided, kernel.AVOIDED),
            (found.nac_before, kernel.NAC_BEFORE),
            (found.nac_after, kernel.NAC_AFTER),
        ):
            numbers = (
                estimate.value, estimate.low, estimate.high, estimate.plain_low,
                estimate.plain_high,
            )  # fmt: skip
            assert np.array(numbers).tobytes() == row[at : at + 5].tobytes()


def test_one_signature_for_every_kernel() -> None:
    """Coerced at one gate: a second dtype or layout would compile (and differ) anew."""
    homes = simulate(3, bills=12, rho=0.0, noise=0.1, seed=1)
    run_batch(homes.batch, homes.table, [homes.year], confidence=0.9)
    f32 = Batch(
        homes.batch.start.astype(np.int64), homes.batch.end.astype(np.float64),
        np.asfortranarray(homes.batch.use.astype(np.float32)), homes.batch.side.astype(np.int32),
        homes.batch.offsets, homes.batch.station, homes.batch.wanted, homes.batch.net,
    )  # fmt: skip
    run_batch(f32, homes.table, [homes.year], confidence=0.9)
    assert len(kernel.compare_batch.signatures) == 1
