"""Writing: the template reads back when filled in; nothing written can act as a formula."""

from __future__ import annotations

import csv
from pathlib import Path

import pytest

from normalize.bills.read import read_bills
from normalize.bills.write import safe_text, write_periods, write_template
from normalize.days import iso
from normalize.errors import UnwritableReport


def test_template_filled_in_reads_back(tmp_path: Path) -> None:
    file = tmp_path / "bills.csv"
    write_template(file)
    with file.open("a", newline="") as stream:
        csv.writer(stream).writerows(
            [
                ["2023-01-05", "2023-02-06", 81, "therm", 95.1, "yes"],
                ["2023-02-06", "2023-03-07", 70.5, "therm", 88, ""],
            ]
        )
    bills = read_bills(file)
    assert (bills.unit, bills.fuel) == ("therm", "natural gas")
    assert bills.periods.use.tolist() == [151.5]
    assert bills.periods.cost.tolist() == [95.1 + 88]


def test_template_is_not_overwritten(tmp_path: Path) -> None:
    file = tmp_path / "bills.csv"
    file.write_text("mine")
    with pytest.raises(UnwritableReport, match="a file of that name"):
        write_template(file)
    assert file.read_text() == "mine"
    with pytest.raises(UnwritableReport, match="cannot be written"):
        write_template(tmp_path / "no" / "where.csv")


def test_net_metered_periods_are_written_as_numbers(tmp_path: Path) -> None:
    source, out = tmp_path / "a.csv", tmp_path / "b.csv"
    source.write_text(
        "Start,End,Net usage (kWh)\n2023-01-05,2023-02-06,81\n2023-02-06,2023-03-07,-70.25\n"
    )
    bills = read_bills(source, net_metered=True)
    write_periods(bills, out)
    assert out.read_text().splitlines()[2] == "electricity,2023-02-06,2023-03-07,29,-70.25,"
    assert read_bills(out, net_metered=True).periods.use.tolist() == [81.0, -70.25]
    with pytest.raises(UnwritableReport, match="of that name"):
        write_periods(bills, out)
    write_periods(bills, out, overwrite=True)


def test_gaps_survive_the_round_trip(tmp_path: Path) -> None:
    source, out = tmp_path / "a.csv", tmp_path / "b.csv"
    source.write_text(
        "Start,End,Days,Therms\n2023-01-05,2023-02-05,32,81\n2023-06-06,2023-07-06,31,0.1\n"
    )
    bills = read_bills(source)
    write_periods(bills, out)
    again = read_bills(out).periods
    assert [iso(int(d)) for d in again.start] == ["2023-01-05", "2023-06-06"]
    assert [iso(int(d)) for d in again.end] == ["2023-02-06", "2023-07-07"]


@pytest.mark.parametrize(
    "text", ["=1+1", "+1", "-1", "@x", "\t=x", " =x", "\r=x", "\uff1dx", "\0=x"]
)
def test_no_cell_acts_as_a_formula(text: str) -> None:
    assert safe_text(text).startswith("'")


@pytest.mark.parametrize("text", ["", "gas", "2023-01-05", "a=b"])
def test_plain_text_is_untouched(text: str) -> None:
    assert safe_text(text) == text
