"""Dates as people write them, and which of day and month comes first in a file.

What belongs here: one cell to a date or a precise reason why not, and the decision, for a
whole file at once, between month first and day first.  A date is never bent into a valid one.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date, datetime, timedelta
from functools import lru_cache
from itertools import pairwise
from typing import Literal

from normalize.bills.amounts import as_text, is_blank
from normalize.days import day_of

Order = Literal["month first", "day first", "year first"]
ORDERS: tuple[Order, ...] = ("month first", "day first", "year first")

_MONTHS = ("jan", "feb", "mar", "apr", "may", "jun", "jul", "aug", "sep", "oct", "nov", "dec")
_LONG_MONTHS = (
    *("january", "february", "march", "april", "may", "june"),
    *("july", "august", "september", "october", "november", "december"),
)
# Months in other languages of the Latin alphabet, as spreadsheets set to them write them.  No
# word here names another month elsewhere.  (common knowledge)
_OTHER_MONTHS = {
    1: "ene enero janv janvier januar jaen gen gennaio janeiro januari jän jänner",
    2: "febrero févr fevr fév février fevrier februar febbraio fev fevereiro februari",
    3: "marzo mars märz maerz mär mrz março marco maart mrt",
    4: "abr abril avr avril aprile",
    5: "mayo mai mag maggio maio mei",
    6: "junio juin juni giu giugno junho",
    7: "julio juil juillet juli lug luglio julho",
    8: "ago agosto aoû août aout augustus",
    9: "set settembre setiembre septiembre septembre setembro sept",
    10: "octubre octobre okt oktober ott ottobre out outubro",
    11: "noviembre novembre novembro",
    12: "dic diciembre déc décembre dec decembre dez dezember dicembre dezembro",
}
_FOREIGN = {word: k for k, words in _OTHER_MONTHS.items() for word in words.split()}
_MON = r"(?P<mon>[^\W\d_]{3,10})\.?"
_SEP = r"[-/. ,]+"
_YEAR = r"'?(?P<year>\d{4}|\d{2})"
_NAMED = (
    re.compile(rf"^(?P<day>\d{{1,2}})(?:st|nd|rd|th)?[-/. ,]*{_MON}[-/. ,]*{_YEAR}$"),
    re.compile(rf"^{_MON}[-/. ,]*(?P<day>\d{{1,2}})(?:st|nd|rd|th)?{_SEP}{_YEAR}$"),
    re.compile(rf"^(?P<year>\d{{4}}){_SEP}{_MON}{_SEP}(?P<day>\d{{1,2}})$"),
)
_YEAR_FIRST = re.compile(r"^(\d{4})[-/. ](\d{1,2})[-/. ](\d{1,2})$")
_THREE = re.compile(r"^(\d{1,2})[-/. ]+(\d{1,2})[-/. ]+'?(\d{4}|\d{2})$")
_EIGHT = re.compile(r"^\d{8}$")
_SERIAL = re.compile(r"^[2-7]\d{4}(?:\.\d+)?$")  # 1954 to 2119 in Excel's day numbers
_MONTH_ALONE = (
    re.compile(rf"^{_MON}[-/. ,]*{_YEAR}$"),
    re.compile(r"^(?P<year>\d{4})[-/](?P<number>\d{1,2})$"),
    re.compile(r"^(?P<number>\d{1,2})/(?P<year>\d{4})$"),
)
_TIME = re.compile(r"(?:[t ]|(?<=\d)t)\s*\d{1,2}:\d{2}.*$")
_WEEKDAY = re.compile(r"^(?:mon|tue|wed|thu|fri|sat|sun)[a-z]*[., ]+")
_EXCEL_ZERO = date(1899, 12, 30)
_EXCEL_1904 = date(1904, 1, 1)


@dataclass(frozen=True, slots=True)
class Written:
    """One date cell as written.

    day : day number where there is but one way to read it.
    parts : (first, second, year) where the order of day and month decides.
    problem : why it is no date; "" for a blank cell, which has neither day nor parts.
    month : (year, month) where it names a month but no day.
    """

    day: int | None = None
    parts: tuple[int, int, int] | None = None
    problem: str = ""
    month: tuple[int, int] | None = None

    @property
    def month_only(self) -> bool:
        """Whether it names a month but no day."""
        return self.month is not None


def pivot(year: int) -> int:
    """A year of two digits, in full: 70 to 99 are the 1900s (POSIX), others the 2000s.

    >>> pivot(99), pivot(24), pivot(2010)
    (1999, 2024, 2010)
    """
    if year >= 100:
        return year
    return year + (1900 if year >= 70 else 2000)


def read_written(cell: object, *, epoch_1904: bool = False) -> Written:
    """What a cell says about a date.

    >>> read_written("2023-01-05T00:00:00Z").day
    19362
    >>> read_written("1/5/23").parts
    (1, 5, 23)
    >>> read_written("2010-05-36").problem
    "'2010-05-36' is not a date of the calendar"
    """
    if is_blank(cell):
        return Written()
    if isinstance(cell, datetime):
        return Written(day=day_of(cell.date()))
    if isinstance(cell, date):
        return Written(day=day_of(cell))
    if isinstance(cell, (int, float)) and not isinstance(cell, bool):
        return _of_number(float(cell), epoch_1904)
    return _of_text(str(cell), epoch_1904)


@lru_cache(maxsize=50_000)  # the same few thousand days stand in a file of many accounts
def _of_text(cell: str, epoch_1904: bool) -> Written:
    shown = as_text(cell)
    text = _TIME.sub("", _WEEKDAY.sub("", shown.lower())).strip().removesuffix("z")
    if found := _YEAR_FIRST.match(text):
        return _of_ymd(int(found[1]), int(found[2]), int(found[3]), shown)
    if found := _THREE.match(text):
        return _of_three(int(found[1]), int(found[2]), int(found[3]), shown)
    if _EIGHT.match(text):
        return _of_eight(text, shown)
    if _SERIAL.match(text):
        return _of_number(float(text), epoch_1904)
    return _of_words(text, shown)


def _of_number(value: float, epoch_1904: bool) -> Written:
    if abs(value) < 1e9 and value.is_integer():
        text = str(int(value))
        if _EIGHT.match(text):
            return _of_eight(text, text)
    if not 20_000 <= value < 80_000:
        return Written(problem="a number that is no date")
    zero = _EXCEL_1904 if epoch_1904 else _EXCEL_ZERO
    return Written(day=day_of(zero + timedelta(days=int(value))))


def _of_ymd(year: int, month: int, day: int, shown: str) -> Written:
    try:
        return Written(day=day_of(date(year, month, day)))
    except ValueError:
        return Written(problem=not_a_date(shown))


def _of_three(first: int, second: int, third: int, shown: str) -> Written:
    if first > 31 and third <= 31:  # 98-05-31: only a year can be above 31
        return _of_ymd(pivot(first), second, third, shown)
    return Written(parts=(first, second, third), problem=not_a_date(shown))


def _of_eight(text: str, shown: str) -> Written:
    year = int(text[:4])
    if 1800 <= year <= 2200:
        return _of_ymd(year, int(text[4:6]), int(text[6:]), shown)
    return Written(parts=(int(text[:2]), int(text[2:4]), int(text[4:])), problem=not_a_date(shown))


def _of_words(text: str, shown: str) -> Written:
    for pattern in _NAMED:
        if (found := pattern.match(text)) and (month := _month(found["mon"])):
            return _of_ymd(pivot(int(found["year"])), month, int(found["day"]), shown)
    for pattern in _MONTH_ALONE:
        found = pattern.match(text)
        if found is None:
            continue
        named = "mon" in found.re.groupindex
        month = _month(found["mon"]) if named else int(found["number"])
        if 1 <= month <= 12:
            year = pivot(int(found["year"]))
            if 1900 <= year < 2100:
                said = f"{quoted(shown)} names a month but no day"
                return Written(problem=said, month=(year, month))
    return Written(problem=f"{quoted(shown)} is not a date")


def _month(word: str) -> int:
    if word == "sept":
        return 9
    if word in _MONTHS:
        return _MONTHS.index(word) + 1
    if word in _LONG_MONTHS:
        return _LONG_MONTHS.index(word) + 1
    return _FOREIGN.get(word, 0)


def quoted(text: str) -> str:
    """Text of a cell for a message: short, on one line; digits of long numbers hidden."""
    text = re.sub(r"\d(?=\d{4,}(?!\d))", "x", as_text(text)) if len(text) > 10 else as_text(text)
    text = "".join(c if c.isprintable() else "?" for c in text)
    return repr(text if len(text) <= 20 else text[:19] + "…")


def not_a_date(shown: str) -> str:
    """The words for a date that the calendar does not have."""
    return f"{quoted(shown)} is not a date of the calendar"


def settle(written: Written, order: Order) -> tuple[int | None, str]:
    """Day number and problem of a cell once the order is known.

    >>> settle(read_written("1/5/2023"), "day first")
    (19478, '')
    """
    if written.parts is None:
        return written.day, written.problem
    first, second, year = written.parts
    if order == "year first":
        year, month, day = pivot(first), second, year
        if day > 31:
            return None, written.problem
    else:
        year = pivot(year)
        month, day = (first, second) if order == "month first" else (second, first)
    try:
        return day_of(date(year, month, day)), ""
    except ValueError:
        return None, written.problem


def order_by_values(cells: Sequence[Written]) -> Order | None:
    """The order that numbers above 12 prove, over all cells; None if they prove nothing.

    A single impossible date among many does not overturn the rest.
    """
    first = sum(1 for c in cells if c.parts and 12 < c.parts[0] <= 31 and c.parts[1] <= 12)
    second = sum(1 for c in cells if c.parts and 12 < c.parts[1] <= 31 and c.parts[0] <= 12)
    if first > 10 * second:
        return "day first"
    if second > 10 * first:
        return "month first"
    return None


def order_by_days(
    pairs: Sequence[tuple[Written, Written]], days: Sequence[int | None]
) -> Order | None:
    """The order under which end less start is what a days column says; None if neither is."""
    shares = {}
    alone = all(start == Written() for start, _ in pairs)
    for order in ORDERS[:2]:
        if alone:
            ends = [settle(end, order)[0] for _, end in pairs]
            # Newest first, the days are those of the line before.
            judged = [
                abs(b - a) in (c, d)
                for (a, c), (b, d) in pairwise(zip(ends, days, strict=True))
                if a is not None and b is not None and (c or d)
            ]
        else:
            spans = [_span(pair, order) for pair in pairs]
            judged = [
                abs(s - d) <= 1 for s, d in zip(spans, days, strict=True) if s is not None and d
            ]
        shares[order] = sum(judged) / len(judged) if judged else 0.5
    return _clear(shares, leader=0.8, other=0.5 if not alone else 0.3)


def order_by_spacing(pairs: Sequence[tuple[Written, Written]]) -> Order | None:
    """The order under which bills have the pace of bills; None if both or neither do.

    pairs : (start, end) of each line in the file's order, the start blank where the file
    gives readings alone.
    """
    shares = {}
    steps = 0
    for order in ORDERS[:2]:
        spans = [s for pair in pairs if (s := _span(pair, order)) is not None]
        if not spans:
            ends = [d for _, end in pairs if (d := settle(end, order)[0]) is not None]
            spans = [b - a for a, b in pairwise(ends)]
            if sum(s < 0 for s in spans) > sum(s > 0 for s in spans):
                spans = [-s for s in spans]
        steps = max(steps, len(spans))
        shares[order] = sum(20 <= s <= 100 for s in spans) / len(spans) if spans else 0.5
    if steps < 3:
        return None
    return _clear(shares, leader=0.8, other=0.3) or (
        _clear(shares, leader=0.9, other=0.5) if steps >= 8 else None
    )


def _span(pair: tuple[Written, Written], order: Order) -> int | None:
    """Days from start to end; None where either is not known."""
    start, end = (settle(one, order)[0] for one in pair)
    return end - start if start is not None and end is not None else None


def _clear(shares: dict[Order, float], *, leader: float, other: float) -> Order | None:
    """The order whose share is high while the other's is low."""
    month, day = shares["month first"], shares["day first"]
    if month >= leader and day <= other:
        return "month first"
    return "day first" if day >= leader and month <= other else None
