"""Writing: the template reads back when filled in; nothing written can act as a formula."""

from __future__ import annotations

import csv
from datetime import date
from pathlib import Path

import pytest

from normalize.bills.read import read_bills
from normalize.bills.totals import check_total
from normalize.bills.write import (
    TEMPLATE,
    safe_text,
    write_periods,
    write_template,
    write_template_workbook,
)
from normalize.days import iso
from normalize.errors import BillError, NoBills, UnwritableReport


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


def test_template_workbook_is_the_same_bytes_and_reads_back(tmp_path: Path) -> None:
    from openpyxl import load_workbook

    one, two = tmp_path / "one.xlsx", tmp_path / "two.xlsx"
    write_template_workbook(one)
    write_template_workbook(two)
    assert one.read_bytes() == two.read_bytes()
    book = load_workbook(one)
    assert book.sheetnames == ["bills", "help"]
    sheet = book["bills"]
    checks = {str(v.sqref): v.type for v in sheet.data_validations.dataValidation}
    assert checks["A2:A1000 B2:B1000"] == "date"
    assert sorted(checks.values()) == ["date", "decimal", "list", "list"]
    helped = [row[0].value for row in book["help"].iter_rows(min_row=2)]
    assert helped == list(TEMPLATE)
    lines = [
        [date(2023, 1, 5), date(2023, 2, 6), 81, "therm", 95.1, "yes"],
        [date(2023, 2, 6), date(2023, 3, 7), 70.5, "therm", 88, None],
        [date(2023, 3, 7), date(2023, 4, 6), 60, "therm", None, "no"],
    ]
    for number, line in enumerate(lines, start=2):
        for column, value in enumerate(line, start=1):
            sheet.cell(number, column, value)
    book.save(two)
    bills = read_bills(two)
    assert bills.periods.use.tolist() == [151.5, 60.0]
    assert bills.unit == "therm"
    assert len(bills.rows) == 3


def test_empty_templates_ask_for_bills(tmp_path: Path) -> None:
    write_template(tmp_path / "a.csv")
    write_template_workbook(tmp_path / "a.xlsx")
    for name in ("a.csv", "a.xlsx"):
        with pytest.raises(NoBills, match="no bill beneath"):
            read_bills(tmp_path / name)


TYPED = "Start,End,Therms\n2023-01-05,2023-02-06,81\n2023-02-06,2023-03-07,70.5\n"


@pytest.mark.parametrize(
    ("text", "expected", "words"),
    [
        (TYPED, "151.5", None),
        (TYPED, "152", None),  # right to half of its last digit
        (TYPED, "1,151.5", "1,000 less than"),
        (TYPED, "88.5", "Line 2 (to 2023-02-06) has 81: should it be 18?"),
        (TYPED + "2023-03-99,2023-03-06,9\n", "160.5", "Line 4, which was left out"),
        (TYPED, "81", "is it there twice"),
        (TYPED, "much", "not a number"),
    ],
)
def test_expected_total(text: str, expected: str, words: str | None, tmp_path: Path) -> None:
    file = tmp_path / "typed.csv"
    file.write_text(text)
    bills = read_bills(file)
    if words is None:
        assert "as expected" in check_total(bills, expected)
    else:
        with pytest.raises(BillError) as said:
            check_total(bills, expected)
        assert words in str(said.value)
