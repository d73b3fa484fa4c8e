"""Sums over days and months as BillRows, for readings shorter than a bill.

What belongs here: which days are whole, what is said of those that are not, and days summed to
months that begin on the day of the reading.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from datetime import date
from typing import TYPE_CHECKING, Literal

import numpy as np

from normalize.bills.day_rows import DayRows
from normalize.bills.local_days import DAY, Clock, spoken, sum_days
from normalize.bills.periods import BillRow
from normalize.days import date_of, day_of

if TYPE_CHECKING:
    from numpy.typing import NDArray

    Int = NDArray[np.int32]
    Long = NDArray[np.int64]
    Byte = NDArray[np.uint8]
    Float = NDArray[np.float64]

SumTo = Literal["day", "month"]
SHORT_READING = 20 * 3600  # seconds: anything shorter is summed to days (a day may have 23 h)


def day_rows(
    name: str, local: Long, seconds: Long, use: Float, cost: Float, line: Long, estimated: Long,
    *, keep: Byte | None = None, offset: Int | None = None, clock: Clock | None = None,
    room: int | None = None,
) -> tuple[DayRows, list[str]]:  # fmt: skip
    """One row for each local day, and sentences; a day with readings missing has a problem.

    Arguments as of sum_days.
    """
    s = sum_days(
        local, seconds, use, cost, line, estimated,
        keep=keep, offset=offset, clock=clock, room=room,
    )  # fmt: skip
    step = int(np.median(seconds)) if seconds.size else 0
    readings = int(s.count.sum())
    notes = [
        f"{several(readings, 'reading')} of {spoken(step)}, summed to "
        f"{several(s.day.size, 'local day')}"
    ]
    if (bad := int(np.count_nonzero(s.missing))) > 0:
        gone = several(round(float(s.missing.sum()) / max(step, 1)), "reading")
        notes.append(f"left out: {several(bad, 'day')} from which {gone} are missing")
    if (doubled := int(np.count_nonzero(s.twice))) > 0:
        notes.append(f"left out: {several(doubled, 'day')} with readings twice")
    if (guessed := int(s.estimated.sum())) > 0:
        notes.append(f"estimates were used as they are: {several(guessed, 'reading')}")
    return DayRows(name, s), notes


def several(count: int, word: str) -> str:
    """A count with its noun: "1 day", "1,234 days"."""
    return f"{count:,} {word}" + ("" if count == 1 else "s")


def month_edge(year: int, month: int, read_day: int) -> int:
    """The day of the reading in a month; the last day where the month is too short.

    >>> date_of(month_edge(2023, 2, 31)).isoformat()
    '2023-02-28'
    """
    year, month = year + (month - 1) // 12, (month - 1) % 12 + 1
    for day in range(min(read_day, 31), 27, -1):
        try:
            return day_of(date(year, month, day))
        except ValueError:
            continue
    return day_of(date(year, month, min(read_day, 27)))


def months_of(rows: Sequence[BillRow], read_day: int) -> tuple[BillRow, ...]:
    """Days summed to months that begin on ``read_day``; a month not whole has a problem."""
    groups: dict[tuple[int, int], list[BillRow]] = {}
    for row in rows:
        if row.start is None:
            continue
        when = date_of(row.start)
        low = month_edge(when.year, when.month, read_day)
        first = when.month if row.start >= low else when.month - 1
        begin = month_edge(when.year, first, read_day)
        groups.setdefault((begin, month_edge(when.year, first + 1, read_day)), []).append(row)
    return tuple(_month(begin, end, group) for (begin, end), group in sorted(groups.items()))


def _month(begin: int, end: int, rows: Sequence[BillRow]) -> BillRow:
    good = [r for r in rows if not r.problem]
    lacking = end - begin - sum((r.end or 0) - (r.start or 0) for r in good)
    costs = [r.cost for r in good if r.cost is not None]
    problem = f"{lacking} of {end - begin} days are missing or not whole" if lacking > 0 else ""
    return replace(
        rows[0], start=begin, end=end, use=sum(r.use or 0.0 for r in good),
        cost=sum(costs) if len(costs) == len(good) and costs else None, problem=problem,
    )  # fmt: skip


__all__ = ["DAY", "SHORT_READING", "SumTo", "day_rows", "month_edge", "months_of"]
