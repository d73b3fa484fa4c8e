"""Small ugly files: what is wrong with each, and what must come out.

All are invented; the expected values are read off the file by eye.  Formats of dates and
numbers: general practice of the trade (common practice, no source).
"""

from __future__ import annotations

from dataclasses import dataclass, field
from datetime import date
from pathlib import Path
from typing import Any

import pytest

from normalize.bills.periods import Bills
from normalize.bills.read import read_bills
from normalize.days import iso


@dataclass
class Ugly:
    """wrong : what is wrong with the file.  periods : (start, end, use) that must come out.
    left_out : line → words of the reason.  reading, cautions : words that must be said.
    """

    wrong: str
    text: str | bytes
    periods: list[tuple[str, str, float]]
    options: dict[str, Any] = field(default_factory=dict)
    left_out: dict[int, str] = field(default_factory=dict)
    reading: tuple[str, ...] = ()
    cautions: tuple[str, ...] = ()
    costs: list[float] | None = None
    unit: str | None = None
    fuel: str | None = None
    temps: list[float] | None = None


JFM = [("2023-01-05", "2023-02-06", 81.0), ("2023-02-06", "2023-03-07", 70.5)]
GAS = {"fuel": "natural gas"}

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
        "year, month and day in columns of their own, month in words, years of two digits",
        "Year,Month,Day,Days,Therms\n23,Feb,6,32,81\n23,March,7,29,70.5\n",
        JFM,
    ),
    Ugly(
        "no names to recognise: every column is named by the user",
        "A,B,C\n2023-01-05,2023-02-06,81\n2023-02-06,2023-03-07,70.5\n",
        JFM,
        {"start_column": "A", "end_column": "B", "usage_column": "C", "unit": "therm"},
    ),
    Ugly(
        "only the date of the bill, accepted by the user",
        "Invoice date,Days,Therms\n2023-02-06,32,81\n2023-03-07,29,70.5\n",
        JFM,
        {"end_column": "Invoice date"},
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
    Ugly(
        "ragged lines, spare columns, spaces and hard spaces",
        "Start , End,\u00a0Therms ,,\n 2023-01-05 ,2023-02-06,\u00a081\u00a0,,,,\n"
        "2023-02-06,2023-03-07,70.5\n",
        JFM,
    ),
    Ugly(
        "cancel and rebill, in the words of a file",
        "Start,End,Therms,Cost\n2023-01-05,2023-02-06,810,900\n2023-02-06,2023-03-07,70.5,88\n"
        "2023-01-05,2023-02-06,-810,-900\n2023-01-05,2023-02-06,81,95\n",
        JFM,
        costs=[95.0, 88.0],
    ),
    Ugly(
        "a formula and markup in cells that are not used",
        'Start,End,Therms,Notes\n2023-01-05,2023-02-06,81,"=cmd()"\n'
        "2023-02-06,2023-03-07,70.5,<script>x</script>\n",
        JFM,
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
        "fuel named by a service: electric use beside gas",
        "Type,Start,End,Usage,Units\nNatural gas usage,2023-01-05,2023-02-06,81,therms\n"
        "Natural gas usage,2023-02-06,2023-03-07,70.5,therms\n"
        "Electric usage,2023-01-05,2023-02-06,700,kWh\n",
        JFM,
        GAS,
    ),
    Ugly(
        "a daily record: each line is the use of its day",
        "Date,kWh\n" + "".join(f"2023-01-{d:02},{d}\n" for d in range(5, 17)),
        [(f"2023-01-{d:02}", f"2023-01-{d + 1:02}", float(d)) for d in range(5, 17)],
        reading=("each line is the use of its day",),
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


def read(case: Ugly, folder: Path) -> Bills:
    file = folder / "bills.csv"
    file.write_bytes(case.text if isinstance(case.text, bytes) else case.text.encode())
    return read_bills(file, **case.options)


def periods_of(bills: Bills) -> list[tuple[str, str, float]]:
    p = bills.periods
    return [
        (iso(int(a)), iso(int(b)), round(float(u), 9))
        for a, b, u in zip(p.start, p.end, p.use, strict=True)
    ]


@pytest.mark.parametrize("case", CORPUS, ids=lambda c: c.wrong)
def test_ugly_file(case: Ugly, tmp_path: Path) -> None:
    bills = read(case, tmp_path)
    assert periods_of(bills) == case.periods
    for line, words in case.left_out.items():
        entry = next(e for e in bills.ledger if e.line == line)
        assert entry.fate == "left out"
        assert words in entry.note
    for words in case.reading:
        assert any(words in sentence for sentence in bills.reading), bills.reading
    for words in case.cautions:
        assert any(words in sentence for sentence in bills.cautions), bills.cautions
    if case.costs is not None:
        assert bills.periods.cost.tolist() == pytest.approx(case.costs)
    if case.temps is not None:
        assert bills.periods.mean_temp_f is not None
        assert bills.periods.mean_temp_f.tolist() == pytest.approx(case.temps)
    assert bills.unit == (case.unit or bills.unit)
    assert bills.fuel == (case.fuel or bills.fuel)


@pytest.mark.parametrize("case", CORPUS, ids=lambda c: c.wrong)
def test_round_trip(case: Ugly, tmp_path: Path) -> None:
    """read → write → read gives the same periods."""
    from normalize.bills.write import write_periods

    bills = read(case, tmp_path)
    out = tmp_path / "clean.csv"
    write_periods(bills, out)
    again = read_bills(out, kind=bills.kind)
    assert periods_of(again) == periods_of(bills)
    assert again.periods.use.tolist() == bills.periods.use.tolist()
    assert (again.fuel, again.unit) == (bills.fuel, bills.unit)
    assert [round(c, 9) for c in again.periods.cost if c == c] == [
        round(c, 9) for c in bills.periods.cost if c == c
    ]


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
