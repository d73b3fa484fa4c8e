"""Files as they are saved: encodings, delimiters, titles, footers, pages, workbooks."""

from __future__ import annotations

from datetime import date
from pathlib import Path

import pytest

from normalize.bills.read import read_bills
from tests.bills.ugly import JFM, Ugly, check_words, periods_of, read, written_and_read

CORPUS = [
    Ugly(
        "nothing",
        "Start,End,Usage (therms),Cost\n2023-01-05,2023-02-06,81,95.10\n"
        "2023-02-06,2023-03-07,70.5,88\n",
        JFM,
        costs=[95.10, 88.0],
        unit="therm",
        fuel="natural gas",
        reading=("usage from column 'Usage (therms)'",),
    ),
    Ugly(
        "tabs, UTF-16 with its mark (a spreadsheet's 'Unicode text')",
        "Start\tEnd\tTherms\n1/5/2023\t2/6/2023\t81\n2/6/2023\t3/17/2023\t70.5\n".encode("utf-16"),
        [("2023-01-05", "2023-02-06", 81.0), ("2023-02-06", "2023-03-17", 70.5)],
        reading=("dates are month first",),
    ),
    Ugly(
        "UTF-16 without its mark",
        "Start,End,Therms\n2023-01-05,2023-02-06,81\n2023-02-06,2023-03-07,70.5\n".encode(
            "utf-16-le"
        ),
        JFM,
    ),
    Ugly(
        "bars between columns, cp1252 pound signs, byte order mark absent",
        "Start|End|Therms|Cost £\n2023-01-05|2023-02-06|81|£95.10\n"
        "2023-02-06|2023-03-07|70.5|£88\n".encode("cp1252"),
        JFM,
        costs=[95.1, 88.0],
    ),
    Ugly(
        "UTF-8 mark, sep= line, quotes, empty lines, CRLF",
        '\ufeffsep=;\r\n\r\n"Start";"End";"Therms"\r\n"2023-01-05";"2023-02-06";"81"\r\n\r\n'
        '"2023-02-06";"2023-03-07";"70.5"\r\n',
        JFM,
    ),
    Ugly(
        "title, address and remarks above the header; total and remark below",
        "Usage history\nCustomer: A. Person\nService from 1/1/2023 to 12/31/2023\n\n"
        "Start Date,End Date,Usage (therms),Amount\n2023-01-05,2023-02-06,81,95.10\n"
        "2023-02-06,2023-03-07,70.5,88\nTotal,,151.5,183.10\nThank you for saving paper,,,\n",
        JFM,
        left_out={8: "a total"},
        reading=("header on line 5", "line 9 passed over"),
    ),
    Ugly(
        "header repeated on each page",
        "Start,End,Therms\n2023-01-05,2023-02-06,81\nStart,End,Therms\n"
        "2023-02-06,2023-03-07,70.5\n",
        JFM,
        reading=("the header is repeated on line 3",),
    ),
    Ugly(
        "ragged lines, spare columns, spaces and hard spaces",
        "Start , End,\u00a0Therms ,,\n 2023-01-05 ,2023-02-06,\u00a081\u00a0,,,,\n"
        "2023-02-06,2023-03-07,70.5\n",
        JFM,
    ),
    Ugly(
        "a formula and markup in cells that are not used",
        'Start,End,Therms,Notes\n2023-01-05,2023-02-06,81,"=cmd()"\n'
        "2023-02-06,2023-03-07,70.5,<script>x</script>\n",
        JFM,
    ),
    Ugly(
        "text in usage, a date in year 9999, a wrong year, a blank date",
        "Start,End,Therms\n2023-01-05,2023-02-06,81\n2023-02-06,2023-03-07,70.5\n"
        "2023-03-07,2023-04-06,see bill\n2023-04-06,9999-05-07,4\n2023-04-06,,4\n"
        "1023-04-06,2023-05-06,1\n",
        JFM,
        left_out={
            4: "usage 'see bill' is not a number",
            5: "a date outside 1900 to 2100",
            6: "no end date given",
            7: "a date outside 1900 to 2100",
        },
    ),
    Ugly(
        "nan, inf, 1e308 and a negative year",
        "Start,End,Therms\n2023-01-05,2023-02-06,81\n2023-02-06,2023-03-07,70.5\n"
        "2023-03-07,2023-04-06,nan\n2023-04-06,2023-05-06,inf\n2023-05-06,2023-06-06,1e308\n"
        "-5,2023-07-01,3\n",
        JFM,
        left_out={
            4: "no usage given",
            5: "usage 'inf' is not a number",
            6: "usage is missing or not a number that can be billed",
            7: "not a date",
        },
    ),
]


@pytest.mark.parametrize("case", CORPUS, ids=lambda c: c.wrong)
def test_ugly_file(case: Ugly, tmp_path: Path) -> None:
    bills = read(case, tmp_path)
    assert periods_of(bills) == case.periods
    check_words(case, bills)


@pytest.mark.parametrize("case", CORPUS, ids=lambda c: c.wrong)
def test_round_trip(case: Ugly, tmp_path: Path) -> None:
    bills = read(case, tmp_path)
    assert periods_of(written_and_read(bills, tmp_path)) == periods_of(bills)


def test_same_table_as_a_workbook(tmp_path: Path) -> None:
    """Dates as dates, numbers as text, a title and a help sheet; in both of Excel's calendars."""
    from openpyxl import Workbook
    from openpyxl.utils.datetime import CALENDAR_MAC_1904

    for epoch in (None, CALENDAR_MAC_1904):
        book = Workbook()
        if epoch is not None:
            book.epoch = epoch
        sheet = book.active
        assert sheet is not None
        sheet.title = "Bills"
        sheet.append(["History of use"])
        sheet.append(["Start", "End", "Therms", "Estimated"])
        sheet.append([date(2023, 1, 5), date(2023, 2, 6), "81", False])
        sheet.append([date(2023, 2, 6), "2023-03-07", 70.5, "no"])
        book.create_sheet("Help").append(["Fill in the other sheet"])
        file = tmp_path / "bills.xlsx"
        book.save(file)
        bills = read_bills(file)
        assert periods_of(bills) == JFM
        assert "sheet 'Bills'" in bills.reading
        assert [row.line for row in bills.rows] == [3, 4]


def test_hidden_rows_and_sheets_formulas_and_merged_headings(tmp_path: Path) -> None:
    """Hidden rows are read and told; hidden sheets are not; a merged heading is of its columns."""
    from openpyxl import Workbook

    book = Workbook()
    sheet = book.active
    assert sheet is not None
    sheet.append(["", "", "Gas", "", "Electricity", ""])
    sheet.merge_cells("C1:D1")
    sheet.merge_cells("E1:F1")
    sheet.append(["Start", "End", "Use", "Cost", "Use", "Cost"])
    sheet.append([date(2023, 1, 5), date(2023, 2, 6), 81, 90, 700, 80])
    sheet.append([date(2023, 2, 6), date(2023, 3, 7), 70.5, 80, 600, 70])
    sheet.append([date(2023, 3, 7), date(2023, 4, 6), "=1+1", 80, 500, 60])
    sheet.row_dimensions[4].hidden = True
    other = book.create_sheet("old")
    other.append(["Start", "End", "Therms"])
    other.append([date(2013, 1, 5), date(2013, 2, 6), 1])
    other.sheet_state = "hidden"
    file = tmp_path / "bills.xlsx"
    book.save(file)
    bills = read_bills(file, fuel="natural gas", unit="therm")
    assert periods_of(bills) == JFM
    assert bills.periods.cost.tolist() == [90.0, 80.0]
    assert any("1 row that the sheet hides" in c and "line 4" in c for c in bills.cautions)
    assert any("1 formula without a stored result" in c for c in bills.cautions)
    power = read_bills(file, fuel="electricity", unit="kWh")
    assert power.periods.use.tolist() == [700.0, 600.0, 500.0]
