"""The calibration study's own parts: simulator, counting, the Guideline 14 formula, the page."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from statsmodels.tsa.arima_process import ArmaProcess
from statsmodels.tsa.stattools import acf

from normalize.fitting.columns import AFTER, BEFORE
from normalize.savings.guideline import fractional_uncertainty
from tests.prove.calibration import choice, conclusions, errors, judge, plan
from tests.prove.calibration.cells import FORMS, Cell
from tests.prove.calibration.guideline import half_widths, lag_one, residuals
from tests.prove.calibration.homes import WORK_DAYS, simulate
from tests.prove.calibration.measures import Result, covered, measure, monte_carlo_error
from tests.prove.calibration.run import COVERAGE, results_of

CELL = Cell("heating", 12, 0.3)


@pytest.mark.parametrize("rho", [0.0, 0.3, 0.7, 0.95])
@pytest.mark.parametrize("df", [0, 3])
def test_errors_are_the_autoregression_that_statsmodels_describes(rho: float, df: int) -> None:
    """Theoretical autocorrelations and variance of AR(1): statsmodels' ArmaProcess."""
    process = ArmaProcess.from_coeffs([rho] if rho else [])
    made = errors.autoregression(np.random.default_rng(5), (4, 60_000), rho, df=df)[:, 200:]
    found = np.mean([acf(row, nlags=3, fft=True) for row in made], axis=0)
    assert found == pytest.approx(process.acf(4), abs=0.03)
    theory = (1.0 - rho * rho) * process.acovf(1)[0]
    assert theory == pytest.approx(1.0)
    assert made.var() == pytest.approx(theory, rel=0.25 if df else 0.06)  # t3: heavy


def test_outliers_come_on_top_of_the_noise() -> None:
    """Variance 1 + share · size², by the definition in errors.py (arithmetic)."""
    cell = replace(CELL, tails="outliers", rho=0.0)
    made = errors.errors(np.random.default_rng(6), cell, 400, 500)
    expected = 1.0 + errors.OUTLIER_SHARE * errors.OUTLIER_SIZE**2
    assert made.var() == pytest.approx(expected, rel=0.03)


def test_a_weekly_pattern_sums_to_nothing_over_a_week() -> None:
    made = errors.weekly(np.random.default_rng(7), 30, 70)
    assert made.reshape(30, 10, 7).sum(axis=2) == pytest.approx(0.0, abs=1e-12)
    assert (made**2).mean() == pytest.approx(errors.WEEKEND**2)


@pytest.mark.parametrize(
    "cell",
    [
        CELL, Cell("flat", 9), Cell("line", 12, offer="asked"), Cell("cooling", 12, climate="hot"),
        Cell("two slopes", 12, offer="asked"), Cell("heating and cooling", 12, climate="cold"),
        Cell("heating", 9, schedule="two-monthly"), Cell("heating", 60, schedule="daily"),
        Cell("heating", 10, schedule="delivered", a_year=5, offer="heat"),
        replace(CELL, folded=True),
    ],
    ids=judge.short,
)  # fmt: skip
def test_simulated_homes_hang_together(cell: Cell) -> None:
    homes = simulate(cell, 24)
    batch = homes.batch
    side = np.asarray(batch.side)
    assert homes.nac[:, 0] == pytest.approx(365.0)
    for i in range(24):
        own = slice(int(batch.offsets[i]), int(batch.offsets[i + 1]))
        start, end, code = batch.start[own], batch.end[own], side[own]
        assert (end > start).all()
        assert (np.diff(code.astype(int)) >= 0).all()
        gap = start[1:] - end[:-1]
        assert set(gap.tolist()) == {0, WORK_DAYS}
        assert gap[np.diff(code.astype(int)) == 1].tolist() == [WORK_DAYS]
        assert (homes.home[own] == i).all()
    before = side == BEFORE
    assert homes.expected[before] == pytest.approx(homes.without[before])
    assert (homes.expected > 0.0).all()


def test_noise_has_the_size_that_the_cell_says() -> None:
    homes = simulate(replace(CELL, rho=0.0, noise=0.2), 400)
    days = np.asarray(homes.batch.end) - np.asarray(homes.batch.start)
    share = (np.asarray(homes.batch.use) - homes.expected) / np.sqrt(days * 30.5)
    assert share.std() == pytest.approx(0.2, rel=0.02)


def test_the_truth_is_the_mean_of_the_expected_use() -> None:
    """Twelve months of expected bills, over many homes and years, make a normal year or so."""
    homes = simulate(CELL, 400)
    before = np.asarray(homes.batch.side) == BEFORE
    days = (np.asarray(homes.batch.end) - np.asarray(homes.batch.start))[before]
    a_year = 365.0 * homes.expected[before].sum() / days.sum()
    assert a_year == pytest.approx(365.0, rel=0.03)


def test_nothing_was_done_in_a_placebo() -> None:
    homes = simulate(CELL, 20, placebo=True)
    assert homes.nac[:, 0] == pytest.approx(homes.nac[:, 1])
    assert homes.avoided == pytest.approx(0.0, abs=1e-9)


def test_a_cell_is_the_same_whenever_it_is_simulated() -> None:
    a, b = simulate(CELL, 5), simulate(CELL, 5)
    assert np.array_equal(a.batch.use, b.batch.use)
    assert not np.array_equal(a.batch.use, simulate(replace(CELL, rho=0.31), 5).batch.use)


def test_coverage_is_counted() -> None:
    low = np.array([0.0, 0.0, 0.0, np.nan, 2.0])
    high = np.array([1.0, 1.0, 1.0, 1.0, 3.0])
    truth = np.array([0.0, 1.0, 1.1, 0.5, 2.5])
    assert covered(low, high, truth) == (0.75, 4)
    assert monte_carlo_error(0.9, 2000) == pytest.approx(0.0067082, abs=1e-6)


@pytest.mark.kernel
def test_guideline_formula_by_hand() -> None:
    """ΔS of one home, flat form: CV, lag-1 and formula written out (Reddy & Claridge 2000)."""
    homes = simulate(Cell("flat", 12, 0.5), 3)
    batch = homes.batch
    mine = (homes.home == 1) & (np.asarray(batch.side) == BEFORE)
    days = (np.asarray(batch.end) - np.asarray(batch.start)).astype(float)
    y = np.asarray(batch.use)[mine] / days[mine]
    mean = np.average(y, weights=days[mine])
    e = y - mean
    rows = np.full((3, 24), np.nan)
    from normalize.fitting.columns import BASE, MEAN, RSS

    rows[:, BASE] = rows[:, MEAN] = mean
    rows[:, RSS] = (days[mine] * e * e).sum()
    rho = float((e[1:] * e[:-1]).sum() / (e * e).sum())
    assert lag_one(homes, residuals(homes, rows))[1] == pytest.approx(rho)
    cv = np.sqrt((days[mine] * e * e).sum() / days[mine].mean() / 11) / mean
    t = 1.795885  # 95 % point of Student's t with 11 degrees of freedom (any table)
    n_prime = 12 * (1 - max(rho, 0)) / (1 + max(rho, 0))
    by_hand = t * 1.26 * cv * np.sqrt(12 / n_prime * (1 + 2 / n_prime) / 12) * 400.0
    plain = t * 1.26 * cv * np.sqrt((1 + 2 / 12) / 12) * 400.0
    found = half_widths(homes, rows, np.zeros(3, np.int8), np.full(3, 400.0))
    assert found[1] == pytest.approx([by_hand, plain], rel=1e-6)
    share = fractional_uncertainty(n=12, m=12, rho=0.0, cv=float(cv), fraction=1.0, t=t)
    assert share * 400.0 == pytest.approx(plain)


def test_averaging_is_buckland_burnham_augustin() -> None:
    """Biometrics 53:603-618, eq. 9, by hand: w (0.75, 0.25), θ (10, 14), se (1, 2), t 2."""
    one = np.ones((1, 2))
    side = choice._Side(
        np.array([[10.0, 14.0]]), np.array([[10.0, 14.0]]), np.array([[1.0, 2.0]]), 2.0 * one, one
    )
    value, middle, half = choice.average(side, np.array([[0.75, 0.25]]))
    assert value == pytest.approx([11.0])
    assert middle == pytest.approx([11.0])
    assert half == pytest.approx([2 * (0.75 * np.sqrt(1 + 1) + 0.25 * np.sqrt(4 + 9))])


def test_the_design_has_what_the_study_promises() -> None:
    core = plan.core()
    assert len(core) == len(set(core)) == len(FORMS) * len(plan.BILLS) * len(plan.RHOS)
    spokes = {c for rows in plan.spokes().values() for c in rows}
    assert {c.noise for c in spokes} | {0.10} == set(plan.NOISES)
    assert {c.climate for c in spokes} == {"temperate", *plan.CLIMATES}
    assert {c.a_year for c in spokes if c.schedule == "delivered"} == {5, 7, 10}
    assert len({c.seed for c in [*core, *spokes]}) == len({*core, *spokes})


@pytest.mark.kernel
def test_a_cell_is_measured_kept_and_judged(tmp_path: Path) -> None:
    """Thirty homes measure nothing; the parts fit together and a kept result is the same."""
    result = measure(CELL, 30)
    assert result.of("normalized").n == 30 - round(30 * result.unavailable)
    assert 0.5 < result.of("normalized").coverage <= 1.0
    assert result.of("normalized").width > result.of("normalized", "plain").width
    assert str(Result.from_json(result.as_json())) == str(result)  # as text: NaN is not itself
    for _ in range(2):  # measured, then taken from the folder
        kept = results_of(COVERAGE, [CELL], 30, processes=1, cache=tmp_path)
        assert str(kept) == str({CELL: result})
    assert len(list(tmp_path.rglob("*.json"))) == 1
    verdict = judge.coverage_verdict([result], "normalized", "one cell")
    assert verdict.met is not judge.outside(result, "normalized")


def test_the_conclusion_follows_the_numbers() -> None:
    """A way that is better by a tenth is preferred; one that is better by nothing is not."""

    def score(rms: float) -> choice.Score:
        return choice.Score(100, 0.9, rms, rms, 0.9, 0.9, 0.2)

    def made(averaged: float) -> str:
        scores = {way: score(0.05) for way in choice.WAYS} | {choice.AVERAGED: score(averaged)}
        return conclusions.conclusion([choice.Choice(CELL, 100, scores)])

    assert "Averaged lowers the error by 10.0%" in made(0.045)
    assert "picks one form by BIC" in made(0.05)


def test_after_the_work_use_is_less() -> None:
    homes = simulate(CELL, 50)
    after = np.asarray(homes.batch.side) == AFTER
    assert (homes.without[after] >= homes.expected[after] - 1e-9).all()
