"""Ways of forming a day's degree-days, flagged where they differ; neighbours; alternatives."""

from __future__ import annotations

from dataclasses import replace
from datetime import date, datetime, timedelta
from pathlib import Path

import numpy as np
import pytest

from normalize.days import day_of
from normalize.errors import MissingWeather, WeatherError
from normalize.weather.alternatives import alternatives
from normalize.weather.degree_days import (
    annual_degree_days,
    bill_degree_days,
    by_period,
    monthly_degree_days,
    parse_base,
)
from normalize.weather.gaps import fill_gaps
from normalize.weather.methods import METHODS, daily_degree_days, mismatch
from normalize.weather.neighbour import fill_from_neighbour
from normalize.weather.read import read_weather
from normalize.weather.temperature import DailyTemperature
from normalize.weather.year import long_term_year
from tests.weather.makers import daily_lines, seasons, weather, write, years


def test_hourly_integration_is_the_sum_of_hours() -> None:
    """Half a day at 55 and half at 75: 5 heating and 5 cooling, where the mean has none."""
    w = DailyTemperature(
        "S", 0, np.array([65.0]), np.zeros(1, bool), "mean of hours",
        hour_day=np.zeros(24, np.int64), hour_f=np.repeat([55.0, 75.0], 12),
    )  # fmt: skip
    daily = daily_degree_days(w, parse_base("65F"), "hourly")
    assert (daily.heating.tolist(), daily.cooling.tolist()) == ([5.0], [5.0])
    assert daily_degree_days(w, parse_base("65F")).heating.tolist() == [0.0]


def test_days_of_23_and_25_hours(tmp_path: Path) -> None:
    """Across both changes of the clock in 2023 (US), as a local file writes them."""
    lines = ["datetime,temp_f"]
    when = datetime(2023, 1, 1)  # noqa: DTZ001 - the clock on the wall
    while when.year == 2023:
        hour = (when.month, when.day, when.hour)
        if hour != (3, 12, 2):  # does not exist
            lines.append(f"{when:%Y-%m-%d %H:%M},{30 + when.hour}")
        if hour == (11, 5, 1):  # comes twice
            lines.append(f"{when:%Y-%m-%d %H:%M},{30 + when.hour}")
        when += timedelta(hours=1)
    w = read_weather(write(tmp_path, lines))
    assert w.hour_day is not None
    hours = np.bincount(w.hour_day - w.first_day)
    spring = day_of(date(2023, 3, 12)) - w.first_day
    autumn = day_of(date(2023, 11, 5)) - w.first_day
    assert (hours[spring], hours[autumn], hours[100]) == (23, 25, 24)
    daily = daily_degree_days(w, parse_base("65F"), "hourly")
    assert daily.heating[spring] == pytest.approx(65 - (sum(range(30, 54)) - 32) / 23)
    assert daily.heating[autumn] == pytest.approx(65 - (sum(range(30, 54)) + 31) / 25)


@pytest.mark.parametrize("method", sorted(METHODS))
@pytest.mark.parametrize("base", ["65F", "10C", "50F"])
def test_heating_minus_cooling_is_base_minus_mean(method: str, base: str) -> None:
    """For every method that treats heating and cooling alike; exact in the base's own unit."""
    if method == "whole-degrees" and base == "10C":
        pytest.skip("counted in °F only")
    rng = np.random.default_rng(3)
    hour_f = rng.normal(60, 15, (40, 24))
    high, low = hour_f.max(axis=1), hour_f.min(axis=1)
    w = weather(
        date(2023, 1, 1), hour_f.mean(axis=1), max_f=high, min_f=low,
        hour_day=np.repeat(day_of(date(2023, 1, 1)) + np.arange(40), 24), hour_f=hour_f.ravel(),
    )  # fmt: skip
    b = parse_base(base)
    daily = daily_degree_days(w, b, method)
    if method == "four-case":  # its straddling cases are approximations and do not balance
        assert (daily.heating >= 0).all()
        return
    wanted = (b.base_f - daily.temp_f) * b.per_f_day
    assert daily.heating - daily.cooling == pytest.approx(wanted, abs=1e-9)


def test_what_a_method_needs_and_the_file_lacks() -> None:
    w = weather(date(2023, 1, 1), [50.0, 60.0])
    for method in ("max-min", "four-case", "whole-degrees", "hourly"):
        with pytest.raises(MissingWeather, match="for this method"):
            daily_degree_days(w, parse_base("65F"), method)
    with pytest.raises(WeatherError, match="is no method"):
        daily_degree_days(w, parse_base("65F"), "guess")


def test_filled_days_have_only_a_mean() -> None:
    """With another method a filled day is missing, and so is its month."""
    temp = np.full(31, 50.0)
    w = weather(date(2023, 1, 1), temp, max_f=temp + 5, min_f=temp - 5)
    w.temp_f[9] = w.max_f[9] = w.min_f[9] = np.nan  # type: ignore[index]
    w = fill_gaps(w)
    assert monthly_degree_days(w, parse_base("65F")).rows[0].heating == pytest.approx(465.0)
    row = monthly_degree_days(w, parse_base("65F"), method="max-min").rows[0]
    assert (row.heating, row.days_missing) == (None, 1)


def test_by_bill_is_by_period_with_labels() -> None:
    w = years(2022, 2023)
    start = [day_of(date(2022, 1, 10)), day_of(date(2022, 2, 11)), day_of(date(2023, 12, 20))]
    end = [start[1], day_of(date(2022, 3, 14)), day_of(date(2024, 1, 20))]
    base = parse_base("18C")
    table = bill_degree_days(w, start, end, base)
    made = by_period(w, start, end, base)
    assert [r.heating for r in table.rows[:2]] == pytest.approx(made.heating[:2].tolist())
    assert table.rows[0].label == "2022-01-10 to 2022-02-10"
    assert (table.rows[2].heating, table.rows[2].days_missing) == (None, 19)


def test_unit_conversion_at_the_same_base_is_exact() -> None:
    """65 °F is 18.333 °C: the totals are in the ratio 5/9; base 18 °C is another base."""
    w = years(2023, 2023)
    f = annual_degree_days(w, parse_base("65F")).rows[0]
    assert f.heating is not None
    same = annual_degree_days(w, parse_base("18.333333333333332C")).rows[0]
    assert same.heating == pytest.approx(f.heating * 5 / 9, rel=1e-12)
    other = annual_degree_days(w, parse_base("18C")).rows[0]
    assert other.heating is not None
    assert abs(other.heating - f.heating * 5 / 9) > 50


def test_no_rescaling_reproduces_ephrata() -> None:
    """WRCC, Ephrata WA: 5859/4606/3925/3500/2540 at 65/60/57/55/50 °F.

    Neither scaling by the base, nor 365 a degree, nor another station's shares give the others
    within 3 %: each is summed anew.
    """
    published = {65: 5859, 60: 4606, 57: 3925, 55: 3500, 50: 2540}
    slopes = [
        (published[a] - published[b]) / (a - b) for a, b in ((65, 60), (60, 57), (57, 55), (55, 50))
    ]
    assert slopes == sorted(slopes, reverse=True)  # convex: days below fall with the base
    assert max(slopes) < 365
    for base, value in published.items():
        if base != 65:
            assert abs(published[65] * base / 65 - value) > 0.03 * value
            assert abs(published[65] - 365 * (65 - base) - value) > 0.03 * value
    # Another station's share (Lebanon, NH, normals 1991-2020) is no help either.
    for base, other in ((60, 5991.6), (57, 5264.1), (55, 4806.6), (50, 3761.0)):
        assert abs(published[65] * other / 7333.4 - published[base]) > 0.03 * published[base]


def test_methods_that_differ_are_flagged() -> None:
    w = years(2012, 2023)
    high_low = replace(w, method="mean of daily maximum and minimum")
    hours = replace(w, method="mean of hours")
    year = long_term_year(high_low)
    assert mismatch(high_low, year) == ""
    assert "means of hours and the long-term year is made of means of maximum" in mismatch(
        hours, year
    )
    typical = replace(year, method="mean of hours, typical year")
    assert mismatch(hours, typical) == ""
    assert "means of maximum and minimum" in mismatch(high_low, typical)
    assert "is not said" in mismatch(replace(w, method="as given"), typical)
    assert mismatch(high_low, replace(year, method="")) == ""


# Neighbours


def pair() -> tuple[DailyTemperature, DailyTemperature]:
    """Two invented places: the neighbour is 2 °F warmer in the mean and swings less."""
    w = years(2021, 2023)
    noise = np.random.default_rng(8).normal(0, 1.0, w.n_days)
    other = replace(w, temp_f=52 + 0.9 * (w.temp_f - 50) + noise, station="Next Valley")
    return w, other


def test_a_gap_is_filled_from_the_neighbour() -> None:
    w, other = pair()
    truth = w.temp_f.copy()
    w.temp_f[200:214] = np.nan
    made = fill_from_neighbour(w, other)
    assert np.flatnonzero(made.filled).tolist() == list(range(200, 214))
    assert np.abs(made.temp_f[200:214] - truth[200:214]).max() < 4.0
    assert np.abs(made.temp_f[200:214] - truth[200:214]).mean() < 1.5  # noise of 1 °F / 0.9
    assert "14 days in 1 gap were filled from Next Valley by regression" in made.notes[-1]


def test_limits_of_a_neighbour() -> None:
    w, other = pair()
    w.temp_f[200:231] = np.nan  # 31 days
    w.temp_f[300:303] = np.nan
    other.temp_f[301] = np.nan
    made = fill_from_neighbour(w, other)
    assert not made.filled.any()
    assert "2 gaps were not filled from Next Valley: longer than 30 days" in made.notes[-1]
    stranger = replace(other, temp_f=np.random.default_rng(1).normal(50, 20, w.n_days))
    assert not fill_from_neighbour(w, stranger).filled.any()
    elsewhere = replace(other, first_day=w.first_day + 5000)
    assert not fill_from_neighbour(w, elsewhere).filled.any()


def test_a_neighbour_read_in_the_morning_is_noticed() -> None:
    w, other = pair()
    w.temp_f[200:205] = np.nan
    late = replace(other, first_day=other.first_day + 1)
    assert "better a day apart" in " ".join(fill_from_neighbour(w, late).notes)
    assert "better a day apart" not in " ".join(fill_from_neighbour(w, other).notes)


def test_read_weather_with_a_neighbour(tmp_path: Path) -> None:
    first = date(2022, 1, 1)
    temps = seasons(first, date(2022, 12, 31))
    holed = temps.copy()
    holed[[50, 51, 52, 53, 54, 55, 90]] = np.nan
    rows = [line.replace("nan", "") for line in daily_lines(first, holed)]
    mine = write(tmp_path, ["date,mean_f", *rows], "mine.csv")
    its = write(tmp_path, ["date,mean_f", *daily_lines(first, temps + 3)], "its.csv")
    w = read_weather(mine, neighbour=its)
    assert int(w.filled.sum()) == 7
    assert w.temp_f == pytest.approx(temps, abs=0.06)
    assert [name for name, _ in w.source] == ["mine.csv", "its.csv"]


def test_alternatives(tmp_path: Path) -> None:
    w = years(2001, 2023)
    year = long_term_year(w)
    first = date(2012, 1, 1)
    lines = ["date,mean_f", *daily_lines(first, seasons(first, date(2023, 12, 31), seed=9))]
    other = write(tmp_path, lines, "other.csv")
    means = write(tmp_path, ["month,mean_f", *[f"{m},50" for m in range(1, 13)]], "means.csv")
    made = alternatives(
        w, year, stations=[other, tmp_path / "none.csv"], years=[means, other], n_years=10
    )
    assert [(a.name, a.changes, a.usable) for a in made] == [
        ("other, mean of 10 years, 2014-2023", "station", True),
        ("none", "station", False),
        ("mean of 5 years, 2019-2023", "long-term year", True),
        ("mean of 20 years, 2004-2023", "long-term year", True),
        ("estimate from monthly means", "long-term year", True),
        ("other", "long-term year", False),
    ]
    assert "no such file" in made[1].unavailable
    assert made[2].weather is w
