"""Sums over days as BillRows, for readings shorter than a day, and where months begin.

What belongs here: which days are whole, and what is said of those that are not.  Days are summed
further in period_sums.py.
"""

from __future__ import annotations

from datetime import date
from typing import TYPE_CHECKING, Literal

import numpy as np

from normalize.bills.day_rows import DayRows
from normalize.bills.local_days import DAY, Clock, spoken, sum_days
from normalize.days import day_of

if TYPE_CHECKING:
    from numpy.typing import NDArray

    Int = NDArray[np.int32]
    Long = NDArray[np.int64]
    Byte = NDArray[np.uint8]
    Float = NDArray[np.float64]

SumTo = Literal["day", "month", "bill"]
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
    return DayRows(name, s, step), notes


def several(count: int, word: str) -> str:
    """A count with its noun: "1 day", "1,234 days"."""
    return f"{count:,} {word}" + ("" if count == 1 else "s")


def month_edge(year: int, month: int, read_day: int) -> int:
    """The day of the reading in a month; the last day where the month is too short.

    >>> month_edge(2023, 2, 31) == day_of(date(2023, 2, 28))
    True
    """
    year, month = year + (month - 1) // 12, (month - 1) % 12 + 1
    for day in range(min(read_day, 31), 27, -1):
        try:
            return day_of(date(year, month, day))
        except ValueError:
            continue
    return day_of(date(year, month, min(read_day, 27)))


__all__ = ["DAY", "SHORT_READING", "SumTo", "day_rows", "month_edge", "several"]
