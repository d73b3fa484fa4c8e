"""Interval files: local days through changes of the clock, missing readings, many ways to write.

Expected sums are counted by hand: every reading is 0.5 unless said otherwise.  The dates on which
clocks change in the US (second Sunday of March, first of November, since 2007) are public law.
"""

from __future__ import annotations

from collections.abc import Iterator
from datetime import UTC, datetime, timedelta
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from normalize.bills.answers import answers_of
from normalize.bills.periods import Bills
from normalize.bills.read import read_bills, understand_file
from normalize.bills.table import open_file
from normalize.days import iso
from normalize.errors import AmbiguousBills, NormalizeError, UnreadableBills

pytestmark = pytest.mark.kernel
TMP_PATH_IS_SHARED = [HealthCheck.function_scoped_fixture]


def read(lines: list[str], folder: Path, encoding: str = "utf-8", **options: object) -> Bills:
    file = folder / "intervals.csv"
    file.write_bytes(("\n".join(lines) + "\n").encode(encoding))
    return read_bills(file, **options)  # type: ignore[arg-type]


def days_of(bills: Bills) -> dict[str, float]:
    p = bills.periods
    return {iso(int(a)): round(float(u), 9) for a, u in zip(p.start, p.use, strict=True)}


def moments(first: str, n: int, minutes: int = 60) -> Iterator[datetime]:
    begin = datetime.fromisoformat(first)
    return (begin + timedelta(minutes=minutes * k) for k in range(n))


JAN = {"2023-01-13": 12.0, "2023-01-14": 12.0, "2023-01-15": 12.0}
HOURS = list(moments("2023-01-13T00:00", 72))


@pytest.mark.parametrize(
    ("head", "shape"),
    [
        ("Timestamp,kWh", "%Y-%m-%d %H:%M,0.5"),
        ("Timestamp,kWh", "%Y-%m-%dT%H:%M:%S.000,0.500"),
        ("Timestamp;kWh", "%d.%m.%Y %H:%M;0,5"),
        ("Date/Time\tkWh", "%m/%d/%Y %I:%M %p\t0.5"),
        ("Timestamp,kWh", "%m/%d/%y %H:%M,.5"),
        ("Timestamp,kWh", '"%Y%m%d %H:%M","0.5"'),
        ("Timestamp,kWh", "%d-%b-%Y %H:%M,0.5"),
        ("Timestamp,kWh", "%b %d 2023 %I:%M %p,0.5"),
        ("Date,Time,kWh", "%Y-%m-%d,%H:%M,0.5"),
        ("Date,Hour,kWh", "%Y-%m-%d,%H,0.5"),
        ("Date,Time,kWh", "%Y-%m-%d,%H%M,0.5"),
        ("TYPE,DATE,START TIME,END TIME,USAGE,UNITS,COST,NOTES",
         "Electric usage,%Y-%m-%d,%H:%M,x,0.5,kWh,$0.10,"),
        ("Interval start,Interval end,kWh", "%Y-%m-%d %H:%M,x,0.5"),
        ("Interval start,Usage,Unit", "%Y-%m-%d %H:%M,500,Wh"),
        ("Meter,Timestamp,kWh", "12345678,%Y-%m-%d %H:%M,0.5"),
    ],
)  # fmt: skip
def test_ways_to_write_moments(head: str, shape: str, tmp_path: Path) -> None:
    bills = read([head, *(h.strftime(shape) for h in HOURS)], tmp_path)
    scale = 1000 if "500,Wh" in shape else 1
    assert days_of(bills) == {day: use * scale for day, use in JAN.items()}
    assert bills.fuel == "electricity"
    assert any("72 readings of 1 h, summed to 3 local days" in text for text in bills.reading)
    if "$" in shape:
        assert bills.periods.cost.tolist() == pytest.approx([2.4] * 3)


@pytest.mark.parametrize("encoding", ["utf-8-sig", "utf-16", "cp1252"])
def test_encodings(encoding: str, tmp_path: Path) -> None:
    lines = ["Ende der Ablesung é", "Timestamp,kWh", *(f"{h:%Y-%m-%d %H:%M},0.5" for h in HOURS)]
    assert days_of(read(lines, tmp_path, encoding)) == JAN


def test_title_repeated_header_footer_and_blank_lines(tmp_path: Path) -> None:
    body = [f"{h:%Y-%m-%d %H:%M},0.5" for h in HOURS]
    lines = ["History", "", "Timestamp,kWh", *body[:40], "Timestamp,kWh", "", *body[40:],
             "Total,36"]  # fmt: skip
    bills = read(lines, tmp_path)
    assert days_of(bills) == JAN
    assert any("passed over: 2 lines" in text for text in bills.reading)
    assert [row.line for row in bills.rows] == [4, 28, 54]


def test_newest_first(tmp_path: Path) -> None:
    lines = ["Timestamp,kWh", *(f"{h:%Y-%m-%d %H:%M},0.5" for h in reversed(HOURS))]
    assert days_of(read(lines, tmp_path)) == JAN


def test_quarter_hours_that_are_named_by_their_end(tmp_path: Path) -> None:
    quarter = moments("2023-01-13T00:15", 96 * 2, 15)
    bills = read(["Timestamp,kWh", *(f"{q:%Y-%m-%d %H:%M},0.5" for q in quarter)], tmp_path)
    assert days_of(bills) == {"2023-01-13": 48.0, "2023-01-14": 48.0}
    assert any("end of its interval" in text for text in bills.reading)


def test_hours_that_are_named_by_their_end_up_to_24(tmp_path: Path) -> None:
    lines = [f"2023-01-{day},{hour}:00,0.5" for day in (13, 14) for hour in range(1, 25)]
    bills = read(["Date,Hour ending,kWh", *lines], tmp_path)
    assert days_of(bills) == {"2023-01-13": 12.0, "2023-01-14": 12.0}


def test_start_or_end_can_be_said(tmp_path: Path) -> None:
    lines = ["Timestamp,kWh", *(f"{h:%Y-%m-%d %H:%M},0.5" for h in HOURS[1:70])]
    assert any("start or the end" in text for text in read(lines, tmp_path).cautions)
    ends = read(lines, tmp_path, interval_times="end")
    assert ends.cautions == ()
    assert days_of(ends) == {"2023-01-13": 12.0, "2023-01-14": 12.0}


def test_local_clock_changes_without_a_zone(tmp_path: Path) -> None:
    spring = [h for h in moments("2023-03-11T00:00", 72) if not (h.day == 12 and h.hour == 2)]
    found = days_of(read(["Timestamp,kWh", *(f"{h:%Y-%m-%d %H:%M},0.5" for h in spring)], tmp_path))
    assert found == {"2023-03-11": 12.0, "2023-03-12": 11.5, "2023-03-13": 12.0}
    autumn = list(moments("2023-11-04T00:00", 72))
    autumn.insert(26, autumn[25])  # one o'clock twice on the fifth
    found = days_of(read(["Timestamp,kWh", *(f"{h:%Y-%m-%d %H:%M},0.5" for h in autumn)], tmp_path))
    assert found == {"2023-11-04": 12.0, "2023-11-05": 12.5, "2023-11-06": 12.0}


def test_an_hour_missing_on_any_other_day_is_missing(tmp_path: Path) -> None:
    lines = [f"{h:%Y-%m-%d %H:%M},0.5" for h in HOURS if not (h.day == 14 and h.hour == 2)]
    bills = read(["Timestamp,kWh", *lines], tmp_path)
    assert days_of(bills) == {"2023-01-13": 12.0, "2023-01-15": 12.0}
    note = next(e.note for e in bills.ledger if e.fate == "left out")
    assert note == "readings of 1 h are missing on this day"


def utc_lines(first: str, n: int) -> list[str]:
    begin = datetime.fromisoformat(first).replace(tzinfo=UTC)
    return [f"{begin + timedelta(hours=k):%Y-%m-%dT%H:%M:%SZ},0.5" for k in range(n)]


def test_utc_asks_for_the_zone(tmp_path: Path) -> None:
    lines = ["Timestamp,kWh", *utc_lines("2023-03-11T05:00", 24 + 23 + 24)]
    with pytest.raises(AmbiguousBills, match="time_zone"):
        read(lines, tmp_path)
    bills = read(lines, tmp_path, time_zone="America/New_York")
    assert days_of(bills) == {"2023-03-11": 12.0, "2023-03-12": 11.5, "2023-03-13": 12.0}


def test_offsets_in_the_file_are_its_local_time(tmp_path: Path) -> None:
    from zoneinfo import ZoneInfo

    begin = datetime(2023, 11, 4, 4, tzinfo=UTC)
    zone = ZoneInfo("America/New_York")
    stamps = [(begin + timedelta(hours=k)).astimezone(zone) for k in range(24 + 25 + 24)]
    bills = read(["Timestamp,kWh", *(f"{s.isoformat()},0.5" for s in stamps)], tmp_path)
    assert days_of(bills) == {"2023-11-04": 12.0, "2023-11-05": 12.5, "2023-11-06": 12.0}


def test_a_file_appended_to_itself_counts_once(tmp_path: Path) -> None:
    lines = [f"{h:%Y-%m-%d %H:%M},0.5" for h in HOURS]
    bills = read(["Timestamp,kWh", *lines, *lines], tmp_path)
    assert days_of(bills) == JAN
    assert any("counted once: 72 lines" in text for text in bills.reading)


def test_two_values_for_one_hour_are_not_chosen_between(tmp_path: Path) -> None:
    lines = [f"{h:%Y-%m-%d %H:%M},0.5" for h in HOURS]
    bills = read(["Timestamp,kWh", *lines, "2023-01-14 05:00,9"], tmp_path)
    assert days_of(bills) == {"2023-01-13": 12.0, "2023-01-15": 12.0}
    assert "twice" in next(e.note for e in bills.ledger if e.fate == "left out")


def test_a_stray_comma_does_not_shift_a_number(tmp_path: Path) -> None:
    lines = [f"{h:%Y-%m-%d %H:%M},0.5,$1" for h in HOURS]
    lines[30] = lines[30].replace("0.5", "1,234")
    bills = read(["Timestamp,kWh,Cost", *lines], tmp_path)
    assert days_of(bills) == {"2023-01-13": 12.0, "2023-01-15": 12.0}


def test_numbers_that_need_a_second_look(tmp_path: Path) -> None:
    lines = [f"{h:%Y-%m-%d %H:%M},0.5" for h in HOURS]
    lines[3] = "2023-01-13 03:00,5e-1"
    lines[4] = '2023-01-13 04:00,"1,000.5"'
    lines[5] = "2023-01-13 05:00,(0.5)"
    assert days_of(read(["Timestamp,kWh", *lines], tmp_path))["2023-01-13"] == 1011.0


def test_several_meters_are_asked_about(tmp_path: Path) -> None:
    lines = [f"{m},{h:%Y-%m-%d %H:%M},{u}" for h in HOURS
             for m, u in (("11112222", 0.5), ("33334444", 7))]  # fmt: skip
    with pytest.raises(AmbiguousBills, match="2222") as caught:
        read(["Meter,Timestamp,kWh", *lines], tmp_path)
    assert "11112222" not in str(caught.value)
    assert days_of(read(["Meter,Timestamp,kWh", *lines], tmp_path, rows="2222")) == JAN


def test_estimates_are_counted(tmp_path: Path) -> None:
    lines = [f"{h:%Y-%m-%d %H:%M},0.5,{'E' if h.hour < 2 else 'A'}" for h in HOURS]
    bills = read(["Timestamp,kWh,Quality", *lines], tmp_path)
    assert any("used as they are: 6 readings" in text for text in bills.reading)


def test_days_are_summed_to_months_on_request(tmp_path: Path) -> None:
    hours = moments("2023-01-01T00:00", 24 * 90)
    lines = ["Timestamp,kWh", *(f"{h:%Y-%m-%d %H:%M},0.5" for h in hours)]
    assert days_of(read(lines, tmp_path, sum_to="month")) == {
        "2023-01-01": 12.0 * 31, "2023-02-01": 12.0 * 28, "2023-03-01": 12.0 * 31,
    }  # fmt: skip
    fifth = read(lines, tmp_path, sum_to="month", read_day=5)
    assert days_of(fifth) == {"2023-01-05": 12.0 * 31, "2023-02-05": 12.0 * 28}
    assert "are missing" in next(e.note for e in fifth.ledger if e.fate == "left out")


def test_daily_lines_are_the_use_of_their_day(tmp_path: Path) -> None:
    days = list(moments("2023-01-01T00:00", 40, 24 * 60))
    few = read(["Date,kWh", *(f"{d:%Y-%m-%d},{d.day}" for d in days)], tmp_path)
    assert days_of(few)["2023-01-01"] == 1.0
    assert few.periods.n == 40
    many = [d + timedelta(days=0) for d in moments("2000-01-01T00:00", 6000, 24 * 60)]
    bills = read(["Date,kWh", *(f"{d:%m/%d/%Y},{d.day}" for d in many)], tmp_path)
    assert bills.periods.n == 6000
    assert days_of(bills)["2003-02-28"] == 28.0


@pytest.mark.parametrize(
    ("lines", "words"),
    [
        (["Timestamp,kW", *(f"{h:%Y-%m-%d %H:%M},0.5" for h in HOURS)], "kW"),
        (["Timestamp,Usage", *(f"{h:%Y-%m-%d %H:%M},0.5" for h in HOURS)], "fuel"),
        (["Timestamp,kWh", *(f"{h.month}/{h.day}/2023 {h:%H:%M},0.5"
                             for h in moments("2023-01-03T00:00", 72))], "month first"),
        (["Timestamp,kWh", *(f"{h:%Y-%m-%d %H:%M},x" for h in HOURS)], "number"),
    ],
)  # fmt: skip
def test_questions_and_refusals(lines: list[str], words: str, tmp_path: Path) -> None:
    with pytest.raises(NormalizeError, match=words):
        read(lines, tmp_path)


def test_an_unknown_zone(tmp_path: Path) -> None:
    lines = ["Timestamp,kWh", *utc_lines("2023-03-11T05:00", 30)]
    for zone in ("Nowhere/City", "../etc/passwd", "\0", "+99:00"):
        with pytest.raises(NormalizeError, match="time zone"):
            read(lines, tmp_path, time_zone=zone)


def test_no_more_lines_than_a_century_of_quarter_hours(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    import normalize.bills.interval_file as interval_file

    monkeypatch.setattr(interval_file, "MAX_LINES", 50)
    with pytest.raises(UnreadableBills, match="more than 50 lines"):
        read(["Timestamp,kWh", *(f"{h:%Y-%m-%d %H:%M},0.5" for h in HOURS)], tmp_path)


@settings(max_examples=40, deadline=None, suppress_health_check=TMP_PATH_IS_SHARED)
@given(
    first=st.datetimes(datetime.fromisoformat("2001-01-01"), datetime.fromisoformat("2030-01-01")),
    uses=st.lists(st.integers(0, 10**7), min_size=50, max_size=200),
    minutes=st.sampled_from([5, 15, 30, 60]),
    shape=st.sampled_from(["%Y-%m-%d %H:%M", "%Y-%m-%dT%H:%M:%S", "%d-%b-%Y %I:%M %p",
                           "%Y%m%d %H:%M", "%Y-%m-%d,%H%M", '"%Y-%m-%d %H:%M"']),
    places=st.integers(0, 4),
    pad=st.sampled_from(["", " "]),
)  # fmt: skip
def test_daily_sums_are_those_of_pandas(
    first: datetime, uses: list[int], minutes: int, shape: str, places: int, pad: str,
    tmp_path: Path,
) -> None:  # fmt: skip
    """Sums of every day, whole or not, against pandas, a reference library, on the same moments."""
    import pandas as pd

    begin = first.replace(minute=0, second=0, microsecond=0)
    stamps = [begin + timedelta(minutes=minutes * k) for k in range(len(uses))]
    numbers = [round(u / 10**places, places) for u in uses]
    head = "Date,Time,kWh" if "," in shape else "Timestamp,kWh"
    lines = [f"{s.strftime(shape)},{pad}{u:.{places}f}{pad}" for s, u in
             zip(stamps, numbers, strict=True)]  # fmt: skip
    file = tmp_path / "any.csv"
    file.write_text("\n".join([head, *lines]) + "\n")
    answers = answers_of(file.name, {"interval_times": "start"})
    rows = understand_file(open_file(file), answers, None).rows
    frame = pd.Series(numbers, index=[s.date() for s in stamps])
    sums = frame.groupby(level=0).sum()
    assert [iso(r.start or 0) for r in rows] == [f"{d}" for d in sums.index]
    assert [r.use for r in rows] == pytest.approx(sums.tolist(), rel=1e-12, abs=1e-12)


@pytest.mark.parametrize(
    ("head", "lines", "day"),
    [
        # Hours and minutes without a colon, whose noughts a spreadsheet has dropped.
        ("Date,Time,kWh", [f"2023-01-13,{h * 100 + m},0.5" for h in range(24) for m in
                           (0, 15, 30, 45)], 48.0),
        ("Date,Time,kWh", [f"2023-01-13,{h:02}{m:02},0.5" for h in range(24) for m in
                           (0, 15, 30, 45)], 48.0),
        ("Date,Time,kWh", [f"2023-01-13,{h:02}:00 - {h + 1:02}:00,0.5" for h in range(24)], 12.0),
        ("Time,Date,kWh", [f"{h}:00,2023-01-13,0.5" for h in range(24)], 12.0),
        ("Date,Time,kWh", [f"2023-01-13 00:00,{h}:00,0.5" for h in range(24)], 12.0),
        ("Timestamp,kWh", [f"13-JAN-2023:{h:02}:00,0.5" for h in range(24)], 12.0),
        ("Timestamp,kWh", [f"2023-01-13 {h:02}:00:00.000 -0500,0.5" for h in range(24)], 12.0),
        ("Timestamp,kWh", [f"  2023-01-13 {h:02}:00  , 0.5 " for h in range(24)], 12.0),
        ("Timestamp,kWh,x", [f'"2023-01-13 {h:02}:00","0.5","a, b"' for h in range(24)], 12.0),
        ("Timestamp,kWh", [f"2023-01-13 {h:02}:00,0.5\r" for h in range(24)], 12.0),
        ("Timestamp,kWh", [f"2023-01-13 {h:02}:00,.5 kWh" for h in range(24)], 12.0),
    ],
)  # fmt: skip
def test_more_ways_to_write(head: str, lines: list[str], day: float, tmp_path: Path) -> None:
    bills = read([head, *lines], tmp_path)
    assert days_of(bills) == {"2023-01-13": day}


def test_a_date_beside_a_time_that_contradicts_it_is_not_used(tmp_path: Path) -> None:
    lines = [f"2023-01-13 {h:02}:00,{(h + 1) % 24}:00,0.5" for h in range(24)]
    with pytest.raises(NormalizeError):
        read(["Date,Time,kWh", *lines], tmp_path)
