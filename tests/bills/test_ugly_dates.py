"""How dates are written, which of day and month comes first, and where a bill ends."""

from __future__ import annotations

from pathlib import Path

import pytest

from tests.bills.ugly import JFM, Ugly, check_words, periods_of, read, written_and_read

CORPUS = [
    Ugly(
        "newest first",
        "Start,End,Therms\n2023-02-06,2023-03-07,70.5\n2023-01-05,2023-02-06,81\n",
        JFM,
    ),
    Ugly(
        "inclusive ends: the next bill starts the day after",
        "Start,End,Therms\n2023-01-05,2023-02-05,81\n2023-02-06,2023-03-06,70.5\n",
        JFM,
        reading=("an end date is the last day of the bill",),
    ),
    Ugly(
        "one bill, ends settled by the days column",
        "Start,End,Days,Therms\n2023-01-05,2023-02-05,32,81\n",
        JFM[:1],
    ),
    Ugly(
        "reading date and days; day and month only settled by the 23rd",
        "Read Date,# Days,Therms\n2/6/2023,32,81\n3/7/2023,29,70.5\n3/23/2023,16,9\n",
        [*JFM, ("2023-03-07", "2023-03-23", 9.0)],
    ),
    Ugly(
        "order of day and month only settled by the pace of bills",
        "Read Date,kWh\n05/01/2023,9\n05/02/2023,70\n05/03/2023,60\n05/04/2023,50\n",
        [
            ("2023-01-05", "2023-02-05", 70.0),
            ("2023-02-05", "2023-03-05", 60.0),
            ("2023-03-05", "2023-04-05", 50.0),
        ],
        reading=("only so do the bills follow each other",),
    ),
    Ugly(
        "order of day and month only settled by the days column",
        "From,To,Days,kWh\n10/05/2020,11/04/2020,30,84\n11/04/2020,12/07/2020,33,132\n",
        [("2020-10-05", "2020-11-04", 84.0), ("2020-11-04", "2020-12-07", 132.0)],
        reading=("only so do they agree with the days column",),
    ),
    Ugly(
        "order of day and month only settled by the date of the bill",
        "Bill Date,From,To,Therms\n05/03/2023,01/02/2023,02/03/2023,84\n"
        "16/04/2023,02/03/2023,03/04/2023,13\n",
        [("2023-02-01", "2023-03-02", 84.0), ("2023-03-02", "2023-04-03", 13.0)],
        reading=("dates are day first",),
    ),
    Ugly(
        "order of day and month settled by readings and days, newest first",
        "Read date,Days,Therms\n12/07/2020,33,132\n11/04/2020,30,84\n10/05/2020,28,9\n",
        [
            ("2020-09-07", "2020-10-05", 9.0),
            ("2020-10-05", "2020-11-04", 84.0),
            ("2020-11-04", "2020-12-07", 132.0),
        ],
        reading=("agree with the days column",),
    ),
    Ugly(
        "both dates in one column",
        "Billing Period,Usage,Unit\n01/05/2023 - 02/06/2023,81,THERMS\n"
        "02/06/2023 - 03/17/2023,70.5,THERMS\n",
        [("2023-01-05", "2023-02-06", 81.0), ("2023-02-06", "2023-03-17", 70.5)],
        unit="therm",
    ),
    Ugly(
        "dates in words, with weekdays and times",
        'From,To,Usage (ccf)\n"Thu, Jan 5, 2023",6 February 2023 12:00 AM,81\n'
        "6-Feb-23,2023-03-07T00:00:00Z,70.5\n",
        JFM,
        unit="ccf",
    ),
    Ugly(
        "eight-digit dates; unit stands behind each number",
        "Start,End,Usage\n20230105,20230206,81 therms\n20230206,20230307,70.5 therms\n",
        JFM,
        unit="therm",
    ),
    Ugly(
        "day numbers of a spreadsheet in a CSV",
        "Start,End,Therms\n44931,44963,81\n44963,44992,70.5\n",
        JFM,
    ),
    Ugly(
        "year, month and day in columns of their own, month in words, years of two digits",
        "Year,Month,Day,Days,Therms\n23,Feb,6,32,81\n23,March,7,29,70.5\n",
        JFM,
    ),
    Ugly(
        "only the date of the bill, accepted by the user",
        "Invoice date,Days,Therms\n2023-02-06,32,81\n2023-03-07,29,70.5\n",
        JFM,
        {"end_column": "Invoice date"},
    ),
    Ugly(
        "days column that contradicts one bill's dates",
        "Start,End,Days,Therms\n2023-01-05,2023-02-06,32,81\n2023-02-06,2023-03-07,29,70.5\n"
        "2023-03-07,2023-04-06,3,9\n2023-04-06,2023-05-06,30,8\n2023-05-06,2023-06-06,31,7\n",
        [
            *JFM,
            ("2023-03-07", "2023-04-06", 9.0),
            ("2023-04-06", "2023-05-06", 8.0),
            ("2023-05-06", "2023-06-06", 7.0),
        ],
        cautions=("is 30 days, but the days column says 3",),
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
