"""A driver's table: which days each row stands for, and questions where that is open.

Lengths of months are the calendar's (Python's calendar module is the reference).
"""

from __future__ import annotations

import calendar
import contextlib
from pathlib import Path

import pytest

from normalize.bills.date_list import read_days
from normalize.bills.driver_rows import DriverAnswers, DriverRows, driver_of_bills, read_driver
from normalize.bills.read import read_bills
from normalize.days import day_of_iso
from normalize.errors import AmbiguousBills, BillError, MissingFile, UnreadableBills


def read(tmp_path: Path, text: str, name: str = "tonnes", **answers: str) -> DriverRows:
    file = tmp_path / "driver.csv"
    file.write_text(text, encoding="utf-8")
    return read_driver(file, name, DriverAnswers(**answers))  # type: ignore[arg-type]


def test_a_row_a_day_needs_no_question(tmp_path: Path) -> None:
    rows = read(tmp_path, "Date,School day\n2023-01-02,1\n2023-01-03,yes\n2023-01-04,no\n")
    first = day_of_iso("2023-01-02")
    assert rows.start == (first, first + 1, first + 2)
    assert rows.end == (first + 1, first + 2, first + 3)
    assert rows.value == (1.0, 1.0, 0.0)


@pytest.mark.parametrize(
    "months", ["Jan 2023,310\nFeb 2023,280", "2023-01,310\n2023-02,280", "1/2023,310\n2/2023,280"]
)
def test_months_last_as_long_as_the_calendar_says(tmp_path: Path, months: str) -> None:
    rows = read(tmp_path, f"Month,Tonnes\n{months}\n", values="total")
    assert [e - s for s, e in zip(rows.start, rows.end, strict=True)] == [
        calendar.monthrange(2023, m)[1] for m in (1, 2)
    ]
    assert rows.start[0] == day_of_iso("2023-01-01")


def test_a_spreadsheets_first_of_the_month_under_month_is_the_month(tmp_path: Path) -> None:
    rows = read(tmp_path, "Month,Tonnes\n2023-01-01,1\n2023-02-01,2\n", values="total")
    assert rows.end == (day_of_iso("2023-02-01"), day_of_iso("2023-03-01"))


def test_year_and_month_in_columns_of_their_own(tmp_path: Path) -> None:
    rows = read(tmp_path, "Year,Month,Tonnes\n2024,2,29\n", values="total")
    assert rows.end[0] - rows.start[0] == 29  # a leap year


def test_the_end_is_the_last_day_where_rows_follow_each_other_so(tmp_path: Path) -> None:
    text = "Start,End,Units\n2023-01-01,2023-01-31,5\n2023-02-01,2023-02-28,6\n"
    rows = read(tmp_path, text, "units", values="level")
    assert rows.end[0] == rows.start[1] == day_of_iso("2023-02-01")
    meeting = text.replace("01-31", "02-01").replace("02-28", "03-01")
    assert read(tmp_path, meeting, "units", values="level").end == rows.end


def test_daily_dates_are_day_first_when_only_so_are_they_days(tmp_path: Path) -> None:
    text = "Date,Tonnes\n" + "".join(f"0{d}/05/2023,{d}\n" for d in range(1, 8))
    assert read(tmp_path, text).start[0] == day_of_iso("2023-05-01")


@pytest.mark.parametrize(
    ("text", "answers", "asks"),
    [
        ("Month,Tonnes\n2023-01,310\n", {}, "values"),
        ("Start,End,Tonnes\n2023-01-01,2023-01-31,5\n", {"values": "total"}, "end_dates"),
        ("Date,Tonnes\n2023-01-05,3\n2023-02-05,4\n", {}, "which days each amount"),
        ("Date,Tonnes\n1/5/2023,3\n", {}, "dates"),
        (
            "Start,End,Tonnes\n2023-01-01,2023-02-01,5\n2023-01-20,2023-03-01,6\n",
            {"values": "total", "end_dates": "exclusive"},
            "stands in two rows",
        ),
        ('Date,Tonnes\n2023-01-05,"1,234"\n2023-01-06,"1.234"\n', {}, "decimal"),
    ],
)
def test_what_can_be_read_in_two_ways_is_asked(
    tmp_path: Path, text: str, answers: dict[str, str], asks: str
) -> None:
    with pytest.raises(AmbiguousBills) as caught:
        read(tmp_path, text, **answers)
    assert asks in str(caught.value)


def test_a_column_that_is_not_there_lists_those_that_are(tmp_path: Path) -> None:
    with pytest.raises(UnreadableBills, match="'Sales', 'Costs'"):
        read(tmp_path, "Date,Sales,Costs\n2023-01-05,3,4\n2023-01-06,3,4\n")


def test_the_only_other_column_is_taken_unless_one_was_named(tmp_path: Path) -> None:
    text = "Date,Output\n2023-01-05,3\n2023-01-06,4\n"
    assert read(tmp_path, text).value == (3.0, 4.0)
    with pytest.raises(UnreadableBills, match="Output"):
        read(tmp_path, text, column="Input")


def test_faulty_rows_are_left_out_and_told(tmp_path: Path) -> None:
    rows = read(tmp_path, "Date,Tonnes\n2023-01-05,3\n2023-02-31,4\n2023-01-07,lots\n2023-01-06,\n")
    assert rows.value == (3.0,)
    assert "line 3" in rows.reading[-1]
    assert "'lots' is not an amount" in rows.reading[-1]


@pytest.mark.parametrize("amount", ["1e300", "9" * 400, "inf", "\x00", "=1+1"])
def test_absurd_amounts_are_none(tmp_path: Path, amount: str) -> None:
    text = f"Date,Tonnes\n2023-01-05,3\n2023-01-06,{amount}\n"
    with contextlib.suppress(BillError):  # a NUL makes it no table at all
        assert read(tmp_path, text).value == (3.0,)


def test_a_file_that_is_not_there(tmp_path: Path) -> None:
    with pytest.raises(MissingFile):
        read_driver(tmp_path / "none.csv", "x", DriverAnswers())


def test_a_column_of_the_bills_belongs_to_each_bills_own_days(tmp_path: Path) -> None:
    file = tmp_path / "bills.csv"
    file.write_text(
        "Start,End,Usage (therms),Cost,Occupied units\n"
        "2023-01-05,2023-02-06,100,120,27\n2023-02-06,2023-03-07,90,110,28\n"
        "2023-03-07,2023-04-05,60,80,\n2023-04-05,2023-05-04,50,70,30\n"
    )
    bills = read_bills(file, fuel="natural gas")
    rows = driver_of_bills(file, bills, "occupied units", DriverAnswers(values="level"))
    assert rows.value == (27.0, 28.0, 30.0)
    assert rows.start[2] == day_of_iso("2023-04-05")
    assert rows.end == (
        day_of_iso("2023-02-06"), day_of_iso("2023-03-07"), day_of_iso("2023-05-04"),
    )  # fmt: skip
    with pytest.raises(AmbiguousBills, match="values"):
        driver_of_bills(file, bills, "occupied units", DriverAnswers())


def test_a_list_of_holidays(tmp_path: Path) -> None:
    file = tmp_path / "holidays.csv"
    file.write_text("Date,Name\n2023-12-25,Midwinter\n2023-07-04,Midsummer\n")
    days, (name, digest) = read_days(file)
    assert days == (day_of_iso("2023-07-04"), day_of_iso("2023-12-25"))
    assert name == "holidays.csv"
    assert len(digest) == 64
    file.write_text("2023-07-04\n2023-13-25\n")
    with pytest.raises(UnreadableBills):
        read_days(file)
    file.write_text("1/7/2023\n")
    with pytest.raises(AmbiguousBills, match="month first"):
        read_days(file)
