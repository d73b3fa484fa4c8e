"""A file that lists days, such as holidays: one date a row, a name beside it or not."""

from __future__ import annotations

import os
from collections.abc import Sequence

from normalize.bills.amounts import as_text
from normalize.bills.dates import Written, order_by_values, read_written, settle
from normalize.bills.table import Cell, RawTable, open_file, read_table
from normalize.days import FIRST_SANE_DAY, LAST_SANE_DAY
from normalize.errors import AmbiguousBills, UnreadableBills

MOST_SHOWN = 3  # faulty lines that a message names


def read_days(path: str | os.PathLike[str]) -> tuple[tuple[int, ...], tuple[str, str]]:
    """Day numbers of the first column that holds dates, in order, and (file, SHA-256).

    A heading is passed over; any other row without a date is an error, for a holiday that is
    lost would count as a working day.  Raises MissingFile, UnreadableBills, AmbiguousBills.
    """
    table = read_table(open_file(path), score=_score)
    column = _column(table)
    written = [read_written(_cell(r.cells, column), epoch_1904=table.epoch_1904)
               for r in table.rows]  # fmt: skip
    dated = [k for k, w in enumerate(written) if w.day is not None or w.parts is not None]
    if not dated:
        raise UnreadableBills("no column holds dates", where=table.name, wanted="one date a row")
    bad = [table.rows[k].line for k in range(dated[0], len(written)) if k not in set(dated)]
    if bad or dated[0] > 1:
        lines = ", ".join(str(n) for n in (bad or [table.rows[0].line])[:MOST_SHOWN])
        raise UnreadableBills(
            f"no date stands in line {lines}", where=table.name, wanted="one date a row"
        )
    cells = [written[k] for k in dated]
    order = order_by_values(cells) or "month first"
    if any(w.parts for w in cells) and order_by_values(cells) is None:
        raise AmbiguousBills(
            "the dates can be read with the month first or with the day first",
            where=table.name,
            next_step="Write them as 2023-07-04.",
        )
    days = []
    for k, cell in zip(dated, cells, strict=True):
        day, problem = settle(cell, order)
        if day is None or not FIRST_SANE_DAY <= day < LAST_SANE_DAY:
            raise UnreadableBills(
                problem or "a date outside 1900 to 2100",
                where=f"{table.name}:{table.rows[k].line}",
            )
        days.append(day)
    return tuple(sorted(set(days))), (table.name, table.sha256)


def _score(cells: Sequence[Cell]) -> float:
    return float(any(_is_date(read_written(c)) for c in cells))


def _is_date(written: Written) -> bool:
    return written.day is not None or written.parts is not None


def _cell(cells: Sequence[Cell], k: int) -> Cell:
    return cells[k] if k < len(cells) else None


def _column(table: RawTable) -> int:
    """The column in which most rows hold a date; numbers such as a year are none."""
    width = max(len(row.cells) for row in table.rows)
    counts = [
        sum(
            _is_date(read_written(_cell(row.cells, k)))
            for row in table.rows[:500]
            if len(as_text(_cell(row.cells, k))) > len("2023")
        )
        for k in range(width)
    ]
    return counts.index(max(counts))
