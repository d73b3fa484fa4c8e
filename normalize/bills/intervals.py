"""Interval files: readings of five minutes to a day, tens of megabytes of them.

What belongs here: their way into one row for each local day, long files and wide ones alike.
Whether a file is one is told in interval_head.py, lines are taken apart in interval_file.py,
moments made in interval_times.py, days summed in local_days.py.  Headings and questions are
those of every table (columns.py, groups.py).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from normalize.bills.amounts import Decimal, as_text, decide_decimal
from normalize.bills.answers import Answers, Understood
from normalize.bills.columns import (
    Columns,
    choose_cost,
    choose_usage,
    described,
    find_columns,
)
from normalize.bills.day_rows import DayRows
from normalize.bills.fuel_and_unit import fuel_of, unit_of
from normalize.bills.groups import cell, fuel_of_line
from normalize.bills.interval_accounts import IntervalAccounts, accounts_of_intervals
from normalize.bills.interval_file import Taken, stamp_role
from normalize.bills.interval_head import IntervalHead, whole_sheet
from normalize.bills.interval_kernel import BLANK, FULL, TOO_WIDE
from normalize.bills.interval_sums import keep_lines
from normalize.bills.interval_times import (
    Moments,
    bare_numbers,
    days_of,
    moments_of,
    wide_moments,
)
from normalize.bills.local_days import DAY
from normalize.bills.records import is_estimated
from normalize.bills.sum_rows import day_rows, several
from normalize.bills.table import BillFile, RawRow, RawTable
from normalize.errors import NoBills

if TYPE_CHECKING:
    from numpy.typing import NDArray

    Long = NDArray[np.int64]
    Float = NDArray[np.float64]
    Byte = NDArray[np.uint8]

SAMPLE = 400  # cells looked at for their decimal mark
MOST_USE = 1e12  # of any unit in one interval


@dataclass(frozen=True, slots=True)
class _Readings:
    """Readings one by one, whatever the shape of the file.

    state, own : (n,) of the reading's line: state, 1 if it is the account's.  use : (n,).  cost,
    guessed : (n,) or (1,) as in sum_days.  line : (n,) or (1,).  width : readings of a line.
    room : seconds of a day beyond which the file has no place for readings, or None.
    """

    moments: Moments
    state: Byte
    own: Byte
    use: Float
    cost: Float
    guessed: Long
    line: Long
    width: int = 1
    room: int | None = None


@dataclass(frozen=True, slots=True)
class OpenedIntervals:
    """An interval file, its lines told apart.  days, note : of the dates, settled by all lines."""

    head: IntervalHead
    columns: Columns
    taken: Taken
    accounts: IntervalAccounts
    days: Long
    note: str
    fuel: str
    where: str
    notes: tuple[str, ...]


def open_intervals(file: BillFile, head: IntervalHead, answers: Answers) -> OpenedIntervals:
    """Take a file apart, once for all its accounts.  Raises as read_bills does."""
    table = RawTable(file.name, file.sha256, head.rows, head.delimiter)
    columns, body = find_columns(table, answers.named)
    if head.sheet:
        head = whole_sheet(file, head)
    where = f"{file.name}:{columns.line}"
    columns, notes = choose_usage(columns, fuel=answers.fuel, unit=answers.unit, where=file.name)
    fuel = answers.fuel or fuel_of(columns, _of_a_fuel(columns, body), answers.unit, where)
    columns = choose_cost(columns, fuel)
    taken = Taken.of(file, head, columns, _decimal(columns, body, head, answers, where))
    taken.look_again()
    taken = replace(taken, lines=replace(taken.lines, second=bare_numbers(taken.lines.second)))
    accounts = accounts_of_intervals(taken, columns, answers, where)
    days, note = days_of(taken.lines, taken.data, answers, where)
    return OpenedIntervals(head, columns, taken, accounts, days, note, fuel, where, tuple(notes))


def _of_a_fuel(columns: Columns, body: Sequence[RawRow]) -> Sequence[RawRow]:
    """Rows whose fuel can be read, if any."""
    k = columns.get("fuel")
    if k is None:
        return body
    return [r for r in body if not fuel_of_line(as_text(cell(r, k)), "", True)[1]] or body


def read_intervals(file: BillFile, head: IntervalHead, answers: Answers) -> Understood:
    """Local days of one account.  Raises as read_bills does."""
    opened = open_intervals(file, head, answers)
    which, notes = opened.accounts.chosen(answers, opened.where)
    return understand_account(opened, which, answers, notes)


def understand_account(
    opened: OpenedIntervals, which: NDArray[np.intp] | None, answers: Answers,
    notes: Sequence[str] = (),
) -> Understood:  # fmt: skip
    """Local days of the account on some lines, or on all.  Raises as read_bills does."""
    columns, where, head = opened.columns, opened.where, opened.head
    taken, days, fuel = opened.taken, opened.days, answers.fuel or opened.fuel
    if which is not None:
        taken, dates = taken.only(which)
        days = days[dates]
    unit, unit_note = unit_of(
        columns, _unit_rows(taken, columns), (), said=answers.unit, fuel=fuel, where=where
    )
    make = _long if head.wide is None else _wide
    readings = make(taken, head, columns, days, opened.note, answers, where)
    rows, more = _summed(readings, taken)
    roles = [role for role in ("start", "end", "read", "time") if columns.get(role) is not None]
    return Understood(
        fuel, unit, "meter", rows,
        (
            *((f"sheet {head.sheet[:40]!r}",) if head.sheet else ()),
            f"interval data, header on line {columns.line}", f"fuel: {fuel}", unit_note,
            *described(columns, (*roles, *(("usage", "cost") if head.wide is None else ()))),
            *opened.notes, *notes, *readings.moments.notes, *more,
        ),
        readings.moments.cautions, sent=bool(np.any(readings.use < 0)),
    )  # fmt: skip


def _long(
    taken: Taken, head: IntervalHead, columns: Columns, days: Long, note: str, answers: Answers,
    where: str,
) -> _Readings:  # fmt: skip
    """Readings of a file with a line for each."""
    lines = taken.lines
    moments = moments_of(lines, days, note, stamp_role(columns), answers, where)
    return _Readings(
        moments, lines.state, _own(lines.state), np.ascontiguousarray(taken.number("usage")),
        taken.number("cost") if "cost" in taken.numbers else np.full(1, np.nan),
        _estimated(taken, columns), taken.line_numbers(),
    )  # fmt: skip


def _own(state: Byte) -> Byte:
    own: Byte = (state == FULL).view(np.uint8)
    return own


def _wide(
    taken: Taken, head: IntervalHead, columns: Columns, days: Long, note: str, answers: Answers,
    where: str,
) -> _Readings:  # fmt: skip
    """Readings of a file with a line for each day."""
    if head.wide is None:
        raise TypeError("a wide head is needed")
    lines, wide, width = taken.lines, head.wide, len(head.wide.columns)
    for slot, k in enumerate(wide.columns):
        if k in wide.extra:  # filled once a year, and with noughts on all other days
            lines.value[lines.value[:, slot] == 0, slot] = np.nan
    guessed = _estimated(taken, columns)
    number = taken.at
    if number is None:
        number = np.arange(taken.first, taken.first + lines.state.size, dtype=np.int64)
    return _Readings(
        wide_moments(lines, days, note, wide, answers, where),
        np.repeat(lines.state, width), np.repeat(_own(lines.state), width),
        lines.value.reshape(-1), np.full(1, np.nan),
        np.repeat(guessed, width) if guessed.size > 1 else guessed,
        np.repeat(number, width), width, None if wide.extra else DAY,
    )  # fmt: skip


def _decimal(
    columns: Columns, body: Sequence[RawRow], head: IntervalHead, answers: Answers, where: str
) -> Decimal:
    """The decimal mark, from the first lines."""
    used = [columns.get(role) for role in ("usage", "cost")]
    used += head.wide.columns if head.wide is not None else ()
    cells = [cell(row, k) for k in used if k is not None for row in body[: SAMPLE // len(used)]]
    return decide_decimal(cells, delimiter=head.delimiter, answer=answers.decimal, where=where)[0]


def _unit_rows(big: Taken, columns: Columns) -> list[RawRow]:
    """One row for each unit that the file names."""
    k = columns.get("unit")
    if k is None:
        return []
    blank: tuple[None, ...] = (None,) * k
    known = [w for w in big.words("unit")[:20] if w != columns.headings[k].text]
    return [RawRow(0, (*blank, word)) for word in known]


def _estimated(big: Taken, columns: Columns) -> NDArray[np.int64]:
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


def _summed(r: _Readings, taken: Taken) -> tuple[DayRows, list[str]]:
    """One row for each local day, and sentences."""
    moments, keep = r.moments, np.empty(r.use.shape, np.uint8)
    if keep_lines(r.state, moments.known, r.own, r.use, MOST_USE, keep) == 0:
        raise NoBills("no line has both a time and a number", where=taken.name)
    unread = _unread(r, keep)
    repeated = _once(moments, r.use, keep)
    _drop_unreal(moments, r.use, keep)
    rows, notes = day_rows(
        taken.name, moments.local, np.full(1, moments.step), r.use, r.cost, r.line, r.guessed,
        keep=keep, offset=moments.offset if moments.zoned else None, clock=moments.clock,
        room=r.room,
    )  # fmt: skip
    if unread.size:
        notes.append(
            f"passed over: {several(unread.size, 'line')} without a time and a number, or with "
            f"more cells than the header (first on line {taken.line(int(unread[0]))})"
        )
    if repeated:
        what = "line" if r.width == 1 else "reading"
        notes.append(f"repeated to the letter and counted once: {several(repeated, what)}")
    return rows, [*notes, *_long_days(r, rows)]


def _unread(r: _Readings, keep: Byte) -> NDArray[np.intp]:
    """Lines of which nothing was kept, though they hold something."""
    if np.all(keep):
        return np.empty(0, np.intp)
    kept = keep.reshape(-1, r.width).any(axis=1)
    state, own = r.state[:: r.width], r.own[:: r.width]
    return np.flatnonzero(((own == 1) & ~kept & (state != BLANK)) | (state == TOO_WIDE))


def _drop_unreal(moments: Moments, use: Float, keep: Byte) -> None:
    """Drop readings of nothing in the hour that clocks leap over, which a file may write as 0."""
    clock = moments.clock
    if clock is None or moments.zoned:
        return
    leap = np.flatnonzero(np.diff(clock.offset) > 0)
    if leap.size == 0:  # a clock that never changes
        return
    begin, end = (clock.since[leap] + clock.offset[leap + k] for k in (0, 1))
    at = np.searchsorted(begin, moments.local, side="right") - 1
    keep[(at >= 0) & (moments.local < end[at]) & (use == 0)] = 0


def _long_days(r: _Readings, rows: DayRows) -> list[str]:
    """A sentence on days of 25 hours in a file that has room for 24."""
    if r.room is None or r.moments.clock is None:
        return []
    days = int(np.count_nonzero(r.moments.clock.seconds_of_day(rows.sums.day) > r.room))
    if days == 0:
        return []
    return [
        f"{several(days, 'day')} of 25 hours in a file with room for 24: the hour that comes "
        "twice is added to its namesake, or lost; the file does not say"
    ]
