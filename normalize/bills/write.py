"""Write bills: the template to fill in, and cleaned periods that read back the same.

What belongs here: CSV and XLSX out, guarded so that no cell can act as a formula in a
spreadsheet.
"""

from __future__ import annotations

import csv
import io
import math
import os
import re
import zipfile
from collections.abc import Iterable, Sequence
from datetime import UTC, datetime
from pathlib import Path
from typing import TYPE_CHECKING

from normalize.bills.periods import Bills
from normalize.days import iso
from normalize.errors import UnwritableReport

if TYPE_CHECKING:
    from openpyxl.worksheet.datavalidation import DataValidation

TEMPLATE = ("start", "end", "usage", "unit", "cost", "estimated")
_TRIGGERS = "=+-@\t\r\0\uff1d\uff0b\uff0d\uff20"  # also the full-width forms of = + - @


def safe_text(text: str) -> str:
    """Text for a cell; an apostrophe before what a spreadsheet would run as a formula.

    >>> safe_text("=1+1"), safe_text(" @x"), safe_text("gas")
    ("'=1+1", "' @x", 'gas')
    """
    cleaned = text.replace("\0", "")
    bare = cleaned.lstrip()
    risky = cleaned[:1] in tuple(_TRIGGERS) or bare[:1] in tuple(_TRIGGERS)
    return "'" + cleaned if cleaned and risky else cleaned


def write_template(path_csv: str | os.PathLike[str]) -> None:
    """Write a CSV with the headings that read_bills knows, to be filled in.

    start : first day of the bill.  end : the day of the reading at its end, on which the next
    bill starts.  Raises UnwritableReport; an existing file is not overwritten.
    """
    _write(path_csv, _csv([TEMPLATE]), overwrite=False)


HELP = (
    ("start", "The day on which the bill begins: the day of the reading before. 2023-01-05"),
    ("end", "The day of the reading at its end, on which the next bill starts. 2023-02-06"),
    ("usage", "What was used, as a number: 81"),
    ("unit", "Of the usage, the same on every line: therm, ccf, kWh, gal, L, cord …"),
    ("cost", "What the bill came to, if you have it: 95.10"),
    ("estimated", "yes where the meter was not read but guessed; else leave it empty"),
)
HELP_TITLE = "One line for each bill, oldest or newest first. Fill in the sheet 'bills'."
_FIXED_DATE = datetime(2000, 1, 1, tzinfo=UTC)  # the same bytes each time
_UNITS = (
    "therm", "ccf", "Mcf", "m3", "kWh", "MWh", "gal", "L", "cord", "short ton", "lb", "Mlb",
)  # fmt: skip
_LINES = 1000  # that carry the checks of the template
_WIDE = 78


def write_template_workbook(path: str | os.PathLike[str]) -> None:
    """Write the template as XLSX: a sheet to fill in that checks what is typed, and a help sheet.

    Raises UnwritableReport; an existing file is not overwritten.
    """
    from openpyxl import Workbook

    book = Workbook()
    sheet = book.active
    if sheet is None:  # a new workbook has one
        sheet = book.create_sheet()
    sheet.title = "bills"
    sheet.append(list(TEMPLATE))
    sheet.freeze_panes = "A2"
    for letter in "ABCDEF":
        sheet.column_dimensions[letter].width = 14
    for letter in "AB":
        for line in range(2, 202):
            sheet[f"{letter}{line}"].number_format = "yyyy-mm-dd"
    for check in _checks():
        sheet.add_data_validation(check)
    guide = book.create_sheet("help")
    guide.append([HELP_TITLE])
    for heading, words in HELP:
        guide.append([heading, words])
    guide.column_dimensions["B"].width = _WIDE
    book.properties.created = book.properties.modified = _FIXED_DATE.replace(tzinfo=None)
    book.properties.creator = "normalize"
    packed = io.BytesIO()
    book.save(packed)
    _write_bytes(path, _same_bytes(packed.getvalue()))


def _checks() -> list[DataValidation]:
    """What each column of the template accepts, with the words of the refusal."""
    from openpyxl.worksheet.datavalidation import DataValidation

    dates = DataValidation("date", operator="between", formula1="DATE(1900,1,1)",
                           formula2="DATE(2099,12,31)", allow_blank=True)  # fmt: skip
    dates.error = "A day, such as 2023-01-05."
    numbers = DataValidation("decimal", operator="between", formula1="-1000000000",
                             formula2="1000000000", allow_blank=True)  # fmt: skip
    numbers.error = "A number, such as 81 or 95.10."
    units = DataValidation("list", formula1=f'"{",".join(_UNITS)}"', allow_blank=True)
    units.error = "One of the units of the list."
    marks = DataValidation("list", formula1='"yes,no"', allow_blank=True)
    marks.error = "yes or no, or nothing."
    for check, columns in ((dates, "AB"), (numbers, "CE"), (units, "D"), (marks, "F")):
        check.errorTitle = "Bills"
        check.showErrorMessage = True
        for letter in columns:
            check.add(f"{letter}2:{letter}{_LINES}")
    return [dates, numbers, units, marks]


def _same_bytes(data: bytes) -> bytes:
    """The same workbook with every part dated alike, so that it is the same file each time."""
    out = io.BytesIO()
    with (
        zipfile.ZipFile(io.BytesIO(data)) as old,
        zipfile.ZipFile(out, "w", zipfile.ZIP_DEFLATED) as new,
    ):
        for name in old.namelist():
            part = old.read(name)
            if name == "docProps/core.xml":
                part = re.sub(
                    rb"(<dcterms:modified[^>]*>)[^<]*", rb"\g<1>2000-01-01T00:00:00Z", part
                )
            new.writestr(zipfile.ZipInfo(name, (2000, 1, 1, 0, 0, 0)), part, zipfile.ZIP_DEFLATED)
    return out.getvalue()


def write_periods(bills: Bills, path: str | os.PathLike[str], *, overwrite: bool = False) -> None:
    """Write cleaned periods as CSV; read_bills gives the same periods back.

    Account names and numbers are not written.  Raises UnwritableReport.
    """
    p = bills.periods
    head = ["fuel", "start", "end", "days", f"usage ({bills.unit})", "cost"]
    temps = p.mean_temp_f
    if temps is not None:
        head.append("mean temperature (°F)")
    lines: list[Sequence[str]] = [head]
    for k in range(p.n):
        line = [
            safe_text(bills.fuel), iso(int(p.start[k])), iso(int(p.end[k])), str(int(p.days[k])),
            _number(float(p.use[k])), _number(float(p.cost[k])),
        ]  # fmt: skip
        if temps is not None:
            line.append(_number(float(temps[k])))
        lines.append(line)
    _write(path, _csv(lines), overwrite=overwrite)


def _number(value: float) -> str:
    """A number as a number, negative ones untouched; shortest digits that read back exactly."""
    if not math.isfinite(value):
        return ""
    return str(int(value)) if value.is_integer() and abs(value) < 1e15 else repr(value)


def _csv(lines: Iterable[Sequence[str]]) -> str:
    out = io.StringIO()
    csv.writer(out, lineterminator="\r\n").writerows(lines)
    return out.getvalue()


def _write(path: str | os.PathLike[str], text: str, *, overwrite: bool) -> None:
    _write_bytes(path, text.encode(), overwrite=overwrite)


def _write_bytes(path: str | os.PathLike[str], data: bytes, *, overwrite: bool = False) -> None:
    file = Path(path)
    try:
        with file.open("wb" if overwrite else "xb") as stream:
            stream.write(data)
    except FileExistsError:
        raise UnwritableReport(
            "there is a file of that name", where=file.name, next_step="Choose another name."
        ) from None
    except (OSError, ValueError) as err:
        reason = err.strerror if isinstance(err, OSError) and err.strerror else "its name is odd"
        raise UnwritableReport(f"the file cannot be written ({reason})", where=file.name) from None
