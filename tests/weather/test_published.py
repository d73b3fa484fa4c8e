"""Long-term years from published normals and from monthly means, against published numbers."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from normalize.errors import AmbiguousWeather, UnreadableWeather
from normalize.weather.degree_days import daily_cooling
from normalize.weather.estimate import MONTH_DAYS, estimated_heating, estimated_year
from normalize.weather.published import Published, year_of_published
from normalize.weather.stations.zone import zone_of, zone_of_degree_days
from normalize.weather.year import LongTermYear, long_term_year, read_long_term_year
from tests.weather.makers import SHARED, write, years

# NOAA 1991-2020 U.S. normals, station USW00094765 (Lebanon, NH), annual; public domain.
HEATING = {65: 7333.4, 60: 5991.6, 57: 5264.1, 55: 4806.6, 50: 3761.0, 45: 2835.7, 40: 2041.6}
COOLING = {
    72: 92.5, 70: 160.1, 65: 461.1, 60: 944.3, 57: 1311.8, 55: 1584.3, 50: 2363.7, 45: 3263.4,
    40: 4294.3,
}  # fmt: skip

# Urbana, IL, 1981-2010 normals: monthly means and degree-days, Illinois State Water Survey.
URBANA = (24.8, 29.0, 40.0, 51.9, 62.5, 72.2, 74.9, 73.4, 66.2, 53.9, 41.3, 28.9)
URBANA_HEATING = (1256, 1009, 777, 402, 146, 17, 1, 5, 79, 358, 711, 1117)
URBANA_COOLING = (0, 0, 1, 10, 69, 233, 309, 265, 115, 14, 0, 0)


def lebanon(*, without: int | None = None) -> LongTermYear:
    heating = {float(b): v for b, v in HEATING.items() if b != without}
    cooling = {float(b): v for b, v in COOLING.items() if b != without}
    return year_of_published("Lebanon", Published(heating, cooling), where="test")


def test_published_bases_are_kept() -> None:
    year = lebanon()
    for base, value in HEATING.items():
        assert year.heating(base) == pytest.approx(value, abs=0.05)
    for base, value in COOLING.items():
        assert year.cooling(base) == pytest.approx(value, abs=0.15)


@pytest.mark.parametrize("base", [50, 55, 57, 60])
def test_a_heating_base_left_out_is_found_within_a_fifth_of_a_per_cent(base: int) -> None:
    """Left out of both lists: the cooling at a base would give its heating away."""
    assert lebanon(without=base).heating(base) == pytest.approx(HEATING[base], rel=0.002)


@pytest.mark.parametrize("base", sorted(COOLING))
def test_a_cooling_base_left_out_is_found_within_five_degree_days(base: int) -> None:
    """At the ends (40, 72) too, where nothing published lies beyond."""
    assert lebanon(without=base).cooling(base) == pytest.approx(COOLING[base], abs=5.0)


def test_monotone_convex_and_balanced_between_the_bases() -> None:
    """What any year has: H rises ever faster, C falls ever slower, H − C = Σ(base − mean)."""
    year = lebanon()
    bases = np.arange(20.0, 100.0, 0.1)
    heat = np.array([year.heating(b) for b in bases])
    cool = np.array([year.cooling(b) for b in bases])
    assert (np.diff(heat) >= 0).all()
    assert (np.diff(heat, 2) >= -1e-7).all()
    assert (np.diff(cool) <= 0).all()
    assert (np.diff(cool, 2) >= -1e-7).all()
    assert heat - cool == pytest.approx(365 * (bases - year.mean_f), abs=1e-6)
    assert year.weight.sum() == pytest.approx(365.0)
    assert 0 <= year.days_below(40) <= year.days_below(65) <= 365


@pytest.mark.parametrize("kind", ["annualseasonal", "monthly", "daily"])
def test_the_three_files_of_normals_agree(kind: str) -> None:
    """NOAA's own files: monthly sums are within 0.2, daily sums (without February 29) 1.5."""
    path = SHARED / "data" / "noaa" / f"normals_{kind}.csv"
    if not path.exists():
        pytest.skip("the shared files are not here")
    year = read_long_term_year(path)
    assert year.station == "LEBANON MUNI AP, NH US (USW00094765)"
    off = {"annualseasonal": 0.05, "monthly": 0.25, "daily": 1.5}[kind]
    for base, value in HEATING.items():
        assert year.heating(base) == pytest.approx(value, abs=off)
    for base in (65, 60, 57, 55, 70, 72):
        assert year.cooling(base) == pytest.approx(COOLING[base], abs=off + 0.1)
    assert "rest on 22 of the 30 years" in " ".join(year.notes)
    assert "flag R (representative)" in " ".join(year.notes)
    assert zone_of(year) == 6  # Lebanon, NH (memory)


def test_degree_days_of_normal_means_would_lose_a_third_of_cooling() -> None:
    """The trap: Σ(TAVG−65)⁺ of the daily normals is 305.6, published 461.1."""
    import csv

    path = SHARED / "data" / "noaa" / "normals_daily.csv"
    if not path.exists():
        pytest.skip("the shared files are not here")
    with path.open(encoding="utf-8") as file:
        means = [float(row["DLY-TAVG-NORMAL"]) for row in csv.DictReader(file)]
    assert daily_cooling(means, 65.0).sum() == pytest.approx(305.6, abs=0.05)
    assert read_long_term_year(path).cooling(65.0) == pytest.approx(459.6, abs=0.5)


def test_a_made_up_file_of_annual_normals(tmp_path: Path) -> None:
    names, cells = ["STATION", "NAME", "ANN-TAVG-NORMAL"], ["USW00000001", "X AP, ZZ US", "  46.0"]
    for kind, values in (("HTDD", HEATING), ("CLDD", COOLING)):
        for base, value in values.items():
            name = f"ANN-{kind}-" + ("NORMAL" if base == 65 else f"BASE{base}")
            names += [name, f"comp_flag_{name}", f"years_{name}"]
            cells += [f"  {value}", "S", "30"]
    lines = [",".join(f'"{c}"' for c in row) for row in (names, cells)]
    year = read_long_term_year(write(tmp_path, lines))
    assert year.name == "normals 1991-2020 of X AP, ZZ US (USW00000001)"
    assert year.heating(60) == pytest.approx(HEATING[60], abs=0.05)
    assert "rest on" not in " ".join(year.notes)
    missing = [lines[0], lines[1].replace("5991.6", "-9999.0")]
    assert read_long_term_year(write(tmp_path, missing)).heating(60) == pytest.approx(
        HEATING[60], rel=0.002
    )


def test_a_hot_place_with_no_heating_at_low_bases() -> None:
    """Invented numbers of a place like Miami; regression, not truth."""
    heating = {40.0: 0.0, 45.0: 0.2, 50.0: 1.1, 55.0: 8.0, 57.0: 14.0, 60.0: 33.0, 65.0: 120.0}
    year = year_of_published(
        "hot", Published(heating, {65.0: 4800.0, 70.0: 3100.0, 72.0: 2450.0}), where="test"
    )
    for base, value in heating.items():
        assert year.heating(base) == pytest.approx(value, abs=0.5)


@pytest.mark.parametrize(
    ("heating", "cooling", "words"),
    [
        ({65.0: 7333.4}, {65.0: 461.1}, "at 1 bases"),
        ({50.0: 3761.0, 55.0: 3000.0, 60.0: 5991.6}, {60.0: 944.3}, "no year of weather"),
        ({50.0: 3000.0, 55.0: 4800.0, 60.0: 5000.0}, {50.0: 3000.0}, "no year of weather"),
        ({50.0: 3761.0, 55.0: 4806.6, 60.0: 5991.6}, {}, "not both"),
    ],
)
def test_numbers_that_no_year_has_are_refused(
    heating: dict[float, float], cooling: dict[float, float], words: str
) -> None:
    with pytest.raises(UnreadableWeather, match=words):
        year_of_published("x", Published(heating, cooling), where="test")


def test_urbana_from_monthly_means_alone() -> None:
    """The ASHRAE/Erbs formula (memory) gives 5922.9 for the year; published are 5878 and 1016.

    By month within 25 °F·day of the published heating.
    """
    heat = estimated_heating(URBANA, 65.0)
    assert heat.sum() == pytest.approx(5922.9, abs=0.05)
    assert heat.sum() == pytest.approx(sum(URBANA_HEATING), rel=0.01)
    assert np.abs(heat - URBANA_HEATING).max() < 25
    cool = heat - np.array(MONTH_DAYS) * (65.0 - np.array(URBANA))
    assert cool.sum() == pytest.approx(sum(URBANA_COOLING), rel=0.06)


def test_the_estimated_year_is_that_formula_at_any_base_and_says_so(tmp_path: Path) -> None:
    months = ("Jan", "Feb", "Mar", "Apr", "May", "Jun", "July", "Aug", "Sept", "Oct", "Nov", "Dec")
    lines = ["month,mean_f", *[f"{m},{t}" for m, t in zip(months, URBANA, strict=True)]]
    year = read_long_term_year(write(tmp_path, lines, "urbana.csv"))
    for base in (40.0, 55.0, 61.3, 65.0, 75.0):
        wanted = estimated_heating(URBANA, base).sum() * 365 / 365.25
        assert year.heating(base) == pytest.approx(wanted, rel=2e-4, abs=0.6)
    assert year.method == "estimated from monthly means (ASHRAE/Erbs)"
    assert "estimate" in year.name
    assert year.notes[0].startswith("An estimate")
    in_c = [f"{i + 1},{(t - 32) * 5 / 9:.4f}" for i, t in enumerate(URBANA)]
    same = read_long_term_year(write(tmp_path, ["month;mean_c".replace(";", ","), *in_c], "c.csv"))
    assert same.heating(65.0) == pytest.approx(year.heating(65.0), rel=1e-4)
    with pytest.raises(AmbiguousWeather, match="°F or °C"):
        read_long_term_year(write(tmp_path, ["month,mean", *lines[1:]], "d.csv"))


def test_the_estimate_against_days_that_are_known() -> None:
    """Monthly means of an invented station: the estimate is within 3 % of its own days'."""
    w = years(2001, 2020)
    truth = long_term_year(w, years=20)
    day = np.arange(w.first_day, w.last_day)
    month = day.astype("datetime64[D]").astype("datetime64[M]").astype(np.int64) % 12
    means = [float(w.temp_f[month == m].mean()) for m in range(12)]
    assert estimated_year(means).heating(60.0) == pytest.approx(truth.heating(60.0), rel=0.03)


def test_the_trend_is_shown() -> None:
    """Invented: 0.5 °F a decade is built in and found within three standard errors."""
    w = years(1981, 2020)
    w.temp_f[:] += 0.05 * np.arange(w.n_days) / 365.25
    year = long_term_year(w)
    assert year.trend_f_per_decade is not None
    assert year.trend_error_f is not None
    assert abs(year.trend_f_per_decade - 0.5) < 3 * year.trend_error_f
    assert "40 whole years 1981-2020 warmed by" in " ".join(year.notes)
    still = long_term_year(years(2011, 2020))
    assert "no clear warming or cooling" in " ".join(still.notes)
    assert long_term_year(years(2014, 2020)).trend_f_per_decade is None


@pytest.mark.parametrize(
    ("heating", "cooling", "zone"),
    [
        (0.0, 11000.0, 0), (200.0, 9001.0, 1), (2000.0, 6301.0, 2), (3600.0, 6300.0, 3),
        (3601.0, 4000.0, 4), (5400.0, 3000.0, 4), (7200.0, 2000.0, 5), (9000.0, 1500.0, 6),
        (9001.0, 900.0, 7), (12601.0, 500.0, 8),
    ],
)  # fmt: skip
def test_zones_at_their_bounds(heating: float, cooling: float, zone: int) -> None:
    """ASHRAE 169's bounds, IP (memory)."""
    assert zone_of_degree_days(heating, cooling) == zone
