"""Interval files: 15-minute, hourly or daily readings as CSV, tens of megabytes of them.

What belongs here: telling such a file from a table of bills, and its way into one row for each
local day.  Lines are taken apart in interval_kernel.py, moments made in
interval_times.py, days summed in local_days.py.  Headings and
questions are those of every table (columns.py, select.py).
"""

from __future__ import annotations

import csv
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from normalize.bills.amounts import Decimal, as_text, decide_decimal, number_of
from normalize.bills.answers import Answers, Understood
from normalize.bills.columns import (
    Columns,
    answer,
    choose_cost,
    choose_usage,
    described,
    find_columns,
)
from normalize.bills.dates import read_written
from normalize.bills.day_rows import DayRows
from normalize.bills.fuel_and_unit import fuel_of, unit_of
from normalize.bills.groups import cell, masked
from normalize.bills.headings import squeeze
from normalize.bills.interval_kernel import (
    BLANK,
    FULL,
    SKIP,
    STAMP,
    TIME,
    TOO_WIDE,
    USE,
    WORD,
    Lines,
    take_apart,
)
from normalize.bills.interval_sums import count_lines, keep_lines
from normalize.bills.interval_times import Moments, moments_of
from normalize.bills.local_days import DAY
from normalize.bills.records import is_estimated
from normalize.bills.sum_rows import day_rows, several
from normalize.bills.table import BillFile, CsvHead, RawRow, RawTable, Score, csv_head
from normalize.errors import AmbiguousBills, NoBills, NormalizeError, UnreadableBills

if TYPE_CHECKING:
    from numpy.typing import NDArray

MANY_DAYS = 5_000  # daily lines: more than that are read here, for speed
MAX_LINES = 4_000_000  # a century of quarter hours
MOST_USE = 1e12  # of any unit in one interval
SAMPLE = 400  # lines looked at to tell what kind of file it is


def is_interval_file(file: BillFile, answers: Answers, score: Score) -> CsvHead | None:
    """The file's head if its lines are intervals within days (or very many days), else None."""
    head = csv_head(file, score)
    if head is None:
        return None
    table = RawTable(file.name, file.sha256, head.rows, head.delimiter)
    try:
        columns, body = find_columns(table, answers.named)
    except NormalizeError:
        return None  # the reader of tables says what is the matter
    body = body[:SAMPLE]
    when = _date_column(columns)
    if when is None or len(body) < 2:
        return None
    timed = [row for row in body if _has_time(cell(row, when), cell(row, columns.get("time")))]
    if 2 * len(timed) > len(body) and _within_days(timed, when):
        return head
    spans = columns.get("start") is not None and columns.get("end") is not None
    return head if head.lines > MANY_DAYS and not spans and _daily(body, when) else None


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
    days = [as_text(cell(row, when)).replace("T", " ").split(" ")[0] for row in rows]
    return len(set(days)) <= 0.6 * len(days)


def _daily(body: Sequence[RawRow], when: int) -> bool:
    found = [read_written(cell(row, when)) for row in body]
    days = [w.day for w in found if w.day is not None]
    if len(days) < len(found) / 2:
        parts = [w.parts for w in found if w.parts is not None]
        return len({p[:2] for p in parts}) > 0.8 * len(body)  # nearly each line another day
    steps = np.abs(np.diff(np.array(days)))
    return bool(steps.size and np.median(steps) <= 1)


def read_intervals(file: BillFile, head: CsvHead, answers: Answers) -> Understood:
    """Local days of one account.  Raises as read_bills does."""
    table = RawTable(file.name, file.sha256, head.rows, head.delimiter)
    columns, body = find_columns(table, answers.named)
    where = f"{file.name}:{columns.line}"
    columns, usage_notes = choose_usage(
        columns, fuel=answers.fuel, unit=answers.unit, where=file.name
    )
    body = body[:SAMPLE]
    fuel = answers.fuel or fuel_of(columns, body, answers.unit, where)
    columns = choose_cost(columns, fuel)
    decimal = _decimal(columns, body, head, answers, where)
    big = _Big.of(file, head, columns, decimal)
    own, other_notes = _of_account(big, columns, answers, where)
    unit, unit_note = unit_of(
        columns, _unit_rows(big, columns), (), said=answers.unit, fuel=fuel, where=where
    )
    moments = moments_of(big.lines, _stamp_role(columns), big.data, answers, where)
    big.look_again()
    use = big.number("usage")
    cost = big.number("cost") if "cost" in big.numbers else np.full(1, np.nan)
    rows, notes = _summed(big, moments, own, use, cost, _estimated(big, columns))
    roles = [role for role in ("start", "end", "read", "time") if columns.get(role) is not None]
    return Understood(
        fuel, unit, "meter", rows,
        (
            f"interval data, header on line {columns.line}", f"fuel: {fuel}", unit_note,
            *described(columns, (*roles, "usage", "cost")), *usage_notes, *other_notes,
            *moments.notes, *notes,
        ),
        moments.cautions, sent=bool(np.any(use < 0)),
    )  # fmt: skip


def _stamp_role(columns: Columns) -> str:
    return next(r for r in ("start", "read", "end") if columns.get(r) is not None)


def _decimal(
    columns: Columns, body: Sequence[RawRow], head: CsvHead, answers: Answers, where: str
) -> Decimal:
    """The decimal mark, from the first lines."""
    cells = [cell(row, columns.get(role)) for role in ("usage", "cost") for row in body]
    return decide_decimal(cells, delimiter=head.delimiter, answer=answers.decimal, where=where)[0]


@dataclass(frozen=True, slots=True)
class _Big:
    """The file taken apart. data : its bytes, recoded if need be.  first : line of lines[0].

    roles : of the kernel, one for each column.  numbers, kinds : role, or column of an account,
    to its place among the numbers and the words.
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

    @classmethod
    def of(cls, file: BillFile, head: CsvHead, columns: Columns, decimal: Decimal) -> _Big:
        """Read every line below the header."""
        data = file.data
        if head.encoding == "utf-16":
            data = data.decode("utf-16", errors="replace").encode()
        begin = 0
        for _ in range(columns.line):
            begin = data.find(b"\n", begin) + 1
        flat = np.frombuffer(data, np.uint8)
        count = count_lines(flat, begin) + 1
        if count > MAX_LINES:
            raise UnreadableBills(f"the file holds more than {MAX_LINES:,} lines", where=file.name)
        roles, numbers, kinds = _roles(columns)
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

    def number(self, role: str) -> NDArray[np.float64]:
        """A column of numbers, NaN for none."""
        return self.lines.value[:, self.numbers[role]]

    def look_again(self) -> None:
        """What the kernel could not read as a number is read as in any table, in place."""
        columns = [k for k, role in enumerate(self.roles) if role == USE]
        for i, begin in self.lines.odd.tolist():
            end = self.data.find(b"\n", begin)
            line = self.text(begin, end if end >= 0 else len(self.data))
            cells = next(csv.reader([line], delimiter=self.delimiter), [])
            for slot, k in enumerate(columns):
                number = number_of(cells[k], self.decimal) if k < len(cells) else None
                self.lines.value[i, slot] = np.nan if number is None else number


def _roles(columns: Columns) -> tuple[list[int], dict[str, int], dict[str | int, int]]:
    """What each column is for; places of roles among numbers and among words."""
    roles = [SKIP] * len(columns.headings)
    for role, use in (("usage", USE), ("cost", USE), ("time", TIME)):
        if (k := columns.get(role)) is not None:
            roles[k] = use
    roles[columns.by_role[_stamp_role(columns)]] = STAMP
    words = {k: role for role in ("unit", "estimated") if (k := columns.get(role)) is not None}
    kinds: dict[str | int, int] = {}
    for k in range(len(roles)):
        if (k in words or k in columns.accounts) and roles[k] == SKIP:
            roles[k] = WORD
            kinds[words.get(k, k)] = len(kinds)
    order = [k for k, role in enumerate(roles) if role == USE]
    numbers: dict[str, int] = {}
    for each in ("usage", "cost"):
        if (k := columns.by_role.get(each, -1)) >= 0:
            numbers[each] = order.index(k)
    return roles, numbers, kinds


def _of_account(
    big: _Big, columns: Columns, answers: Answers, where: str
) -> tuple[NDArray[np.bool_], tuple[str, ...]]:
    """Which lines are the account's; asks where the file holds several."""
    own = big.lines.state == FULL
    for k in columns.accounts:
        words = big.words(k)
        known = [w for w in words if squeeze(w) and w != columns.headings[k].text]
        if len(known) < 2:
            continue
        shown = sorted({masked(w) for w in known})
        if answers.rows is None:
            raise AmbiguousBills(
                f"column {columns.headings[k].text!r} tells {len(known)} accounts or meters "
                f"apart ({', '.join(shown[:8])})",
                where=where,
                wanted="to know which is meant, for they are never added up",
                next_step=answer("rows", *(s.lstrip("…") for s in shown[:2])),
            )
        wanted = squeeze(answers.rows)
        hits = [
            n
            for n, w in enumerate(words)
            if squeeze(w) == wanted or (len(wanted) >= 4 and squeeze(w).endswith(wanted))
        ]
        if not hits:
            raise UnreadableBills("no line belongs to what rows names", where=where,
                                  wanted="one of " + ", ".join(shown[:12]))  # fmt: skip
        kept = own & np.isin(big.lines.word[:, big.kinds[k]], hits)
        other = int(own.sum() - kept.sum())
        return kept, (f"{several(other, 'line')} of other accounts or meters",)
    return own, ()


def _unit_rows(big: _Big, columns: Columns) -> list[RawRow]:
    """One row for each unit that the file names."""
    k = columns.get("unit")
    if k is None:
        return []
    blank: tuple[None, ...] = (None,) * k
    known = [w for w in big.words("unit")[:20] if w != columns.headings[k].text]
    return [RawRow(0, (*blank, word)) for word in known]


def _estimated(big: _Big, columns: Columns) -> NDArray[np.int64]:
    k = columns.get("estimated")
    marks = [int(bool(is_estimated(w, columns.headings[k or 0]))) for w in big.words("estimated")]
    if k is None or not any(marks):
        return np.zeros(1, np.int64)
    number = big.lines.word[:, big.kinds["estimated"]]
    return np.where(number >= 0, np.array([*marks, 0])[number], 0)


def _once(moments: Moments, use: NDArray[np.float64], keep: NDArray[np.uint8]) -> int:
    """Drop from ``keep`` lines that repeat another to the letter; returns how many.

    On a day of 25 hours an hour is there twice by right, so only what goes beyond is dropped.
    """
    if moments.rising:
        return 0
    some = np.flatnonzero(keep)
    if some.size == 0 or np.all(np.diff(moments.local[some]) > 0):
        return 0
    order = some[np.lexsort((use[some], moments.offset[some], moments.local[some]))]
    a, b = order[:-1], order[1:]
    same = np.zeros(order.size, np.bool_)
    same[1:] = (moments.local[a] == moments.local[b]) & (use[a] == use[b])
    same[1:] &= moments.offset[a] == moments.offset[b]
    days = moments.local[order] // DAY - int(moments.local[order[0]]) // DAY
    covered = np.bincount(days)[days] * moments.step
    same &= covered != DAY + 3600
    keep[order[same]] = 0
    return int(same.sum())


def _summed(
    big: _Big, moments: Moments, own: NDArray[np.bool_], use: NDArray[np.float64],
    cost: NDArray[np.float64], guessed: NDArray[np.int64],
) -> tuple[DayRows, list[str]]:  # fmt: skip
    state, keep = big.lines.state, np.empty(use.shape, np.uint8)
    use = np.ascontiguousarray(use)
    kept = keep_lines(state, moments.known, own.view(np.uint8), use, MOST_USE, keep)
    if kept == 0:
        raise NoBills("no line has both a time and a number", where=big.name)
    unread = np.empty(0, np.intp)
    if kept < keep.size:
        passed = own & (keep == 0) & (state != BLANK)
        unread = np.flatnonzero(passed | (state == TOO_WIDE))
    repeated = _once(moments, use, keep)
    rows, notes = day_rows(
        big.name, moments.local, np.full(1, moments.step), use, cost, np.full(1, big.first),
        guessed, keep=keep, offset=moments.offset if moments.zoned else None, clock=moments.clock,
    )  # fmt: skip
    if unread.size:
        notes.append(
            f"passed over: {several(unread.size, 'line')} without a time and a number, or with "
            f"more cells than the header (first on line {int(unread[0]) + big.first})"
        )
    if repeated:
        notes.append(f"repeated to the letter and counted once: {several(repeated, 'line')}")
    return rows, notes
