"""The long-term year against sums done the slow way, and typical years against pvlib's files."""

from __future__ import annotations

import importlib.util
from calendar import isleap
from dataclasses import replace
from datetime import date
from pathlib import Path

import numpy as np
import pytest

from normalize.days import day_of
from normalize.errors import MissingWeather, UnreadableWeather, WeatherError
from normalize.weather.gaps import fill_gaps
from normalize.weather.year import long_term_year, read_long_term_year, year_from_sample
from tests.weather.makers import seasons, weather, write, years


def test_against_sums_done_the_slow_way() -> None:
    """H0, C0 and days below, at bases on, between and outside the days' temperatures."""
    w = years(2012, 2023)
    year = long_term_year(w)
    assert year.years == tuple(range(2014, 2024))
    assert year.name == "mean of 10 years, 2014-2023"
    for base in (-80.0, 30.0, 50.0, 61.7, float(w.temp_f[-100]), 70.0, 200.0):
        heat, cool, below = [], [], []
        for y in year.years:
            a = day_of(date(y, 1, 1)) - w.first_day
            temps = w.temp_f[a : a + 365 + isleap(y)].tolist()
            heat.append(365 * sum(max(base - t, 0.0) for t in temps) / len(temps))
            cool.append(365 * sum(max(t - base, 0.0) for t in temps) / len(temps))
            below.append(365 * sum(t < base for t in temps) / len(temps))
        assert year.heating(base) == pytest.approx(sum(heat) / 10, rel=1e-11, abs=1e-8)
        assert year.cooling(base) == pytest.approx(sum(cool) / 10, rel=1e-11, abs=1e-7)
        assert year.days_below(base) == pytest.approx(sum(below) / 10, rel=1e-12)


def test_properties_in_the_base() -> None:
    year = long_term_year(years(2014, 2023))
    bases = np.linspace(20, 90, 281)
    heat = np.array([year.heating(b) for b in bases])
    cool = np.array([year.cooling(b) for b in bases])
    assert (np.diff(heat) >= 0).all()
    assert (np.diff(heat, 2) >= -1e-8).all()
    assert (np.diff(cool) <= 0).all()
    assert (np.diff(cool, 2) >= -1e-8).all()
    assert heat - cool == pytest.approx(365 * (bases - year.mean_f), rel=1e-9, abs=1e-6)
    slope = (year.heating(60.001) - year.heating(60.0)) / 0.001
    assert slope == pytest.approx(year.days_below(60.0), abs=0.5)


def test_a_year_with_40_missing_days_is_left_out_and_the_one_before_taken() -> None:
    w = years(2010, 2023)
    a = day_of(date(2019, 3, 1)) - w.first_day
    w.temp_f[a : a + 40] = np.nan
    year = long_term_year(w)
    assert year.years == (2013, 2014, 2015, 2016, 2017, 2018, 2020, 2021, 2022, 2023)
    assert year.left_out == ((2019, "40 days missing; at most 15 may be"),)
    assert year.name == "mean of 10 years of 2013-2023"
    assert any("2019 (40 days missing" in note for note in year.notes)


def test_scattered_missing_days_count_even_when_filled() -> None:
    w = years(2014, 2023)
    a = day_of(date(2019, 1, 2)) - w.first_day
    w.temp_f[a : a + 60 : 3] = np.nan  # 20 single days, all short gaps
    filled = fill_gaps(w)
    assert filled.days_filled == 20
    year = long_term_year(filled)
    assert 2019 not in year.years
    assert any("10 years were asked for and 9 could be used" in n for n in year.notes)


def test_missing_january_days_do_not_make_the_year_milder() -> None:
    w = years(2014, 2023)
    whole = long_term_year(w).heating(65)
    a = day_of(date(2020, 1, 10)) - w.first_day
    holed = replace(w, temp_f=w.temp_f.copy())
    holed.temp_f[a : a + 15] = np.nan
    year = long_term_year(holed)
    assert 2020 in year.years
    assert year.cum_days[-1] == pytest.approx(365, abs=1e-9)
    assert year.heating(65) == pytest.approx(whole, rel=0.003)
    # the plain mean of the days that are left would be lower by more
    plain = np.mean(np.maximum(65 - holed.temp_f[np.isfinite(holed.temp_f)], 0)) * 365
    assert abs(year.heating(65) - whole) < abs(plain - whole)


def test_an_unfinished_last_year_is_left_out_with_its_reason() -> None:
    start = date(2019, 1, 1)
    w = weather(start, seasons(start, date(2023, 6, 30)))
    year = long_term_year(w)
    assert year.years == (2019, 2020, 2021, 2022)
    assert year.left_out == ((2023, "the record ends on 2023-06-30"),)
    assert long_term_year(w, years=2, last=2021).years == (2020, 2021)


def test_every_year_weighs_the_same_and_has_365_days() -> None:
    year = long_term_year(years(2020, 2021), years=2)  # 366 and 365 days
    assert set(np.round(year.weight, 12)) == {round(365 / 366 / 2, 12), 0.5}


def test_no_whole_year_says_what_to_do() -> None:
    start = date(2023, 2, 1)
    w = weather(start, seasons(start, date(2023, 12, 31)))
    with pytest.raises(MissingWeather, match=r"the record begins on 2023-02-01.*typical-year"):
        long_term_year(w)
    with pytest.raises(WeatherError, match="0 years"):
        long_term_year(years(2022, 2023), years=0)


def test_same_bits_again() -> None:
    one, two = long_term_year(years(2010, 2023)), long_term_year(years(2010, 2023))
    assert one.cum_degrees.tobytes() == two.cum_degrees.tobytes()
    assert one.cum_degrees[1:].tobytes() == np.cumsum(one.weight * one.temp_f).tobytes()


@pytest.mark.parametrize(
    ("temps", "weights"),
    [([50.0], [364.0]), ([50.0, np.nan], [300.0, 65.0]), ([], []), ([1.0, 2.0], [365.0])],
)
def test_samples_that_are_no_year(temps: list[float], weights: list[float]) -> None:
    with pytest.raises(WeatherError):
        year_from_sample("x", temps, weights)


def _pvlib_data() -> Path:
    found = importlib.util.find_spec("pvlib")
    if found is None or found.origin is None:
        pytest.skip("pvlib is not installed")
    return Path(found.origin).parent / "data"


@pytest.mark.parametrize(
    ("name", "hdd_c", "cdd_c"),
    [("723170TYA.CSV", 2153.2, 725.5), ("703165TY.csv", 5078.1, 0.0)],
)
def test_tmy3_of_pvlib(name: str, hdd_c: float, cdd_c: float) -> None:
    """Greensboro and Sand Point, TMY3 files shipped with pvlib: daily means, base 18.3333 °C.

    The figures were summed from these files independently of this program.
    """
    year = read_long_term_year(_pvlib_data() / name)
    assert year.temp_f.size == 365
    assert set(year.weight) == {1.0}
    assert year.heating(18.3333 * 1.8 + 32) / 1.8 == pytest.approx(hdd_c, abs=0.05)
    assert year.cooling(18.3333 * 1.8 + 32) / 1.8 == pytest.approx(cdd_c, abs=0.05)


def test_tmy3_row_by_row() -> None:
    """The same file taken apart line by line: 365 days of 24 rows in the order of the file."""
    path = _pvlib_data() / "723170TYA.CSV"
    lines = path.read_text(encoding="latin-1").splitlines()
    column = lines[1].split(",").index("Dry-bulb (C)")
    hours = np.array([float(line.split(",")[column]) for line in lines[2:]])
    means = np.sort(hours.reshape(365, 24).mean(axis=1) * 1.8 + 32)
    assert read_long_term_year(path).temp_f == pytest.approx(means, abs=1e-9)


def _epw(folder: Path, hours: np.ndarray, *, torn: str = "") -> Path:
    head = [
        "LOCATION,Harrow Valley,ZZ,XXX,invented,000000,44.0,-72.0,-5.0,200.0",
        "DESIGN CONDITIONS,0",
        "TYPICAL/EXTREME PERIODS,0",
        "GROUND TEMPERATURES,0",
        "HOLIDAYS/DAYLIGHT SAVINGS,No,0,0,0",
        "COMMENTS 1,semicolons; and, commas",
        "COMMENTS 2,",
        "DATA PERIODS,1,1,Data,Sunday,1/1,12/31",
    ]
    rows = []
    first = day_of(date(2001, 1, 1))
    for i, temp in enumerate(hours):
        d = date.fromordinal(date(2001, 1, 1).toordinal() + i // 24)
        assert day_of(d) >= first
        rows.append(f"{1980 + d.month},{d.month},{d.day},{i % 24 + 1},60,?9?9,{temp:.1f},0.0,50")
    return write(folder, [*head, *rows, *([torn] if torn else [])], "typical.epw")


def test_epw_hours_end_at_their_number(tmp_path: Path) -> None:
    """Hour 24 belongs to the day it ends; months' years differ; degree-days by hand."""
    hours = np.repeat(np.where(np.arange(365) % 2 == 0, 0.0, 20.0), 24)
    year = read_long_term_year(_epw(tmp_path, hours))
    assert year.station == "Harrow Valley, ZZ, XXX"
    # 183 days of 32 °F and 182 of 68 °F
    assert year.heating(65) == pytest.approx(183 * 33)
    assert year.cooling(65) == pytest.approx(182 * 3)
    assert year.years == ()


def test_epw_missing_hours(tmp_path: Path) -> None:
    hours = np.repeat(np.full(365, 10.0), 24)
    hours[24 * 40 : 24 * 42] = 99.9
    hours[24 * 100 + 3] = 99.9
    year = read_long_term_year(_epw(tmp_path, hours))
    assert year.temp_f.size == 363
    assert year.cum_days[-1] == pytest.approx(365)
    assert year.heating(65) == pytest.approx(365 * 15)
    assert any("2 days missing" in n for n in year.notes)
    assert not any("impossible" in n for n in year.notes)  # 99.9 is the format's own mark


def test_epw_that_is_cut_short_or_torn(tmp_path: Path) -> None:
    with pytest.raises(UnreadableWeather, match="has 31 days"):
        read_long_term_year(_epw(tmp_path, np.full(31 * 24, 5.0)))
    with pytest.raises(UnreadableWeather, match=r"typical\.epw:8769: is not a whole EPW row"):
        read_long_term_year(_epw(tmp_path, np.full(8760, 5.0), torn="1999,1,x"))
    with pytest.raises(UnreadableWeather, match="hour 25"):
        read_long_term_year(_epw(tmp_path, np.full(8760, 5.0), torn="1999,1,1,25,0,?,5.0"))


def test_an_observed_file_is_no_typical_year(tmp_path: Path) -> None:
    path = write(tmp_path, ["date,mean_f", "2023-01-01,30"])
    with pytest.raises(UnreadableWeather, match=r"not a typical-year or normals file.*observed"):
        read_long_term_year(path)
