"""Raw tables out of hostile files: CSV text or an XLSX sheet becomes rows of cells.

What belongs here: size limits, encodings, delimiters, refusal of files that are no table.
No word of a header is understood here; the caller passes a ``score`` that says how much a
line looks like a header, and the best delimiter or sheet is the one with the best header.
"""

from __future__ import annotations

import csv
import hashlib
import io
import os
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from datetime import date
from pathlib import Path

from normalize.errors import AmbiguousBills, UnreadableBills
from normalize.text_files import GZIP, UTF16_MARKS, decoded, encoding_of, kind_of, read_bytes

Cell = str | int | float | date | None
Score = Callable[[Sequence[Cell]], float]

MAX_BYTES = 100_000_000  # of a bill file; a lifetime of monthly bills is some kilobytes
MAX_ROWS = 1_000_000  # three years of monthly bills of 25,000 accounts
MAX_CELLS = 20_000_000  # in all: some GB of memory at the worst
MAX_COLUMNS = 500
MAX_LINE = 100_000  # characters of one line
MAX_CELL = 5_000  # characters of one cell
LIKELY_HEADER = 10.0  # score of a line with a date and an amount heading (our own, no source)
COUNTED_BYTES = 1_000_000  # in which lines are counted, to tell a long file from a short one
HEADER_LINES = 60  # a header is looked for in this many rows from the top

_DELIMITERS = {",": "comma", ";": "semicolon", "\t": "tab", "|": "bar"}
_CURES = {
    "an old Excel workbook (.xls)": "Save it as .xlsx or CSV.",
    "a PDF": "Type the bills into a template (normalize new) or ask for a CSV export.",
    "a picture": "Type the bills into a template (normalize new).",
    "a compressed file": "Unpack it first.",
}


@dataclass(frozen=True, slots=True)
class RawRow:
    """One line (CSV) or row (sheet), counted from 1 as a person would find it."""

    line: int
    cells: tuple[Cell, ...]


@dataclass(frozen=True, slots=True)
class RawTable:
    """A file as rows of cells.

    name : file name without folder.  sha256 : of the file's bytes.  delimiter : of a CSV,
    empty for a sheet.  sheet : name, empty for a CSV.  epoch_1904 : Excel's other calendar.
    hidden : rows that the sheet hides.  uncomputed : formulas whose results it does not hold.
    """

    name: str
    sha256: str
    rows: tuple[RawRow, ...]
    delimiter: str = ""
    sheet: str = ""
    epoch_1904: bool = False
    hidden: tuple[int, ...] = ()
    uncomputed: int = 0


@dataclass(frozen=True, slots=True)
class BillFile:
    """A file's bytes. name : without folder.  sha256 : of the bytes."""

    name: str
    data: bytes
    sha256: str


def open_file(path: str | os.PathLike[str]) -> BillFile:
    """The bytes of a file of sane size.  Raises MissingFile, UnreadableBills."""
    file = Path(path)
    data = _bytes_of(file)
    return BillFile(file.name, data, hashlib.sha256(data).hexdigest())


def read_table(file: BillFile, *, score: Score, sheet: str | None = None) -> RawTable:
    """A CSV or XLSX file as rows of cells.

    Raises UnreadableBills, AmbiguousBills (several sheets that look like bills).
    """
    data, digest = file.data, file.sha256
    if data.startswith(b"PK"):
        from normalize.bills.workbook import read_workbook

        return read_workbook(data, name=file.name, sha256=digest, score=score, sheet=sheet)
    if sheet is not None:
        raise UnreadableBills(
            "a sheet was named, but this is no XLSX workbook",
            where=file.name,
            next_step="Leave out sheet, or give the workbook.",
        )
    text = _text_of(data, file.name)
    delimiter = _delimiter_of(text, score)
    rows = tuple(_csv_rows(text, delimiter, file.name))
    if not rows:
        raise UnreadableBills("the file holds no lines", where=file.name, wanted="a table of bills")
    return RawTable(file.name, digest, rows, delimiter)


def read_tables(file: BillFile, *, score: Score, sheet: str | None = None) -> list[RawTable]:
    """A CSV as one table; of a workbook every sheet that looks like bills.

    Raises UnreadableBills.
    """
    if sheet is not None or not file.data.startswith(b"PK"):
        return [read_table(file, score=score, sheet=sheet)]
    from normalize.bills.workbook import likely_sheets

    names = likely_sheets(file.data, name=file.name, score=score)
    return [read_table(file, score=score, sheet=name) for name in names]


def _bytes_of(file: Path) -> bytes:
    data = read_bytes(file, most=MAX_BYTES, wanted="a table of bills", error=UnreadableBills)
    if data.isspace():
        raise UnreadableBills("the file is empty", where=file.name, wanted="a table of bills")
    what = "a compressed file" if data.startswith(GZIP) else kind_of(data)
    if what:
        raise UnreadableBills(
            f"this is {what}", where=file.name, wanted="a CSV or XLSX table",
            next_step=_CURES.get(what, "Look for a CSV export at the same place."),
        )  # fmt: skip
    return data


@dataclass(frozen=True, slots=True)
class CsvHead:
    """The first lines of a CSV, split. lines : of its first megabyte.  encoding : to read by."""

    rows: tuple[RawRow, ...]
    delimiter: str
    lines: int
    encoding: str


def csv_head(file: BillFile, score: Score) -> CsvHead | None:
    """The first lines of a CSV file without reading the rest; None if it is none."""
    data = file.data
    if data.startswith(b"PK") or (b"\0" in data[:4000] and not data.startswith(UTF16_MARKS)):
        return None
    lines = data.count(b"\n", 0, COUNTED_BYTES)
    sample = data[: 32 * 1024]
    if lines < 2 or b"\n" not in sample:
        return None
    encoding = encoding_of(data)
    cut = sample.rfind(b"\n")
    text = sample[:cut].decode(encoding, errors="replace").lstrip("\ufeff")
    if "\0" in text:
        return None
    delimiter = _delimiter_of(text, score)
    try:
        rows = tuple(_csv_rows(text, delimiter, file.name))
    except UnreadableBills:
        return None
    return CsvHead(rows, delimiter, lines, encoding) if rows else None


def _text_of(data: bytes, name: str) -> str:
    """Decoded text: by its byte order mark, else UTF-8, UTF-16 without a mark, cp1252."""
    text = decoded(data)
    if "\0" in text:
        raise UnreadableBills(
            "the file holds bytes that are no text", where=name, wanted="a CSV or XLSX table"
        )
    if text.lstrip()[:1] == "<":
        raise UnreadableBills(
            "this is XML or HTML, not a table",
            where=name,
            wanted="a CSV or XLSX table",
            next_step="Look for a CSV or spreadsheet download at the same place.",
        )
    if "\n" not in text:
        text = text.replace("\r", "\n")
    # Before any splitting into columns, so that a line of a gigabyte costs no more than itself.
    if text.count("\n") > MAX_ROWS:
        raise _too_big(name, f"more than {MAX_ROWS:,} lines")
    if any(len(line) > MAX_LINE for line in text.split("\n")):
        raise _too_big(name, f"a line of more than {MAX_LINE:,} characters")
    return text


def _delimiter_of(text: str, score: Score) -> str:
    """The delimiter under which some early line looks most like a header."""
    head = text[: 4 * MAX_LINE].splitlines()[:HEADER_LINES]
    if head and head[0].lower().startswith("sep=") and head[0][4:5] in _DELIMITERS:
        return head[0][4:5]
    best, best_rank = ",", (-1.0, -1)
    for delimiter in _DELIMITERS:
        try:
            rows = [r[:MAX_COLUMNS] for r in csv.reader(head, delimiter=delimiter)]
        except csv.Error:
            continue
        wide = [r for r in rows if len(r) > 1]
        rank = (max((score(r) for r in wide), default=0.0), len(wide))
        if rank > best_rank:
            best, best_rank = delimiter, rank
    return best


def _csv_rows(text: str, delimiter: str, name: str) -> Iterator[RawRow]:
    reader = csv.reader(io.StringIO(text, newline=""), delimiter=delimiter)
    before = held = 0
    try:
        for count, cells in enumerate(reader):
            line, before = before + 1, reader.line_num
            if count >= MAX_ROWS:
                raise _too_big(name, f"more than {MAX_ROWS:,} lines")
            if len(cells) > MAX_COLUMNS:
                raise _too_big(name, f"a line ({line}) of more than {MAX_COLUMNS} columns")
            held += len(cells)
            if held > MAX_CELLS:
                raise _too_big(name, f"more than {MAX_CELLS:,} cells")
            if any(len(cell) > MAX_CELL for cell in cells):
                raise _too_big(name, f"a cell (line {line}) of more than {MAX_CELL:,} characters")
            if any(cell.strip() for cell in cells):
                yield RawRow(line, tuple(cells))
    except csv.Error:
        raise UnreadableBills(
            "the line cannot be split into columns",
            where=f"{name}:{reader.line_num}",
            next_step="Look for a quotation mark that is not closed.",
        ) from None


def _too_big(name: str, what: str) -> UnreadableBills:
    return UnreadableBills(
        f"the file holds {what}", where=name, next_step="Check that it is a file of bills."
    )


def choose_sheet(
    found: Sequence[tuple[str, float]], *, name: str, good_enough: float = LIKELY_HEADER
) -> str:
    """The one sheet that looks like bills; asks when several do. found : (sheet, score)."""
    likely = [sheet for sheet, value in found if value >= good_enough]
    if len(likely) > 1:
        lines = " or ".join(f'sheet = "{s[:40]}"' for s in likely[:12])
        more = " or …" if len(likely) > 12 else ""
        raise AmbiguousBills(
            f"{len(likely)} sheets look like bills",
            where=name,
            wanted="to know which is meant, for they are never added up",
            next_step=f"Put {lines}{more} under [[account]] in site.toml, or use --sheet; "
            "normalize bills shows all of them.",
        )
    return likely[0] if likely else max(found, key=lambda pair: pair[1])[0]
