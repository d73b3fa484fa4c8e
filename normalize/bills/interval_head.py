"""Whether a file is one of intervals, by its first lines; and a sheet of them as text.

What belongs here: telling interval files, long (a line for each interval) and wide (a line for
each day), from tables of bills.  Reading them is in intervals.py.
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from datetime import date, datetime, time, timedelta

import numpy as np

from normalize.bills.amounts import as_text
from normalize.bills.answers import Answers
from normalize.bills.columns import Columns, find_columns
from normalize.bills.dates import read_written
from normalize.bills.groups import cell
from normalize.bills.table import (
    HEADER_LINES,
    MAX_ROWS,
    BillFile,
    Cell,
    CsvHead,
    RawRow,
    RawTable,
    Score,
    csv_head,
)
from normalize.bills.wide_head import WideHead, as_table, wide_head
from normalize.errors import NormalizeError

MANY_DAYS = 5_000  # daily lines: more than that are read here, for speed
WIDE_SCORE = 100.0  # of a header that no other can be taken for
SAMPLE = 200  # lines looked at to tell what kind of file it is
_BEFORE_TIME = re.compile(r"[T ]|(?<=\d{4}):")  # 13-JAN-2023:00:15, too
_EXCEL_ZERO = datetime.combine(date(1899, 12, 30), time())  # moments of a sheet have no zone
_EXCEL_1904 = datetime.combine(date(1904, 1, 1), time())


@dataclass(frozen=True, slots=True)
class IntervalHead(CsvHead):
    """The first lines of an interval file.

    wide : its columns of intervals; None for a long file.  data : what to read, for a sheet its
    cells as text; the file's bytes where it is None.  sheet : its name.
    """

    wide: WideHead | None = None
    data: bytes | None = None
    sheet: str = ""


def is_interval_file(
    file: BillFile, answers: Answers, score: Score, sheet: str | None = None
) -> IntervalHead | None:
    """The file's head if its lines are intervals within days (or very many days), else None.

    sheet : of a workbook; where none is named, the one that looks most like a table.
    """

    def wide_too(cells: Sequence[Cell]) -> float:
        wide = wide_head((RawRow(1, tuple(cells)),))
        return WIDE_SCORE if wide is not None else score(cells)

    if file.data.startswith(b"PK"):
        return _first_look(file, answers, wide_too, sheet)
    head = csv_head(file, wide_too)
    if head is None:
        return None
    table = RawTable(file.name, file.sha256, head.rows, head.delimiter)
    found = _of_rows(table, answers, head.lines)
    return None if found is None else replace(found, lines=head.lines, encoding=head.encoding)


def _first_look(
    file: BillFile, answers: Answers, score: Score, sheet: str | None
) -> IntervalHead | None:
    """The head of a workbook's sheet, by its first rows."""
    try:
        table = _sheet(file, score, sheet, HEADER_LINES + SAMPLE)
    except NormalizeError:
        return None  # the reader of tables says what is the matter
    head = _of_rows(replace(table, rows=tuple(_sheet_rows(table))), answers, len(table.rows))
    return head and replace(head, delimiter="\t", encoding="utf-8", sheet=table.sheet)


def whole_sheet(file: BillFile, head: IntervalHead) -> IntervalHead:
    """The head with all of its sheet as text.  Raises UnreadableBills."""
    table = _sheet(file, lambda _: 0.0, head.sheet, MAX_ROWS)
    return replace(head, data=_as_lines(tuple(_sheet_rows(table))))


def _sheet(file: BillFile, score: Score, sheet: str | None, most: int) -> RawTable:
    from normalize.bills.workbook import read_workbook

    return read_workbook(
        file.data, name=file.name, sha256=file.sha256, score=score, sheet=sheet, most=most
    )


def _of_rows(table: RawTable, answers: Answers, lines: int) -> IntervalHead | None:
    """The head of a table whose first rows are those of an interval file."""
    wide = wide_head(table.rows)
    rows = table.rows if wide is None else as_table(table.rows, wide)
    try:
        columns, body = find_columns(replace(table, rows=rows), answers.named)
    except NormalizeError:
        return None  # the reader of tables says what is the matter
    head = IntervalHead(rows, table.delimiter, lines, "", wide)
    body = body[:SAMPLE]
    when = _date_column(columns)
    if when is None or len(body) < 2:
        return None
    if wide is not None:
        return head if columns.line == wide.line else None
    timed = [row for row in body if _has_time(cell(row, when), cell(row, columns.get("time")))]
    if 2 * len(timed) > len(body) and _within_days(timed, when):
        return head
    spans = columns.get("start") is not None and columns.get("end") is not None
    return head if lines > MANY_DAYS and not spans and _daily(body, when) else None


def _sheet_rows(table: RawTable) -> Iterator[RawRow]:
    """Rows of a sheet whose moments are written as in a CSV."""
    zero = _EXCEL_1904 if table.epoch_1904 else _EXCEL_ZERO
    header = wide_head(table.rows)
    try:
        columns = find_columns(table, {})[0]
        line, times = columns.line, columns.get("time")
        when = _date_column(columns)
    except NormalizeError:
        line, times, when = 0, None, None
    if header is not None:
        line, times, when = header.line, None, None
    cells = [cell(row, when) for row in table.rows if row.line > line]
    midnight = " 00:00:00" if any(isinstance(c, datetime) for c in cells) else ""
    for row in table.rows:
        if row.line <= line:
            yield row
            continue
        yield RawRow(
            row.line,
            tuple(
                _moment(c, zero, midnight) if k == when or (header and k not in header.starts)
                else _time(c) if k == times else c
                for k, c in enumerate(row.cells)
            ),
        )  # fmt: skip


def _moment(value: Cell, zero: datetime, midnight: str) -> Cell:
    """A date or moment of a sheet as ISO text; other cells as they are.

    midnight : what a day among moments is written with.
    """
    if isinstance(value, float) and 20_000 <= value < 80_000:
        value = zero + timedelta(days=value)
    if isinstance(value, datetime):
        return (value + timedelta(microseconds=500_000)).strftime("%Y-%m-%d %H:%M:%S")
    return f"{value.isoformat()}{midnight}" if isinstance(value, date) else value


def _time(value: Cell) -> Cell:
    """A time of day that a sheet keeps as part of a day."""
    if isinstance(value, float) and 0 <= value < 1:
        minutes = round(value * 1440)
        return f"{minutes // 60}:{minutes % 60:02}"
    return value


def _as_lines(rows: Sequence[RawRow]) -> bytes:
    """Rows as tab-separated lines, each at its own number."""
    lines: list[str] = []
    for row in rows:
        lines += [""] * (row.line - 1 - len(lines))
        lines.append("\t".join(" ".join(as_text(c).split()) for c in row.cells))
    return ("\n".join(lines) + "\n").encode()


def _date_column(columns: Columns) -> int | None:
    for role in ("start", "read", "end"):
        if (k := columns.get(role)) is not None:
            return k
    return None


def _has_time(value: object, beside: object) -> bool:
    text = as_text(value)
    return ":" in text or (beside is not None and any(c.isdigit() for c in as_text(beside)))


def _within_days(rows: Sequence[RawRow], when: int) -> bool:
    """Whether several lines share their day, as intervals do and bills do not."""
    days = [_BEFORE_TIME.split(as_text(cell(row, when)), maxsplit=1)[0] for row in rows]
    return len(set(days)) <= 0.6 * len(days)


def _daily(body: Sequence[RawRow], when: int) -> bool:
    found = [read_written(cell(row, when)) for row in body]
    days = [w.day for w in found if w.day is not None]
    if len(days) < len(found) / 2:
        parts = [w.parts for w in found if w.parts is not None]
        return len({p[:2] for p in parts}) > 0.8 * len(body)  # nearly each line another day
    steps = np.abs(np.diff(np.array(days)))
    return bool(steps.size and np.median(steps) <= 1)
