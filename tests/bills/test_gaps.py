"""Stretches without a bill are named.  Expected dates: the calendar."""

from __future__ import annotations

from pathlib import Path

from normalize.bills.gaps import gap_words
from normalize.bills.read import read_bills

ROWS = (
    "start,end,therms\n2022-01-05,2022-02-04,90\n2022-02-04,2022-03-06,80\n"
    "2022-05-05,2022-06-04,30\n2022-06-04,2022-07-04,20\n"
)


def test_a_missing_stretch_is_named_with_its_days(tmp_path: Path) -> None:
    file = tmp_path / "bills.csv"
    file.write_text(ROWS, encoding="utf-8")
    bills = read_bills(file, fuel="natural gas", end_dates="exclusive")
    # March 6 to 31 are 26 days, April has 30, May 1 to 4 are 4: 60.
    assert gap_words(bills.periods) == "No bill covers 2022-03-06 to 2022-05-05 (60 days)."


def test_bills_without_a_gap_say_nothing(tmp_path: Path) -> None:
    file = tmp_path / "bills.csv"
    file.write_text("\n".join(ROWS.splitlines()[:3]) + "\n2022-03-06,2022-04-05,50\n", "utf-8")
    bills = read_bills(file, fuel="natural gas", end_dates="exclusive")
    assert gap_words(bills.periods) == ""
