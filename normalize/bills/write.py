"""Write bills: the template to fill in, and cleaned periods that read back the same.

What belongs here: CSV out, guarded so that no cell can act as a formula in a spreadsheet.
"""

from __future__ import annotations

import csv
import io
import math
import os
from collections.abc import Iterable, Sequence
from pathlib import Path

from normalize.bills.periods import Bills
from normalize.days import iso
from normalize.errors import UnwritableReport

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
    file = Path(path)
    try:
        with file.open("w" if overwrite else "x", encoding="utf-8", newline="") as stream:
            stream.write(text)
    except FileExistsError:
        raise UnwritableReport(
            "there is a file of that name", where=file.name, next_step="Choose another name."
        ) from None
    except (OSError, ValueError) as err:
        reason = err.strerror if isinstance(err, OSError) and err.strerror else "its name is odd"
        raise UnwritableReport(f"the file cannot be written ({reason})", where=file.name) from None
