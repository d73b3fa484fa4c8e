"""Days as integers, counted from 1970-01-01, and back to the dates people read."""

from __future__ import annotations

from datetime import date, timedelta

EPOCH = date(1970, 1, 1)
FIRST_SANE_DAY = (
    date(1900, 1, 1) - EPOCH
).days  # a bill or a station day before this is a typing error
LAST_SANE_DAY = (date(2100, 1, 1) - EPOCH).days


def day_of(when: date) -> int:
    """Day number of a date.

    >>> day_of(date(1970, 1, 2))
    1
    """
    return date(when.year, when.month, when.day).toordinal() - EPOCH.toordinal()


def date_of(day: int) -> date:
    """Date of a day number.

    >>> date_of(1).isoformat()
    '1970-01-02'
    """
    return EPOCH + timedelta(days=int(day))


def iso(day: int) -> str:
    """ISO text of a day number.

    >>> iso(19000)
    '2022-01-08'
    """
    return date_of(day).isoformat()


def day_of_iso(text: str) -> int:
    """Day number of ISO text ``YYYY-MM-DD``; ValueError if it is none.

    >>> day_of_iso("2022-01-08")
    19000
    """
    return day_of(date.fromisoformat(text))
