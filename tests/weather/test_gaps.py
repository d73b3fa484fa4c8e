"""Short gaps are filled from the season, long ones stay."""

from __future__ import annotations

from datetime import date

import numpy as np
import pytest

from normalize.days import day_of
from normalize.weather.gaps import calendar_day, day_of_year_mean, fill_gaps, gaps_of
from tests.weather.makers import weather, years


def test_limit_of_three_days() -> None:
    w = years(2018, 2023)
    truth = w.temp_f.copy()
    w.temp_f[100:103] = np.nan
    w.temp_f[200:204] = np.nan
    made = fill_gaps(w)
    assert np.flatnonzero(made.filled).tolist() == [100, 101, 102]
    assert np.flatnonzero(np.isnan(made.temp_f)).tolist() == [200, 201, 202, 203]
    measured = ~made.filled & np.isfinite(made.temp_f)
    assert (made.temp_f[measured] == truth[measured]).all()
    (gap,) = gaps_of(made)
    assert str(gap) == "2018-07-20 to 2018-07-23 (4 days)"
    assert made.notes[0].startswith("3 days in 1 short gap were filled")
    assert "stay missing: 2018-07-20 to 2018-07-23 (4 days)." in made.notes[1]
    assert w.days_filled == 0  # the input is left as it was


def test_a_pure_season_is_filled_exactly_where_a_straight_line_is_not() -> None:
    """Without weather, the fill follows the curve of the season, not the chord across the gap."""
    start = date(2016, 1, 1)
    n = day_of(date(2024, 1, 1)) - day_of(start)
    w = weather(start, np.zeros(n))
    place = calendar_day(np.arange(w.first_day, w.last_day))
    w.temp_f[:] = 50 - 25 * np.cos(2 * np.pi * place / 366)
    truth = w.temp_f[1000:1003].copy()
    chord = np.interp([1, 2, 3], [0, 4], [w.temp_f[999], w.temp_f[1003]])
    w.temp_f[1000:1003] = np.nan
    made = fill_gaps(w).temp_f[1000:1003]
    assert np.abs(made - truth).max() < 0.01
    assert np.abs(made - truth).max() < np.abs(chord - truth).max()


def test_a_warm_spell_stays_warm() -> None:
    w = years(2016, 2023)
    w.temp_f[1500] = day_of_year_mean(w)[calendar_day(np.array([w.first_day + 1500]))[0]] + 20
    w.temp_f[1502] = w.temp_f[1500]
    w.temp_f[1501] = np.nan
    season = day_of_year_mean(w)[calendar_day(np.array([w.first_day + 1501]))[0]]
    assert fill_gaps(w).temp_f[1501] - season == pytest.approx(20, abs=0.5)


def test_leap_day() -> None:
    w = years(2019, 2023)
    i = day_of(date(2020, 2, 29)) - w.first_day
    w.temp_f[i] = np.nan
    made = fill_gaps(w)
    assert made.filled[i]
    mean = day_of_year_mean(w)
    assert np.isfinite(mean).all()
    assert abs(mean[59] - (mean[58] + mean[60]) / 2) < 0.5


def test_few_days_and_none() -> None:
    made = fill_gaps(weather(date(2023, 1, 1), [30.0, np.nan, np.nan, 36.0]))
    assert made.temp_f.tolist() == pytest.approx([30, 32, 34, 36], abs=0.1)
    edge = fill_gaps(weather(date(2023, 1, 1), [np.nan, 30.0, np.nan]))
    assert np.isnan(edge.temp_f).tolist() == [True, False, True]
    empty = fill_gaps(weather(date(2023, 1, 1), [np.nan, np.nan]))
    assert np.isnan(empty.temp_f).all()
