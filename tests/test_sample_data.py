"""The sample data: made by its script, byte for byte, and what it says of itself is so."""

from __future__ import annotations

import csv
import json
import math
import subprocess
import sys
import tomllib
from datetime import date, datetime, timedelta
from importlib.metadata import version
from itertools import pairwise
from pathlib import Path
from typing import Any

import pytest

DATA = Path(__file__).parent.parent / "sample_data"
SITES = ("quince_street", "harrow_farm", "mill_library", "tarn_lane_school")
MADE_WITH = "3.1.5"  # openpyxl; another version may lay out the same cells in other bytes

Truth = dict[str, Any]


@pytest.fixture(scope="module")
def made(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A fresh run of the script, in a process of its own."""
    folder = tmp_path_factory.mktemp("sample")
    subprocess.run([sys.executable, DATA / "make_sample_data.py", folder], check=True)
    return folder


@pytest.fixture(scope="module")
def truth() -> Truth:
    with (DATA / "truth.json").open(encoding="utf-8") as file:
        loaded: Truth = json.load(file)
    return loaded


def files(folder: Path) -> set[str]:
    """Every data file, as a path within the folder."""
    found = (p.relative_to(folder) for p in folder.rglob("*") if p.is_file())
    return {p.as_posix() for p in found if p.suffix not in (".py", ".pyc")}


def cells(path: Path) -> list[tuple[object, ...]]:
    from openpyxl import load_workbook

    book = load_workbook(path)
    return [row for sheet in book for row in sheet.iter_rows(values_only=True)]


def test_every_file_is_the_script_s_or_a_site_file(made: Path) -> None:
    by_hand = {f"{site}/site.toml" for site in SITES}
    assert files(DATA) == files(made) | by_hand


def test_making_it_again_gives_the_same_bytes(made: Path) -> None:
    for name in files(made):
        same = (DATA / name).read_bytes() == (made / name).read_bytes()
        if name.endswith(".xlsx") and version("openpyxl") != MADE_WITH:
            same = cells(DATA / name) == cells(made / name)
        assert same, name


def test_it_stays_small() -> None:
    sizes = [(DATA / name).stat().st_size for name in files(DATA)]
    assert max(sizes) < 1_000_000
    assert sum(sizes) < 1_500_000


@pytest.mark.parametrize("site", SITES)
def test_site_files_name_files_that_are_there(site: str, truth: Truth) -> None:
    with (DATA / site / "site.toml").open("rb") as file:
        plan = tomllib.load(file)
    assert (DATA / site / plan["weather"]["observed"]).is_file()
    assert {a["name"] for a in plan["account"]} == set(truth["sites"][site])
    for account in plan["account"]:
        assert (DATA / site / account["bills"]).is_file()
        known = truth["sites"][site][account["name"]]
        assert account["fuel"] == known["fuel"]
        assert plan["upgrade"][0]["start"].isoformat() == known["work_first_day"]
        assert plan["upgrade"][0]["end"].isoformat() == known["work_last_day"]


def station(site: str) -> dict[date, tuple[str, str]]:
    """The station's file, read plainly: day → maximum and minimum as written."""
    with (DATA / site / "station.csv").open(encoding="utf-8", newline="") as file:
        rows = [row[-3:] for row in csv.reader(file)][1:]
    return {date.fromisoformat(day): (high, low) for day, high, low in rows}


@pytest.mark.parametrize("site", SITES)
def test_the_weather_is_long_and_has_gaps(site: str) -> None:
    days = station(site)
    first, last = min(days), max(days)
    assert (first, last) == (date(2012, 1, 1), date(2026, 6, 30))
    every = [first + timedelta(n) for n in range((last - first).days + 1)]
    known = [d for d in every if all(days.get(d, ("", "")))]
    assert 10 < len(every) - len(known) < 30
    assert all(float(days[d][0]) > float(days[d][1]) for d in known)


@pytest.mark.parametrize("site", SITES)
def test_the_weather_persists_from_day_to_day(site: str) -> None:
    """Lag-1 correlation of daily departures about 0.6–0.8 in mid-latitudes (common practice)."""
    days = station(site)
    mean = {d: (float(h) + float(low)) / 2 for d, (h, low) in days.items() if h and low}
    normal: dict[tuple[int, int], list[float]] = {}
    for day, temp in mean.items():
        for n in range(-7, 8):
            near = day + timedelta(n)
            normal.setdefault((near.month, near.day), []).append(temp)
    depart = {
        d: t - math.fsum(normal[d.month, d.day]) / len(normal[d.month, d.day])
        for d, t in mean.items()
    }
    pairs = [(a, depart[d + timedelta(1)]) for d, a in depart.items() if d + timedelta(1) in depart]
    lag1 = math.fsum(a * b for a, b in pairs) / math.fsum(a * a for a, _ in pairs)
    assert 0.6 < lag1 < 0.8


@pytest.mark.parametrize(("site", "most"), [("quince_street", 7800), ("mill_library", 7500)])
def test_the_climate_is_cool(site: str, most: float, truth: Truth) -> None:
    """Degree-days summed anew from the station's file agree with truth.json but for its gaps."""
    days = station(site)
    name = truth["sites"][site]["gas"]["station"]
    for year, told in truth["heating_degree_days_65f"][name].items():
        whole = [v for d, v in days.items() if d.year == int(year)]
        known = [(float(h) + float(low)) / 2 for h, low in whole if h and low]
        summed = math.fsum(max(65 - t, 0) for t in known)
        lost = (366 if int(year) % 4 == 0 else 365) - len(known)
        assert summed <= told <= summed + 65 * lost
        assert 5800 < told < most


def test_the_last_winter_before_was_colder_than_the_first_after(truth: Truth) -> None:
    """Else comparing bills would do, and the sample would show nothing."""
    for site in SITES:
        days = station(site)

        def winter(year: int, days: dict[date, tuple[str, str]] = days) -> float:
            span = [date(year, 11, 1) + timedelta(n) for n in range(150)]
            known = [days[d] for d in span if all(days.get(d, ("", "")))]
            return math.fsum(65 - (float(h) + float(low)) / 2 for h, low in known) / len(known)

        assert winter(2022) > 1.1 * winter(2023)


@pytest.mark.parametrize("site", SITES)
def test_true_normal_year_follows_from_the_parameters(site: str, truth: Truth) -> None:
    """NAC = 365·(base + slope·mean degree-days), summed anew from the station's own file.

    The file lacks some days that truth.json knows, hence the tolerance.
    """
    days = station(site)
    temps = [
        (float(h) + float(low)) / 2
        for d, (h, low) in days.items()
        if h and low and d.year in truth["long_term_years"]
    ]
    for known in truth["sites"][site].values():
        for side in (known["before"], known["after"]):
            use = 365 * side["base_load"]
            if side["heating_slope"] is not None:
                cold = math.fsum(max(side["balance_heating_f"] - t, 0) for t in temps)
                use += 365 * side["heating_slope"] * cold / len(temps)
            if side["cooling_slope"] is not None:
                hot = math.fsum(max(t - side["balance_cooling_f"], 0) for t in temps)
                use += 365 * side["cooling_slope"] * hot / len(temps)
            assert use == pytest.approx(side["nac"], rel=0.005)
        saved = known["before"]["nac"] - known["after"]["nac"]
        assert known["normalized"] == pytest.approx(saved, abs=0.002)
        assert known["fraction"] == pytest.approx(saved / known["before"]["nac"], abs=1e-5)


def test_the_savings_are_what_the_readme_promises(truth: Truth) -> None:
    quince, farm = truth["sites"]["quince_street"], truth["sites"]["harrow_farm"]
    assert quince["gas"]["fraction"] == pytest.approx(0.18, abs=0.005)
    assert farm["oil"]["fraction"] > 0.5
    assert farm["electricity"]["fraction"] < -0.5  # an increase, shown as one
    text = (DATA / "README.md").read_text(encoding="utf-8")
    for accounts in truth["sites"].values():
        for known in accounts.values():
            assert f"{known['normalized']:,.1f}" in text
            assert f"{known['fraction']:.1%}" in text


def table(path: Path, header: str) -> list[list[str]]:
    """The rows below the header of a CSV."""
    with path.open(encoding="utf-8-sig", newline="") as file:
        rows = list(csv.reader(file))
    start = next(i for i, row in enumerate(rows) if row and row[0] == header)
    return rows[start + 1 :]


def test_quince_gas_is_as_ugly_as_promised() -> None:
    rows = table(DATA / "quince_street" / "gas.csv", "Bill Date")
    bills = [r for r in rows if len(r) == 7 and r[1]]
    assert sum(r[5] == "Estimated" for r in bills) == 1
    trio = [r for r in bills if r[1] == next(b[1] for b in bills if float(b[4]) < 0)]
    assert len(trio) == 3
    assert float(trio[0][4]) == -float(trio[1][4])
    ends = {r[2] for r in bills}
    starts = [r[1] for r in bills if r[1] not in ends]
    assert len(starts) == 2  # the first bill, and the one after the missing bill
    assert any(r and r[0] == "Total" for r in rows)


def test_quince_electricity_is_newest_first() -> None:
    rows = table(DATA / "quince_street" / "electricity.csv", "Read date")
    days = [int(r[1]) for r in rows]
    assert all(24 <= d <= 38 for d in days)
    assert rows[0][0].endswith("2025")
    assert rows[-1][0].endswith("2021")
    assert [r[3] for r in rows].count("E") == 2


def test_harrow_deliveries_carry_what_was_burnt(truth: Truth) -> None:
    """Gallons between full fills: no more than chance away from the expected use."""
    rows = table(DATA / "harrow_farm" / "oil.csv", "Delivery date")
    assert [r[3] for r in rows].count("partial") == 3
    assert rows[0][3] == rows[-1][3] == "full"
    assert all(0 < float(r[2]) < 275 for r in rows)  # a house's tank (common practice)
    start, end = date.fromisoformat(rows[0][0]), date(2023, 9, 20)
    burnt = math.fsum(float(r[2]) for r in rows[1:] if date.fromisoformat(r[0]) <= end)
    yearly = burnt / (end - start).days * 365
    assert yearly == pytest.approx(truth["sites"]["harrow_farm"]["oil"]["before"]["nac"], rel=0.08)


def test_library_workbooks_hold_text_numbers_and_a_row_twice() -> None:
    gas = [r for r in cells(DATA / "mill_library" / "gas.xlsx")[5:] if r[0] and r[1]]
    assert any(isinstance(r[4], str) for r in gas)
    assert any(isinstance(r[4], float | int) for r in gas)
    assert len(gas) - len(set(gas)) == 1
    power = [r for r in cells(DATA / "mill_library" / "electricity.xlsx")[3:] if r[0]]
    ends = [r[0] for r in power if isinstance(r[0], datetime)]
    days = [int(str(r[1])) for r in power]
    told = zip(pairwise(ends), days[1:], strict=True)
    gap = sum((end - before).days != count for (before, end), count in told)
    assert gap == 1  # the bill that was never filed


def test_the_schools_bills_count_its_school_days(truth: Truth) -> None:
    """Fewer of them after 2023, none at weekends: as many as its calendar can hold."""
    rows = table(DATA / "tarn_lane_school" / "gas.csv", "Start")
    spans = [(date.fromisoformat(r[0]), date.fromisoformat(r[1]), int(r[4])) for r in rows]
    for start, end, school in spans:
        weekdays = sum((start + timedelta(n)).weekday() < 5 for n in range((end - start).days))
        assert 0 <= school <= weekdays
    yearly = {
        year: math.fsum(n for start, _, n in spans if start.year == year)
        for year in (2022, 2023, 2024, 2025)
    }
    assert yearly[2022] > 170 > 160 > yearly[2024]
    assert truth["sites"]["tarn_lane_school"]["gas"]["driver_normal_a_year"] == 175.0
