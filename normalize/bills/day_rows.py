"""Rows of single days as arrays: ten thousand of them, and a BillRow only when one is looked at.

What belongs here: the rows that sums over local days come to, and their ledger.  To whoever
reads them they are sequences of BillRow and LedgerEntry like any other.
"""

from __future__ import annotations

from abc import abstractmethod
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, TypeVar, overload

import numpy as np

from normalize.bills import rules
from normalize.bills.local_days import DaySums, spoken
from normalize.bills.periods import BillRow, LedgerEntry

if TYPE_CHECKING:
    from collections.abc import Callable

    from numpy.typing import NDArray

T = TypeVar("T")


class _Made(Sequence[T]):
    """A sequence whose items are made when they are looked at; equal to any with equal items."""

    __slots__ = ()

    @abstractmethod
    def _item(self, k: int) -> T:
        """The item at place k, 0 ≤ k < len(self)."""

    @overload
    def __getitem__(self, k: int) -> T: ...
    @overload
    def __getitem__(self, k: slice) -> tuple[T, ...]: ...
    def __getitem__(self, k: int | slice) -> T | tuple[T, ...]:
        if isinstance(k, slice):
            return tuple(self._item(i) for i in range(*k.indices(len(self))))
        if not -len(self) <= k < len(self):
            raise IndexError(k)
        return self._item(k % len(self))

    def __eq__(self, other: object) -> bool:
        if not isinstance(other, Sequence) or isinstance(other, str):
            return NotImplemented
        return len(self) == len(other) and all(a == b for a, b in zip(self, other, strict=True))

    __hash__ = None  # type: ignore[assignment]


class DayRows(_Made[BillRow]):
    """One row for each local day of an interval file.

    file : its name.  sums : its days.  step : seconds of a reading.
    """

    __slots__ = ("file", "step", "sums")

    def __init__(self, file: str, sums: DaySums, step: int = 0) -> None:
        self.file = file
        self.sums = sums
        self.step = step

    def __len__(self) -> int:
        return int(self.sums.day.size)

    @property
    def usable(self) -> NDArray[np.bool_]:
        """(n,) days of which every reading is there, once."""
        whole: NDArray[np.bool_] = (self.sums.missing == 0) & (self.sums.twice == 0)
        return whole

    def _item(self, k: int) -> BillRow:
        s = self.sums
        day, cost = int(s.day[k]), float(s.cost[k])
        return BillRow(
            self.file, int(s.line[k]), day, day + 1, float(s.use[k]),
            None if np.isnan(cost) else cost, problem=problem_of(s, k),
            note=estimates_note(int(s.estimated[k]), int(s.count[k])),
        )  # fmt: skip


def problem_of(sums: DaySums, k: int) -> str:
    """Why a day cannot be used, or ""."""
    if sums.missing[k]:
        return f"readings of {spoken(int(sums.missing[k]))} are missing on this day"
    if sums.twice[k]:
        return f"readings of {spoken(int(sums.twice[k]))} are there twice on this day"
    return ""


def estimates_note(estimated: int, count: int) -> str:
    """A note on a day or period of which a large share was estimated, or "".

    >>> estimates_note(30, 96), estimates_note(3, 96)
    ('30 of 96 readings are estimates', '')
    """
    if estimated == 0 or estimated < rules.ESTIMATED_SHARE * count:
        return ""
    return f"{estimated:,} of {count:,} readings are estimates"


@dataclass(frozen=True, slots=True, eq=False)
class DayLedger(_Made[LedgerEntry]):
    """What became of each day. rows : the days.  place : (n,) where each stands among the usable
    ones, -1 for the others.  fate : (usable,) period from 0, -1 for left out.  entry : makes the
    entry of a usable day.
    """

    rows: DayRows
    place: NDArray[np.int64]
    fate: NDArray[np.int32]
    entry: Callable[[BillRow, int], LedgerEntry]

    def __len__(self) -> int:
        return len(self.rows)

    @property
    def fates(self) -> NDArray[np.int64]:
        """(n,) period of each row from 0, -1 for left out."""
        return np.where(self.place >= 0, self.fate[np.maximum(self.place, 0)], -1).astype(np.int64)

    def _item(self, k: int) -> LedgerEntry:
        row = self.rows[k]
        if self.place[k] < 0:
            return LedgerEntry(row.file, row.line, "left out", row.problem)
        return self.entry(row, int(self.place[k]))
