"""The lines of a large CSV taken apart in one pass over its bytes, compiled.

What belongs here: which cell is what, and where its number or moment goes.  Single cells are
read in interval_cells.py; what the columns mean is decided before (intervals.py), what the
numbers come to after.  UTF-16 is recoded by the caller.  (normalize.jit)
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from normalize.bills.interval_cells import (
    BAD_TIME,
    LONGEST_TEXT,
    NO_OFFSET,
    NO_TIME,
    ROOM,
    cell_end,
    cell_span,
    date_end,
    patient_clock,
    patient_number,
    quick_clock,
    quick_number,
    quick_zone,
    same_bytes,
    three_numbers,
)
from normalize.jit import kernel

if TYPE_CHECKING:
    from numpy.typing import NDArray

    Bytes = NDArray[np.uint8]
    Int = NDArray[np.int32]
    Small = NDArray[np.int16]
    Long = NDArray[np.int64]
    Float = NDArray[np.float64]

MAX_WORDS = 4096  # distinct words of a column of words: more is no column of units or accounts

# What a column is for.
SKIP, STAMP, TIME, USE, WORD = 0, 1, 2, 3, 4

# State of a line.
BLANK, FULL, TOO_WIDE = 0, 1, 2


@kernel
def _word(data: Bytes, a: int, b: int, spans: Long, seen: Long) -> int:
    """Number of a word among those seen; a new one is remembered.  -1 when there are too many.

    seen : how many there are, and the one that was last.
    """
    for k in range(seen[0]):
        if spans[k, 1] - spans[k, 0] == b - a and same_bytes(data, spans[k, 0], a, b - a):
            seen[1] = k
            return k
    new: int = seen[0]
    if new >= MAX_WORDS:
        return -1
    spans[new, 0], spans[new, 1] = a, b
    seen[0], seen[1] = new + 1, new
    return new


@kernel
def _date(data: Bytes, a: int, b: int, parts: Small, spans: Long, seen: Long, old: int) -> int:
    """Number of a date, which is a new one unless the line before had the same.

    seen : how many there are.  old : the date of the line before, -1 for none.
    """
    size = spans[old, 1] - spans[old, 0] if old >= 0 else -1
    if size == b - a and same_bytes(data, spans[old, 0], a, size):
        return old
    m: int = seen[0]
    spans[m, 0], spans[m, 1] = a, b
    three_numbers(data, a, b, parts[m])
    seen[0] += 1
    return m


@kernel
def _time_of_day(stamp: int, beside: int) -> int:
    """Seconds of the day from a stamp and from a column of times; BAD_TIME if they contradict."""
    if beside in (NO_TIME, stamp):
        return 0 if stamp == NO_TIME else stamp
    return beside if stamp == NO_TIME or stamp == 0 else BAD_TIME


@kernel
def _patient_cell(
    data: Bytes, a: int, b: int, role: int, slot: int, i: int, begins: int, point: int,
    line: Long, value: Float, word: Int, parts: Small, spans: Long, words: Long, seen: Long,
    odd: Long, counts: Long,
) -> None:  # fmt: skip
    """A cell that no quick reader knows. line : date, time, time beside, offset, date before."""
    if role == STAMP:
        c = date_end(data, a, b)
        old = line[0] if line[0] >= 0 else line[4]
        line[0] = _date(data, a, c, parts, spans, counts, old)
        line[4] = line[0] if 0 < c - a <= LONGEST_TEXT else -1
        line[1], line[3] = patient_clock(data, c, b)
    elif role == TIME:
        line[2], zone = patient_clock(data, a, b)
        if zone != NO_OFFSET:
            line[3] = zone
    elif role == USE:
        value[i, slot], ask = patient_number(data, a, b, point)
        if ask and (counts[1] == 0 or odd[counts[1] - 1, 0] != i):
            odd[counts[1], 0], odd[counts[1], 1] = i, begins
            counts[1] += 1
    elif role == WORD:
        word[i, slot] = _word(data, a, b, words[slot], seen[slot])


@kernel
def read_lines(
    data: Bytes, begin: int, delimiter: int, point: int, roles: Long, slots: Long,
    state: Bytes, date: Int, second: Int, offset: Int, value: Float, word: Int,
    parts: Small, spans: Long, words: Long, seen: Long, odd: Long, counts: Long,
) -> int:  # fmt: skip
    """Every line from byte ``begin`` on; returns how many there are.

    Longer than a function should be: what every cell passes stands here, for a call from this
    loop costs a quarter of its time (measured).

    roles, slots : (columns,) what a column is for, and its place among its kind.
    state … word : (lines,) or (lines, kinds), as in Lines.  parts, spans : (lines,) of dates.
    words, seen : (kinds, MAX_WORDS, 2), (kinds, 2) of words.  odd : (lines, 2) the line and
    first byte of lines with a number that must be looked at.  counts : of dates, of odd lines.
    """
    n, columns, i, j = data.shape[0], roles.shape[0], 0, begin
    line = np.full(5, -1, np.int64)
    known, at, size = -1, 0, 0  # the date of the line before
    while j < n:
        begins, full, more, k = j, 0, True, 0
        when, clock, beside, zone = -1, NO_TIME, NO_TIME, NO_OFFSET
        for m in range(value.shape[1]):
            value[i, m] = np.nan
        for m in range(word.shape[1]):
            word[i, m] = -1
        while more:
            role, slot = (roles[k], slots[k]) if k < columns else (0, 0)
            end = -1
            if role > 0 and j + ROOM < n:
                quoted = data[j] == 34
                a = j + 1 if quoted else j
                if role == USE:
                    number, c = quick_number(data, a, point)
                    end = cell_end(data, c, delimiter, quoted) if c >= 0 else -1
                    if end >= 0:
                        value[i, slot] = number
                elif role == STAMP:
                    if known >= 0 and same_bytes(data, a, at, size):
                        c, s, z = a + size, NO_TIME, NO_OFFSET
                        if data[c] == 32 or data[c] == 84:
                            s, c = quick_clock(data, c + 1)
                            if c >= 0:
                                z, c = quick_zone(data, c)
                        end = cell_end(data, c, delimiter, quoted) if c >= 0 else -1
                        if end >= 0:
                            when, clock, zone = known, s, z
                elif role == TIME:
                    s, c = quick_clock(data, a)
                    end = cell_end(data, c, delimiter, quoted) if c >= 0 else -1
                    if end >= 0:
                        beside = s
                elif seen[slot, 1] >= 0:
                    c = words[slot, seen[slot, 1], 0]
                    m = words[slot, seen[slot, 1], 1] - c
                    if m <= LONGEST_TEXT and same_bytes(data, a, c, m):
                        end = cell_end(data, a + m, delimiter, quoted)
                        if end >= 0:
                            word[i, slot] = seen[slot, 1]
            if end >= 0:
                full = max(full, 1)
            else:
                a, b, end = cell_span(data, j, delimiter)
                if b > a:
                    full = max(full, 1 if k < columns else 2)
                line[0], line[1], line[2], line[3], line[4] = when, clock, beside, zone, known
                _patient_cell(
                    data, a, b, role, slot, i, begins, point, line, value, word, parts, spans,
                    words, seen, odd, counts,
                )  # fmt: skip
                when, clock, beside, zone, known = line[0], line[1], line[2], line[3], line[4]
                if role == STAMP and known >= 0:
                    at, size = spans[known, 0], spans[known, 1] - spans[known, 0]
            k += 1
            more = end < n and data[end] != 10
            j = end + 1
        state[i], date[i], offset[i] = full, when, zone
        second[i] = _time_of_day(clock, beside)
        i += 1
    return i


@dataclass(frozen=True, slots=True)
class Lines:
    """What the kernel found, one row for each line.

    state : BLANK, FULL or TOO_WIDE.  date : number of the line's date, -1 for none.
    second : seconds of the day, or NO_TIME, BAD_TIME, a bare number (interval_cells.py).
    offset : seconds from UTC, or NO_OFFSET.  value : (n, kinds) use and cost, NaN for none.
    word : (n, kinds) number of its word.  parts : (dates, 3) numbers of a date as written,
    parts[:, 0] is -1 for a date that is no three numbers.  spans : (dates, 2) its bytes.
    words : for each kind, its words as (start, end) in the bytes.  odd : (k, 2) line and first
    byte of each line with a number that only a slower reader can read.
    """

    state: Bytes
    date: Int
    second: Int
    offset: Int
    value: Float
    word: Int
    parts: Small
    spans: Long
    words: tuple[Long, ...]
    odd: Long


def take_apart(
    data: Bytes, begin: int, delimiter: str, point: str, roles: list[int], lines: int
) -> Lines:
    """Run the kernel. roles : one for each column, USE columns in the order of their values.

    lines : at least as many as there are.
    """
    slots, kinds = np.zeros(len(roles), np.int64), {USE: 0, WORD: 0}
    for k, role in enumerate(roles):
        if role in kinds:
            slots[k] = kinds[role]
            kinds[role] += 1
    # The kernel fills what it reads; pages that nothing needs are never touched.
    state, value = np.empty(lines, np.uint8), np.empty((lines, kinds[USE]), np.float64)
    date, second, offset = (np.empty(lines, np.int32) for _ in range(3))
    word = np.empty((lines, kinds[WORD]), np.int32)
    parts, spans = np.empty((lines, 3), np.int16), np.empty((lines, 2), np.int64)
    odd = np.empty((lines, 2), np.int64)
    words = np.zeros((kinds[WORD], MAX_WORDS, 2), np.int64)
    seen = np.tile(np.array([0, -1], np.int64), (kinds[WORD], 1))
    counts = np.zeros(2, np.int64)
    n = read_lines(
        data, begin, ord(delimiter), ord(point), np.array(roles, np.int64), slots,
        state, date, second, offset, value, word, parts, spans, words, seen, odd, counts,
    )  # fmt: skip
    return Lines(
        state[:n], date[:n], second[:n], offset[:n], value[:n], word[:n],
        parts[: counts[0]], spans[: counts[0]],
        tuple(words[k, : seen[k, 0]] for k in range(kinds[WORD])), odd[: counts[1]],
    )  # fmt: skip
