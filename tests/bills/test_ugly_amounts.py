"""Numbers, money and marks: thousands, credits, estimates, cancelled bills, deliveries, tanks."""

from __future__ import annotations

from pathlib import Path

import pytest

from tests.bills.ugly import JFM, Ugly, check_words, periods_of, read, written_and_read

CORPUS = [
    Ugly(
        "semicolons, decimal commas, thousands points, day first",
        "Von;From;To;kWh;Cost (€)\nx;05.01.2023;13.02.2023;1.234,5;95,10 €\n"
        "y;13.02.2023;15.03.2023;987,0;88,00 €\n",
        [("2023-01-05", "2023-02-13", 1234.5), ("2023-02-13", "2023-03-15", 987.0)],
        costs=[95.10, 88.0],
        unit="kWh",
        fuel="electricity",
        reading=("numbers have a decimal comma", "dates are day first"),
    ),
    Ugly(
        "a column of types tells how each bill was read, not whose it is",
        "Start,End,Therms,Type,Cost\n2023-01-05,2023-02-06,81,Estimated,95.10\n"
        "2023-02-06,2023-03-07,70.5,Actual,88\n",
        [("2023-01-05", "2023-03-07", 151.5)],
        reading=("mark of an estimated reading from column 'Type'",),
    ),
    Ugly(
        "thousands, brackets and CR for credits, dollar signs, dashes for nothing",
        'Start,End,kWh,Cost\n2023-01-05,2023-02-06,"1,281","$1,095.10"\n'
        "2023-02-06,2023-03-07,70.5,($88.00)\n2023-03-07,2023-04-06,60,5.00 CR\n"
        "2023-04-06,2023-05-06,--,\n",
        [
            ("2023-01-05", "2023-02-06", 1281.0),
            ("2023-02-06", "2023-03-07", 70.5),
            ("2023-03-07", "2023-04-06", 60.0),
        ],
        costs=[1095.10, -88.0, -5.0],
        left_out={5: "no usage given"},
    ),
    Ugly(
        "estimated marks in a column of A and E",
        "Start,End,Read Type,Therms\n2023-01-05,2023-02-06,E,81\n2023-02-06,2023-03-07,A,70.5\n",
        [("2023-01-05", "2023-03-07", 151.5)],
    ),
    Ugly(
        "column 'Actual?' asks the other way round",
        "Start,End,Actual?,Therms\n2023-01-05,2023-02-06,N,81\n2023-02-06,2023-03-07,Y,70.5\n",
        [("2023-01-05", "2023-03-07", 151.5)],
    ),
    Ugly(
        "estimate marked behind the number",
        "Start,End,Therms\n2023-01-05,2023-02-06,81 E\n2023-02-06,2023-03-07,70.5 A\n",
        [("2023-01-05", "2023-03-07", 151.5)],
    ),
    Ugly(
        "estimate told in a remark; 'not estimated' is no estimate",
        "Start,End,Therms,Notes\n2023-01-05,2023-02-06,81,estimated reading\n"
        "2023-02-06,2023-03-07,70.5,not estimated\n",
        [("2023-01-05", "2023-03-07", 151.5)],
    ),
    Ugly(
        "cancel and rebill, in the words of a file",
        "Start,End,Therms,Cost\n2023-01-05,2023-02-06,810,900\n2023-02-06,2023-03-07,70.5,88\n"
        "2023-01-05,2023-02-06,-810,-900\n2023-01-05,2023-02-06,81,95\n",
        JFM,
        costs=[95.0, 88.0],
    ),
    Ugly(
        "an oil dealer's list, with full and partial fills",
        "Delivery Date,Gallons Delivered,Fill\n2022-10-01,150,full\n2022-12-01,120,full\n"
        "2023-01-05,60,partial\n2023-02-01,110,full\n2023-03-01,40,partial\n",
        [("2022-10-01", "2022-12-01", 120.0), ("2022-12-01", "2023-02-01", 170.0)],
        {"fuel": "oil"},
        left_out={2: "opens the record", 6: "partial fill, and no full fill follows"},
        unit="gal",
        fuel="heating oil",
    ),
    Ugly(
        "deliveries without a word about fills; two on one day",
        "Date,Gallons\n2022-10-01,150\n2022-12-01,100\n2022-12-01,20\n2023-02-01,170\n",
        [("2022-10-01", "2022-12-01", 120.0), ("2022-12-01", "2023-02-01", 170.0)],
        {"fuel": "propane"},
        cautions=("every one counts as a full fill",),
    ),
    Ugly(
        "a record that begins with a partial fill, and a delivery without amount",
        "Delivery date,Gallons,Full?\n2022-09-01,50,N\n2022-10-01,150,Y\n2022-12-01,120,Y\n"
        "2023-01-01,,Y\n2023-02-01,110,Y\n2023-03-01,100,Y\n",
        [("2022-10-01", "2022-12-01", 120.0), ("2023-02-01", "2023-03-01", 100.0)],
        {"fuel": "oil"},
        left_out={
            2: "before the first full fill",
            5: "no amount given",
            6: "opens the record again",
        },
    ),
    Ugly(
        "tank levels make partial fills count",
        "Delivery date,Gallons delivered,Tank % after\n2022-12-01,100,90\n2023-01-05,50,60\n"
        "2023-02-06,61,50\n2023-03-07,120.5,75\n",
        [("2022-12-01", "2023-01-05", 110.0), *[(a, b, u) for a, b, u in JFM]],
        {"fuel": "heating oil", "tank_size": 200},
        left_out={2: "opens the record"},
        reading=("by the levels of the tank",),
    ),
    Ugly(
        "tank levels before the delivery, size in a column",
        "Delivery date,Gallons,Tank % before,Tank size\n2023-01-05,150,20,200\n"
        "2023-02-06,40,54.5,200\n2023-03-07,90,39.25,200\n",
        JFM,
        {"fuel": "propane"},
        left_out={2: "opens the record"},
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
