"""Drivers laid over periods, kinds of days, and the fit that projects them out.

References: NumPy's business-day calendar for weekends and holidays; statsmodels' WLS at the
balance temperature found; exhaustive search over τ with SciPy-free least squares of NumPy.
"""

from __future__ import annotations

import numpy as np
import pytest
import statsmodels.api as sm

from normalize.days import day_of_iso
from normalize.fitting.align import Aligned
from normalize.fitting.batch import Batch, Stations
from normalize.fitting.batch import settings as kernel_settings
from normalize.fitting.day_types import HOLIDAY, WEEKEND, Calendar, day_types
from normalize.fitting.driver_fit import fit_with, shared_with
from normalize.fitting.drivers import DailyAmounts, as_drivers, normal_level, period_means
from normalize.fitting.fit import batch_of_one
from normalize.weather.temperature import DailyTemperature

FIRST = day_of_iso("2021-01-04")  # a Monday
HOLIDAYS = ("2021-07-05", "2021-12-25", "2022-07-04", "2022-12-26")


def daily(amount: list[float], **more: object) -> DailyAmounts:
    return DailyAmounts("x", 100, np.array(amount), "level", "x.csv", **more)  # type: ignore[arg-type]


def test_a_periods_mean_is_that_of_its_days_and_unknown_days_are_counted() -> None:
    start, end = np.array([100, 102, 104], np.int32), np.array([102, 104, 107], np.int32)
    mean, missing = period_means(daily([1.0, 3.0, np.nan, 5.0, 1.0, 2.0]), start, end)
    assert mean[0] == 2.0
    assert np.isnan(mean[1])
    assert np.isnan(mean[2])
    assert missing.tolist() == [0, 1, 1]  # the last day lies beyond what is known


def test_periods_without_a_known_amount_say_so_and_hold_nothing() -> None:
    start, end = np.array([100, 102], np.int32), np.array([102, 104], np.int32)
    drivers, reasons = as_drivers([daily([1.0, 3.0, np.nan, 5.0])], start, end, [1.5])
    assert drivers.values.tolist() == [[0.5], [0.0]]
    assert reasons == ("", "1 of its 2 days have no amount of x")


def test_the_normal_level_comes_from_the_last_year_of_the_reporting_period() -> None:
    amounts = daily([1.0] * 365 + [3.0] * 365 + [9.0] * 35)
    level, how = normal_level(amounts, (100, 465), (465, 830))
    assert level == 3.0
    assert "reporting" in how
    level, how = normal_level(amounts, (100, 465), (465, 565))  # less than a year after the work
    assert level == 1.0
    assert "baseline" in how
    assert normal_level(daily([1.0], normal=7.0, normal_from="said"), None, None) == (7.0, "said")


def test_weekends_and_holidays_are_numpys() -> None:
    """numpy.is_busday is the reference."""
    last = FIRST + 720
    calendar = Calendar(holidays=tuple(day_of_iso(h) for h in HOLIDAYS))
    kinds = {k.name: k.amount for k in day_types(calendar, FIRST, last)}
    dates = np.arange(FIRST, last).astype("datetime64[D]")
    weekday = np.is_busday(dates)
    working = np.is_busday(dates, holidays=np.array(HOLIDAYS, dtype="datetime64[D]"))
    assert (kinds[WEEKEND] == ~weekday).all()
    assert (kinds[HOLIDAY] == (weekday & ~working)).all()


def test_kinds_of_days_exclude_each_other_and_are_unknown_where_nothing_is_said() -> None:
    terms = ((day_of_iso("2021-01-04"), day_of_iso("2021-06-12")),
             (day_of_iso("2021-08-30"), day_of_iso("2021-12-18")))  # fmt: skip
    calendar = Calendar(holidays=(day_of_iso("2021-05-31"),), terms=terms)
    weekend, holiday, school = day_types(calendar, FIRST, FIRST + 400)
    total = weekend.amount + holiday.amount + school.amount
    assert set(total[~np.isnan(total)]) <= {0.0, 1.0}
    at = {d: day_of_iso(d) - FIRST for d in ("2021-05-31", "2021-06-01", "2021-07-06")}
    assert holiday.amount[at["2021-05-31"]] == 1.0
    assert school.amount[at["2021-05-31"]] == 0.0
    assert school.amount[at["2021-06-01"]] == 1.0
    assert school.amount[at["2021-07-06"]] == 0.0
    assert np.isnan(school.amount[day_of_iso("2021-12-20") - FIRST])  # after the last term named
    assert np.isnan(holiday.amount[day_of_iso("2022-01-03") - FIRST])  # a year without a list
    assert not np.isnan(weekend.amount).any()


def test_another_week_and_a_missing_term() -> None:
    (friday,) = day_types(Calendar(weekend=(4, 5)), FIRST, FIRST + 7)
    assert friday.amount.tolist() == [0, 0, 0, 0, 1, 1, 0]
    assert friday.normal == pytest.approx(2 / 7)
    gap = ((FIRST, FIRST + 100), (FIRST + 300, FIRST + 400))  # a term between is not listed
    (_, school) = day_types(Calendar(terms=gap), FIRST, FIRST + 400)
    assert np.isnan(school.amount[100:300]).all()
    assert not np.isnan(school.amount[:100]).any()


def account(seed: int, n: int, effects: tuple[float, ...], noise: float) -> tuple[
    Aligned, np.ndarray, np.ndarray, np.ndarray
]:  # fmt: skip
    """Bills of a heating load with drivers of known effect; also the drivers and h at 60 °F."""
    rng = np.random.default_rng(seed)
    lengths = rng.integers(27, 35, n)
    end = (FIRST + np.cumsum(lengths)).astype(np.int32)
    start = (end - lengths).astype(np.int32)
    day = np.arange(FIRST, int(end[-1]))
    temp = 50.0 - 22.0 * np.cos((day - 15) / 365.25 * 2 * np.pi) + rng.normal(0, 7, day.size)

    def means(v: np.ndarray) -> np.ndarray:
        return np.array([v[a - FIRST : b - FIRST].mean() for a, b in zip(start, end, strict=True)])

    h = means(np.maximum(60.0 - temp, 0.0))
    x = rng.normal(0.0, 1.0, (n, len(effects)))
    y = 1.0 + 0.2 * h + x @ np.array(effects) + noise * rng.normal(0.0, 1.0, n)
    weather = DailyTemperature("x", FIRST, temp, np.zeros(temp.size, bool))
    aligned = Aligned(start, end, y * lengths, means(temp), ("",) * n, weather)
    return aligned, x, y, temp


def h_at(aligned: Aligned, temp: np.ndarray, tau: float) -> np.ndarray:
    below = np.maximum(tau - temp, 0.0)
    spans = zip(aligned.start - FIRST, aligned.end - FIRST, strict=True)
    return np.array([below[a:b].mean() for a, b in spans])


def bench(aligned: Aligned) -> tuple[Batch, Stations]:
    return batch_of_one(aligned, np.zeros(aligned.n, np.uint8), ("heating",))


@pytest.mark.parametrize("k", [1, 2, 3])
def test_coefficients_with_drivers_are_statsmodels_wls(k: int) -> None:
    """At the balance temperature found: statsmodels' WLS, weights the days of each bill."""
    aligned, x, y, temp = account(k, 24, (0.5, -0.3, 0.2)[:k], 0.3)
    fit = fit_with(*bench(aligned), 0, x)
    assert fit is not None
    assert fit.balance_heating_f is not None
    columns = np.column_stack([np.ones(24), x, h_at(aligned, temp, fit.balance_heating_f)])
    wls = sm.WLS(y, columns, weights=aligned.days.astype(float)).fit()
    assert fit.coefficients == pytest.approx(wls.params.tolist(), abs=1e-8)
    assert fit.se == pytest.approx(wls.bse[1 : 1 + k].tolist(), abs=1e-8)
    assert fit.t == pytest.approx(wls.tvalues[1 : 1 + k].tolist(), rel=1e-8)


def test_the_balance_temperature_with_drivers_is_the_best_of_a_fine_grid() -> None:
    """An exhaustive search over τ with NumPy's least squares never finds a lower RSS."""
    low, high = kernel_settings()[:2]
    for seed in range(5):
        aligned, x, y, temp = account(seed, 24, (0.6, 0.0), 0.5)
        fit = fit_with(*bench(aligned), 0, x)
        assert fit is not None
        assert fit.balance_heating_f is not None
        root = np.sqrt(aligned.days.astype(float))

        def rss(tau: float) -> float:
            columns = np.column_stack([np.ones(24), x, h_at(aligned, temp, tau)])  # noqa: B023
            left = np.linalg.lstsq(columns * root[:, None], y * root, rcond=None)[1]  # noqa: B023
            return float(left[0])

        grid = [rss(tau) for tau in np.arange(45.0, 75.0, 0.25) if low <= tau <= high]
        assert rss(fit.balance_heating_f) <= min(grid) * (1 + 1e-12)


def test_without_noise_the_drivers_effects_come_back() -> None:
    """Identity: bills made from known numbers return them."""
    aligned, x, _, _ = account(3, 20, (0.7, -0.4), 0.0)
    fit = fit_with(*bench(aligned), 0, x)
    assert fit is not None
    assert fit.coef == pytest.approx((0.7, -0.4), abs=1e-6)
    assert fit.coefficients[0] == pytest.approx(1.0, abs=1e-6)
    assert fit.balance_heating_f == pytest.approx(60.0, abs=1e-5)


def test_where_a_driver_is_centred_moves_only_the_base_load() -> None:
    aligned, x, _, _ = account(4, 24, (0.7,), 0.2)
    at_zero, at_two = (fit_with(*bench(aligned), 0, x - level) for level in (0.0, 2.0))
    assert at_zero is not None
    assert at_two is not None
    assert at_two.coef == pytest.approx(at_zero.coef, rel=1e-9)
    assert at_two.balance_heating_f == pytest.approx(at_zero.balance_heating_f, abs=1e-7)
    moved = at_two.coefficients[0] - at_zero.coefficients[0]
    assert moved == pytest.approx(2.0 * at_zero.coef[0], rel=1e-7)


def test_shared_variation_is_r_squared() -> None:
    """statsmodels' R² of the column on the others."""
    rng = np.random.default_rng(2)
    x, others, weight = rng.normal(size=30), rng.normal(size=(30, 3)), rng.uniform(20, 40, 30)
    x = x + others @ np.array([1.0, 0.5, 0.0])
    r2 = sm.WLS(x, sm.add_constant(others), weights=weight).fit().rsquared
    assert shared_with(x, others, weight) == pytest.approx(r2, abs=1e-10)
    assert shared_with(np.full(30, 4.0), others, weight) == 1.0
