"""Wide interval files (a line for each day, a column for each interval) and workbooks of intervals.

Expected sums are counted by hand: every reading is 0.5 unless said otherwise.  The dates on which
clocks change in the US (second Sunday of March, first of November, since 2007) are public law.
The same readings written long, wide and as a workbook must come to the same days.
"""

from __future__ import annotations

import io
from collections.abc import Callable, Sequence
from datetime import date, datetime, time, timedelta
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from normalize.bills.periods import Bills
from normalize.bills.read import read_bills
from normalize.days import iso
from normalize.errors import AmbiguousBills, NormalizeError

pytestmark = pytest.mark.kernel

HOURS = [f"{h:02}:00" for h in range(24)]
QUARTERS = [f"{h:02}:{m:02}" for h in range(24) for m in (0, 15, 30, 45)]


def read(lines: Sequence[str], folder: Path, **options: object) -> Bills:
    file = folder / "wide.csv"
    file.write_text("\n".join(lines) + "\n")
    return read_bills(file, **options)  # type: ignore[arg-type]


def days_of(bills: Bills) -> dict[str, float]:
    p = bills.periods
    return {iso(int(a)): round(float(u), 9) for a, u in zip(p.start, p.use, strict=True)}


def days(first: str, n: int) -> list[date]:
    return [date.fromisoformat(first) + timedelta(days=k) for k in range(n)]


def book(rows: Sequence[Sequence[object]], folder: Path) -> Path:
    from openpyxl import Workbook

    made = Workbook()
    sheet = made.active
    assert sheet is not None
    for row in rows:
        sheet.append(list(row))
    data = io.BytesIO()
    made.save(data)
    file = folder / "book.xlsx"
    file.write_bytes(data.getvalue())
    return file


@pytest.mark.parametrize(
    "labels",
    [
        HOURS,
        [f"{h}:00" for h in range(1, 25)],
        [f"{h:02}:00" for h in (*range(1, 24), 0)],
        [f"HE{h}" for h in range(1, 25)],
        [f"HE {h:02}" for h in range(1, 25)],
        [f"Hour {h}" for h in range(1, 25)],
        [f"Hour Ending {h}" for h in range(1, 25)],
        [str(h) for h in range(1, 25)],
        [str(h) for h in range(24)],
        [f"{h:02}00" for h in range(1, 25)],
        [f"{h % 12 or 12}:00 {'AM' if h < 12 else 'PM'}" for h in range(24)],
        [f"{h:02}:00-{h + 1:02}:00" for h in range(24)],
        [f"{h:02}:00 - {h:02}:59" for h in range(24)],
        [f"H{h:02}" for h in range(24)],
    ],
)
def test_ways_to_head_hours(labels: list[str], tmp_path: Path) -> None:
    lines = [",".join(["Date", "Unit", *labels])]
    lines += [",".join([f"{d:%m/%d/%Y}", "kWh", *["0.5"] * 24]) for d in days("2023-01-13", 3)]
    bills = read(lines, tmp_path)
    assert days_of(bills) == dict.fromkeys(("2023-01-13", "2023-01-14", "2023-01-15"), 12.0)
    assert any("72 readings of 1 h, summed to 3 local days" in text for text in bills.reading)


@pytest.mark.parametrize(
    ("labels", "step"),
    [
        (QUARTERS, "15 min"),
        ([*QUARTERS[1:], "24:00"], "15 min"),
        ([q.replace(":", "") for q in QUARTERS], "15 min"),
        ([f"kWh {q}" for q in QUARTERS], "15 min"),
        ([f"{q} (kWh)" for q in QUARTERS], "15 min"),
        ([f"Interval {k}" for k in range(1, 97)], "15 min"),
        (QUARTERS[::2], "30 min"),
        ([f"{h}:{m:02}:00" for h in range(24) for m in range(0, 60, 5)], "5 min"),
    ],
)
def test_ways_to_head_shorter_intervals(labels: list[str], step: str, tmp_path: Path) -> None:
    lines = ["\t".join(["Meter", "Date", *labels, "Total"])]
    lines += ["\t".join(["m1", f"{d}", *["0.5"] * len(labels), "99"]) for d in
              days("2023-01-13", 3)]  # fmt: skip
    bills = read(lines, tmp_path, fuel="electricity", unit="kWh")
    assert set(days_of(bills).values()) == {0.5 * len(labels)}
    assert any(f"readings of {step}" in text for text in bills.reading)


def test_decimal_comma_title_and_a_heading_less_column_of_dates(tmp_path: Path) -> None:
    lines = ["Lastgang in kWh", "", ";".join(["", *HOURS])]
    lines += [";".join([f"{d:%d.%m.%Y}", *["0,5"] * 24]) for d in days("2023-01-13", 3)]
    bills = read(lines, tmp_path)
    assert set(days_of(bills).values()) == {12.0}
    assert [row.line for row in bills.rows] == [4, 5, 6]


def test_the_unit_is_asked(tmp_path: Path) -> None:
    lines = [",".join(["Date", *HOURS])]
    lines += [",".join([f"{d}", *["0.5"] * 24]) for d in days("2023-01-13", 3)]
    with pytest.raises(AmbiguousBills, match="fuel"):
        read(lines, tmp_path)
    with pytest.raises(AmbiguousBills, match="unit"):
        read(lines, tmp_path, fuel="natural gas")


def wide(first: str, cells: dict[str, list[str]], head: list[str] = HOURS) -> list[str]:
    width = len(head)
    lines = [",".join(["Date", *(f"{h} kWh" for h in head)])]
    return lines + [",".join([f"{d}", *cells.get(f"{d}", ["0.5"] * width)]) for d in days(first, 3)]


@pytest.mark.parametrize("zone", [None, "America/New_York"])
def test_the_day_of_23_hours(zone: str | None, tmp_path: Path) -> None:
    for skipped in ("", "0"):
        short = [*["0.5"] * 2, skipped, *["0.5"] * 21]
        bills = read(wide("2023-03-11", {"2023-03-12": short}), tmp_path, time_zone=zone)
        assert days_of(bills) == {"2023-03-11": 12.0, "2023-03-12": 11.5, "2023-03-13": 12.0}


@pytest.mark.parametrize("zone", [None, "America/New_York"])
def test_the_day_of_25_hours(zone: str | None, tmp_path: Path) -> None:
    head = [f"HE{k}" for k in range(1, 26)]
    usual, long = [*["0.5"] * 24, ""], ["0.5"] * 25
    cells = {f"{d}": usual for d in days("2023-11-04", 3)} | {"2023-11-05": long}
    bills = read(wide("2023-11-04", cells, head), tmp_path, time_zone=zone)
    assert days_of(bills) == {"2023-11-04": 12.0, "2023-11-05": 12.5, "2023-11-06": 12.0}
    doubled = ["0.5", "1.0", *["0.5"] * 22]  # a file without room adds the hour to its namesake
    bills = read(wide("2023-11-04", {"2023-11-05": doubled}), tmp_path, time_zone=zone)
    assert days_of(bills) == {"2023-11-04": 12.0, "2023-11-05": 12.5, "2023-11-06": 12.0}


def test_missing_intervals_are_counted(tmp_path: Path) -> None:
    gap = [*["0.5"] * 7, "", "n/a", *["0.5"] * 15]
    bills = read(wide("2023-01-13", {"2023-01-14": gap}), tmp_path)
    assert days_of(bills) == {"2023-01-13": 12.0, "2023-01-15": 12.0}
    assert any("1 day from which 2 readings are missing" in text for text in bills.reading)
    assert [e.note for e in bills.ledger if e.note] == ["readings of 2 h are missing on this day"]


def test_a_workbook_of_moments(tmp_path: Path) -> None:
    begin = datetime.fromisoformat("2023-01-13")
    rows: list[list[object]] = [["Usage history"], [], ["Timestamp", "Usage (kWh)"]]
    rows += [[begin + timedelta(minutes=15 * k), 0.125] for k in range(96 * 3)]
    bills = read_bills(book(rows, tmp_path))
    assert days_of(bills) == dict.fromkeys(("2023-01-13", "2023-01-14", "2023-01-15"), 12.0)
    assert [row.line for row in bills.rows] == [4, 100, 196]


def test_a_workbook_of_dates_and_times_and_a_wide_one(tmp_path: Path) -> None:
    rows: list[list[object]] = [["Date", "Start time", "kWh"]]
    rows += [[d, time(h), 0.5] for d in days("2023-01-13", 3) for h in range(24)]
    found = days_of(read_bills(book(rows, tmp_path)))
    assert set(found.values()) == {12.0}
    flat: list[list[object]] = [["Date", *(time(h) for h in range(24))]]
    flat += [[d, *[0.5] * 24] for d in days("2023-01-13", 3)]
    again = days_of(read_bills(book(flat, tmp_path), fuel="electricity", unit="kWh"))
    assert again == found


@pytest.mark.parametrize("zone", ["-05:00", "+14:00", "UTC"])
def test_a_clock_that_never_changes(zone: str, tmp_path: Path) -> None:
    """Found by fuzzing: no hour is leapt over, so readings of nothing are readings."""
    cells = {"2023-03-12": [*["0.5"] * 2, "0", *["0.5"] * 21]}
    bills = read(wide("2023-03-11", cells), tmp_path, time_zone=zone)
    assert days_of(bills) == {"2023-03-11": 12.0, "2023-03-12": 11.5, "2023-03-13": 12.0}
    assert all(not row.problem for row in bills.rows)


@pytest.mark.parametrize("label", ["0:00", "2023", "12:00 AM", "7:15"])
def test_one_time_in_every_heading_heads_no_day(label: str, tmp_path: Path) -> None:
    """Found by fuzzing: a header of one time of day, over and over."""
    lines = [",".join(["Date", *[label] * 24])]
    lines += [",".join([f"{d}", *["0.5"] * 24]) for d in days("2023-01-13", 3)]
    with pytest.raises(NormalizeError):
        read(lines, tmp_path, fuel="electricity", unit="kWh")


@settings(
    max_examples=25, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture]
)
@given(
    values=st.lists(
        st.lists(st.one_of(st.none(), st.integers(0, 9999)), min_size=24, max_size=24),
        min_size=3, max_size=6,
    ),
    first=st.dates(date(2015, 1, 1), date(2024, 12, 1)),
)  # fmt: skip
def test_long_wide_and_workbook_agree(
    values: list[list[int | None]], first: date, tmp_path: Path
) -> None:
    """Whatever is missing, the three ways to write the same readings have the same rows."""
    whole = [[v if k > 1 else (v or 0) for k, v in enumerate(day)] for day in values]
    when = [first + timedelta(days=k) for k in range(len(whole))]
    long = ["Date,Time,kWh"]
    flat = [",".join(["Date", *(f"{h} kWh" for h in HOURS)])]
    sheet: list[list[object]] = [["Timestamp", "kWh"]]
    for d, day in zip(when, whole, strict=True):
        flat.append(",".join([f"{d}", *("" if v is None else f"{v / 1000}" for v in day)]))
        for h, v in enumerate(day):
            if v is not None:
                long.append(f"{d},{h:02}:00,{v / 1000}")
                sheet.append([datetime.combine(d, time(h)), v / 1000])
    found = []
    makes: list[Callable[[], Bills]] = [
        lambda: read(long, tmp_path, interval_times="start"),
        lambda: read(flat, tmp_path),
        lambda: read_bills(book(sheet, tmp_path), interval_times="start"),
    ]
    for make in makes:
        try:
            bills = make()
        except NormalizeError as err:  # no day is whole: all three must say so
            found.append(type(err).__name__)
            continue
        found.append([(r.start, round(r.use or 0, 9), bool(r.problem)) for r in bills.rows])  # type: ignore[arg-type]
    assert found[0] == found[1] == found[2]
