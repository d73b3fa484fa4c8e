"""Files made to hurt, generated, for tests and for the measurement in tests/prove/bills_hostile.py.

Each maker writes one file; what must happen is a clear error or an ordinary answer, in bounded
time and memory.
"""

from __future__ import annotations

import io
import zipfile
from collections.abc import Callable
from pathlib import Path

from tests.bills.espi_makers import DAY, HEAD, JAN, gas, reading

BODY = "2023-01-05,2023-02-06,81\n2023-02-06,2023-03-07,70.5\n"
TABLE = "Start,End,Therms\n" + BODY
BOMB = (
    "<!DOCTYPE feed ["
    + '<!ENTITY a0 "aaaaaaaaaa">'
    + "".join(f'<!ENTITY a{k + 1} "{f"&a{k};" * 10}">' for k in range(9))
    + "]>"
)
ABSURD = ("nan", "inf", "1e308", "9" * 400)
SHEET = '<worksheet xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main"><sheetData>'


def workbook(**parts: bytes) -> bytes:
    """An XLSX from openpyxl with some parts replaced or added. parts : name → bytes."""
    from openpyxl import Workbook

    book = Workbook()
    sheet = book.active
    assert sheet is not None
    for line in TABLE.splitlines():
        sheet.append(line.split(","))
    packed = io.BytesIO()
    book.save(packed)
    out = io.BytesIO()
    new = dict(parts)
    with (
        zipfile.ZipFile(packed) as old,
        zipfile.ZipFile(out, "w", zipfile.ZIP_DEFLATED) as zipped,
    ):
        for name in old.namelist():
            zipped.writestr(name, new.pop(name, old.read(name)))
        for name, data in new.items():
            zipped.writestr(name, data)
    return out.getvalue()


def _sparse(path: Path, size: int, head: bytes = b"") -> None:
    with path.open("wb") as stream:
        stream.write(head)
        stream.truncate(size)


def gigabyte_line(path: Path) -> None:
    """One line of a gigabyte, written sparsely: its bytes are NUL, its size is real."""
    _sparse(path, 1_000_000_000, b"Start,End,Therms\n")


def long_line(path: Path) -> None:
    """One line just under the limit of a file's size."""
    path.write_bytes(b"Start,End,Therms\n" + b"7" * 99_000_000)


MAKERS: dict[str, Callable[[Path], None]] = {
    "entity bomb (ten to the ninth)": lambda p: p.write_text(BOMB + "<feed>&a9;</feed>") and None,
    "entity bomb behind a declaration, UTF-16": lambda p: (
        p.write_bytes(
            (HEAD.replace("UTF-8", "UTF-16") + BOMB + "<feed>&a9;</feed>").encode("utf-16")
        )
        and None
    ),
    "quadratic entity": lambda p: (
        p.write_text(f'<!DOCTYPE f [<!ENTITY a "{"a" * 100_000}">]><f>{"&a;" * 100_000}</f>')
        and None
    ),
    "external entity": lambda p: (
        p.write_text('<!DOCTYPE f [<!ENTITY a SYSTEM "file:///etc/passwd">]><f>&a;</f>') and None
    ),
    "document type far behind a comment": lambda p: (
        p.write_text(HEAD + f"<!--{'x' * 200_000}-->" + BOMB + "<feed>&a9;</feed>") and None
    ),
    "XML nested 100,000 deep": lambda p: p.write_text("<a>" * 100_000) and None,
    "XML of 300,000 daily readings": lambda p: (
        p.write_text(gas([reading(JAN + DAY * k, DAY, 1) for k in range(300_000)])) and None
    ),
    "XML values nan, inf, 1e308": lambda p: (
        p.write_text(gas([reading(JAN + DAY * k, DAY, v) for k, v in enumerate(ABSURD)])) and None
    ),
    "workbook: a part of 190 MB of spaces": lambda p: (
        p.write_bytes(workbook(**{"xl/worksheets/sheet1.xml": SHEET.encode() + b" " * 190_000_000}))
        and None
    ),
    "workbook: entities in a sheet": lambda p: (
        p.write_bytes(
            workbook(
                **{"xl/worksheets/sheet1.xml": (BOMB + "<worksheet>&a9;</worksheet>").encode()}
            )
        )
        and None
    ),
    "workbook: a name that leads out": lambda p: (
        p.write_bytes(workbook(**{"../evil.xml": b"x"})) and None
    ),
    "workbook: an archive inside": lambda p: (
        p.write_bytes(workbook(**{"xl/inner.zip": workbook()})) and None
    ),
    "workbook: 16,384 columns": lambda p: (
        p.write_bytes(
            workbook(
                **{
                    "xl/worksheets/sheet1.xml": (
                        SHEET
                        + '<row r="1">'
                        + "".join("<c><v>1</v></c>" for _ in range(16_384))
                        + "</row></sheetData></worksheet>"
                    ).encode()
                }
            )
        )
        and None
    ),
    "workbook: a row number of a million": lambda p: (
        p.write_bytes(
            workbook(
                **{
                    "xl/worksheets/sheet1.xml": (
                        SHEET + '<row r="1048576"><c r="A1048576"><v>1</v></c></row></sheetData>'
                        "</worksheet>"
                    ).encode()
                }
            )
        )
        and None
    ),
    "a million columns": lambda p: (
        p.write_text("Start,End,Therms" + ",x" * 1_000_000 + "\n" + BODY) and None
    ),
    "a million columns below the header": lambda p: p.write_text(TABLE + "1," * 1_000_000) and None,
    "one line of 1 GB": gigabyte_line,
    "one line of 99 MB": long_line,
    "a quotation mark that never closes, 20 MB": lambda p: (
        p.write_text('Start,End,Therms\n"' + BODY * 400_000) and None
    ),
    "20 million empty lines": lambda p: p.write_text(TABLE + "\n" * 20_000_000) and None,
    "interval file of 2 million broken lines": lambda p: (
        p.write_text(
            "Timestamp,kWh\n"
            + "".join(f"2023-01-13 {h:02}:00,0.5\n" for h in range(24))
            + "x:y,\n" * 2_000_000
        )
        and None
    ),
    "interval file across all years": lambda p: (
        p.write_text(
            "Timestamp,kWh\n"
            + "".join(f"2023-01-13 {h:02}:00,0.5\n" for h in range(24))
            + "0001-01-01 00:00,1\n9999-12-31 00:00,1\n1900-01-01 00:00,1\n2099-12-31 00:00,1\n"
        )
        and None
    ),
    "interval file of nan, inf, 1e308": lambda p: (
        p.write_text(
            "Timestamp,kWh\n"
            + "".join(
                f"2023-01-13 {h:02}:00,{v}\n"
                for h, v in enumerate(["nan", "inf", "-inf", "1e308", "9" * 400, "1e-320"] * 4)
            )
        )
        and None
    ),
    "formulas as text": lambda p: (
        p.write_text(
            "Start,End,Therms,Notes\n2023-01-05,2023-02-06,=1+1,=cmd()\n"
            "2023-02-06,2023-03-07,+70.5,@SUM(A1)\n"
        )
        and None
    ),
    "nan, inf and 1e308": lambda p: (
        p.write_text(
            "Start,End,Therms\n2023-01-05,2023-02-06,nan\n2023-02-06,2023-03-07,inf\n"
            "2023-03-07,2023-04-06,1e308\n2023-04-06,2023-05-06," + "9" * 400 + "\n"
        )
        and None
    ),
    "years 1 and 9999": lambda p: (
        p.write_text("Start,End,Therms\n0001-01-01,0001-02-01,81\n9999-11-30,9999-12-31,70.5\n")
        and None
    ),
    "NUL bytes": lambda p: p.write_bytes(TABLE.replace("81", "8\0001").encode()) and None,
    "NUL bytes only": lambda p: p.write_bytes(b"\0" * 10_000) and None,
    "random bytes": lambda p: (
        p.write_bytes(bytes((k * 7919 + k * k) % 256 for k in range(50_000))) and None
    ),
}
# These have an ordinary answer: what is bad in them is left out and told.
READABLE = {
    "formulas as text",
    "interval file of 2 million broken lines",
    "interval file across all years",
}
SLOW = {"one line of 99 MB", "XML of 300,000 daily readings", "20 million empty lines"}
