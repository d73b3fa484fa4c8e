"""Files with the same bytes every time: text, and workbooks."""

from __future__ import annotations

import csv
import io
import os
import zipfile
from datetime import datetime
from pathlib import Path
from typing import TYPE_CHECKING

# openpyxl writes through lxml where it is installed, with other bytes; read before the import.
os.environ.setdefault("OPENPYXL_LXML", "False")

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

    from openpyxl.worksheet.worksheet import Worksheet

MOMENT = datetime(2026, 7, 1, 12, 0, 0)  # noqa: DTZ001 - workbooks know no time zone


def write_csv(
    path: Path, rows: Sequence[Sequence[object]], *, ends: str = "\n", mark: bool = False
) -> None:
    """Rows as CSV. ends : line ends; mark : a byte order mark in front, as spreadsheets put."""
    text = io.StringIO()
    csv.writer(text, lineterminator=ends).writerows(rows)
    data = text.getvalue().encode("utf-8-sig" if mark else "utf-8")
    path.write_bytes(data)


def write_workbook(path: Path, fill: Callable[[Worksheet], None]) -> None:
    """One sheet as XLSX, times fixed and entries stored, not packed.

    Packing would let the machine's compression library decide the bytes.
    """
    from openpyxl import Workbook

    book = Workbook()
    sheet = book.active
    if sheet is None:
        raise RuntimeError("a new workbook has no sheet")
    fill(sheet)
    book.properties.creator = "sample data"
    book.properties.created = MOMENT
    raw = io.BytesIO()
    book.save(raw)
    with (
        zipfile.ZipFile(raw) as source,
        zipfile.ZipFile(path, "w", zipfile.ZIP_STORED) as target,
    ):
        for name in sorted(source.namelist()):
            entry = zipfile.ZipInfo(name, MOMENT.timetuple()[:6])
            entry.create_system = 3  # else it tells Windows from the others
            target.writestr(entry, _with_fixed_times(name, source.read(name)))


def _with_fixed_times(name: str, data: bytes) -> bytes:
    if name != "docProps/core.xml":
        return data
    head, _, rest = data.partition(b'<dcterms:modified xsi:type="dcterms:W3CDTF">')
    if not rest:
        raise RuntimeError("the workbook's properties have another shape than expected")
    stamp = MOMENT.strftime("%Y-%m-%dT%H:%M:%SZ").encode()
    return head + b'<dcterms:modified xsi:type="dcterms:W3CDTF">' + stamp + rest[rest.index(b"<") :]
