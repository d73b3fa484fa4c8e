"""Dates alone, days, months without days, and readings of the meter."""

from __future__ import annotations

from pathlib import Path

import pytest

from tests.bills.ugly import JFM, Ugly, check_words, periods_of, read, written_and_read

CORPUS = [
    Ugly(
        "reading dates alone: the first opens the record",
        "Meter read date,kWh\n2023-01-05,999\n2023-02-06,81\n2023-03-07,70.5\n",
        JFM,
        left_out={2: "opens the record: the first period runs from this reading"},
    ),
    Ugly(
        "reading dates alone, newest first, one date impossible",
        "Date,kWh\n2023-05-07,12\n2023-04-06,11\n2023-02-30,70\n2023-02-06,81\n2023-01-05,999\n",
        [("2023-01-05", "2023-02-06", 81.0), ("2023-04-06", "2023-05-07", 12.0)],
        left_out={
            3: "opens the record again",
            4: "'2023-02-30' is not a date of the calendar",
            6: "opens the record",
        },
    ),
    Ugly(
        "readings of the meter and no usage: each less the one before",
        "Read date,Meter reading (therms)\n2023-01-05,5012\n2023-02-06,5093\n2023-03-07,5163.5\n",
        JFM,
        left_out={2: "opens the record"},
        reading=("each reading of the meter less the one before",),
    ),
    Ugly(
        "readings before and after on each line, a multiplier",
        "From,To,Previous reading,Current reading,Multiplier,Unit\n"
        "2023-01-05,2023-02-06,100,181,10,kWh\n2023-02-06,2023-03-07,181,251.5,10,kWh\n",
        [(a, b, 10 * u) for a, b, u in JFM],
        unit="kWh",
        reading=("times the multiplier of the meter, 10",),
    ),
    Ugly(
        "the register passes 9999 and begins again",
        "Read date,Meter reading (ccf)\n2022-11-05,9705\n2022-12-05,9800\n2023-01-05,9950\n"
        "2023-02-06,31\n2023-03-07,101.5\n",
        [("2022-11-05", "2022-12-05", 95.0), ("2022-12-05", "2023-01-05", 150.0), *JFM],
        left_out={2: "opens the record"},
    ),
    Ugly(
        "the meter is replaced without a word: its fall is no rollover",
        "Read date,Meter reading (ccf)\n2022-11-05,5705\n2022-12-05,5800\n2023-01-05,31\n"
        "2023-02-06,112\n2023-03-07,182.5\n",
        [("2022-11-05", "2022-12-05", 95.0), *JFM],
        left_out={4: "the meter was replaced, or one of the two is wrong"},
    ),
    Ugly(
        "the meter is replaced, and the file says so: each counts from its own first reading",
        "Meter,Read date,Reading (kWh)\nA1,2022-11-05,5705\nA1,2022-12-05,5800\n"
        "A1,2023-01-05,5900\nB2,2023-01-05,0\nB2,2023-02-06,81\nB2,2023-03-07,151.5\n",
        [("2022-11-05", "2022-12-05", 95.0), ("2022-12-05", "2023-01-05", 100.0), *JFM],
        left_out={2: "opens the record"},
        reading=("the meter was replaced",),
    ),
    Ugly(
        "an estimated reading of the register: its error goes with the next",
        "Read date,Meter reading (therms),A/E\n2023-01-05,5012,A\n2023-02-06,5100,E\n"
        "2023-03-07,5163.5,A\n",
        [("2023-01-05", "2023-03-07", 151.5)],
    ),
    Ugly(
        "months without days, read on the fifth",
        "Month,Therms\nFeb-23,81\nMar-23,70.5\n",
        [("2023-01-05", "2023-02-05", 81.0), ("2023-02-05", "2023-03-05", 70.5)],
        {"read_day": 5},
        reading=("ends on day 5 of the month it names",),
    ),
    Ugly(
        "year and month in two columns, calendar months",
        "Year,Month,kWh\n2023,12,81\n2024,1,70.5\n",
        [("2023-12-01", "2024-01-01", 81.0), ("2024-01-01", "2024-02-01", 70.5)],
        {"read_day": "calendar"},
    ),
    Ugly(
        "a spreadsheet made the first of each month of 'Jan 2023'",
        "Bill month,kWh\n2023-01-01,81\n2023-02-01,70.5\n",
        [("2022-12-20", "2023-01-20", 81.0), ("2023-01-20", "2023-02-20", 70.5)],
        {"read_day": 20},
    ),
    Ugly(
        "read on the 31st, which February does not have",
        "Month,Therms\n2023-02,81\n2023-03,70.5\n",
        [("2023-01-31", "2023-02-28", 81.0), ("2023-02-28", "2023-03-31", 70.5)],
        {"read_day": 31},
    ),
    Ugly(
        "months named in other languages",
        "From,To,Therms\n5 ene 2023,6 févr. 2023,81\n6. Februar 2023,7 März 2023,70.5\n",
        JFM,
    ),
    Ugly(
        "a daily record: each line is the use of its day",
        "Date,kWh\n" + "".join(f"2023-01-{d:02},{d}\n" for d in range(5, 17)),
        [(f"2023-01-{d:02}", f"2023-01-{d + 1:02}", float(d)) for d in range(5, 17)],
        reading=("each line is the use of its day",),
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
