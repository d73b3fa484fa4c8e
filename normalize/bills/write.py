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

    from normalize.bills.accounts import FileAccounts

TEMPLATE = ("start", "end", "usage", "unit", "cost", "estimated")
TEMPERATURE = "mean temperature (°F)"
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
    temps = bills.periods.mean_temp_f is not None
    head = ["fuel", "start", "end", "days", f"usage ({bills.unit})", "cost"]
    lines = [head + ([TEMPERATURE] if temps else [])]
    for k in range(bills.periods.n):
        span, use, cost, more = _cells(bills, k, temps=temps)
        lines.append([safe_text(bills.fuel), *span, use, cost, *more])
    _write(path, _csv(lines), overwrite=overwrite)


def write_accounts(
    found: FileAccounts,
    path: str | os.PathLike[str],
    *,
    full_numbers: bool = False,
    overwrite: bool = False,
) -> None:
    """Write every account's cleaned periods into one CSV; read_accounts gives them back.

    A column names the account: masked, or with ``full_numbers`` as the file has it.
    Raises UnwritableReport.
    """
    temps = any(b.periods.mean_temp_f is not None for _, b in found.readable)
    head = ["account", "fuel", "start", "end", "days", "usage", "unit", "cost"]
    lines = [head + ([TEMPERATURE] if temps else [])]
    for account, bills in found.readable:
        name = safe_text(account.full_name if full_numbers else account.label)
        for k in range(bills.periods.n):
            span, use, cost, more = _cells(bills, k, temps=temps)
            lines.append([name, safe_text(bills.fuel), *span, use, bills.unit, cost, *more])
    _write(path, _csv(lines), overwrite=overwrite)


def _cells(bills: Bills, k: int, *, temps: bool) -> tuple[list[str], str, str, list[str]]:
    """Start, end and days; use; cost; and the mean temperature where there is a column of it."""
    p = bills.periods
    span = [iso(int(p.start[k])), iso(int(p.end[k])), str(int(p.days[k]))]
    known = p.mean_temp_f
    more = [_number(float(known[k])) if known is not None else ""] if temps else []
    return span, _number(float(p.use[k])), _number(float(p.cost[k])), more


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
