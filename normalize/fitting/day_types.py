"""Kinds of days: weekends, holidays, school days, each as an amount of 0 or 1 a day.

They exclude each other: a day of the weekend is that and nothing else, a holiday is one on a
working day, a school day lies in a term and is neither.  What is left, a working day out of
term, is what the base load stands for.  Nothing is guessed: days that the lists do not speak
of are unknown.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from normalize.days import date_of, day_of
from normalize.fitting.drivers import DailyAmounts

DAYS_OF_WEEK: Final = (
    "monday", "tuesday", "wednesday", "thursday", "friday", "saturday", "sunday",
)  # fmt: skip
USUAL_WEEKEND: Final = (5, 6)
LONGEST_BREAK: Final = 120  # days between school terms; a longer one is a term not listed
#                             (summer breaks last 6 to 13 weeks: common practice, no source)
WEEKEND: Final = "weekend days"
HOLIDAY: Final = "holidays"
SCHOOL: Final = "school days"


@dataclass(frozen=True, slots=True)
class Calendar:
    """What site.toml says of days.

    weekend : days of the week, Monday is 0; empty for none.  holidays : day numbers.
    terms : school terms, ``[start, end)``.  holidays_a_year, school_days_a_year : in a normal
    year, where said.  source : of the holidays.
    """

    weekend: tuple[int, ...] = USUAL_WEEKEND
    holidays: tuple[int, ...] = ()
    terms: tuple[tuple[int, int], ...] = ()
    holidays_a_year: float | None = None
    school_days_a_year: float | None = None
    source: str = "site.toml"


def day_of_week(day: NDArray[np.int64]) -> NDArray[np.int64]:
    """Monday is 0.  Day 0, 1970-01-01, was a Thursday.

    >>> day_of_week(np.array([0, 4])).tolist()
    [3, 0]
    """
    found: NDArray[np.int64] = (day + 3) % 7
    return found


def day_types(calendar: Calendar, first: int, last: int) -> tuple[DailyAmounts, ...]:
    """Each kind of day over ``[first, last)``, in the order weekend, holidays, school days.

    A holiday list speaks of the calendar years in which it names a day; terms speak of the
    time from the first day of one to the last day of the last, breaks included.
    """
    day = np.arange(first, max(first, last), dtype=np.int64)
    weekend = np.isin(day_of_week(day), calendar.weekend)
    listed = np.isin(day, calendar.holidays)
    holiday = listed & ~weekend
    holidays_known = _years_named(day, calendar.holidays)
    out = []
    if calendar.weekend:
        words = ", ".join(DAYS_OF_WEEK[k].capitalize() for k in calendar.weekend)
        share = len(calendar.weekend) / 7.0
        how = f"{len(calendar.weekend)} days in 7"
        out.append(_kind(WEEKEND, first, weekend, np.ones_like(weekend), words, share, how))
    if calendar.holidays:
        normal, how = _a_year(calendar.holidays_a_year)
        out.append(_kind(HOLIDAY, first, holiday, holidays_known, calendar.source, normal, how))
    if calendar.terms:
        inside, known = _in_terms(day, calendar.terms)
        school = inside & ~weekend & ~listed
        if calendar.holidays:
            known &= holidays_known | ~inside | weekend
        normal, how = _a_year(calendar.school_days_a_year)
        out.append(_kind(SCHOOL, first, school, known, "school_terms", normal, how))
    return tuple(out)


def _kind(
    name: str,
    first: int,
    true: NDArray[np.bool_],
    known: NDArray[np.bool_],
    source: str,
    normal: float | None,
    how: str,
) -> DailyAmounts:
    amount = np.where(known, true.astype(np.float64), np.nan)
    return DailyAmounts(name, first, amount, "day type", source, (), normal, how)


def _a_year(days: float | None) -> tuple[float | None, str]:
    """The share of a year of 365 days, as a long-term year has them."""
    return (None, "") if days is None else (days / 365.0, "as site.toml says")


def _years_named(day: NDArray[np.int64], holidays: tuple[int, ...]) -> NDArray[np.bool_]:
    known = np.zeros(day.shape, dtype=np.bool_)
    for year in sorted({date_of(h).year for h in holidays}):
        opens = day_of(date_of(0).replace(year=year))
        known |= (day >= opens) & (day < day_of(date_of(0).replace(year=year + 1)))
    return known


def _in_terms(
    day: NDArray[np.int64], terms: tuple[tuple[int, int], ...]
) -> tuple[NDArray[np.bool_], NDArray[np.bool_]]:
    """(in a term, known) of each day."""
    inside = np.zeros(day.shape, dtype=np.bool_)
    known = np.zeros(day.shape, dtype=np.bool_)
    before = None
    for start, end in sorted(terms):
        inside |= (day >= start) & (day < end)
        opens = start if before is None or start - before > LONGEST_BREAK else before
        known |= (day >= opens) & (day < end)
        before = end
    return inside, known
