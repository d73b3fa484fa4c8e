"""Answers as a user gets them: what is known, what is not and from when; money, checks, totals."""

from __future__ import annotations

import numpy as np
import pytest

from normalize.bills.periods import Bills, Periods
from normalize.days import date_of
from normalize.errors import NoUpgrade
from normalize.fitting.align import align
from normalize.savings.checks import cv_limit, fractional_uncertainty
from normalize.savings.compare import compare, measure_savings
from normalize.savings.offer import forms_offered
from normalize.savings.sides import Work, label_periods
from normalize.savings.worth import AVERAGE, FROM_BILLS, price_of
from normalize.weather.temperature import DailyTemperature
from normalize.weather.year import LongTermYear, year_from_sample
from tests.fitting.accounts import weather

pytestmark = pytest.mark.kernel

TEMP = weather(np.random.default_rng(12), 3000, mean=50.0)
STATION = DailyTemperature("made up", 0, TEMP, np.zeros(3000, bool))


def year() -> LongTermYear:
    return year_from_sample("eight years", TEMP, np.full(3000, 365 / 3000))


def house(
    before: int, after: int, *, effect: float = 0.2, slope: float = 0.12, noise: float = 0.0
) -> tuple[Bills, Work]:
    """Monthly gas bills; the true use is 0.6 + slope·(61 − T)⁺ a day, times 1 − effect after."""
    rng = np.random.default_rng(before + 100 * after)
    size = rng.integers(28, 34, before + after)
    end = 300 + np.cumsum(size)
    start = end - size
    start[before:] += 25
    end[before:] += 25
    day = 0.6 + slope * np.maximum(61 - TEMP, 0)
    use = np.array([day[a:b].sum() for a, b in zip(start, end, strict=True)])
    use[before:] *= 1 - effect
    use *= 1 + noise * rng.normal(size=len(use))
    n = before + after
    periods = Periods(
        start.astype(np.int32), end.astype(np.int32), use, np.full(n, np.nan),
        np.zeros(n, bool), np.ones(n, np.int32),
    )  # fmt: skip
    work = Work(int(end[before - 1]), int(end[before - 1]) + 25)
    return Bills("gas", "natural gas", "therm", (), periods, ()), work


def test_noise_free_bills_give_the_true_saving() -> None:
    """Truth: the generating use over the same long-term days."""
    bills, work = house(24, 18)
    found = measure_savings(bills, STATION, upgrade=(work.start, work.end), long_term=year())
    day = 0.6 + 0.12 * np.maximum(61 - TEMP, 0)
    assert found.nac_before.value == pytest.approx(365 * day.mean(), rel=1e-9)
    assert found.normalized.value == pytest.approx(0.2 * 365 * day.mean(), rel=1e-6)
    assert found.normalized.fraction == pytest.approx(0.2, rel=1e-6)
    assert found.normalized.verdict == "reduction"
    actual = float(bills.periods.use[24:].sum())
    assert found.avoided.value == pytest.approx(actual / 0.8 - actual, rel=1e-6)
    assert found.actual_use == pytest.approx(actual)


def test_an_increase_is_an_increase() -> None:
    bills, work = house(24, 18, effect=-0.3, noise=0.02)
    found = measure_savings(bills, STATION, upgrade=(work.start, work.end), long_term=year())
    assert found.normalized.verdict == "increase"
    assert found.normalized.value is not None
    assert found.normalized.value < 0
    assert found.normalized.fraction == pytest.approx(-0.3, abs=0.06)


def test_no_change_cannot_be_told_from_zero() -> None:
    bills, work = house(24, 18, effect=0.0, noise=0.05)
    found = measure_savings(bills, STATION, upgrade=(work.start, work.end), long_term=year())
    assert found.normalized.verdict == "cannot tell"


def test_five_bills_after_the_work_give_avoided_use_so_far_and_a_date() -> None:
    bills, work = house(24, 5, noise=0.02)
    found = measure_savings(bills, STATION, upgrade=(work.start, work.end), long_term=year())
    assert found.avoided.available
    assert found.avoided.so_far
    assert found.normalized.unavailable is not None
    assert "270 are needed" in found.normalized.unavailable
    last = int(bills.periods.end[-1])
    days = int((bills.periods.end[24:] - bills.periods.start[24:]).sum())
    assert found.normalized.known_from is not None
    assert last + 270 - days <= found.normalized.known_from <= last + 270 - days + 31
    assert found.nac_before.available
    assert not found.nac_after.available


def test_a_short_baseline_leaves_nothing_and_says_so() -> None:
    bills, work = house(6, 18)
    found = measure_savings(bills, STATION, upgrade=(work.start, work.end), long_term=year())
    for estimate in (found.normalized, found.avoided):
        assert estimate.unavailable is not None
        assert "before the work" in estimate.unavailable
        assert estimate.known_from is None


def test_without_a_long_term_year_avoided_use_is_still_known() -> None:
    bills, work = house(24, 14)
    found = measure_savings(bills, STATION, upgrade=(work.start, work.end), long_term=None)
    assert found.avoided.available
    assert "long-term year" in (found.normalized.unavailable or "")


def test_winter_alone_is_not_taken_for_a_flat_load() -> None:
    """Nine cold months: no mild bills, so no balance temperature; a flat load would be wrong."""
    cold = np.full(3000, 25.0) + 10 * np.sin(np.arange(3000) / 30.0)
    station = DailyTemperature("cold", 0, cold, np.zeros(3000, bool))
    start = np.arange(20, dtype=np.int32) * 30
    use = np.array([(0.6 + 0.1 * (61 - cold[a : a + 30])).sum() for a in start])
    periods = Periods(
        start, start + 30, use, np.full(20, np.nan), np.zeros(20, bool), np.ones(20, np.int32)
    )
    found = compare(align(periods, station), Work(300, 300 + 1), year(), forms=("flat", "heating"))
    assert found.savings.normalized.unavailable is not None
    assert "answers to weather" in found.savings.normalized.unavailable


def test_periods_that_touch_the_work_belong_to_neither_side() -> None:
    bills, _ = house(24, 18)
    p = bills.periods
    work = Work(int(p.start[12]) + 5, int(p.start[14]) + 5)
    labels = label_periods(align(p, STATION), work)
    assert labels[11] == "before"
    assert labels[12:15] == ("work window",) * 3
    assert labels[15] == "after"


def test_two_upgrades_leave_the_stretch_between_unused() -> None:
    bills, _ = house(24, 18)
    p = bills.periods
    work = Work(
        int(p.start[10]), int(p.end[20]), ((int(p.start[10]), int(p.end[10])),
        (int(p.start[20]), int(p.end[20]))),
    )  # fmt: skip
    labels = label_periods(align(p, STATION), work)
    assert labels[10] == labels[20] == "work window"
    assert set(labels[11:20]) == {"between"}


def test_a_former_occupants_bills_stay_out() -> None:
    bills, work = house(24, 18)
    since = int(bills.periods.start[8])
    labels = label_periods(align(bills.periods, STATION), work, occupied_since=since)
    assert labels[:8] == ("earlier occupant",) * 8
    assert labels[8] == "before"


def test_a_window_that_ends_before_it_starts_is_refused() -> None:
    bills, _ = house(24, 18)
    with pytest.raises(NoUpgrade, match="before it starts"):
        measure_savings(bills, STATION, upgrade=(900, 900), long_term=None)


def test_fractional_savings_uncertainty_of_guideline_14() -> None:
    """n = m = 12, ρ = 0, CV = F = 10 %, k = 1.26: 0.393 at t = 1, 0.712 at t = 1.812
    (Guideline 14 formula, computed; Reddy & Claridge 2000).
    """
    given = {"n": 12, "m": 12, "rho": 0.0, "cv": 0.1, "fraction": 0.1}
    assert fractional_uncertainty(**given, t=1.0) == pytest.approx(0.393, abs=5e-4)
    assert fractional_uncertainty(**given, t=1.812) == pytest.approx(0.712, abs=5e-4)


def test_cv_limits_of_guideline_14() -> None:
    """20 % under 12 months, 25 % to 60, 30 % above: Guideline 14-2014 (memory)."""
    assert [cv_limit(d) for d in (300, 700, 1900)] == [0.20, 0.25, 0.30]


def test_a_water_heater_is_not_offered_heating() -> None:
    assert forms_offered("natural gas", space_heating=False) == ("flat",)
    assert "cooling" in forms_offered("electricity", space_heating=False)
    assert forms_offered("propane", asked=("line",)) == ("line",)


def prices(cost: np.ndarray, use: np.ndarray) -> Periods:
    n = len(use)
    start = 30 * np.arange(n, dtype=np.int32)
    return Periods(start, start + 30, use, cost, np.zeros(n, bool), np.ones(n, np.int32))


def test_the_fixed_charge_is_taken_out_of_the_price() -> None:
    rng = np.random.default_rng(0)
    use = rng.uniform(20, 150, 24)
    found = price_of(prices(18.5 + 1.32 * use, use), stated=None, delivered=False)
    assert found.per_unit == pytest.approx(1.32, rel=1e-9)
    assert found.source == FROM_BILLS


def test_even_use_gives_the_average_and_calls_it_so() -> None:
    use = np.full(24, 100.0)
    found = price_of(prices(18.5 + 1.32 * use, use), stated=None, delivered=False)
    assert found.source == AVERAGE
    assert found.per_unit == pytest.approx(1.505)


def test_no_cost_gives_no_price_and_says_what_to_do() -> None:
    use = np.full(24, 100.0)
    found = price_of(prices(np.full(24, np.nan), use), stated=None, delivered=False)
    assert found.per_unit is None
    assert "price = " in (found.unavailable or "")


def test_weather_that_ends_too_early_is_named_and_gives_no_date() -> None:
    """Bills go on, the station's record does not: waiting for bills would cure nothing."""
    bills, work = house(24, 18)
    short = DailyTemperature(
        "ends early", 0, TEMP[: work.end + 130], np.zeros(work.end + 130, bool)
    )
    found = measure_savings(bills, short, upgrade=(work.start, work.end), long_term=year())
    assert found.normalized.unavailable is not None
    assert "weather record ends on" in found.normalized.unavailable
    assert found.normalized.known_from is None


def test_too_few_bills_after_do_not_touch_the_range_before() -> None:
    bills, work = house(24, 5, noise=0.05)
    both = measure_savings(bills, STATION, upgrade=(work.start, work.end), long_term=year())
    p = bills.periods
    alone = Bills(
        "gas", "natural gas", "therm", (),
        Periods(p.start[:24], p.end[:24], p.use[:24], p.cost[:24], p.estimated[:24], p.joined[:24]),
        (),
    )  # fmt: skip
    only = measure_savings(alone, STATION, upgrade=(work.start, work.end), long_term=year())
    assert both.nac_before == only.nac_before


@pytest.mark.parametrize("spread", [0.02, 0.1, 0.5])
def test_even_use_still_shows_its_price_when_the_costs_are_exact(spread: float) -> None:
    """Judged by the price's own standard error, not by how much use varies."""
    use = 100.0 * (1 + spread * np.sin(np.arange(24)))
    found = price_of(prices(12.0 + 1.10 * use, use), stated=None, delivered=False)
    assert found.per_unit == pytest.approx(1.10, rel=1e-6)


def test_a_charge_by_the_bill_and_one_by_the_day_are_told_apart() -> None:
    rng = np.random.default_rng(1)
    days = rng.integers(25, 40, 24)
    use = rng.uniform(20, 150, 24)
    end = np.cumsum(days)
    for charge in (np.full(24, 12.0), 0.4 * days):
        p = Periods(
            (end - days).astype(np.int32), end.astype(np.int32), use, charge + 1.10 * use,
            np.zeros(24, bool), np.ones(24, np.int32),
        )  # fmt: skip
        found = price_of(p, stated=None, delivered=False)
        assert found.per_unit == pytest.approx(1.10, rel=1e-9)


def test_no_more_than_all_can_be_saved() -> None:
    bills, work = house(24, 14, effect=1.0, noise=0.03)
    found = measure_savings(bills, STATION, upgrade=(work.start, work.end), long_term=year())
    assert found.normalized.fraction == pytest.approx(1.0, abs=1e-9)
    assert found.normalized.fraction_high == pytest.approx(1.0, abs=1e-9)
    assert found.avoided.fraction_high is not None
    assert found.avoided.fraction_high <= 1.0


def test_the_work_may_be_given_as_dates_or_day_numbers() -> None:
    bills, work = house(24, 18)
    first, last = date_of(work.start), date_of(work.end - 1)
    numbers = measure_savings(bills, STATION, upgrade=(work.start, work.end), long_term=None)
    for days in ((first, last), (first.isoformat(), last.isoformat())):
        assert measure_savings(bills, STATION, upgrade=days, long_term=None) == numbers
    with pytest.raises(NoUpgrade, match="is no date"):
        measure_savings(bills, STATION, upgrade=("2023-09-31", "2023-10-02"), long_term=None)
