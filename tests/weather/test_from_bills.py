"""Temperatures that the bills carry, laid over their days."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest

from normalize.errors import MissingWeather, WeatherError
from normalize.weather.from_bills import temperature_of_bills
from normalize.weather.year import long_term_year
from tests.weather.makers import years


def test_each_mean_over_its_own_days() -> None:
    w = temperature_of_bills([100, 133, 160], [130, 160, 170], [30.0, np.nan, 50.0])
    assert w.by_bill
    assert w.method == "mean temperature printed on the bills"
    assert (w.first_day, w.n_days) == (100, 70)
    assert (w.temp_f[:30] == 30).all()
    assert np.isnan(w.temp_f[30:60]).all()
    assert (w.temp_f[60:] == 50).all()
    assert any("hides its days on either side of the balance temperature" in n for n in w.notes)


def test_a_mean_hides_degree_days() -> None:
    """Monthly means never give more heating than the days they hide (Jensen's inequality)."""
    days = years(2014, 2023)
    edges = np.append(np.arange(days.first_day, days.last_day, 30), days.last_day)
    means = [days.temp_f[a - days.first_day : b - days.first_day].mean()
             for a, b in pairwise(edges)]  # fmt: skip
    hidden = long_term_year(temperature_of_bills(edges[:-1], edges[1:], means))
    assert hidden.mean_f == pytest.approx(long_term_year(days).mean_f, abs=0.001)  # leap years
    assert hidden.cooling(65) < long_term_year(days).cooling(65)
    assert any("bills' mean temperatures" in n for n in hidden.notes)


def test_what_cannot_be_laid() -> None:
    with pytest.raises(MissingWeather, match="no bill carries"):
        temperature_of_bills([0], [30], [np.nan])
    with pytest.raises(MissingWeather):
        temperature_of_bills([0], [30], [9999.0])
    with pytest.raises(WeatherError, match="1970-01-29: two bills share days"):
        temperature_of_bills([0, 28], [30, 60], [30.0, 31.0])
    with pytest.raises(WeatherError, match="ends before it starts"):
        temperature_of_bills([5], [5], [30.0])
    with pytest.raises(WeatherError, match="differ in length"):
        temperature_of_bills([5], [6, 7], [30.0])
