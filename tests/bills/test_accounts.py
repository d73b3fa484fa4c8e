"""Every account of one file at once: nothing summed, nothing lost, nothing guessed.

Invented files; expected values are read off them by eye.
"""

from __future__ import annotations

from collections import Counter
from pathlib import Path
from typing import Any

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from normalize.bills.accounts import FileAccounts, read_accounts
from normalize.bills.read import read_bills
from normalize.errors import AmbiguousBills, NoBills, UnreadableBills
from tests.bills import espi_makers as espi

SPANS = [("2023-01-05", "2023-02-06"), ("2023-02-06", "2023-03-07"), ("2023-03-07", "2023-04-06")]


def accounts_of(folder: Path, text: str, **options: Any) -> FileAccounts:
    file = folder / "bills.csv"
    file.write_text(text)
    return read_accounts(file, **options)


def uses(found: FileAccounts) -> dict[str, list[float]]:
    return {a.label: a.bills.periods.use.tolist() if a.bills else [] for a in found.accounts}


def test_accounts_and_fuels_on_lines_of_their_own(tmp_path: Path) -> None:
    lines = ["Account,Service,Start,End,Usage,Unit,Cost"]
    for a, b in SPANS:
        for account, times in (("0011005678", 1), ("0022001234", 2)):
            lines += [f"{account},Electric,{a},{b},{100 * times},kWh,20",
                      f"{account},Gas,{a},{b},{10 * times},therms,9",
                      f"{account},Water,{a},{b},7,gal,3"]  # fmt: skip
    lines.append("Total,,,,660,,")
    found = accounts_of(tmp_path, "\n".join(lines))
    assert uses(found) == {
        "…5678 electricity": [100.0] * 3, "…5678 natural gas": [10.0] * 3,
        "…1234 electricity": [200.0] * 3, "…1234 natural gas": [20.0] * 3,
    }  # fmt: skip
    assert [a.bills.unit for a in found.accounts if a.bills] == ["kWh", "therm"] * 2
    assert Counter(e.note for e in found.nobodys) == {
        "'Water' is no fuel that can be read": 6, "a total, not a bill": 1,
    }  # fmt: skip
    assert "0011005678" not in repr(found)


@pytest.mark.parametrize(
    ("one", "two"),
    [("11112222", "33334444"), ("70001122", "70003344"), ("12-99-3456", "45-67-8901")],
)
def test_account_numbers_that_look_like_dates(one: str, two: str, tmp_path: Path) -> None:
    """Else the bills of one account pass for later versions of the other's."""
    text = "Account,Start,End,Therms\n" + "".join(
        f"{one},{a},{b},1\n{two},{a},{b},9\n" for a, b in SPANS
    )
    found = accounts_of(tmp_path, text)
    assert uses(found) == {f"…{one[-4:]}": [1.0] * 3, f"…{two[-4:]}": [9.0] * 3}


def test_a_meter_column_of_dates_tells_no_accounts(tmp_path: Path) -> None:
    text = "Meter,Start,End,Therms\n" + "".join(f"{b},{a},{b},1\n" for a, b in SPANS)
    assert len(accounts_of(tmp_path, text).accounts) == 1


def test_two_fuels_side_by_side(tmp_path: Path) -> None:
    text = "Start,End,Electric (kWh),Electric cost,Gas (therms),Gas cost\n" + "".join(
        f"{a},{b},100,20,10,9\n" for a, b in SPANS
    )
    found = accounts_of(tmp_path, text)
    assert uses(found) == {"electricity": [100.0] * 3, "natural gas": [10.0] * 3}
    assert [b.periods.cost.tolist() for b in found.bills] == [[20.0] * 3, [9.0] * 3]
    assert found.nobodys == ()


def test_cubic_metres_beside_kilowatt_hours_may_be_the_same_gas(tmp_path: Path) -> None:
    text = "Start,End,Volume (m3),Usage (kWh)\n" + "".join(f"{a},{b},10,110\n" for a, b in SPANS)
    with pytest.raises(AmbiguousBills, match="fuel"):
        accounts_of(tmp_path, text)


def test_an_account_that_cannot_be_read_ends_nothing(tmp_path: Path) -> None:
    text = "Account,Start,End,Therms\n" + "".join(
        f"A1,{a},{b},10\nB2,{a},{b},much\nC3,{a},{b},30\n" for a, b in SPANS
    )
    found = accounts_of(tmp_path, text)
    assert uses(found) == {"A1": [10.0] * 3, "B2": [], "C3": [30.0] * 3}
    assert "usage 'much' is not a number" in found.accounts[1].problem
    assert len(found.bills) == 2


def test_lines_without_a_number_are_nobodys(tmp_path: Path) -> None:
    text = "Account,Start,End,Therms\n" + "".join(
        f"A1,{a},{b},10\n,{a},{b},99\nC3,{a},{b},30\n" for a, b in SPANS
    )
    found = accounts_of(tmp_path, text)
    assert uses(found) == {"A1": [10.0] * 3, "C3": [30.0] * 3}
    assert [(e.line, e.fate) for e in found.nobodys] == [
        (3, "left out"), (6, "left out"), (9, "left out"),
    ]  # fmt: skip
    assert all("does not say whose" in e.note for e in found.nobodys)


def test_what_one_account_leaves_open_the_file_settles(tmp_path: Path) -> None:
    """B2's dates alone can be read both ways and its end may be inclusive: A1's cannot."""
    text = (
        "Account,Start,End,Therms\nA1,1/13/2023,2/12/2023,1\nA1,2/13/2023,3/12/2023,2\n"
        "B2,1/2/2023,2/3/2023,3\nB2,5/6/2023,6/7/2023,4\nC3,7/2/2023,8/3/2023,5\n"
    )
    found = accounts_of(tmp_path, text)
    a, b, c = found.bills
    assert (b.periods.days.tolist(), c.periods.days.tolist()) == ([33, 33], [33])
    assert a.periods.days.tolist() == [31, 28]
    assert "as you said" not in " ".join(s for x in found.bills for s in x.reading)
    assert any("as the other accounts of the file show" in s for s in b.reading)
    with pytest.raises(AmbiguousBills):
        accounts_of(tmp_path, text.replace("A1,2/13", "A1,4/13").replace("3/12", "5/12"))


def test_a_question_of_every_account_is_asked_once(tmp_path: Path) -> None:
    text = "Account,Month,Therms\n" + "".join(
        f"{n},{m}-23,9\n" for n in ("A1", "B2") for m in ("Jan", "Feb", "Mar")
    )
    with pytest.raises(AmbiguousBills, match="read_day"):
        accounts_of(tmp_path, text)
    assert len(accounts_of(tmp_path, text, read_day=5).bills) == 2


def test_one_account_is_read_as_before(tmp_path: Path) -> None:
    text = "Account,Start,End,Therms\n" + "".join(f"A1,{a},{b},10\n" for a, b in SPANS)
    found = accounts_of(tmp_path, text)
    (bills,) = found.bills
    again = read_bills(tmp_path / "bills.csv")
    assert (bills.periods.use.tolist(), bills.ledger) == (again.periods.use.tolist(), again.ledger)
    with pytest.raises(NoBills, match="one bill alone"):
        accounts_of(tmp_path, "Start,End,Therms\n2023-01-05,2023-02-06,81\n")
    with pytest.raises(TypeError, match="no keyword 'feul'"):
        accounts_of(tmp_path, text, feul="natural gas")


def test_rows_and_fuel_choose(tmp_path: Path) -> None:
    text = "Account,Service,Start,End,Usage,Unit\n" + "".join(
        f"{n},Electric,{a},{b},1,kWh\n{n},Gas,{a},{b},2,therms\n"
        for n in ("0011005678", "0022001234")
        for a, b in SPANS
    )
    found = accounts_of(tmp_path, text, fuel="natural gas")
    assert uses(found) == {"…5678": [2.0] * 3, "…1234": [2.0] * 3}
    assert len(found.nobodys) == 6
    one = accounts_of(tmp_path, text, fuel="natural gas", rows="1234")
    assert uses(one) == {"1234": [2.0] * 3}


def test_meters_that_follow_each_other_stay_one_account(tmp_path: Path) -> None:
    text = "Account,Meter,Start,End,Therms\n" + "".join(
        f"A1,{'M1' if k < 2 else 'M2'},{a},{b},{k}\nB2,M3,{a},{b},9\n"
        for k, (a, b) in enumerate([*SPANS, ("2023-04-06", "2023-05-06")])
    )
    found = accounts_of(tmp_path, text)
    assert uses(found) == {"A1": [0.0, 1.0, 2.0, 3.0], "B2": [9.0] * 4}


@pytest.mark.parametrize("numbered", [False, True])
def test_a_sheet_for_each_account(numbered: bool, tmp_path: Path) -> None:
    from openpyxl import Workbook

    book = Workbook()
    book.remove(book.worksheets[0])
    for title, use in (("House", 10), ("Shop", 20), ("Barn", 30)):
        sheet = book.create_sheet(title)
        sheet.append(["Account", "Start", "End", "Therms"])
        for a, b in SPANS:
            sheet.append([f"00110056{use}" if numbered else None, a, b, use])
    book.create_sheet("Notes").append(["nothing of interest"])
    file = tmp_path / "bills.xlsx"
    book.save(file)
    found = read_accounts(file)
    assert uses(found) == {"House": [10.0] * 3, "Shop": [20.0] * 3, "Barn": [30.0] * 3}
    with pytest.raises(AmbiguousBills) as asked:
        read_bills(file)
    for title, used in (("House", 10.0), ("Shop", 20.0), ("Barn", 30.0)):
        assert f'sheet = "{title}"' in str(asked.value)
        assert read_bills(file, sheet=title).periods.use.tolist() == [used] * 3


def test_sheets_that_may_be_years_of_one_account(tmp_path: Path) -> None:
    from openpyxl import Workbook

    book = Workbook()
    book.remove(book.worksheets[0])
    for year in (2022, 2023):
        sheet = book.create_sheet(str(year))
        sheet.append(["Start", "End", "Therms"])
        for a, b in SPANS:
            sheet.append([a.replace("2023", str(year)), b.replace("2023", str(year)), 5])
    file = tmp_path / "years.xlsx"
    book.save(file)
    found = read_accounts(file)
    assert list(uses(found)) == ["2022", "2023"]
    assert "as the years of one account would" in found.notes[0]


def test_workbook_with_an_account_column(tmp_path: Path) -> None:
    from openpyxl import Workbook

    book = Workbook()
    sheet = book.worksheets[0]
    sheet.append(["Account", "Start", "End", "Therms"])
    for a, b in SPANS:
        sheet.append([1100005678, a, b, 5])
        sheet.append([2200001234.0, a, b, 6])
    sheet.row_dimensions[3].hidden = True
    file = tmp_path / "bills.xlsx"
    book.save(file)
    found = read_accounts(file)
    assert uses(found) == {"…5678": [5.0] * 3, "…1234": [6.0] * 3}
    hidden = [any("hides" in c for c in b.cautions) for b in found.bills]
    assert hidden == [False, True]


def meter_entries(n: int, kind: str, use: int, *, uom: int, bill: int) -> list[str]:
    own = f"U/1/UsagePoint/{n}"
    readings = [
        espi.reading(espi.JAN, espi.FEB - espi.JAN, use),
        espi.reading(espi.FEB, espi.MAR - espi.FEB, use + 1),
    ]
    bill_of = espi.summary(espi.JAN, espi.FEB - espi.JAN, 1, bill).replace("U/1/UsagePoint/1", own)
    return [
        espi.point(kind, own),
        espi.meter(f"{own}/MeterReading/1", f"ReadingType/{n}"),
        espi.block(readings, own=f"{own}/MeterReading/1/IntervalBlock/1"),
        espi.reading_type(f"ReadingType/{n}", uom=uom, powerOfTenMultiplier=0),
        bill_of,
    ]


def test_espi_meters_each_with_its_own_cost(tmp_path: Path) -> None:
    """Three usage points with the same dates: use and bills of one never reach another."""
    file = tmp_path / "usage.xml"
    entries = [espi.clock()]
    for n, kind, use, uom, bill in ((1, "1", 81, 169, 1_000_000), (2, "0", 5000, 72, 2_000_000),
                                    (3, "0", 7000, 72, 3_000_000)):  # fmt: skip
        entries += meter_entries(n, kind, use, uom=uom, bill=bill)
    file.write_text(espi.feed(*entries))
    found = read_accounts(file)
    assert uses(found) == {
        "meter 1": [81.0, 82.0], "meter 2": [5.0, 5.001], "meter 3": [7.0, 7.001],
    }  # fmt: skip
    assert [b.fuel for b in found.bills] == ["natural gas", "electricity", "electricity"]
    assert [round(float(b.periods.cost[0]), 9) for b in found.bills] == [10.0, 20.0, 30.0]
    with pytest.raises(AmbiguousBills, match='rows = "meter 2" or rows = "meter 3"'):
        read_bills(file, fuel="electricity")
    assert read_bills(file, rows="meter 3").periods.use.tolist() == [7.0, 7.001]


def test_espi_bills_from_summaries_stay_with_their_meter(tmp_path: Path) -> None:
    """No readings at all: two meters' summaries of the same months were one series before."""
    file = tmp_path / "usage.xml"
    entries = [espi.clock()]
    for n in (1, 2):
        own = f"U/1/UsagePoint/{n}"
        entries.append(espi.point("1", own))
        for a, b in ((espi.JAN, espi.FEB), (espi.FEB, espi.MAR)):
            text = espi.summary(a, b - a, 1000 * n, 100)
            entries.append(text.replace("U/1/UsagePoint/1", own))
    file.write_text(espi.feed(*entries))
    assert uses(read_accounts(file)) == {"meter 1": [1.0, 1.0], "meter 2": [2.0, 2.0]}


@settings(
    max_examples=60, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture]
)
@given(
    st.lists(
        st.tuples(
            st.sampled_from(["1100005678", "2200005678", "House", ""]),
            st.sampled_from(["Electric", "Gas", "Water", ""]),
            st.integers(0, 11),
            st.integers(0, 500),
        ),
        min_size=1,
        max_size=40,
    )
)
def test_every_line_is_somewhere_once(
    tmp_path: Path, lines: list[tuple[str, str, int, int]]
) -> None:
    """Rows of all accounts, and those of nobody, are the lines of the file."""
    text = "Account,Service,Start,End,Usage,Unit\n" + "".join(
        f"{n},{s},2022-{m + 1:02}-05,{2022 + (m > 10)}-{(m + 1) % 12 + 1:02}-05,{u},"
        f"{ {'Electric': 'kWh', 'Gas': 'therms', 'Water': 'gal'}.get(s, '') }\n"
        for n, s, m, u in lines
    )
    try:
        found = accounts_of(tmp_path, text, end_dates="exclusive")
    except (AmbiguousBills, UnreadableBills, NoBills):
        return
    if len(found.accounts) == 1 and not found.nobodys:
        return  # read as a file of one account: its own property elsewhere
    told = [e.line for e in found.nobodys]
    for account in found.accounts:
        if account.bills is None:
            assert account.problem
            told += [-1] * account.lines
        else:
            told += [r.line for r in account.bills.rows]
    known = [line for line in told if line > 0]
    assert len(told) == len(lines)
    assert len(set(known)) == len(known)
    for account in found.accounts:
        if account.bills is not None:
            whose = {(lines[r.line - 2][0], lines[r.line - 2][1]) for r in account.bills.rows}
            assert len({n for n, _ in whose} - {""}) <= 1
            assert len({s for _, s in whose} - {""}) <= 1


def test_accounts_named_in_lines_above_their_bills(tmp_path: Path) -> None:
    """Else the second account's bills pass for later versions of the first one's."""
    text = (
        "Usage report\nAccount: 7000112233\nStart,End,Therms\n2023-01-05,2023-02-06,81\n"
        "2023-02-06,2023-03-07,70\nAccount No.,7000998877\nStart,End,Therms\n"
        "2023-01-05,2023-02-06,11\n2023-02-06,2023-03-07,12\nTotal,,23\n"
    )
    found = accounts_of(tmp_path, text)
    assert uses(found) == {"…2233": [81.0, 70.0], "…8877": [11.0, 12.0]}
    with pytest.raises(AmbiguousBills, match='rows = "2233" or rows = "8877"'):
        read_bills(tmp_path / "bills.csv")
    assert read_bills(tmp_path / "bills.csv", rows="8877").periods.use.tolist() == [11.0, 12.0]
    one = text.replace("7000998877", "7000112233").replace("2023-0", "2023-0")
    assert len(accounts_of(tmp_path, one).accounts) == 1


def test_totals_of_each_account_are_nobodys(tmp_path: Path) -> None:
    text = "Account,Start,End,Therms\n" + "".join(
        f"{n},{a},{b},10\n" for n in ("7000112233", "7000998877") for a, b in SPANS
    )
    text = text.replace("7000998877", "Total for 7000112233,,,30\n7000998877", 1)
    found = accounts_of(tmp_path, text + "Total for 7000998877,,,30\nGrand total,,,60\n")
    assert uses(found) == {"…2233": [10.0] * 3, "…8877": [10.0] * 3}
    assert [e.note for e in found.nobodys] == ["a total, not a bill"] * 3


def side_by_side(gas: list[str]) -> str:
    dates = ["2022-12-20", "2023-01-20", "2023-02-19", "2023-03-21", "2023-04-20", "2023-05-20"]
    lines = [f"{day},900,{use}" for day, use in zip(dates, gas, strict=True)]
    return "\n".join(["Read date,Electric kWh,Gas therms", *lines]) + "\n"


def test_gas_read_every_second_month_beside_power_read_every_month(tmp_path: Path) -> None:
    """A blank is no reading: the gas bill that follows covers two months, not one."""
    found = accounts_of(tmp_path, side_by_side(["", "110", "", "160", "", "60"]))
    gas = next(b for b in found.bills if b.fuel == "natural gas")
    assert gas.periods.use.tolist() == [160.0, 60.0]
    assert gas.periods.days.tolist() == [60, 60]
    assert any("not read on this date" in e.note for e in gas.ledger)
    power = next(b for b in found.bills if b.fuel == "electricity")
    assert power.periods.n == 5


def test_one_blank_beside_another_fuel_is_no_reading_to_count_from(tmp_path: Path) -> None:
    """Missing bill or no reading: nobody knows, so what follows is not given a length by guess."""
    found = accounts_of(tmp_path, side_by_side(["9", "110", "", "160", "100", "60"]))
    gas = next(b for b in found.bills if b.fuel == "natural gas")
    assert gas.periods.use.tolist() == [110.0, 100.0, 60.0]
    assert [e.line for e in gas.ledger if e.fate == "left out"] == [2, 4, 5]
    assert any("began at an unknown date" in e.note for e in gas.ledger)


def test_named_accounts_above_a_header_without_bills(tmp_path: Path) -> None:
    """Found by fuzzing: no line beneath the header to take a width from."""
    with pytest.raises(NoBills, match="no bill beneath"):
        accounts_of(tmp_path, "Account: 7000998877\nAccount: 7000112233\nStart,End,Therms\n")
