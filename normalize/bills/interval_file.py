"""An interval file, taken apart by the kernel: its numbers, words and dates by column.

What belongs here: from a head and its columns to arrays.  Lines are taken apart in
interval_kernel.py; what the arrays mean is in intervals.py.
"""

from __future__ import annotations

import csv
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from normalize.bills.amounts import Decimal, number_of
from normalize.bills.columns import Columns
from normalize.bills.interval_head import IntervalHead
from normalize.bills.interval_kernel import SKIP, STAMP, TIME, USE, WORD, Lines, take_apart
from normalize.bills.interval_sums import count_lines
from normalize.bills.table import BillFile
from normalize.errors import UnreadableBills

if TYPE_CHECKING:
    from numpy.typing import NDArray

MAX_LINES = 4_000_000  # a century of quarter hours


def stamp_role(columns: Columns) -> str:
    """The role whose column says when."""
    return next(r for r in ("start", "read", "end") if columns.get(r) is not None)


@dataclass(frozen=True, slots=True)
class Taken:
    """An interval file taken apart. data : its bytes, recoded if need be.  first : its first line.

    roles : of the kernel, one for each column.  numbers, kinds : role, or column of an account,
    to its place among the numbers and the words.  at : (n,) numbers of the lines of one account;
    None where all are there, one after the other.
    """

    name: str
    data: bytes
    first: int
    lines: Lines
    delimiter: str
    roles: tuple[int, ...]
    numbers: dict[str, int]
    kinds: dict[str | int, int]
    decimal: Decimal
    at: NDArray[np.int64] | None = None

    @classmethod
    def of(cls, file: BillFile, head: IntervalHead, columns: Columns, decimal: Decimal) -> Taken:
        """Read every line below the header."""
        data = file.data if head.data is None else head.data
        if head.encoding == "utf-16":
            data = data.decode("utf-16", errors="replace").encode()
        begin = 0
        for _ in range(columns.line):
            begin = data.find(b"\n", begin) + 1
        flat = np.frombuffer(data, np.uint8)
        count = count_lines(flat, begin) + 1
        if count > MAX_LINES:
            raise UnreadableBills(f"the file holds more than {MAX_LINES:,} lines", where=file.name)
        roles, numbers, kinds = _roles(columns, head)
        point = "," if decimal == "comma" else "."
        lines = take_apart(flat, begin, head.delimiter, point, roles, count)
        return cls(
            file.name, data, columns.line + 1, lines, head.delimiter, tuple(roles), numbers,
            kinds, decimal,
        )  # fmt: skip

    def text(self, a: int, b: int) -> str:
        """Some bytes as text."""
        return self.data[a:b].decode("utf-8", "replace")

    def words(self, kind: str | int) -> list[str]:
        """The distinct words of a column."""
        place = self.kinds.get(kind)
        if place is None:
            return []
        return [self.text(int(a), int(b)) for a, b in self.lines.words[place]]

    def line(self, place: int) -> int:
        """The number, in the file, of a line."""
        return self.first + place if self.at is None else int(self.at[place])

    def line_numbers(self) -> NDArray[np.int64]:
        """Numbers of all lines, or (1,) the first where they follow each other."""
        return np.full(1, self.first, np.int64) if self.at is None else self.at

    def only(self, which: NDArray[np.intp]) -> tuple[Taken, NDArray[np.intp]]:
        """Some of the lines, in order, and the numbers that their dates had before.

        Each time that a column is asked for its words, it has only those of these lines.
        """
        a = self.lines
        date = a.date[which]
        used, again = np.unique(date[date >= 0].astype(np.intp), return_inverse=True)
        dates = np.full(date.shape, -1, np.int32)
        dates[date >= 0] = again
        word, words = a.word[which], []
        for k, spans in enumerate(a.words):
            there, column = np.unique(word[:, k]), word[:, k].copy()
            there = there[there >= 0]
            word[:, k] = np.where(column >= 0, np.searchsorted(there, column), -1)
            words.append(spans[there])
        lines = Lines(
            a.state[which], dates, a.second[which], a.offset[which], a.value[which], word,
            a.parts[used], a.spans[used], tuple(words), a.odd[:0],
        )  # fmt: skip
        return replace(self, lines=lines, at=which.astype(np.int64) + self.first), used

    def number(self, role: str) -> NDArray[np.float64]:
        """A column of numbers, NaN for none."""
        return self.lines.value[:, self.numbers[role]]

    def look_again(self) -> None:
        """What the kernel could not read as a number is read as in any table, in place."""
        columns = [k for k, role in enumerate(self.roles) if role == USE]
        for i, begin in self.lines.odd.tolist():
            end = self.data.find(b"\n", begin)
            line = self.text(begin, end if end >= 0 else len(self.data))
            try:
                cells = next(csv.reader([line], delimiter=self.delimiter), [])
            except csv.Error:  # a stray carriage return or NUL: no number there
                cells = []
            for slot, k in enumerate(columns):
                number = number_of(cells[k], self.decimal) if k < len(cells) else None
                self.lines.value[i, slot] = np.nan if number is None else number


def _roles(
    columns: Columns, head: IntervalHead
) -> tuple[list[int], dict[str, int], dict[str | int, int]]:
    """What each column is for; places of roles among numbers and among words."""
    roles = [SKIP] * len(columns.headings)
    uses = {"usage": USE, "cost": USE, "time": TIME} if head.wide is None else {}
    for role, use in uses.items():
        if (k := columns.get(role)) is not None:
            roles[k] = use
    roles[columns.by_role[stamp_role(columns)]] = STAMP
    words = {
        k: role for role in ("unit", "estimated", "fuel") if (k := columns.get(role)) is not None
    }
    kinds: dict[str | int, int] = {}
    for k in range(len(roles)):
        if (k in words or k in columns.accounts) and roles[k] == SKIP:
            roles[k] = WORD
            kinds[words.get(k, k)] = len(kinds)
    for k in head.wide.columns if head.wide is not None else ():
        roles[k] = USE
    order = [k for k, role in enumerate(roles) if role == USE]
    numbers: dict[str, int] = {}
    for each in ("usage", "cost"):
        if (k := columns.by_role.get(each, -1)) >= 0:
            numbers[each] = order.index(k)
    return roles, numbers, kinds
