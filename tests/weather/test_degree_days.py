"""Degree-days against published values, and properties that hold for any weather."""

from __future__ import annotations

from datetime import date

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from normalize.days import day_of
from normalize.errors import MissingWeather, WeatherError
from normalize.weather.day_means import (
    exact_mean,
    four_case_cooling,
    four_case_heating,
    growing_degree_days,
    whole_degree_mean,
)
from normalize.weather.degree_days import (
    annual_degree_days,
    by_period,
    cooling_degree_days,
    daily_cooling,
    daily_heating,
    heating_degree_days,
    monthly_degree_days,
    parse_base,
)
from normalize.weather.degrees import to_fahrenheit
from normalize.weather.read import read_weather
from tests.weather.makers import SHARED, seasons, weather, years

B65 = parse_base("65F")


@pytest.mark.parametrize(
    ("low", "high", "base", "hdd", "cdd"),
    [
        (12, 34, 65, 42, 0),  # common practice, no source
        (68, 88, 65, 0, 13),  # common practice, no source
        (60, 70, 65, 0, 0),  # a day at the base: none, never negative (common practice)
        (31, 65, 50, 2, 0),  # WRCC monthly summaries' rule: 50 - 48
        (62, 72, 65, 0, 2),  # NWS Boston, 19 Sep 2021: mean 67
    ],
)
def test_one_day(low: float, high: float, base: float, hdd: float, cdd: float) -> None:
    mean = exact_mean([high], [low])
    assert daily_heating(mean, base).tolist() == [hdd]
    assert daily_cooling(mean, base).tolist() == [cdd]


def test_celsius_base() -> None:
    """Daily means 10, -4, 20 °C at base 18 give 8, 22, 0 (Statistics Netherlands)."""
    temps = to_fahrenheit(np.array([10.0, -4.0, 20.0]), "C")
    base = parse_base("18C")
    made = by_period(weather(date(2023, 1, 1), temps), *_days(2023, 1, 1, 3), base)
    assert made.heating == pytest.approx([8.0, 22.0, 0.0], abs=1e-12)


def test_weather_service_rounding() -> None:
    """68 and 53 °F: 60.5 becomes 61, so 4 heating degree-days (NWS Burlington)."""
    mean = whole_degree_mean([68.0], [53.0])
    assert mean.tolist() == [61.0]
    assert daily_heating(mean, 65.0).tolist() == [4.0]


def test_rounding_is_half_up_below_zero_too() -> None:
    """-3 and -4 °F have the mean -3.5, which half up is -3 (NWS rule as above)."""
    assert whole_degree_mean([-3.0], [-4.0]).tolist() == [-3.0]


def test_four_cases() -> None:
    """Base 15.5 °C: the formulas as published in CIBSE TM41 (memory)."""
    made = four_case_heating([10, 18, 22, 20], [4, 8, 12, 16], 15.5)
    assert made.tolist() == [8.5, 3.125, 0.875, 0.0]


@given(st.floats(-40, 110), st.floats(0, 60), st.floats(30, 80))
def test_four_cases_are_continuous_and_balance(low: float, swing: float, base: float) -> None:
    """Heating − cooling = base − mean where a day lies on one side; both are never negative."""
    high = low + swing
    heat = float(four_case_heating([high], [low], base)[0])
    cool = float(four_case_cooling([high], [low], base)[0])
    assert heat >= 0
    assert cool >= 0
    if high <= base or low >= base:
        assert heat - cool == pytest.approx(base - (high + low) / 2, abs=1e-9)


def test_growing_degree_days() -> None:
    """65 and 31 °F at base 50 grow nothing: the mean, 48, is below it (WRCC's rule)."""
    assert growing_degree_days([65.0, 90.0], [31.0, 70.0]).tolist() == [0.0, 30.0]


def test_65_f_is_not_18_c() -> None:
    """65 °F is 18.33 °C: HDD at 18 °C is never HDD65·5/9 (common practice)."""
    w = years(2022, 2023)
    f = annual_degree_days(w, B65).rows[0].heating
    exact = annual_degree_days(w, parse_base("18.333333333C")).rows[0].heating
    rounded = annual_degree_days(w, parse_base("18C")).rows[0].heating
    assert f is not None
    assert exact is not None
    assert rounded is not None
    assert exact == pytest.approx(f * 5 / 9, rel=1e-8)
    assert rounded < 0.99 * exact


def test_central_park_2014() -> None:
    """NOAA GHCN-Daily USW00094728, 2014; figures of the data folder's SOURCE.md, both ways."""
    path = SHARED / "data" / "noaa" / "ghcn_by_year_rows_USW00094728_2014.csv"
    if not path.exists():
        pytest.skip("the shared data folder is not here")
    w = read_weather(path)
    exact = annual_degree_days(w, B65).rows[0]
    assert (exact.heating, exact.cooling) == pytest.approx((4922.3, 1099.4), abs=0.05)
    counted = annual_degree_days(w, B65, method="whole-degrees").rows[0]
    assert (counted.heating, counted.cooling) == (4875.0, 1128.0)
    months = monthly_degree_days(w, B65, method="whole-degrees")
    published = [1120, 927, 842, 377, 73, 0, 0, 0, 22, 179, 584, 751]
    assert [row.heating for row in months.rows[:12]] == published


temps = st.lists(st.floats(-60, 120), min_size=1, max_size=40)


@given(temps, st.floats(30, 90))
def test_heating_minus_cooling_is_base_minus_mean(temp_f: list[float], base: float) -> None:
    made = heating_degree_days(temp_f, base) - cooling_degree_days(temp_f, base)
    assert made == pytest.approx(sum(base - t for t in temp_f), abs=1e-8)


@given(temps, st.floats(30, 90), st.floats(0.1, 10))
def test_monotone_and_convex_in_the_base(temp_f: list[float], base: float, step: float) -> None:
    low, mid, high = (heating_degree_days(temp_f, base + k * step) for k in (-1, 0, 1))
    assert low <= mid <= high
    assert mid <= (low + high) / 2 + 1e-9
    low, mid, high = (cooling_degree_days(temp_f, base + k * step) for k in (-1, 0, 1))
    assert low >= mid >= high
    assert mid <= (low + high) / 2 + 1e-9


@given(temps, st.floats(30, 90))
def test_units_at_the_same_base_are_exact(temp_f: list[float], base: float) -> None:
    w = weather(date(2023, 1, 1), temp_f)
    start, end = [day_of(date(2023, 1, 1))], [day_of(date(2023, 1, 1)) + len(temp_f)]
    f = by_period(w, start, end, parse_base(f"{base:.6f}F"))
    c = by_period(w, start, end, parse_base(f"{(round(base, 6) - 32) / 1.8:.12f}C"))
    assert c.heating * 1.8 == pytest.approx(f.heating, abs=1e-6)


def _days(y: int, m: int, d: int, n: int) -> tuple[list[int], list[int]]:
    first = day_of(date(y, m, d))
    return list(range(first, first + n)), list(range(first + 1, first + n + 1))


def test_a_period_with_a_missing_day_has_no_degree_days() -> None:
    w = weather(date(2023, 1, 1), [30.0, np.nan, 50.0])
    first = w.first_day
    made = by_period(w, [first, first + 2, first + 2], [first + 3, first + 3, first + 5], B65)
    assert np.isnan(made.heating).tolist() == [True, False, True]
    assert made.days_missing.tolist() == [1, 0, 2]
    with pytest.raises(MissingWeather, match="1 of 3 days"):
        heating_degree_days(w.temp_f, 65.0)


def test_a_period_before_the_record_is_missing_not_shifted() -> None:
    w = weather(date(2023, 1, 10), [30.0, 40.0])
    made = by_period(w, [w.first_day - 5, w.first_day - 1], [w.first_day - 2, w.first_day + 2], B65)
    assert made.days_missing.tolist() == [3, 1]
    assert np.isnan(made.heating).all()


def test_months_with_missing_days_are_incomplete_never_low() -> None:
    temp = seasons(date(2024, 1, 1), date(2024, 12, 31))
    temp[40] = np.nan  # 10 February
    w = weather(date(2024, 1, 1), temp)
    table = monthly_degree_days(w, B65)
    assert len(table.rows) == 12
    assert table.incomplete == ("2024-02",)
    february = table.rows[1]
    assert february.heating is None
    assert (february.days_present, february.days_missing) == (28, 1)  # a leap year
    assert february.heating_so_far == pytest.approx(np.nansum(65 - temp[31:60].clip(max=65)))
    assert annual_degree_days(w, B65).rows[0].heating is None


def test_months_add_up_to_the_year() -> None:
    w = years(2023, 2024)
    months, whole = monthly_degree_days(w, B65), annual_degree_days(w, B65)
    for row, part in zip(whole.rows, (months.rows[:12], months.rows[12:]), strict=True):
        assert row.heating == pytest.approx(sum(m.heating or 0.0 for m in part))
        assert row.days_present == sum(m.days_present for m in part)
    assert [row.days_present for row in whole.rows] == [365, 366]


def test_whole_degrees_need_maximum_minimum_and_fahrenheit() -> None:
    w = years(2023, 2023)
    with pytest.raises(MissingWeather, match="no daily maximum and minimum"):
        annual_degree_days(w, B65, method="whole-degrees")
    both = weather(date(2023, 1, 1), w.temp_f, max_f=w.temp_f + 9, min_f=w.temp_f - 9)
    with pytest.raises(WeatherError, match="counted in °F"):
        annual_degree_days(both, parse_base("18C"), method="whole-degrees")


@pytest.mark.parametrize("text", ["65", "", "F", "65K", "1e3F", "nanF", "999F", "sixty F"])
def test_bases_that_are_none(text: str) -> None:
    with pytest.raises(WeatherError, match="base"):
        parse_base(text)
