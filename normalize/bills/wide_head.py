"""The header of a wide interval file: a line for each day, a column for each interval.

What belongs here: telling such a header, and when the interval of each column begins.  The
header is then rewritten as that of any table, one column "Usage" for all, so that columns.py
reads the rest of it.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

from normalize.bills.amounts import as_text
from normalize.bills.dates import read_written
from normalize.bills.headings import squeeze, take_apart
from normalize.bills.table import HEADER_LINES, Cell, RawRow
from normalize.bills.vocabulary import TOTALS

DAY = 86_400  # seconds
STEPS = (300, 600, 900, 1200, 1800, 3600)  # seconds of an interval
MOST_EXTRA = 3600  # seconds: a day when clocks go back has an hour more
_CLOCK = re.compile(r"(?<!\d)(\d{1,2}):(\d{2})(?::\d{2})?\s*([ap])?(?:\.?m\b)?", re.IGNORECASE)
_NUMBERED = re.compile(r"^([a-z. ]*?)[ .#_-]*(\d{1,4})$")
_PREFIXES = {
    "", "he", "hr", "h", "hour", "hours", "hour ending", "hr ending", "hr end", "hour end",
    "interval", "int", "value", "val", "reading", "period", "p", "usage", "use", "kwh",
    "hour of day",
}  # fmt: skip


@dataclass(frozen=True, slots=True)
class WideHead:
    """line : of the header.  starts : column → second of the day at which its interval begins.

    step : seconds of an interval.  extra : columns of the hour that a day of 25 hours has more.
    """

    line: int
    starts: dict[int, int]
    step: int
    extra: tuple[int, ...]

    @property
    def columns(self) -> tuple[int, ...]:
        """Columns of intervals, in their order in the file."""
        return tuple(sorted((*self.starts, *self.extra)))


def wide_head(rows: Sequence[RawRow]) -> WideHead | None:
    """The header of a wide file among its first rows; None if it is none."""
    for row in rows[:HEADER_LINES]:
        if len(row.cells) > DAY // STEPS[-1]:
            found = _starts(row.cells)
            if found is not None:
                starts, step, extra = found
                return WideHead(row.line, starts, step, extra)
    return None


def _label(cell: Cell) -> tuple[str, int] | None:
    """Kind and number of a heading: ("clock", seconds) or (its words, number)."""
    text = as_text(cell).lower()
    if found := _CLOCK.search(text):
        hour, minute = int(found[1]), int(found[2])
        if found[3]:
            if not 1 <= hour <= 12:
                return None
            hour = hour % 12 + (12 if found[3] == "p" else 0)
        seconds = hour * 3600 + minute * 60
        return ("clock", seconds) if seconds <= DAY and minute < 60 else None
    plain = " ".join(take_apart(text).words)
    if (found := _NUMBERED.match(plain)) and " ".join(found[1].split()) in _PREFIXES:
        return " ".join(found[1].split()), int(found[2])
    return None


def _starts(cells: Sequence[Cell]) -> tuple[dict[int, int], int, tuple[int, ...]] | None:
    """Start of each column's interval, the step, and columns beyond 24 hours."""
    labels = [(k, *label) for k, c in enumerate(cells) if (label := _label(c)) is not None]
    for kind in dict.fromkeys(kind for _, kind, _ in labels):
        mine = [(k, number) for k, each, number in labels if each == kind]
        if len(mine) < DAY // STEPS[-1]:
            continue
        found = _clocks(mine) if kind == "clock" else _numbers(mine)
        if found is not None:
            return found
    return None


def _clocks(mine: list[tuple[int, int]]) -> tuple[dict[int, int], int, tuple[int, ...]] | None:
    """Columns headed by times of day; one that is there twice is that of the longer day."""
    seconds: dict[int, int] = {}
    extra = []
    for k, value in mine:
        if value in seconds.values():
            extra.append(k)
        else:
            seconds[k] = value
    values = list(seconds.values())
    if values[-1] == 0 and values[0] != 0:  # the end of the day, written 0:00
        values[-1] = DAY
        seconds[list(seconds)[-1]] = DAY
    steps = {b - a for a, b in pairwise(values)}
    step = steps.pop() if len(steps) == 1 else 0  # one time over and over has no step
    if step not in STEPS or len(values) * step != DAY or values[0] not in (0, step):
        return None
    if len(extra) * step > MOST_EXTRA:
        return None
    return {k: v - values[0] for k, v in seconds.items()}, step, tuple(extra)


def _numbers(mine: list[tuple[int, int]]) -> tuple[dict[int, int], int, tuple[int, ...]] | None:
    """Columns numbered 1, 2, 3 … or headed by times such as 0015, in the order of the day."""
    columns, values = [k for k, _ in mine], [v for _, v in mine]
    if [v - values[0] for v in values] != list(range(len(values))):
        if any(v % 100 > 59 for v in values):
            return None
        return _clocks([(k, v // 100 * 3600 + v % 100 * 60) for k, v in mine])
    if values[0] not in (0, 1):
        return None
    for step in STEPS:
        over = len(values) - DAY // step
        if 0 <= over <= MOST_EXTRA // step:
            usual = columns[: DAY // step]
            starts = {k: n * step for n, k in enumerate(usual)}
            return starts, step, tuple(columns[len(usual) :])
    return None


def as_table(rows: Sequence[RawRow], head: WideHead) -> tuple[RawRow, ...]:
    """The rows with a header that any reader of tables understands: one column of use."""
    at = next(n for n, row in enumerate(rows) if row.line == head.line)
    header, body = rows[at], rows[at + 1 :]
    unit = _unit_above(rows[: at + 1])
    cells: list[Cell] = [_plain(c) for c in header.cells]
    for k in head.columns:
        cells[k] = ""
    cells[head.columns[0]] = f"Usage ({unit})" if unit else "Usage"
    if not any(take_apart(as_text(c)).role in ("read", "start", "end", "day") for c in cells):
        for k in range(len(cells)):
            some = [row.cells[k] for row in body[:50] if k < len(row.cells)]
            good = [w for c in some if (w := read_written(c)).day is not None or w.parts]
            if k not in head.columns and some and 2 * len(good) > len(some):
                cells[k] = "Date"
                break
    return (*rows[:at], RawRow(header.line, tuple(cells)), *body)


def _plain(cell: Cell) -> Cell:
    """A heading of a wide file, unless it is of a sum of the line or of money."""
    text = as_text(cell)
    heading = take_apart(text)
    words = " ".join(heading.words)
    total = any(squeeze(t) == squeeze(words) for t in TOTALS) or "total" in heading.words
    return "" if total or heading.role in ("usage", "cost", "time", "days") else cell


def _unit_above(rows: Sequence[RawRow]) -> str:
    """The one unit that the header, or else what stands above it, names; "" if none or several."""
    for some in (rows[-1:], rows[:-1]):
        found = [u for row in some for c in row.cells if (u := take_apart(as_text(c)).unit)]
        if len({u.lower() for u in found}) == 1:
            return found[0]
    return ""
