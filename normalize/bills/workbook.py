"""XLSX workbooks, opened with care: a zip of XML from a stranger.

What belongs here: the checks before opening (zip bombs, entities, odd names) and reading one
sheet's values.  openpyxl is loaded only when a workbook is read.
"""

from __future__ import annotations

import io
import re
import warnings
import zipfile
import zlib
from datetime import date, datetime, time, timedelta
from typing import TYPE_CHECKING, Any

from normalize.bills.table import (
    HEADER_LINES,
    LIKELY_HEADER,
    MAX_COLUMNS,
    MAX_ROWS,
    Cell,
    RawRow,
    RawTable,
    Score,
    choose_sheet,
)
from normalize.errors import NormalizeError, UnreadableBills

if TYPE_CHECKING:
    from collections.abc import Iterator

_ROW = re.compile(rb"<row [^>]{0,500}>")
_HIDDEN = re.compile(rb"hidden=[\"'](?:1|true)[\"']")
_ROW_NUMBER = re.compile(rb"\br=[\"'](\d{1,7})[\"']")
_NO_RESULT = re.compile(rb"(?:</f>|<f[^>]{0,500}/>)\s{0,20}(?:</c>|<v\s{0,5}/>|<v></v>)")
MAX_PARTS = 2_000  # files inside the zip
MAX_UNPACKED = 200_000_000  # bytes
MAX_RATIO = 100  # unpacked over packed, of a part of more than a megabyte


def read_workbook(
    data: bytes, *, name: str, sha256: str, score: Score, sheet: str | None, most: int = MAX_ROWS
) -> RawTable:
    """Values of one sheet.  Raises UnreadableBills; AmbiguousBills if several look like bills.

    most : rows from the top; fewer than MAX_ROWS for a first look.
    """
    _check_zip(data, name)
    import openpyxl
    from openpyxl.utils.datetime import CALENDAR_MAC_1904

    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # styles and validations that openpyxl does not keep
        try:
            book = openpyxl.load_workbook(
                io.BytesIO(data), read_only=True, data_only=True, keep_links=False
            )
            chosen = _pick(book, name, score, sheet)
            rows = tuple(_rows(book[chosen], name, most))
            hidden, uncomputed = _unseen(data, getattr(book[chosen], "_worksheet_path", ""))
            epoch_1904 = book.epoch == CALENDAR_MAC_1904
            book.close()
        except NormalizeError:
            raise
        except Exception as err:
            raise _broken(name) from err
    if not rows:
        raise UnreadableBills(
            f"the sheet {chosen[:40]!r} is empty", where=name, wanted="a table of bills"
        )
    return RawTable(name, sha256, rows, "", chosen, epoch_1904, hidden, uncomputed)


def _unseen(data: bytes, part: str) -> tuple[tuple[int, ...], int]:
    """Hidden rows of a sheet, and how many of its formulas have no stored result."""
    with zipfile.ZipFile(io.BytesIO(data)) as packed:
        text = packed.read(part.lstrip("/")) if part else b""
    hidden = [
        int(found[1])
        for tag in _ROW.findall(text)
        if _HIDDEN.search(tag) and (found := _ROW_NUMBER.search(tag)) is not None
    ]
    return tuple(hidden), len(_NO_RESULT.findall(text))


def _broken(name: str) -> UnreadableBills:
    return UnreadableBills(
        "this workbook cannot be read",
        where=name,
        next_step="Open it in a spreadsheet program and save it as XLSX or CSV.",
    )


def _check_zip(data: bytes, name: str) -> None:
    try:
        with zipfile.ZipFile(io.BytesIO(data)) as packed:
            parts = packed.infolist()
            names = {part.filename for part in parts}
            if "[Content_Types].xml" not in names or not any(n.startswith("xl/") for n in names):
                raise UnreadableBills(
                    "this is a zip file, but no XLSX workbook",
                    where=name,
                    wanted="a CSV or XLSX table",
                    next_step="Unpack it first.",
                )
            _check_parts(parts, name)
            for part in parts:
                if part.filename.endswith((".xml", ".rels")):
                    with packed.open(part) as stream:
                        head = stream.read(4096)
                    if b"<!DOCTYPE" in head or b"<!ENTITY" in head:
                        raise _unsafe(name, "it declares XML entities")
    except (zipfile.BadZipFile, zlib.error, NotImplementedError, RuntimeError) as err:
        raise _broken(name) from err
    except (OSError, EOFError, ValueError) as err:
        raise _broken(name) from err


def _check_parts(parts: list[zipfile.ZipInfo], name: str) -> None:
    if len(parts) > MAX_PARTS:
        raise _unsafe(name, f"it holds {len(parts):,} parts")
    if sum(part.file_size for part in parts) > MAX_UNPACKED:
        raise _unsafe(name, f"it unpacks to more than {MAX_UNPACKED // 1_000_000} MB")
    for part in parts:
        if part.file_size > 1_000_000 and part.file_size > MAX_RATIO * max(part.compress_size, 1):
            raise _unsafe(name, f"a part unpacks to more than {MAX_RATIO} times its size")
        pieces = part.filename.replace("\\", "/").split("/")
        if part.filename.startswith(("/", "\\")) or ".." in pieces or ":" in part.filename:
            raise _unsafe(name, "a part has a name that leads out of the workbook")
        if part.filename.lower().endswith((".zip", ".xlsx")) and "embeddings" not in pieces:
            raise _unsafe(name, "it holds another archive")


def _unsafe(name: str, what: str) -> UnreadableBills:
    return UnreadableBills(
        f"the workbook was not opened, for safety: {what}",
        where=name,
        next_step="Save the sheet as CSV in a spreadsheet program.",
    )


def likely_sheets(data: bytes, *, name: str, score: Score) -> list[str]:
    """Every visible sheet that looks like bills; the likeliest where none does."""
    _check_zip(data, name)
    import openpyxl

    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        try:
            book = openpyxl.load_workbook(
                io.BytesIO(data), read_only=True, data_only=True, keep_links=False
            )
            found = _scored(book, name, score)
            book.close()
        except NormalizeError:
            raise
        except Exception as err:
            raise _broken(name) from err
    likely = [title for title, value in found if value >= LIKELY_HEADER]
    return likely or [choose_sheet(found, name=name)]


def _scored(book: Any, name: str, score: Score) -> list[tuple[str, float]]:
    """(title, how much it looks like bills) of each visible sheet."""
    titles = _titles(book)
    visible = [t for t in titles if book[t].sheet_state == "visible"] or titles
    if not visible:
        raise UnreadableBills("the workbook has no sheet of cells", where=name)
    if len(visible) == 1:
        return [(visible[0], 0.0)]
    return [
        (t, max((score(r.cells) for r in _rows(book[t], name, HEADER_LINES)), default=0.0))
        for t in visible
    ]


def _titles(book: Any) -> list[str]:
    from openpyxl.worksheet._read_only import ReadOnlyWorksheet

    return [str(s.title) for s in book.worksheets if isinstance(s, ReadOnlyWorksheet)]


def _pick(book: Any, name: str, score: Score, sheet: str | None) -> str:
    titles = _titles(book)
    if sheet is not None:
        if sheet not in titles:
            raise UnreadableBills(
                f"no sheet is called {sheet[:40]!r}",
                where=name,
                wanted="one of " + ", ".join(repr(t[:40]) for t in titles[:8]),
            )
        return sheet
    return choose_sheet(_scored(book, name, score), name=name)


def _rows(sheet: Any, name: str, limit: int) -> Iterator[RawRow]:
    """Rows that hold something.  The sheet's own statement of its size is not believed."""
    sheet.reset_dimensions()
    for line, values in enumerate(sheet.iter_rows(values_only=True), start=1):
        if len(values) > MAX_COLUMNS and any(v is not None for v in values[MAX_COLUMNS:]):
            raise UnreadableBills(
                f"row {line} has more than {MAX_COLUMNS} columns",
                where=name,
                next_step="Check that it is a file of bills.",
            )
        if line > limit:
            if limit < MAX_ROWS:
                return
            raise UnreadableBills(f"the sheet has more than {MAX_ROWS:,} rows", where=name)
        cells = tuple(_cell(v) for v in values[:MAX_COLUMNS])
        if any(c is not None and c != "" for c in cells):
            yield RawRow(line, cells)


def _cell(value: object) -> Cell:
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, datetime):  # midnight is a day: bills; other moments, intervals
        return value if value.time() != time() else value.date()
    if isinstance(value, (int, float, date)) or value is None:
        return value
    if isinstance(value, (time, timedelta)):
        return str(value)
    return str(value)[:5000].replace("\0", "").strip()
