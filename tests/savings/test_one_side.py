"""A side's evidence: balance temperatures that bills do not place, and drivers.

Sources: integration over the balance temperature by numpy on a grid ten times finer, from
the definition in docs/method.md §5; statsmodels WLS with the driver as a column.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
import statsmodels.api as sm

from normalize.fitting.batch import Batch, settings, stations, take_drivers, take_side, wanted_mask
from normalize.fitting.columns import (
    BASE,
    BEFORE,
    HIGH_H,
    LOW_H,
    SLOPE_H,
    TAU_H,
)
from normalize.fitting.forms import HEATING
from normalize.fitting.side import fit_side
from normalize.savings.compare import run_batch
from normalize.savings.kernel import NAC_BEFORE, NORMALIZED, PREDICTED, UNSURE_BEFORE
from normalize.savings.one_side import side_evidence
from normalize.weather.year import year_from_sample
from tests.fitting.accounts import weather
from tests.savings.homes import simulate

pytestmark = pytest.mark.kernel
RNG = np.random.default_rng(12)
TEMP = weather(RNG, 2400, mean=50.0)
YEAR = year_from_sample("ten years", TEMP[:1825], np.full(1825, 0.2))


def bills(n: int, noise: float, first: int = 0) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    start = first + 30 * np.arange(n)
    daily = 0.6 + 0.12 * np.maximum(61.0 - TEMP, 0)
    mean = np.array([daily[s : s + 30].mean() for s in start])
    return start, start + 30, 30 * mean * (1 + noise * RNG.normal(size=n))


def test_an_open_balance_temperature_is_integrated_over() -> None:
    """Against a dense integration at ρ and power summed out, on 201 temperatures."""
    start, end, use = bills(9, 0.6)
    table = stations([(0, TEMP)], 0, 400)
    side = take_side(
        start.astype(np.int32), end.astype(np.int32), use, np.full(9, BEFORE, np.uint8), BEFORE,
        table.temp, table.first_day[0], table.order, False,
    )  # fmt: skip
    ts, ps, y, d, w, _, _ = side
    none = np.empty((9, 0))
    wanted = wanted_mask(("heating",))
    row = fit_side(ts, ps, y, d, w, none, wanted, True, settings())[HEATING]
    year = (YEAR.temp_f, YEAR.cum_days, YEAR.cum_degrees)
    zero = np.empty(0)
    nothing = (zero, np.empty(0, np.int32), zero, zero, zero, zero, zero)
    values, like, shift, scale2, _, _, _, wide = side_evidence(
        row, HEATING, side, none, nothing, none[:0], year, False
    )
    assert wide
    mean, spread = _dense(y, d, start, row)
    weight = np.exp(like - like.max())
    weight /= weight.sum()
    centre = values[0] + shift[:, 0]
    found = float(weight @ centre)
    deviation = float(np.sqrt(weight @ (scale2[:, 0] + (centre - found) ** 2)))
    # 21 temperatures against 201: the sums agree to a few hundredths of the spread.
    assert found == pytest.approx(mean, abs=0.05 * spread)
    assert deviation == pytest.approx(spread, rel=0.05)


def _dense(y: np.ndarray, d: np.ndarray, start: np.ndarray, row: np.ndarray) -> tuple[float, float]:
    from normalize.fitting.rho import RHO
    from normalize.fitting.spread import LEAST_LEVEL, POWERS

    n = y.shape[0]
    far = np.abs(np.subtract.outer(np.arange(n), np.arange(n)))
    likes, centres, scales = [], [], []
    for tau in np.linspace(row[LOW_H], row[HIGH_H], 201):
        h = np.array([np.maximum(tau - TEMP[s : s + 30], 0).mean() for s in start])
        x = np.column_stack([np.ones(n), h])
        beta, *_ = np.linalg.lstsq(x, y, rcond=None)
        if beta[1] <= 0.0:
            continue
        fitted = x @ beta
        g = np.array([365.0, 365.0 * np.maximum(tau - TEMP[:1825], 0).mean()])
        for power in POWERS:
            level = np.maximum(fitted / fitted.mean(), LEAST_LEVEL) ** power
            for rho in RHO:
                sigma = rho**far * np.outer(level, level)
                inverse = np.linalg.inv(sigma)
                m = x.T @ inverse @ x
                b = np.linalg.solve(m, x.T @ inverse @ y)
                r = y - x @ b
                s = r @ inverse @ r
                dets = np.linalg.slogdet(sigma)[1] + np.linalg.slogdet(m)[1]
                dets -= np.linalg.slogdet(x.T @ x)[1]
                likes.append(-0.5 * (dets + (n - 2) * np.log(s)))
                centres.append(g @ b)
                scales.append(g @ np.linalg.solve(m, g) * s / (n - 2))
    weight = np.exp(np.array(likes) - max(likes))
    weight /= weight.sum()
    mean = float(weight @ np.array(centres))
    return mean, float(np.sqrt(weight @ (np.array(scales) + (np.array(centres) - mean) ** 2)))


def test_an_open_balance_temperature_widens_and_still_covers() -> None:
    """Nine noisy bills a side: the range must hold where the tangent's is no guide."""
    homes = simulate(60, bills=9, rho=0.0, noise=0.3, seed=4, forms=("heating",))
    answer = homes.answers()
    unsure = answer[:, UNSURE_BEFORE] == 1.0
    assert 0.05 < unsure.mean() < 0.95
    low, high = answer[:, NORMALIZED + 1], answer[:, NORMALIZED + 2]
    known = np.isfinite(low)
    covered = ((low <= homes.truth) & (homes.truth <= high))[known].mean()
    assert covered >= 0.80  # 60 homes: three Monte Carlo errors under 0.92


def test_a_driver_is_a_column_of_the_regression() -> None:
    """At the balance temperature found, statsmodels WLS gives the same coefficients."""
    n = 24
    start, end, use = bills(2 * n, 0.03)
    side = np.repeat(np.array([0, 1], np.uint8), n)
    driver = np.tile(RNG.uniform(-0.5, 0.5, n), 2)
    use = use + 30 * 0.8 * driver
    batch = Batch(
        start, end, use, side, np.array([0, 2 * n]), np.zeros(1, int),
        wanted_mask(("heating",))[None, :], np.zeros(1, bool), drivers=driver[:, None],
    )  # fmt: skip
    table = stations([(0, TEMP)], 0, int(end.max()))
    fits, chosen, answer = run_batch(batch, table, [YEAR], confidence=0.9)
    assert (chosen[0] == HEATING).all()
    row = fits[0, 0, HEATING]

    def columns(rows: slice) -> np.ndarray:
        h = [
            np.maximum(row[TAU_H] - TEMP[a:b], 0).mean()
            for a, b in zip(start[rows], end[rows], strict=True)
        ]
        return np.column_stack([np.ones(n), h, driver[rows]])

    ref = sm.WLS(use[:n] / 30.0, columns(slice(0, n)), weights=np.full(n, 30.0)).fit()
    assert row[BASE] == pytest.approx(ref.params[0], rel=1e-9)
    assert row[SLOPE_H] == pytest.approx(ref.params[1], rel=1e-9)
    year_degree_days = 365.0 * np.maximum(row[TAU_H] - TEMP[:1825], 0).mean()
    nac = 365.0 * ref.params[0] + ref.params[1] * year_degree_days
    assert answer[0, NAC_BEFORE] == pytest.approx(nac, rel=1e-9)
    predicted = 30.0 * (columns(slice(n, 2 * n)) @ ref.params).sum()
    assert answer[0, PREDICTED] == pytest.approx(predicted, rel=1e-9)
    # Without the driver the misfit is its variation; with it the range is far narrower.
    without = run_batch(replace(batch, drivers=None), table, [YEAR], confidence=0.9)[2]
    assert answer[0, 12] - answer[0, 11] < 0.7 * (without[0, 12] - without[0, 11])


def test_only_an_accounts_own_drivers_are_taken() -> None:
    drivers = np.arange(8.0).reshape(4, 2)
    side = np.array([0, 1, 0, 2], np.uint8)
    np.testing.assert_array_equal(take_drivers(drivers, 1, side, 0), [[0.0], [4.0]])
    assert take_drivers(drivers, 0, side, 1).shape == (1, 0)
