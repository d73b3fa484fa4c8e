"""Dates and times as weather files write them: text becomes day numbers and minutes.

Month and day are told apart by the file itself (a day above 12 somewhere settles it);
where nothing does, the user is asked.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date
from typing import TYPE_CHECKING, Final

import numpy as np

from normalize.days import EPOCH, FIRST_SANE_DAY, LAST_SANE_DAY
from normalize.errors import UnreadableWeather
from normalize.weather.options import ask

if TYPE_CHECKING:
    from numpy.typing import NDArray

NO_DAY: Final = -(2**31)  # in place of a day that could not be read
NO_OFFSET: Final = -(2**31)  # in place of an offset that is not stated
PIVOT: Final = 70  # two-digit years from here on are 19xx, below 20xx

_SEPARATORS: Final = ("", " ", "T")  # between a date and its time
_EPOCH_ORDINAL: Final = EPOCH.toordinal()
_MONTHS: Final = (
    "jan",
    "feb",
    "mar",
    "apr",
    "may",
    "jun",
    "jul",
    "aug",
    "sep",
    "oct",
    "nov",
    "dec",
)
_ISO: Final = re.compile(r"(\d{4})-(\d{2})-(\d{2})(?:[T ]\s*(.*))?$")
_NUMBERS: Final = re.compile(r"(\d{1,4})([-/.])(\d{1,2})\2(\d{1,4})\.?(?:[T ,]\s*(.*))?$")
_COMPACT: Final = re.compile(r"(\d{4})(\d{2})(\d{2})(?:[T ]?(\d.*))?$")
_DAY_NAME: Final = re.compile(
    r"(\d{1,2})[-/ .]+([A-Za-z]{3,9})\.?[-/ ,]+(\d{2,4})(?:[T ,]\s*(.*))?$"
)
_NAME_DAY: Final = re.compile(r"([A-Za-z]{3,9})\.? +(\d{1,2}),? +(\d{2,4})(?:[T ,]\s*(.*))?$")
_TIME: Final = re.compile(
    r"(\d{1,2})(?::?(\d{2}))?(?::?(\d{2})(?:[.,]\d+)?)?\s*([AaPp]\.?[Mm]\.?)?\s*"
    r"(Z|z|UTC|GMT|[+-]\d{2}(?::?\d{2})?)?$"
)


@dataclass(frozen=True, slots=True)
class Stamps:
    """A column of dates and times.

    day : (n,) int64 day numbers, NO_DAY where unreadable or outside 1900–2099.
    minute : (n,) int64 minute of the day as written, 0 where there is no time, up to 1440
        for 24:00.
    offset : (n,) int64 minutes from UTC where the text states it, else NO_OFFSET.
    two_digit_years : whether the century had to be supplied.
    """

    day: NDArray[np.int64]
    minute: NDArray[np.int64]
    offset: NDArray[np.int64]
    two_digit_years: bool = False


def read_stamps(cells: Sequence[str], where: str, order: str | None = None) -> Stamps:
    """Dates, with times where they are written.

    cells : (n,) text.  order : "month first", "day first", "year first" or None.
    Raises AmbiguousWeather when month and day cannot be told apart.

    >>> read_stamps(["2022-01-08", "2022-01-09 13:30"], "a.csv").minute.tolist()
    [0, 810]
    >>> (read_stamps(["1/8/2022", "1/13/2022"], "a.csv").day - 19000).tolist()
    [0, 5]
    """
    plain = _plain_iso(cells)
    if plain is not None:
        return plain
    n = len(cells)
    days, minutes, offsets = [NO_DAY] * n, [0] * n, [NO_OFFSET] * n
    unsure: list[tuple[int, str, str, str]] = []
    dates: dict[str, int] = {}
    times: dict[str, tuple[int, int] | None] = {}
    for i, cell in enumerate(cells):
        # Hourly files repeat each date and each time many times over: both are kept.
        day = dates.get(cell[:10])
        if day is not None and cell[10:11] in _SEPARATORS:
            time: str | None = cell[11:]
        else:
            day, time = _date(cell.strip(), i, dates, unsure)
        if time:
            if time not in times:
                times[time] = _clock(time)
            clock = times[time]
            if clock is None:
                day = NO_DAY
            else:
                minutes[i], offsets[i] = clock
        days[i] = day
    short = _settle(days, unsure, where, order) if unsure else False
    return Stamps(
        day=np.array(days, dtype=np.int64),
        minute=np.array(minutes, dtype=np.int64),
        offset=np.array(offsets, dtype=np.int64),
        two_digit_years=short,
    )


def _plain_iso(cells: Sequence[str]) -> Stamps | None:
    """A column of nothing but YYYY-MM-DD, the quick way; None where any cell is otherwise."""
    if not all(len(cell) == 10 and cell[4] == "-" == cell[7] for cell in cells):
        return None
    try:
        day = np.array(cells, dtype="datetime64[D]").astype(np.int64)
    except ValueError:
        return None
    day[(day < FIRST_SANE_DAY) | (day >= LAST_SANE_DAY)] = NO_DAY
    return Stamps(day, np.zeros_like(day), np.full_like(day, NO_OFFSET))


def _date(
    text: str, i: int, dates: dict[str, int], unsure: list[tuple[int, str, str, str]]
) -> tuple[int, str | None]:
    """Day number and time of day of one cell; ISO dates are remembered."""
    match = _ISO.match(text)
    if match is None:
        return _other(text, i, unsure)
    day = dates[text[:10]] = _day(int(match[1]), int(match[2]), int(match[3]))
    return day, match[4]


def _other(text: str, i: int, unsure: list[tuple[int, str, str, str]]) -> tuple[int, str | None]:
    """A date that is not ISO; one whose order is open goes on the list of unsure ones."""
    match = _NUMBERS.match(text)
    if match:
        if len(match[1]) == 4:
            return _day(int(match[1]), int(match[3]), int(match[4])), match[5]
        unsure.append((i, match[1], match[3], match[4]))
        return NO_DAY + 1, match[5]
    match = _COMPACT.match(text)
    if match:
        return _day(int(match[1]), int(match[2]), int(match[3])), match[4]
    match = _DAY_NAME.match(text)
    if match:
        return _named(match[3], match[2], match[1]), match[4]
    match = _NAME_DAY.match(text)
    if match:
        return _named(match[3], match[1], match[2]), match[4]
    return NO_DAY, None


def _day(year: int, month: int, day: int) -> int:
    try:
        number = date(year, month, day).toordinal() - _EPOCH_ORDINAL
    except ValueError:
        return NO_DAY
    return number if FIRST_SANE_DAY <= number < LAST_SANE_DAY else NO_DAY


def _named(year: str, month: str, day: str) -> int:
    try:
        number = _MONTHS.index(month[:3].lower()) + 1
    except ValueError:
        return NO_DAY
    return _day(_year(year), number, int(day))


def _year(text: str) -> int:
    if len(text) > 2:
        return int(text)
    return int(text) + (1900 if int(text) >= PIVOT else 2000)


def _clock(text: str) -> tuple[int, int] | None:
    """(minute of the day, offset from UTC in minutes), or None if it is no time."""
    match = _TIME.match(text.strip())
    if not match:
        return None
    hour, minute = int(match[1]), int(match[2] or 0)
    if match[4]:
        if not 1 <= hour <= 12:
            return None
        hour = hour % 12 + (12 if match[4][0] in "Pp" else 0)
    total = hour * 60 + minute
    if minute > 59 or total > 1440:
        return None
    zone = match[5]
    if not zone:
        return total, NO_OFFSET
    if zone[0] not in "+-":
        return total, 0
    digits = zone[1:].replace(":", "").ljust(4, "0")
    minutes = int(digits[:2]) * 60 + int(digits[2:])
    return total, -minutes if zone[0] == "-" else minutes


def _settle(
    days: list[int], unsure: list[tuple[int, str, str, str]], where: str, order: str | None
) -> bool:
    """Give the dates of open order their days, in place. Returns whether years were short.

    A row whose time could not be read has lost its day already and stays lost.
    """
    order = order or _order_of(unsure, where)
    short = False
    for i, a, b, c in unsure:
        if days[i] == NO_DAY:
            continue
        if order == "year first":
            year, month, day = a, b, c
        elif order == "month first":
            year, month, day = c, a, b
        else:
            year, month, day = c, b, a
        short = short or len(year) <= 2
        days[i] = _day(_year(year), int(month), int(day))
    return short


def _order_of(unsure: list[tuple[int, str, str, str]], where: str) -> str:
    firsts = {int(a) for _, a, _, _ in unsure}
    seconds = {int(b) for _, _, b, _ in unsure}
    if all(len(c) <= 2 for _, _, _, c in unsure) and max(firsts) > 31:
        return "year first"
    if any(12 < x <= 31 for x in firsts) and any(12 < x <= 31 for x in seconds):
        return _majority(unsure, where)
    if any(12 < x <= 31 for x in firsts):
        return "day first"
    if any(12 < x <= 31 for x in seconds):
        return "month first"
    example = "/".join(unsure[0][1:])
    raise ask(
        f"dates such as {example} can be read month first or day first",
        where=where,
        key="dates",
        choices='"month first" or "day first"',
    )


def _majority(unsure: list[tuple[int, str, str, str]], where: str) -> str:
    """A stray typing error must not decide; a file of two minds must be asked about."""
    day_first = sum(12 < int(a) <= 31 for _, a, _, _ in unsure)
    month_first = sum(12 < int(b) <= 31 for _, _, b, _ in unsure)
    if min(day_first, month_first) > 0.01 * len(unsure):
        raise UnreadableWeather(
            f"{day_first} dates can only be day first and {month_first} only month first",
            where=where,
            wanted="one order of day and month",
            next_step="Write the dates as YYYY-MM-DD.",
        )
    return "day first" if day_first > month_first else "month first"
