"""Days summed to the periods of bills, and generation added to net use.

Expected sums are counted by hand: every hour is 0.5, so that a day is 12, unless said otherwise.
"""

from __future__ import annotations

from datetime import datetime, timedelta
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from normalize.bills.periods import Bills
from normalize.bills.read import read_bills
from normalize.days import iso
from normalize.errors import AmbiguousBills, NormalizeError, UnreadableBills
from tests.bills import espi_makers as make

pytestmark = pytest.mark.kernel


def put(folder: Path, name: str, lines: list[str]) -> Path:
    file = folder / name
    file.write_text("\n".join(lines) + "\n")
    return file


def hours(first: str, n: int, use: str = "0.5", drop: tuple[int, ...] = ()) -> list[str]:
    begin = datetime.fromisoformat(first)
    stamps = [begin + timedelta(hours=k) for k in range(n) if k not in drop]
    return ["Timestamp,kWh", *(f"{s:%Y-%m-%d %H:%M},{use}" for s in stamps)]


def sums(bills: Bills) -> list[tuple[str, str, float]]:
    p = bills.periods
    return [
        (iso(int(a)), iso(int(b)), round(float(u), 6))
        for a, b, u in zip(p.start, p.end, p.use, strict=True)
    ]


BILLS = [
    "Start,End,kWh,Cost,Read type",
    "2023-01-05,2023-02-03,348,50,Actual",
    "2023-02-03,2023-03-07,384,55,Estimated",
    "2023-03-07,2023-04-04,336,45,Actual",
]


def test_sums_to_the_periods_of_another_file(tmp_path: Path) -> None:
    data = put(tmp_path, "data.csv", hours("2023-01-01T00:00", 24 * 95))
    other = put(tmp_path, "bills.csv", BILLS)
    bills = read_bills(data, periods_from=other)
    # 29, 32 and 28 days of 12; an estimated reading is a date like any other.
    assert sums(bills) == [
        ("2023-01-05", "2023-02-03", 348.0),
        ("2023-02-03", "2023-03-07", 384.0),
        ("2023-03-07", "2023-04-04", 336.0),
    ]
    assert bills.periods.cost.tolist() == [50.0, 55.0, 45.0]
    # 1 to 4 January, and 4 and 5 April.
    assert any("6 days with readings in none of these periods" in t for t in bills.reading)
    assert bills.cautions == ()


def test_missing_intervals_of_a_period_are_counted(tmp_path: Path) -> None:
    data = put(
        tmp_path, "data.csv", hours("2023-01-01T00:00", 24 * 95, drop=(24 * 10, 24 * 10 + 1))
    )
    bills = read_bills(data, periods_from=put(tmp_path, "bills.csv", BILLS))
    assert [s[2] for s in sums(bills)] == [384.0, 336.0]
    notes = [e.note for e in bills.ledger if e.fate == "left out"]
    assert notes == ["1 of 29 days are missing or not whole: 2 readings of 1 h"]
    short = put(tmp_path, "short.csv", hours("2023-01-07T00:00", 24 * 70))
    bills = read_bills(short, periods_from=tmp_path / "bills.csv")
    notes = [e.note for e in bills.ledger if e.fate == "left out"]
    assert notes == [
        "2 of 29 days are missing or not whole: 48 readings of 1 h",
        "17 of 28 days are missing or not whole: 408 readings of 1 h",
    ]


def test_readings_that_do_not_come_to_the_bill_are_told(tmp_path: Path) -> None:
    data = put(tmp_path, "data.csv", hours("2023-01-01T00:00", 24 * 95, use="5"))
    bills = read_bills(data, periods_from=put(tmp_path, "bills.csv", BILLS))
    assert any("come to 1000% of it" in text for text in bills.cautions)


def test_bills_of_another_year_and_none_at_all(tmp_path: Path) -> None:
    data = put(tmp_path, "data.csv", hours("2021-01-01T00:00", 24 * 95))
    with pytest.raises(UnreadableBills, match="no day in common"):
        read_bills(data, periods_from=put(tmp_path, "bills.csv", BILLS))
    with pytest.raises(AmbiguousBills, match="periods_from"):
        read_bills(data, sum_to="bill")
    with pytest.raises(NormalizeError, match="no such file"):
        read_bills(data, periods_from=tmp_path / "none.csv")
    with pytest.raises(UnreadableBills, match="no days"):
        read_bills(tmp_path / "bills.csv", periods_from=tmp_path / "bills.csv")


def test_days_given_as_days_are_summed_too(tmp_path: Path) -> None:
    begin = datetime.fromisoformat("2023-01-05")
    lines = ["Date,kWh", *(f"{begin + timedelta(days=k):%Y-%m-%d},12" for k in range(89))]
    bills = read_bills(put(tmp_path, "days.csv", lines),
                       periods_from=put(tmp_path, "bills.csv", BILLS))  # fmt: skip
    assert [s[2] for s in sums(bills)] == [348.0, 384.0, 336.0]


def espi(folder: Path) -> Path:
    """Sixty-two days of hours of 500 Wh, and two summaries: 30 days, 31 days and an hour less."""
    start = make.at("2023-02-10T05:00")
    readings = [make.reading(start + 3600 * k, 3600, 500) for k in range(24 * 62)]
    types: dict[str, Any] = {"uom": 72, "powerOfTenMultiplier": 0, "commodity": 1}
    first = make.summary(start, 30 * 86400 - 3600, 1, 4_500_000)  # March 12: an hour less
    second = make.summary(start + 30 * 86400 - 3600, 31 * 86400, 1, 5_000_000)
    text = (
        make.HEAD + '<feed xmlns="http://www.w3.org/2005/Atom">' + make.point("0") + make.clock()
        + make.meter() + make.reading_type(**types) + first + second
        + make.block(readings, start=start) + "</feed>"
    )  # fmt: skip
    file = folder / "espi.xml"
    file.write_text(text)
    return file


def test_sums_to_the_bills_of_the_file_itself(tmp_path: Path) -> None:
    bills = read_bills(espi(tmp_path), sum_to="bill")
    assert sums(bills) == [
        ("2023-02-10", "2023-03-12", 360.0),
        ("2023-03-12", "2023-04-12", 31 * 12 - 0.5),
    ]
    assert bills.periods.cost.tolist() == pytest.approx([45.0, 50.0])


def solar(first: str, n: int, use: str = "4") -> list[str]:
    begin = datetime.fromisoformat(first)
    return ["Date,Generation (kWh)",
            *(f"{begin + timedelta(days=k):%Y-%m-%d},{use}" for k in range(n))]  # fmt: skip


NET = [
    "Start,End,Net usage (kWh)",
    "2023-01-05,2023-02-03,100",
    "2023-02-03,2023-03-07,-20",
    "2023-03-07,2023-04-04,50",
]


def test_generation_by_days_makes_bills_gross(tmp_path: Path) -> None:
    net = put(tmp_path, "net.csv", NET)
    bills = read_bills(net, generation=put(tmp_path, "solar.csv", solar("2023-01-01", 120)))
    assert [s[2] for s in sums(bills)] == [100 + 29 * 4, -20 + 32 * 4, 50 + 28 * 4]
    assert bills.gross
    assert bills.unfit == ""
    assert [name for name, _ in bills.source] == ["net.csv", "solar.csv"]
    assert any("130.0 + 356.0 = 486.0 kWh" in text for text in bills.reading)


def test_generation_in_intervals_and_in_another_unit(tmp_path: Path) -> None:
    net = put(tmp_path, "net.csv", hours("2023-01-05T00:00", 24 * 10, use="-0.25"))
    lines = ["Date;PV;Unit"]
    begin = datetime.fromisoformat("2023-01-05")
    lines += [f"{begin + timedelta(minutes=15 * k):%d.%m.%Y %H:%M};100;Wh" for k in range(96 * 14)]
    made = put(tmp_path, "solar.csv", lines)
    bills = read_bills(net, generation=made, generation_column="PV")
    assert bills.unit == "kWh"
    np.testing.assert_allclose(bills.periods.use, [-6 + 9.6] * 10, rtol=1e-9)


def test_days_without_generation_are_left_out_and_told(tmp_path: Path) -> None:
    net = put(tmp_path, "net.csv", NET)
    made = put(tmp_path, "solar.csv", solar("2023-02-03", 100))
    bills = read_bills(net, generation=made)
    assert [s[2] for s in sums(bills)] == [-20 + 32 * 4, 50 + 28 * 4]
    assert [e.fate for e in bills.ledger] == ["left out", "period 1", "period 2"]
    assert "generated on every day" in bills.ledger[0].note
    assert any("solar_since" in text for text in bills.cautions)
    bills = read_bills(net, generation=made, solar_since="2023-02-03")
    assert [s[2] for s in sums(bills)] == [100, -20 + 32 * 4, 50 + 28 * 4]
    bills = read_bills(net, generation=made, solar_since="2023-02-13")
    assert [s[2] for s in sums(bills)] == [100, -20 + 22 * 4, 50 + 28 * 4]


def test_generation_that_does_not_fit_is_refused(tmp_path: Path) -> None:
    net = put(tmp_path, "net.csv", NET)
    other = put(tmp_path, "solar.csv", solar("2021-01-01", 100))
    with pytest.raises(UnreadableBills, match="not one period of use"):
        read_bills(net, generation=other)
    months = put(tmp_path, "months.csv", [
        "Start,End,Generation (kWh)", "2023-01-01,2023-02-01,60", "2023-02-01,2023-03-01,70",
        "2023-03-01,2023-04-01,90",
    ])  # fmt: skip
    with pytest.raises(UnreadableBills, match="not one period of use"):
        read_bills(net, generation=months)
    days = put(tmp_path, "days.csv", hours("2023-01-01T00:00", 24 * 90, use="0.1"))
    with pytest.raises(UnreadableBills, match="periods_from"):
        read_bills(days, generation=months)
    bills = read_bills(days, generation=months, periods_from=months, net_metered=True)
    assert [s[2] for s in sums(bills)] == pytest.approx(
        [31 * 2.4 + 60, 28 * 2.4 + 70, 31 * 2.4 + 90]
    )


def test_generation_of_the_same_bills_fits(tmp_path: Path) -> None:
    made = put(tmp_path, "solar.csv", [
        "Start,End,Solar production (kWh)", "2023-01-05,2023-02-03,60", "2023-02-03,2023-03-07,70",
        "2023-03-07,2023-04-04,90",
    ])  # fmt: skip
    bills = read_bills(put(tmp_path, "net.csv", NET), generation=made)
    assert [s[2] for s in sums(bills)] == [160.0, 50.0, 140.0]


def test_a_large_share_of_estimates_is_in_the_ledger(tmp_path: Path) -> None:
    begin = datetime.fromisoformat("2023-01-05T00:00")
    lines = ["Timestamp,kWh,Quality"]
    for k in range(24 * 89):
        when = begin + timedelta(hours=k)
        guessed = when.day == 10 or (when.day == 11 and when.hour < 5)
        lines.append(f"{when:%Y-%m-%d %H:%M},0.5,{'E' if guessed else 'A'}")
    data = put(tmp_path, "data.csv", lines)
    bills = read_bills(data)
    noted = [(e.fate, e.note) for e in bills.ledger if e.note]
    assert noted == [
        (f"period {k}", "24 of 24 readings are estimates") for k in (6, 37, 65)
    ]  # the tenth of January, February and March; five hours of a day are a small share
    assert any("used as they are: 87 readings" in text for text in bills.reading)
    whole = read_bills(data, periods_from=put(tmp_path, "bills.csv", BILLS))
    assert all(not e.note for e in whole.ledger)


def test_net_use_below_zero_is_no_fault_of_a_bill(tmp_path: Path) -> None:
    bills = read_bills(put(tmp_path, "net.csv", NET))
    assert [s[2] for s in sums(bills)] == [100.0, -20.0, 50.0]
    assert "generated is not known" in bills.unfit


def test_generation_beside_several_accounts_is_asked_about(tmp_path: Path) -> None:
    from normalize.bills.accounts import read_accounts

    lines = ["Account,Start,End,kWh"]
    lines += [f"{name},2023-0{m}-05,2023-0{m + 1}-05,100" for name in ("A1001", "A2002")
              for m in range(1, 5)]  # fmt: skip
    file = put(tmp_path, "two.csv", lines)
    made = put(tmp_path, "solar.csv", solar("2023-01-01", 150))
    with pytest.raises(AmbiguousBills, match="rows"):
        read_accounts(file, generation=made)
    one = read_accounts(file, generation=made, rows="A2002").accounts[0].bills
    assert one is not None
    assert [s[2] for s in sums(one)] == [100 + 31 * 4, 100 + 28 * 4, 100 + 31 * 4, 100 + 30 * 4]


def test_files_are_named_in_site_toml(tmp_path: Path) -> None:
    from normalize.days import day_of_iso
    from normalize.errors import MissingFile
    from normalize.site import read_site

    put(tmp_path, "net.csv", hours("2023-01-01T00:00", 24 * 95, use="-0.1"))
    put(tmp_path, "solar.csv", solar("2023-02-03", 80))
    put(tmp_path, "bills.csv", BILLS)
    begin = datetime.fromisoformat("2022-12-01")
    put(tmp_path, "weather.csv", ["date,mean_f", *(
        f"{begin + timedelta(days=k):%Y-%m-%d},40" for k in range(200))])  # fmt: skip
    text = [
        "[weather]", 'observed = "weather.csv"', "[[account]]", 'fuel = "electricity"',
        'bills = "net.csv"', 'periods_from = "bills.csv"', 'generation = "solar.csv"',
        "solar_since = 2023-02-03",
    ]  # fmt: skip
    put(tmp_path, "site.toml", text)
    site = read_site(tmp_path)
    bills = site.bills[0]
    assert bills is not None
    found = sums(bills)
    assert [s[:2] for s in found] == [
        ("2023-01-05", "2023-02-03"), ("2023-02-03", "2023-03-07"), ("2023-03-07", "2023-04-04"),
    ]  # fmt: skip
    assert [s[2] for s in found] == pytest.approx([29 * -2.4, 32 * 1.6, 28 * 1.6])
    assert site.accounts[0].reader["solar_since"] == day_of_iso("2023-02-03")
    assert {name for name, _ in bills.source} == {"net.csv", "bills.csv", "solar.csv"}
    put(tmp_path, "site.toml", [t.replace("solar.csv", "sollar.csv") for t in text])
    with pytest.raises(MissingFile, match="sollar"):
        read_site(tmp_path)
