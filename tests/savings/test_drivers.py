"""Drivers that earn their place and drivers that do not, and the answer with and without.

Reference for coefficients: statsmodels' WLS at the balance temperature found (also in
tests/fitting/test_drivers.py).  Shares of covered truth and of drivers kept by chance are
measured in tests/prove/drivers.py.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
import statsmodels.api as sm

from normalize.fitting.align import Aligned
from normalize.fitting.drivers import DailyAmounts
from normalize.savings.compare import Comparison, compare
from normalize.savings.drivers import Chosen, choose_drivers
from normalize.savings.sides import Work, label_periods
from normalize.savings.with_and_without import with_and_without
from normalize.weather.temperature import DailyTemperature
from normalize.weather.year import LongTermYear
from tests.prove.drivers import FORMS, School, long_term, school


@pytest.fixture(scope="module")
def home() -> tuple[School, LongTermYear]:
    """A school whose days drive its use; regression, not truth, where no source is named."""
    rng = np.random.default_rng(11)
    temp, year = long_term(rng)
    return school(rng, temp, year, bills=24, rho=0.0, real=True), year


def chosen_of(home: School, *drivers: DailyAmounts) -> Chosen:
    labels = label_periods(home.aligned, home.work)
    return choose_drivers(home.aligned, labels, drivers, forms=FORMS)


def answer(aligned: Aligned, home: School, year: LongTermYear) -> Comparison:
    return compare(aligned, home.work, year, forms=FORMS)


def other(home: School, name: str, amount: np.ndarray, kind: str = "level") -> DailyAmounts:
    return DailyAmounts(name, 0, amount, kind, "x.csv")


def noise(home: School, seed: int) -> np.ndarray:
    return np.random.default_rng(seed).normal(10.0, 3.0, home.driver.amount.shape[0])


def test_a_real_driver_is_kept_and_the_truth_is_found_with_it(
    home: tuple[School, LongTermYear],
) -> None:
    made, year = home
    chosen = chosen_of(made, made.driver)
    assert chosen.kept == ("school days",)
    with_it = answer(chosen.aligned, made, year).savings.normalized
    alone = answer(made.aligned, made, year).savings.normalized
    assert with_it.low is not None
    assert with_it.high is not None
    assert with_it.low <= made.truth <= with_it.high
    assert alone.value is not None
    assert with_it.value is not None
    assert abs(with_it.value - made.truth) < 0.5 * abs(alone.value - made.truth)


def test_the_fit_with_a_driver_is_statsmodels_wls(home: tuple[School, LongTermYear]) -> None:
    """Base load, slope, driver, their errors, RSS and t at the τ found: statsmodels' WLS."""
    made, year = home
    chosen = chosen_of(made, made.driver)
    found = answer(chosen.aligned, made, year)
    fit = found.savings.before
    assert fit is not None
    assert fit.balance_heating_f is not None
    assert chosen.aligned.drivers is not None
    mine = np.array([label == "before" for label in found.labels])
    temp = made.aligned.weather.temp_f
    cold = np.maximum(fit.balance_heating_f - temp, 0.0)
    spans = zip(made.aligned.start[mine], made.aligned.end[mine], strict=True)
    h = np.array([cold[a:b].mean() for a, b in spans])
    x = np.column_stack([np.ones(h.shape[0]), h, chosen.aligned.drivers.values[mine]])
    days = made.aligned.days[mine].astype(float)
    wls = sm.WLS(made.aligned.use[mine] / days, x, weights=days).fit()
    got = (fit.base_load, fit.heating_slope, *fit.driver_effects)
    assert got == pytest.approx(wls.params.tolist(), abs=1e-8)
    assert fit.rss == pytest.approx(float(wls.ssr), rel=1e-9)
    assert fit.se == pytest.approx(wls.bse[:2].tolist(), rel=1e-8)
    spread = np.sqrt(wls.ssr / days.mean() / (days.shape[0] - 4))  # τ counts as found too
    assert fit.cv_rmse == pytest.approx(spread / np.average(wls.model.endog, weights=days))


def test_avoided_use_takes_the_driver_as_it_was(home: tuple[School, LongTermYear]) -> None:
    """Predicted use summed by hand from the baseline's own coefficients."""
    made, year = home
    chosen = chosen_of(made, made.driver)
    found = answer(chosen.aligned, made, year)
    fit = found.savings.before
    assert fit is not None
    assert chosen.aligned.drivers is not None
    total = 0.0
    for i, label in enumerate(found.labels):
        if label == "after":
            a, b = int(made.aligned.start[i]), int(made.aligned.end[i])
            total += float(fit.predict(made.aligned.weather.temp_f[a:b]).sum())
            total += (b - a) * float(chosen.aligned.drivers.values[i] @ fit.driver_effects)
    assert found.savings.predicted_use == pytest.approx(total, rel=1e-9)


def test_drivers_the_bills_cannot_speak_of_are_refused(home: tuple[School, LongTermYear]) -> None:
    made, _ = home
    days = made.driver.amount.shape[0]
    temp = made.aligned.weather.temp_f
    late = np.where(np.arange(days) < made.work.end, np.nan, 1.0)
    weekend = ((np.arange(days) + 3) % 7 >= 5).astype(float)
    chosen = chosen_of(
        made,
        other(made, "area", np.full(days, 4000.0)),
        other(made, "degree-days", np.maximum(61.0 - temp, 0.0)),
        made.driver,
        other(made, "pupils", 25.0 * made.driver.amount),
        other(made, "late", late),
        other(made, "weekend days", weekend, "day type"),
    )
    reasons = {t.name: t.reason for t in chosen.trials}
    assert "the same in every bill" in reasons["area"]
    assert "moves with the weather" in reasons["degree-days"]
    assert "moves with" in reasons["pupils"]
    assert "school days" in reasons["pupils"]
    assert "known for all days of only 0 of the 24 bills before" in reasons["late"]
    assert "nearly the same share" in reasons["weekend days"]
    assert chosen.kept == ("school days",)


def test_a_bill_with_a_day_unknown_is_set_aside_with_its_reason(
    home: tuple[School, LongTermYear],
) -> None:
    made, year = home
    amount = made.driver.amount.copy()
    amount[int(made.aligned.start[5]) + 3] = np.nan
    chosen = chosen_of(made, replace(made.driver, amount=amount))
    assert "have no amount of school days" in chosen.aligned.reason[5]
    found = answer(chosen.aligned, made, year)
    assert found.labels[5] == "set aside"
    assert found.savings.before is not None
    assert found.savings.before.n_periods == 23


def test_an_unkept_driver_leaves_the_headline_as_it_was(home: tuple[School, LongTermYear]) -> None:
    """With an irrelevant driver the answer is bit for bit the one from the weather alone."""
    made, year = home
    holes = noise(made, 3)
    holes[int(made.aligned.start[2])] = np.nan
    chosen = chosen_of(made, other(made, "luck", holes))
    assert chosen.kept == ()
    assert chosen.trials[0].reason
    assert chosen.aligned.drivers is None
    own = answer(chosen.aligned, made, year).savings.normalized
    assert own == answer(made.aligned, made, year).savings.normalized


def test_the_answer_is_shown_with_and_without(home: tuple[School, LongTermYear]) -> None:
    made, year = home
    chosen = chosen_of(made, made.driver, other(made, "luck", noise(made, 3)))
    found = answer(chosen.aligned, made, year)
    report = with_and_without(chosen, found, lambda aligned: answer(aligned, made, year))
    sets = [a.drivers for a in report.answers]
    assert sets == [("school days",), (), ("school days", "luck")]
    assert [a.reported for a in report.answers] == [True, False, False]
    alone = answer(made.aligned, made, year).savings.normalized
    assert report.answers[1].normalized == alone


def test_drivers_come_in_the_order_of_the_site_file(home: tuple[School, LongTermYear]) -> None:
    made, _ = home
    luck = other(made, "luck", noise(made, 3))
    assert [t.name for t in chosen_of(made, luck, made.driver).trials] == ["luck", "school days"]
    assert chosen_of(made, luck, made.driver).kept == ("school days",)


def test_weekends_of_daily_readings_sharpen_the_fit_and_keep_the_answer() -> None:
    """A weekly rhythm cancels over a year: NAC hardly moves, the scatter of days falls.

    The effect found is compared with the one the days were made from.
    """
    rng = np.random.default_rng(5)
    temp, year = long_term(rng)
    n = 800
    day = np.arange(n)
    weekend = ((day + 3) % 7 >= 5).astype(float)
    use = 20.0 + 0.8 * np.maximum(60.0 - temp[:n], 0.0) - 6.0 * weekend + rng.normal(0, 1.5, n)
    weather = DailyTemperature("x", 0, temp[:n], np.zeros(n, bool))
    start = day.astype(np.int32)
    aligned = Aligned(start, start + 1, use, temp[:n], ("",) * n, weather)
    driver = DailyAmounts("weekend days", 0, weekend, "day type", "week", (), 2 / 7, "2 days in 7")
    made = School(aligned, Work(390, 410), driver, truth=0.0)
    chosen = chosen_of(made, made.driver)
    assert chosen.kept == ("weekend days",)
    before = chosen.trials[0].before
    assert before is not None
    assert before.value == pytest.approx(-6.0, abs=3 * before.error)
    own = answer(chosen.aligned, made, year).savings
    alone = answer(aligned, made, year).savings
    assert own.before is not None
    assert alone.before is not None
    assert own.before.cv_rmse < 0.7 * alone.before.cv_rmse
    assert own.nac_before.value == pytest.approx(alone.nac_before.value, rel=0.005)
    assert own.actual_use == pytest.approx(alone.actual_use, rel=1e-12)
