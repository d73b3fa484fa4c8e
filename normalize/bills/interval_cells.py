"""One cell of a CSV as a number, a moment or a word, straight from its bytes, compiled.

What belongs here: a quick reader for the plain ways to write each kind, which answers -1 for
anything else and may look ``ROOM`` bytes ahead, and a patient one for the rest.  Lines are taken
apart in interval_kernel.py.  Bytes are ASCII or a superset of it.  (normalize.jit)
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from normalize.jit import kernel

if TYPE_CHECKING:
    from numpy.typing import NDArray

    Bytes = NDArray[np.uint8]
    Small = NDArray[np.int16]
    Long = NDArray[np.int64]

NO_OFFSET = 1 << 20
_NO_OFFSET = NO_OFFSET
ROOM = 128  # bytes that a quick reader may look ahead
LONGEST_TEXT = 64  # of a date or a word that a quick reader compares
_LONGEST_TEXT = LONGEST_TEXT

# Seconds of the day, or one of these; BARE_HOUR and below: a number that stands alone, which is
# an hour or (0015) hours and minutes, as the whole file shows: the number is BARE_HOUR - code.
NO_TIME, BAD_TIME, BARE_HOUR = -1, -2, -10
_NO_TIME, _BAD_TIME, _BARE_HOUR = -1, -2, -10

_POWERS = 10.0 ** np.arange(16)


@kernel
def cell_end(data: Bytes, j: int, delimiter: int, quoted: bool) -> int:
    """Where a cell ends that can only end at byte j; -1 if it goes on."""
    if quoted:
        if data[j] != 34:
            return -1
        j += 1
    if data[j] == delimiter or data[j] == 10:
        return j
    if data[j] == 13 and data[j + 1] == 10:
        return j + 1
    return -1


@kernel
def same_bytes(data: Bytes, a: int, b: int, size: int) -> bool:
    """Whether two stretches of bytes are the same."""
    for m in range(size):  # noqa: SIM110 (numba compiles no generators)
        if data[a + m] != data[b + m]:
            return False
    return True


@kernel
def quick_number(data: Bytes, j: int, point: int) -> tuple[float, int]:
    """A number such as 12, -0.125 or $3.10 at byte j, and the byte after it or -1."""
    sign, mantissa, digits, decimals = 1.0, 0, 0, 0
    if data[j] == 45:
        sign, j = -1.0, j + 1
    if data[j] == 36:
        j += 1
    d = data[j] - 48
    while 0 <= d <= 9 and digits < 16:
        mantissa = mantissa * 10 + d
        digits, j = digits + 1, j + 1
        d = data[j] - 48
    if data[j] == point:
        j += 1
        d = data[j] - 48
        while 0 <= d <= 9 and digits < 16:
            mantissa = mantissa * 10 + d
            digits, decimals, j = digits + 1, decimals + 1, j + 1
            d = data[j] - 48
    if digits == 0 or digits > 15:
        return 0.0, -1
    # Both are whole and below 2**53, so that the quotient is the nearest float64.
    return sign * (mantissa / _POWERS[decimals]), j


@kernel
def two_digits(data: Bytes, j: int) -> int:
    """The number that two digits make, -1 if they are none."""
    a, b = data[j] - 48, data[j + 1] - 48
    number: int = a * 10 + b if 0 <= a <= 9 and 0 <= b <= 9 else -1
    return number


@kernel
def quick_clock(data: Bytes, j: int) -> tuple[int, int]:
    """A time such as 0:15, 13:15:00.000 or 1:15 PM: its seconds, and the byte after it or -1."""
    hour = two_digits(data, j)
    j += 2
    if hour < 0:
        hour, j = data[j - 2] - 48, j - 1
    minute = two_digits(data, j + 1)
    if not (0 <= hour <= 24 and 0 <= minute < 60) or data[j] != 58:
        return 0, -1
    second, j = 0, j + 3
    if data[j] == 58:
        second, j = two_digits(data, j + 1), j + 3
        if not 0 <= second < 60:
            return 0, -1
        if data[j] == 46:
            stop, j = j + 10, j + 1
            while 48 <= data[j] <= 57 and j < stop:
                j += 1
    k = j + 1 if data[j] == 32 else j
    half = data[k] & 0xDF
    if half == 65 or half == 80:  # A, P
        if not 1 <= hour <= 12 or data[k + 1] & 0xDF != 77:
            return 0, -1
        hour, j = hour % 12 + (12 if half == 80 else 0), k + 2
    total = hour * 3600 + minute * 60 + second
    return (total, j) if total <= 86400 else (0, -1)


@kernel
def quick_zone(data: Bytes, j: int) -> tuple[int, int]:
    """An offset such as -05:00, +0530 or Z, or none; and the byte after it, or -1."""
    if data[j] & 0xDF == 90:
        return 0, j + 1
    if data[j] != 43 and data[j] != 45:
        return _NO_OFFSET, j
    hours = two_digits(data, j + 1)
    k = j + 4 if data[j + 3] == 58 else j + 3
    minutes = two_digits(data, k)
    if hours < 0 or minutes < 0:
        return _NO_OFFSET, -1
    return (44 - data[j]) * (hours * 3600 + minutes * 60), k + 2


@kernel
def cell_span(data: Bytes, j: int, delimiter: int) -> tuple[int, int, int]:
    """First and last byte of what a cell holds, and where the cell ends."""
    n = data.shape[0]
    quoted = j < n and data[j] == 34
    a = j + 1 if quoted else j
    j = a
    while j < n and data[j] != 10 and (data[j] != 34 if quoted else data[j] != delimiter):
        j += 1
    b = j
    while j < n and data[j] != 10 and data[j] != delimiter:
        j += 1
    while b > a and (data[b - 1] == 32 or data[b - 1] == 13):
        b -= 1
    while a < b and (data[a] == 32 or data[a] == 39):
        a += 1
    return a, b, j


@kernel
def patient_number(data: Bytes, a: int, b: int, point: int) -> tuple[float, bool]:
    """The number in a cell (NaN for none), and whether a slower reader must look at it."""
    if a == b:
        return np.nan, False
    if b < data.shape[0] and b - a < 20:
        value, end = quick_number(data, a, point)
        if end == b:
            return value, False
    return np.nan, True


@kernel
def date_end(data: Bytes, a: int, b: int) -> int:
    """Where in a stamp the date ends: before the word that has a colon, or that is all digits."""
    colon, first, letters = -1, -1, False
    for j in range(a, b):
        c = data[j]
        if c == 58:
            colon = j
            break
        if first < 0 and j > a and (c == 32 or (c == 84 and 48 <= data[j - 1] <= 57)):
            first = j
        letters = letters or (first < 0 and (65 <= c <= 90 or 97 <= c <= 122))
    if colon < 0:
        return first if first - a >= 6 and not letters else b
    for j in range(colon - 1, max(a - 1, colon - 4), -1):
        if data[j] == 32 or data[j] == 84 or data[j] == 116:
            return j
    return colon if colon - a > 2 else a


@kernel
def three_numbers(data: Bytes, a: int, b: int, parts: Small) -> None:
    """The numbers of a date such as 1/13/2023 or 20230113; parts[0] = -1 for anything else."""
    first, count, value, digits = 0, 0, 0, 0
    parts[0] = -1
    for j in range(a, b + 1):
        c = data[j] if j < b else 32
        if 48 <= c <= 57:
            value, digits = value * 10 + (c - 48), digits + 1
            if digits > 8:
                return
            continue
        if not (c == 32 or 44 <= c <= 47 or c == 39):  # space , - . / '
            return
        if digits == 8 and count == 0:
            parts[1], parts[2] = value // 100 % 100, value % 100
            first, count = value // 10000, 3
        elif digits > 0:
            if count > 2 or digits > 4:
                return
            if count == 0:
                first = value
            else:
                parts[count] = value
            count += 1
        value, digits = 0, 0
    if count == 3:
        parts[0] = first


@kernel
def _seconds(count: int, hour: int, minute: int, second: int, half: int, empty: bool) -> int:
    """Seconds of the day of so many numbers, or a code. half : 1 AM, 2 PM, 0 neither."""
    if count == 0 or count > 3 or minute > 59 or second > 60:
        return _NO_TIME if empty else _BAD_TIME
    if half > 0:
        if not 1 <= hour <= 12:
            return _BAD_TIME
        hour = hour % 12 + (12 if half == 2 else 0)
    elif count == 1:
        return _BARE_HOUR - hour if hour <= 240000 else _BAD_TIME
    total = hour * 3600 + minute * 60 + second
    return total if total <= 86400 else _BAD_TIME


@kernel
def patient_clock(data: Bytes, a: int, b: int) -> tuple[int, int]:
    """A time in any of the ways people write it, and its offset from UTC."""
    count, hour, minute, second, zone, zone_digits = 0, 0, 0, 0, 0, 0
    value, digits, sign, half, fraction, colon = 0, 0, 0, 0, False, False
    for j in range(a, b + 1):
        c = data[j] if j < b else 32
        if 48 <= c <= 57:
            if fraction:
                continue
            if sign != 0:
                zone, zone_digits = zone * 10 + (c - 48), zone_digits + 1
            else:
                value, digits = value * 10 + (c - 48), digits + 1
            if digits > 6 or zone_digits > 4:
                return _BAD_TIME, _NO_OFFSET
            continue
        if digits > 0:
            if count == 0:
                hour = value
            elif count == 1:
                minute = value
            elif count == 2:
                second = value
            count, value, digits = count + 1, 0, 0
        fraction = c == 46 and colon
        up = c & 0xDF
        if c == 58:
            colon = colon or sign == 0
        elif (c == 43 or c == 45) and colon and sign == 0:
            sign = 44 - c
        elif up == 90:
            sign, zone_digits = 1, 2
        elif up == 65 or up == 80:
            half = 1 if up == 65 else 2
        elif not (
            c <= 34 or c == 39 or 44 <= c <= 47 or up == 84 or up == 77 or up == 69 or up == 72
        ):  # fmt: skip  (T, M, HE)
            return _BAD_TIME, _NO_OFFSET
    total = _seconds(count, hour, minute, second, half, a == b)
    if sign == 0 or total < 0:
        return total, _NO_OFFSET
    if zone_digits <= 2:
        zone *= 100
    return total, sign * (zone // 100 * 3600 + zone % 100 * 60)
