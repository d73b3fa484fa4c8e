"""What a file does not settle is asked, once, with the line that answers it; and what is no
bill file gives one clear message.
"""

from __future__ import annotations

import io
import os
import subprocess
import sys
import zipfile
from pathlib import Path
from typing import Any

import pytest

from normalize.bills.read import read_bills
from normalize.errors import (
    AmbiguousBills,
    BillError,
    MissingFile,
    NoBills,
    NormalizeError,
    UnknownUnit,
    UnreadableBills,
)

H = "Start,End,Therms\n"
PLAIN = H + "2023-01-05,2023-02-06,81\n2023-02-06,2023-03-07,70.5\n"


# text, options, words of the question, the answers that settle it.
QUESTIONS: dict[str, tuple[str, dict[str, Any], str, list[dict[str, Any]]]] = {
    "day and month": (
        "Start,End,Days,Therms\n1/5/2023,6/7/2023,1,81\n6/7/2023,9/9/2023,1,70.5\n",
        {},
        'dates = "month first" or dates = "day first"',
        [{"dates": "month first"}, {"dates": "day first"}],
    ),
    "inclusive or exclusive ends": (
        H + "2023-01-05,2023-02-06,81\n2023-05-09,2023-06-07,70.5\n",
        {},
        'end_dates = "inclusive" or end_dates = "exclusive"',
        [{"end_dates": "inclusive"}, {"end_dates": "exclusive"}],
    ),
    "unit": (
        "Start,End,Usage\n2023-01-05,2023-02-06,81\n2023-02-06,2023-03-07,70\n",
        {"fuel": "natural gas"},
        'unit = "therm" or unit = "ccf"',
        [{"unit": "therm"}],
    ),
    "fuel": (
        "Start,End,Gallons\n2023-01-05,2023-02-06,81\n2023-02-06,2023-03-07,70\n",
        {},
        'fuel = "heating oil" or fuel = "propane" or fuel = "kerosene"',
        [{"fuel": "propane"}],
    ),
    "two fuels": (
        "Start,End,kWh,Therms\n2023-01-05,2023-02-06,81,3\n2023-02-06,2023-03-07,70,4\n",
        {},
        'fuel = "electricity" or fuel = "natural gas"',
        [{"fuel": "electricity"}],
    ),
    "two usage columns": (
        "Start,End,Usage (kWh),Consumption (kWh)\n2023-01-05,2023-02-06,81,3\n"
        "2023-02-06,2023-03-07,70,4\n",
        {},
        'usage_column = "Usage (kWh)"',
        [{"usage_column": "Consumption (kWh)"}],
    ),
    "two meters": (
        "Meter No,Start,End,Therms\n991234,2023-01-05,2023-02-06,81\n"
        "995678,2023-01-05,2023-02-06,70\n"
        "991234,2023-02-06,2023-03-07,8\n",
        {},
        'rows = "1234" or rows = "5678"',
        [{"rows": "1234"}, {"rows": "991234"}],
    ),
    "temperature": (
        "Start,End,Therms,temp\n2023-01-05,2023-02-06,81,3\n2023-02-06,2023-03-07,70,4\n",
        {},
        'temperature_unit = "F"',
        [{"temperature_unit": "C"}],
    ),
    "decimal mark": (
        "Start;End;kWh\n2023-01-05;2023-02-06;1,234\n2023-02-06;2023-03-07;1,100\n",
        {},
        'decimal = "point" or decimal = "comma"',
        [{"decimal": "comma"}],
    ),
    "bill date only": (
        "Bill Date,Therms\n2023-01-05,81\n2023-02-06,70\n",
        {},
        'end_column = "Bill Date"',
        [{"end_column": "Bill Date"}],
    ),
    "MBtu": (
        "Start,End,Usage (MBtu)\n2023-01-05,2023-02-06,81\n2023-02-06,2023-03-07,70.5\n",
        {"fuel": "natural gas"},
        "kBtu for a thousand or MMBtu for a million",
        [],
    ),
}


@pytest.mark.parametrize(
    ("text", "options"),
    [
        (H + "2023-01-05,2023-02-06,81\n", {}),
        (H + "1/5/2023,2/6/2023,81\nTotal,,81\n", {}),
        ("Month,Usage\nJan-23,81\n", {"fuel": "natural gas"}),
        ("Start;End;kWh\n2023-01-05;2023-02-06;1,234\n", {}),
    ],
)
def test_one_bill_alone_is_not_asked_about(
    text: str, options: dict[str, Any], tmp_path: Path
) -> None:
    """No answer could make one bill enough; what is needed is said instead."""
    file = tmp_path / "bills.csv"
    file.write_text(text)
    with pytest.raises(NoBills, match="one bill alone cannot show") as told:
        read_bills(file, **options)
    assert "At least 270 days of bills on each side of the work" in str(told.value)
    assert "Put " not in str(told.value)


def test_one_bill_with_the_answer_given_is_read(tmp_path: Path) -> None:
    file = tmp_path / "bills.csv"
    file.write_text(H + "2023-01-05,2023-02-05,81\n")
    bills = read_bills(file, end_dates="inclusive")
    assert bills.periods.days.tolist() == [32]
    assert any("One bill alone" in said for said in bills.cautions)


@pytest.mark.parametrize("name", QUESTIONS)
def test_question(name: str, tmp_path: Path) -> None:
    text, options, words, answers = QUESTIONS[name]
    file = tmp_path / "bills.csv"
    file.write_text(text)
    with pytest.raises((AmbiguousBills, UnknownUnit)) as asked:
        read_bills(file, **options)
    assert words in str(asked.value)
    assert str(asked.value).startswith("bills.csv")
    for answer in answers:
        assert read_bills(file, **options, **answer).periods.n >= 1


def test_answers_change_what_is_read(tmp_path: Path) -> None:
    file = tmp_path / "bills.csv"
    file.write_text(H + "2023-01-05,2023-02-06,81\n2023-05-09,2023-06-07,70.5\n")
    days = {
        a: read_bills(file, end_dates=a).periods.days.tolist() for a in ("inclusive", "exclusive")
    }
    assert days == {"inclusive": [33, 30], "exclusive": [32, 29]}


def test_several_likely_sheets(tmp_path: Path) -> None:
    from openpyxl import Workbook

    book = Workbook()
    for title, use in (("Gas", 81.0), ("Old", 5.0)):
        sheet = book.create_sheet(title)
        for row in (["Start", "End", "Therms"], ["2023-01-05", "2023-02-06", use],
                    ["2023-02-06", "2023-03-07", use]):  # fmt: skip
            sheet.append(row)
    del book["Sheet"]
    file = tmp_path / "b.xlsx"
    book.save(file)
    with pytest.raises(AmbiguousBills, match='sheet = "Gas"'):
        read_bills(file)
    assert read_bills(file, sheet="Gas").periods.use.tolist() == [81.0, 81.0]
    with pytest.raises(UnreadableBills, match="no sheet is called 'Oil'"):
        read_bills(file, sheet="Oil")


@pytest.mark.parametrize(
    ("options", "words"),
    [
        ({"dates": "us"}, "month first"),
        ({"end_dates": "both"}, "exclusive or inclusive"),
        ({"kind": "tank"}, "meter or delivery"),
        ({"fuel": "plutonium"}, "no fuel is called"),
        ({"unit": "furlong"}, "no unit is called"),
        ({"unit": "kWh"}, "but unit says kWh"),
        ({"usage_column": "Gas"}, "no column is called 'Gas'"),
        ({"rows": "7"}, "no column of accounts"),
        ({"fuel": "electricity"}, "no usage column is in a unit of electricity"),
        ({"sheet": "x"}, "no XLSX workbook"),
    ],
)
def test_answers_that_do_not_fit(options: dict[str, Any], words: str, tmp_path: Path) -> None:
    file = tmp_path / "bills.csv"
    file.write_text(PLAIN)
    with pytest.raises(BillError, match=words):
        read_bills(file, **options)


# --- Nonsense in, one clear message out ---------------------------------------------------

NONSENSE: dict[str, tuple[bytes, str]] = {
    "empty": (b"", "the file is empty"),
    "blank": (b"\n \n\t\n", "the file is empty"),
    "header alone": (H.encode(), "no bill beneath it"),
    "no header": (b"2023-01-05,2023-02-06,81\n2023-02-06,2023-03-07,70\n", "no line looks like"),
    "prose": (b"Dear customer, please find your bill attached.\n", "no line looks like"),
    "no usage": (b"Start,End,Cost\n2023-01-05,2023-02-06,81\n", "no column looks like usage"),
    "meter readings": (b"Read date,Meter reading\n2023-01-05,5012\n", "which fuel"),
    "no dates": (b"Month,Therms\nJanuary,81\nFebruary,70\n", "names months"),
    "months": (b"Month,Therms\nJan-23,81\nFeb-23,70\n", "names months"),
    "months as dates": (b"Date,Therms\n2023-01,81\n2023-02,70\n", "names months, but not the days"),
    "starts alone": (b"Start,Therms\n2023-01-05,81\n", "no end dates"),
    "all text": (H.encode() + b"2023-01-05,2023-02-06,lots\n", "cannot be used"),
    "all estimated": (
        b"Start,End,Est,Therms\n2023-01-05,2023-02-06,Y,8\n2023-02-06,2023-03-07,Y,7\n",
        "none of 2 bills can be used",
    ),
    "one reading": (b"Read date,Therms\n2023-01-05,81\n", "opens the record"),
    "binary": (bytes(range(256)) * 20, "no text"),
    "NUL": (PLAIN.encode() + b"\0", "no text"),
    "old workbook": (b"\xd0\xcf\x11\xe0" + b"\0" * 600, "old Excel workbook"),
    "PDF": (b"%PDF-1.7 ...", "this is a PDF"),
    "gzip": (b"\x1f\x8b\x08...", "compressed"),
    "XML": (b"<?xml version='1.0'?><feed/>", "XML or HTML"),
    "broken zip": (b"PK\x03\x04garbage", "cannot be read"),
    "open quote": (H.encode() + b'2023-01-05,"' + b"x\n" * 90_000, "split into columns"),
    "a very long line": (H.encode() + b"x," * 60_000, "a line of more than"),
    "very many lines": (H.encode() + b"\n" * 1_000_001, "more than 1,000,000 lines"),
    "a very long cell": (H.encode() + b"2023-01-05,2023-02-06," + b"9" * 6000, "a cell"),
    "many columns": (H.encode() + b"," * 1000, "more than 500 columns"),
    "year 0 and month 13": (H.encode() + b"0000-01-01,2023-13-01,5\n", "the one bill there is"),
}  # fmt: skip


@pytest.mark.parametrize("name", NONSENSE)
def test_nonsense(name: str, tmp_path: Path) -> None:
    data, words = NONSENSE[name]
    file = tmp_path / "bills.csv"
    file.write_bytes(data)
    with pytest.raises(BillError) as said:
        read_bills(file)
    assert words in str(said.value)
    assert "bills.csv" in str(said.value)
    assert len(str(said.value)) < 700


def test_folder_missing_file_odd_name(tmp_path: Path) -> None:
    with pytest.raises(UnreadableBills, match="this is a folder"):
        read_bills(tmp_path)
    with pytest.raises(MissingFile, match="no such file"):
        read_bills(tmp_path / "gone.csv")
    with pytest.raises(NormalizeError):
        read_bills("bills\0.csv")


@pytest.mark.skipif(not hasattr(os, "mkfifo"), reason="no pipes on this system")
def test_a_pipe_does_not_hang(tmp_path: Path) -> None:
    os.mkfifo(tmp_path / "pipe.csv")
    with pytest.raises(UnreadableBills, match="not an ordinary file"):
        read_bills(tmp_path / "pipe.csv")


def _zip(parts: dict[str, bytes]) -> bytes:
    out = io.BytesIO()
    with zipfile.ZipFile(out, "w", zipfile.ZIP_DEFLATED) as packed:
        for name, data in parts.items():
            packed.writestr(name, data)
    return out.getvalue()


SHELL = {"[Content_Types].xml": b"<Types/>", "xl/workbook.xml": b"<workbook/>"}


@pytest.mark.parametrize(
    ("parts", "words"),
    [
        ({"a.txt": b"x"}, "no XLSX workbook"),
        ({**SHELL, "xl/worksheets/sheet1.xml": b" " * 5_000_000}, "times its size"),
        ({**SHELL, **{f"xl/p{k}.xml": b"" for k in range(2100)}}, "parts"),
        ({**SHELL, "../../evil.xml": b"<x/>"}, "leads out"),
        ({**SHELL, "xl/s.xml": b'<!DOCTYPE x [<!ENTITY a "b">]><x/>'}, "entities"),
        ({**SHELL, "xl/inner.zip": b"PK"}, "another archive"),
        (SHELL, "cannot be read"),
    ],
)
def test_hostile_workbooks(parts: dict[str, bytes], words: str, tmp_path: Path) -> None:
    file = tmp_path / "bills.xlsx"
    file.write_bytes(_zip(parts))
    with pytest.raises(UnreadableBills, match=words):
        read_bills(file)


def test_damaged_workbooks_give_one_message(tmp_path: Path) -> None:
    """Seeded damage to a good workbook, in its zip and in its XML: no traceback."""
    import random

    from openpyxl import Workbook

    book, out = Workbook(), io.BytesIO()
    assert book.active is not None
    for row in (["Start", "End", "Therms"], ["2023-01-05", "2023-02-06", 8], ["x", None, "=A1"]):
        book.active.append(row)
    book.save(out)
    good, file, chance = out.getvalue(), tmp_path / "bills.xlsx", random.Random(5)
    refused = 0
    for _ in range(150):
        data = bytearray(good)
        for _ in range(chance.choice([1, 3, 30])):
            data[chance.randrange(len(data))] = chance.randrange(256)
        file.write_bytes(bytes(data[: chance.choice([len(data), chance.randrange(4, len(data))])]))
        try:
            read_bills(file, end_dates="exclusive")
        except NormalizeError as err:
            refused += 1
            assert "bills.xlsx" in str(err)  # noqa: PT017 (only some of the files are refused)
    assert refused > 50


def test_accounts_and_addresses_stay_private(tmp_path: Path) -> None:
    file = tmp_path / "bills.csv"
    file.write_text(
        "Account,Service address,Start,End,Therms\n"
        "4400123456789,12 Quince Street,2023-01-05,2023-02-06,4400123456789 Quince\n"
        "4400987654321,14 Quince Street,2023-02-06,2023-03-07,8\n"
    )
    with pytest.raises(AmbiguousBills) as asked:
        read_bills(file)
    with pytest.raises(NormalizeError) as failed:
        read_bills(file, rows="6789")
    for text in (str(asked.value), str(failed.value)):
        assert "4400123456789" not in text
        assert "Street" not in text
        assert "4400987654321" not in text
    assert "…6789" in str(asked.value)


def test_reading_bills_loads_no_pandas_and_no_openpyxl() -> None:
    code = (
        "import sys, normalize.bills.read; "
        "print([m for m in ('pandas', 'openpyxl', 'matplotlib') if m in sys.modules])"
    )
    root = Path(__file__).resolve().parents[2]
    done = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, check=True, cwd=root
    )
    assert done.stdout.strip() == "[]"


def test_no_bills_names_the_commonest_reason(tmp_path: Path) -> None:
    file = tmp_path / "bills.csv"
    file.write_text(H + "2023-01-05,2023-02-06,x\n2023-02-06,2023-03-07,x\n2023-03-07,,1\n")
    with pytest.raises(NoBills, match="2 because: usage 'x' is not a number"):
        read_bills(file)
