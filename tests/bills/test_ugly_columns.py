"""Which column is what: usage, fuels, accounts, units, temperatures, names the user gives."""

from __future__ import annotations

from pathlib import Path

import pytest

from tests.bills.ugly import GAS, JFM, Ugly, check_words, periods_of, read, written_and_read

CORPUS = [
    Ugly(
        "two fuels on one line",
        "Start,End,kWh,Therms,Gas cost,Electric cost\n2023-01-05,2023-02-06,500,81,90,70\n"
        "2023-02-06,2023-03-07,510,70.5,80,71\n",
        JFM,
        GAS,
        costs=[90.0, 80.0],
    ),
    Ugly(
        "two fuels on lines of their own, and water",
        "Service,Start,End,Usage,Unit\nGas,2023-01-05,2023-02-06,81,therms\n"
        "Electric,2023-01-05,2023-02-06,500,kWh\nWater,2023-01-05,2023-02-06,4,CCF\n"
        "Gas,2023-02-06,2023-03-07,70.5,therms\n",
        JFM,
        GAS,
        reading=("2 lines belong to other accounts, fuels or units",),
    ),
    Ugly(
        "two accounts, told apart by the last digits",
        "Account Number,Start,End,Therms\n0001234567,2023-01-05,2023-02-06,81\n"
        "0009999999,2023-01-05,2023-02-06,3\n0001234567,2023-02-06,2023-03-07,70.5\n",
        JFM,
        {"rows": "4567"},
    ),
    Ugly(
        "volume and therms beside each other: therms, and it is said",
        "Start,End,CCF,Therms\n2023-01-05,2023-02-06,78,81\n2023-02-06,2023-03-07,68,70.5\n",
        JFM,
        GAS,
        unit="therm",
        reading=("therms were taken rather than volume", "not used: 'CCF'"),
    ),
    Ugly(
        "volume and therms, volume asked for",
        "Start,End,CCF,Therms\n2023-01-05,2023-02-06,81,83\n2023-02-06,2023-03-07,70.5,72\n",
        JFM,
        {"fuel": "gas", "unit": "CCF"},
        unit="ccf",
    ),
    Ugly(
        "usage per day only",
        "Read date,Days,Therms per day\n2023-02-06,32,2.5\n2023-03-07,29,2\n",
        [("2023-01-05", "2023-02-06", 80.0), ("2023-02-06", "2023-03-07", 58.0)],
        reading=("per day, times the days",),
    ),
    Ugly(
        "demand, tiers, balances and meter readings beside the usage",
        "Account,Previous Read Date,Current Read Date,Meter Reading,Demand (kW),On-Peak kWh,"
        "Total kWh,Amount Due,Current Charges\n7,2023-01-05,2023-02-06,5123,4.4,30,81,500,95.1\n"
        "7,2023-02-06,2023-03-07,5193,4.1,31,70.5,600,88\n",
        JFM,
        costs=[95.1, 88.0],
    ),
    Ugly(
        "mean temperature in °C",
        "Start,End,Therms,Avg Temp (°C)\n2023-01-05,2023-02-06,81,-5\n"
        "2023-02-06,2023-03-07,70.5,0\n",
        JFM,
        temps=[23.0, 32.0],
    ),
    Ugly(
        "temperature without unit, above anything that °C could be",
        "Start,End,Therms,temp\n2023-01-05,2023-02-06,81,23\n2023-02-06,2023-03-07,70.5,61\n",
        JFM,
        temps=[23.0, 61.0],
    ),
    Ugly(
        "no names to recognise: every column is named by the user",
        "A,B,C\n2023-01-05,2023-02-06,81\n2023-02-06,2023-03-07,70.5\n",
        JFM,
        {"start_column": "A", "end_column": "B", "usage_column": "C", "unit": "therm"},
    ),
    Ugly(
        "fuel named by a service: electric use beside gas",
        "Type,Start,End,Usage,Units\nNatural gas usage,2023-01-05,2023-02-06,81,therms\n"
        "Natural gas usage,2023-02-06,2023-03-07,70.5,therms\n"
        "Electric usage,2023-01-05,2023-02-06,700,kWh\n",
        JFM,
        GAS,
    ),
    Ugly(
        "net metering with generation: gross is net and generation",
        "Start,End,Net usage (kWh),Solar generation (kWh)\n2023-01-05,2023-02-06,-19,100\n"
        "2023-02-06,2023-03-07,20.5,50\n",
        JFM,
        reading=("gross use is net use and column",),
    ),
    Ugly(
        "what came in, what went out and what the panels made",
        "Start,End,Delivered kWh,Exported kWh,Generation kWh\n2023-01-05,2023-02-06,60,79,100\n"
        "2023-02-06,2023-03-07,60,39.5,50\n",
        JFM,
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
