"""The lines of a large CSV taken apart in one pass over its bytes, compiled.

What belongs here: cells to numbers and moments, without a string for each.  What the columns
mean is decided before (intervals.py), what the numbers come to after.  Bytes are ASCII or a
superset of it; UTF-16 is recoded by the caller.  (normalize.jit)
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from normalize.jit import kernel

if TYPE_CHECKING:
    from numpy.typing import NDArray

    Bytes = NDArray[np.uint8]
    Int = NDArray[np.int32]
    Small = NDArray[np.int16]
    Long = NDArray[np.int64]
    Float = NDArray[np.float64]
    Byte = NDArray[np.uint8]

NO_OFFSET = 1 << 20
_NO_OFFSET = NO_OFFSET
MAX_WORDS = 4096  # distinct words of a column of words: more is no column of units or accounts
_MAX_WORDS = MAX_WORDS

_POWERS = 10.0 ** np.arange(16)

# What a column is for.
SKIP, STAMP, TIME, USE, COST, WORD = 0, 1, 2, 3, 4, 5
_STAMP, _TIME, _USE, _COST, _WORD = 1, 2, 3, 4, 5

# State of a line.
BLANK, FULL, TOO_WIDE = 0, 1, 2
_FULL, _TOO_WIDE = 1, 2

# acc: count, half, zone, hours, minutes, zone digits, bad, colon, width
_ACC = 9


@kernel
def _end_number(fields: Small, i: int, acc: Long, value: int, digits: int) -> None:
    if digits > 8 or acc[0] > 5 or (value > 9999 and not (acc[0] == 0 and digits == 8)):
        acc[6] = 1
        return
    if acc[0] == 0:
        acc[8] = digits
    if acc[0] == 0 and digits == 8:  # 20230105
        fields[i, 0], fields[i, 1], fields[i, 2] = value // 10000, value // 100 % 100, value % 100
        acc[0] = 3
    else:
        fields[i, acc[0]] = value
        acc[0] += 1


@kernel
def _mark(c: int, acc: Long) -> None:
    """A letter or a sign within a stamp."""
    if c == 58:  # :
        acc[7] = 1
    elif (c == 43 or c == 45) and acc[7] == 1 and acc[2] == 0:  # + or - behind a time
        acc[2] = 1 if c == 43 else -1
    elif c == 90 or c == 122:  # Z
        acc[2], acc[5] = 1, 4
    elif c == 65 or c == 97:  # A
        acc[1] = 1
    elif c == 80 or c == 112:  # P
        acc[1] = 2
    elif not (c == 84 or c == 116 or c == 77 or c == 109 or c == 32 or c == 45 or c == 47
              or c == 46 or c == 44 or c == 34 or c == 39 or c == 72 or c == 104
              or c == 69 or c == 101):  # fmt: skip
        acc[6] = 1


@kernel
def _stamp(data: Bytes, a: int, b: int, fields: Small, i: int, acc: Long) -> None:
    """Numbers of data[a:b] appended to fields[i]."""
    value, digits, fraction = 0, 0, False
    for j in range(a, b):
        c = data[j]
        if 48 <= c <= 57:
            if fraction:
                continue
            if acc[2] != 0:
                acc[5] += 1
                if acc[5] <= 2:
                    acc[3] = acc[3] * 10 + (c - 48)
                elif acc[5] <= 4:
                    acc[4] = acc[4] * 10 + (c - 48)
            else:
                value = value * 10 + (c - 48) if digits < 9 else value
                digits += 1
            continue
        if digits > 0:
            _end_number(fields, i, acc, value, digits)
            value, digits = 0, 0
        fraction = c == 46 and acc[7] == 1  # of a second
        _mark(c, acc)
    if digits > 0:
        _end_number(fields, i, acc, value, digits)


@kernel
def _clock_time(data: Bytes, a: int, b: int, fields: Small, i: int) -> bool:
    """A time such as 0:15 or T00:15:00 into fields[i, 3:6]; False for anything less plain."""
    if a < b and (data[a] == 32 or data[a] == 84):
        a += 1
    colon = a + 1 if a + 1 < b and data[a + 1] == 58 else a + 2
    if colon >= b or data[colon] != 58 or not (b - colon == 3 or b - colon == 6):
        return False
    hour, minute, second = 0, 0, -1
    for j in range(a, colon):
        if not 48 <= data[j] <= 57:
            return False
        hour = hour * 10 + (data[j] - 48)
    for j in range(colon + 1, colon + 3):
        if not 48 <= data[j] <= 57:
            return False
        minute = minute * 10 + (data[j] - 48)
    if b - colon == 6:
        if data[colon + 3] != 58:
            return False
        second = 0
        for j in range(colon + 4, colon + 6):
            if not 48 <= data[j] <= 57:
                return False
            second = second * 10 + (data[j] - 48)
    fields[i, 3], fields[i, 4], fields[i, 5] = hour, minute, second
    return True


@kernel
def _same_bytes(data: Bytes, a: int, b: int, size: int) -> bool:
    for j in range(size):  # noqa: SIM110 (numba compiles no generators)
        if data[a + j] != data[b + j]:
            return False
    return True


@kernel
def _dated(data: Bytes, a: int, b: int, fields: Small, i: int, acc: Long, seen: Long) -> None:
    """A stamp; the date is taken from the line that last wrote the same one.

    seen : first byte, length and line of that date.
    """
    cut = a
    while cut < b and data[cut] != 32 and data[cut] != 84:
        cut += 1
    if seen[2] >= 0 and cut - a == seen[1] and _same_bytes(data, a, seen[0], cut - a):
        k = seen[2]
        fields[i, 0], fields[i, 1], fields[i, 2] = fields[k, 0], fields[k, 1], fields[k, 2]
        acc[0] = 3
    else:
        _stamp(data, a, cut, fields, i, acc)
        seen[2] = -1
        if acc[0] == 3 and acc[6] == 0:
            seen[0], seen[1], seen[2] = a, cut - a, i
    if cut < b:
        if acc[0] == 3 and _clock_time(data, cut, b, fields, i):
            acc[0] = 6
        else:
            _stamp(data, cut, b, fields, i, acc)


@kernel
def _end_stamp(fields: Small, offset: Int, i: int, acc: Long) -> None:
    """The hour of 24, the offset, or fields[i, 0] = -1 for what is no stamp."""
    offset[i] = _NO_OFFSET
    if acc[2] != 0:
        offset[i] = acc[2] * (acc[3] * 3600 + acc[4] * 60)
    for k in range(acc[0], 6):
        fields[i, k] = -1
    if acc[1] > 0 and acc[0] > 3:
        if fields[i, 3] < 1 or fields[i, 3] > 12:
            acc[6] = 1
        fields[i, 3] = fields[i, 3] % 12 + (12 if acc[1] == 2 else 0)
    if acc[6] == 1 or acc[0] < 3:
        fields[i, 0] = -1


@kernel
def _number(data: Bytes, a: int, b: int, point: int) -> tuple[float, int]:
    """Value and state of a plain number: 0 blank, 1 a number, 2 for a slower reader to look at."""
    sign, mantissa, digits, decimals, seen = 1.0, 0, 0, 0, False
    for j in range(a, b):
        c = data[j]
        if 48 <= c <= 57:
            mantissa = mantissa * 10 + (c - 48)
            digits += 1
            decimals += 1 if seen else 0
            if digits > 15:
                return 0.0, 2
        elif c == point and not seen:
            seen = True
        elif c == 45 and digits == 0 and not seen and sign > 0:
            sign = -1.0
        elif c == 32 or (c == 36 and digits == 0):
            continue
        else:
            return 0.0, 2
    if digits == 0:
        return np.nan, 2 if seen or sign < 0 else 0
    # Both are whole and below 2**53, so that the quotient is the nearest float64.
    return sign * (mantissa / _POWERS[decimals]), 1


@kernel
def _cell_ends(data: Bytes, j: int, delimiter: int) -> int:
    """Where a cell ends that can only end at byte j; -1 if it goes on."""
    if j >= data.shape[0] or data[j] == delimiter or data[j] == 10:
        return j
    if data[j] == 13 and (j + 1 >= data.shape[0] or data[j + 1] == 10):
        return j + 1
    return -1


@kernel
def _quick_stamp(data: Bytes, j: int, delimiter: int, fields: Small, i: int, seen: Long) -> int:
    """A stamp of the date seen last and a plain time; where its cell ends, or -1 for neither."""
    cut = j + seen[1]
    if cut + 6 > data.shape[0] or not (data[cut] == 32 or data[cut] == 84):
        return -1
    for m in range(seen[1]):
        if data[j + m] != data[seen[0] + m]:
            return -1
    a = cut + 1
    colon = a + 1 if data[a + 1] == 58 else a + 2
    stop = colon + 3
    if stop < data.shape[0] and data[stop] == 58:
        stop += 3
    end = _cell_ends(data, stop, delimiter)
    if end < 0 or stop > data.shape[0] or not _clock_time(data, cut, stop, fields, i):
        return -1
    k = seen[2]
    fields[i, 0], fields[i, 1], fields[i, 2] = fields[k, 0], fields[k, 1], fields[k, 2]
    return end


@kernel
def _quick_number(data: Bytes, j: int, delimiter: int, point: int) -> tuple[float, int]:
    """A number such as 12 or -0.125 and where its cell ends, or -1 for anything less plain."""
    sign, mantissa, digits, decimals = 1.0, 0, 0, 0
    n = data.shape[0]
    if j < n and data[j] == 45:
        sign, j = -1.0, j + 1
    while j < n and 48 <= data[j] <= 57:
        mantissa = mantissa * 10 + (data[j] - 48)
        digits, j = digits + 1, j + 1
    if j < n and data[j] == point and point != delimiter:
        j += 1
        while j < n and 48 <= data[j] <= 57:
            mantissa = mantissa * 10 + (data[j] - 48)
            digits, decimals, j = digits + 1, decimals + 1, j + 1
    if digits == 0 or digits > 15:
        return 0.0, -1
    return sign * (mantissa / _POWERS[decimals]), _cell_ends(data, j, delimiter)


@kernel
def _word(data: Bytes, a: int, b: int, spans: Long, count: int) -> int:
    """Number of a word among those seen; a new one is remembered.  -1 when there are too many."""
    for k in range(count):
        if spans[k, 1] - spans[k, 0] == b - a:
            same = True
            for j in range(b - a):
                if data[spans[k, 0] + j] != data[a + j]:
                    same = False
                    break
            if same:
                return k
    if count >= _MAX_WORDS:
        return -1
    spans[count, 0], spans[count, 1] = a, b
    return count


@kernel
def read_lines(
    data: Bytes, begin: int, delimiter: int, point: int, roles: Long, slots: Long,
    state: Byte, fields: Small, offset: Int, span: Long,
    value: Float, number_state: Byte, number_span: Long,
    words: Int, word_spans: Long, word_count: Long,
) -> int:  # fmt: skip
    """Every line from byte ``begin`` on; returns how many there are.

    roles, slots : (columns,) what a column is for, and its place among its kind.
    state : (lines,).  fields, offset, span : of the stamp.  value, number_state, number_span :
    (lines, 2 …) use and cost.  words : (lines, kinds) numbers into word_spans[kind].
    """
    n, columns, i, j = data.shape[0], roles.shape[0], 0, begin
    acc = np.zeros(_ACC, np.int64)
    seen = np.full(3, -1, np.int64)
    spoilt = True  # the generic reader has left marks in acc
    last = np.full(words.shape[1], -1, np.int64)
    while j < n:
        if spoilt:
            for m in range(_ACC):
                acc[m] = 0
        acc[0], spoilt = 0, False
        state[i] = 0
        fields[i, 0] = -1
        for m in range(value.shape[1]):
            value[i, m] = np.nan
            number_state[i, m] = 0
        for m in range(words.shape[1]):
            words[i, m] = -1
        begins, ends = 0, 0
        k, blank, more = 0, True, True
        while more:
            role = roles[k] if k < columns else 0
            end = -1
            if role == _STAMP and seen[2] >= 0:
                end = _quick_stamp(data, j, delimiter, fields, i, seen)
                if end >= 0:
                    acc[0] = 6
            elif role in (_USE, _COST):
                number, end = _quick_number(data, j, delimiter, point)
                if end >= 0:
                    value[i, slots[k]], number_state[i, slots[k]] = number, 1
            if end >= 0:
                blank = False
                j = end
                k += 1
                more = j < n and data[j] != 10
                j += 1
                continue
            spoilt = True
            quoted = j < n and data[j] == 34
            a = j + 1 if quoted else j
            j = a
            while j < n and data[j] != 10 and (
                data[j] != 34 if quoted else data[j] != delimiter
            ):  # fmt: skip
                j += 1
            b = j
            while j < n and data[j] != 10 and data[j] != delimiter:
                j += 1
            while b > a and (data[b - 1] == 32 or data[b - 1] == 13):
                b -= 1
            while a < b and (data[a] == 32 or data[a] == 39):
                a += 1
            if b > a:
                blank = False
                if k >= columns:
                    state[i] = _TOO_WIDE
            if role == _STAMP:
                begins, ends = a, b
                _dated(data, a, b, fields, i, acc, seen)
            elif role == _TIME:
                if acc[0] == 3 and _clock_time(data, a, b, fields, i):
                    acc[0] = 6
                else:
                    _stamp(data, a, b, fields, i, acc)
            elif role in (_USE, _COST):
                s = slots[k]
                value[i, s], number_state[i, s] = _number(data, a, b, point)
                if number_state[i, s] == 2:
                    number_span[i, 2 * s], number_span[i, 2 * s + 1] = a, b
            elif role == _WORD:
                s = slots[k]
                w = -2
                if last[s] >= 0:
                    before = word_spans[s, last[s], 0]
                    size = word_spans[s, last[s], 1] - before
                    if size == b - a and _same_bytes(data, a, before, size):
                        w = last[s]
                if w == -2:
                    w = _word(data, a, b, word_spans[s], word_count[s])
                    if w == word_count[s]:
                        word_count[s] += 1
                words[i, s] = w
                last[s] = w
            k += 1
            more = j < n and data[j] != 10
            j += 1
        if not blank and state[i] == 0:
            state[i] = _FULL
        if spoilt or acc[0] != 6:
            _end_stamp(fields, offset, i, acc)
        else:
            offset[i] = _NO_OFFSET
        if fields[i, 0] < 0:
            span[i, 0], span[i, 1] = begins, ends
        i += 1
    return i


@kernel
def local_seconds(
    fields: Small, state: Byte, places: Long, first_of_month: Long, local: Long, known: Byte
) -> None:
    """Seconds since 1970 by the file's own clock; known 0 where a line has no such moment.

    places : which fields are year, month and day.  first_of_month : days, from 1900-01 on.
    """
    for i in range(fields.shape[0]):
        local[i], known[i] = 0, 0
        year, month, day = fields[i, places[0]], fields[i, places[1]], fields[i, places[2]]
        if fields[i, 0] < 0 or state[i] != _FULL or year < 0:
            continue
        if year < 100:
            year += 2000 if year < 70 else 1900
        if year < 1900 or year > 2099 or month < 1 or month > 12 or day < 1:
            continue
        place = (year - 1900) * 12 + month - 1
        if first_of_month[place] + day > first_of_month[place + 1]:
            continue
        hour, minute, second = fields[i, 3], fields[i, 4], max(0, fields[i, 5])
        if minute < 0:  # a whole hour, or 0015 for a quarter past midnight
            hour, minute = (hour // 100, hour % 100) if hour > 24 else (max(0, hour), 0)
        total = hour * 3600 + minute * 60 + second
        if minute > 59 or second > 60 or total > 86400:
            continue
        local[i] = (first_of_month[place] + day - 1) * 86400 + total
        known[i] = 1


@kernel
def add_days(
    local: Long, seconds: Long, use: Float, cost: Float, line: Long, estimated: Long, first: int,
    count: Long, covered: Long, total: Float, money: Float, priced: Long, top: Long, guessed: Long,
) -> None:  # fmt: skip
    """Sums over days, one place for each day from ``first`` on."""
    for i in range(local.shape[0]):
        k = local[i] // 86400 - first
        if count[k] == 0 or line[i] < top[k]:
            top[k] = line[i]
        count[k] += 1
        covered[k] += seconds[i]
        total[k] += use[i]
        guessed[k] += estimated[i]
        if not np.isnan(cost[i]):
            money[k] += cost[i]
            priced[k] += 1


@dataclass(frozen=True, slots=True)
class Lines:
    """What the kernel found, one row for each line.

    state : BLANK, FULL or TOO_WIDE.  fields : (n, 6), -1 where there are none; fields[:, 0]
    is -1 where there is no stamp, and only there span gives the bytes of its cell.
    offset : seconds from UTC, or NO_OFFSET.  value, number_state : use and cost.
    number_span : their bytes, only where the state is 2.  words : (n, kinds).
    vocabulary : for each kind, its words as (start, end) in the bytes.
    """

    state: Byte
    fields: Small
    offset: Int
    span: Long
    value: Float
    number_state: Byte
    number_span: Long
    words: Int
    vocabulary: tuple[Long, ...]


def take_apart(
    data: Bytes, begin: int, delimiter: str, point: str, roles: list[int], lines: int
) -> Lines:
    """Run the kernel. roles : one for each column; lines : at least as many as there are."""
    slots = np.zeros(len(roles), np.int64)
    kinds = 0
    for k, role in enumerate(roles):
        if role == COST:
            slots[k] = 1
        elif role == WORD:
            slots[k] = kinds
            kinds += 1
    # The kernel fills what it reads; pages of spans that nothing needs are never touched.
    out = Lines(
        np.empty(lines, np.uint8),
        np.empty((lines, 6), np.int16),  # every page that is touched costs time
        np.empty(lines, np.int32),
        np.empty((lines, 2), np.int64),
        np.empty((lines, 1 + (COST in roles)), np.float64),
        np.empty((lines, 1 + (COST in roles)), np.uint8),
        np.empty((lines, 4), np.int64),
        np.empty((lines, max(kinds, 1)), np.int32),
        (),
    )
    spans = np.zeros((max(kinds, 1), MAX_WORDS, 2), np.int64)
    counts = np.zeros(max(kinds, 1), np.int64)
    n = read_lines(
        data, begin, ord(delimiter), ord(point), np.array(roles, np.int64), slots,
        out.state, out.fields, out.offset, out.span, out.value, out.number_state,
        out.number_span, out.words, spans, counts,
    )  # fmt: skip
    cut = slice(0, n)
    return Lines(
        out.state[cut], out.fields[cut], out.offset[cut], out.span[cut], out.value[cut],
        out.number_state[cut], out.number_span[cut], out.words[cut],
        tuple(spans[k, : counts[k]] for k in range(kinds)),
    )  # fmt: skip
