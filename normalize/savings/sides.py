"""Which side of the work a period belongs to."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date

import numpy as np
from numpy.typing import NDArray

from normalize.days import day_of, day_of_iso
from normalize.defaults import WINDOW_DAYS
from normalize.errors import NoUpgrade
from normalize.fitting.align import Aligned
from normalize.fitting.columns import AFTER, BEFORE, UNUSED

REASONS = {
    "before": "",
    "after": "",
    "work window": "it touches the work, so it belongs to neither side",
    "between": "it lies between two upgrades",
    "older": "it is further before the work than the bills used",
    "later": "it is further after the work than the bills used",
    "earlier occupant": "it belongs to an earlier occupant",
    "set aside": "",
}


Moment = int | date | str


def _day(when: date | str) -> int:
    try:
        return day_of(when) if isinstance(when, date) else day_of_iso(when)
    except ValueError:
        raise NoUpgrade(
            f"{when!r} is no date", wanted="a day of the work, written 2023-09-11"
        ) from None


@dataclass(frozen=True, slots=True)
class Work:
    """The time of the work on one account.

    start, end : day numbers ``[start, end)`` from the first upgrade's first day to the last
    upgrade's last; windows : each upgrade's own ``[start, end)``.
    """

    start: int
    end: int
    windows: tuple[tuple[int, int], ...] = ()

    @classmethod
    def of(cls, upgrade: tuple[Moment, Moment]) -> Work:
        """The work from first to last day: dates or ISO text, both days in it; or day numbers
        ``[start, end)``, half-open as everywhere inside.

        >>> Work.of(("2023-09-11", "2023-09-22")) == Work.of((19611, 19623))
        True
        """
        first, last = upgrade
        start = first if isinstance(first, int) else _day(first)
        end = last if isinstance(last, int) else _day(last) + 1
        if end <= start:
            raise NoUpgrade(
                f"the work ends ({last}) before it starts ({first})",
                wanted="the first and the last day of the work",
            )
        return cls(start, end)


def label_periods(
    aligned: Aligned,
    work: Work,
    *,
    occupied_since: int | None = None,
    window_days: int = WINDOW_DAYS,
) -> tuple[str, ...]:
    """The side of every period, a key of ``REASONS``.

    A period belongs to a side only if it lies wholly outside the work window; the 24 months
    next to the work count by a period's middle, since bills have odd dates.
    """
    labels = []
    for i in range(aligned.n):
        start, end = int(aligned.start[i]), int(aligned.end[i])
        middle = 0.5 * (start + end)
        if occupied_since is not None and start < occupied_since:
            label = "earlier occupant"
        elif end <= work.start:
            label = "before" if middle >= work.start - window_days else "older"
        elif start >= work.end:
            label = "after" if middle < work.end + window_days else "later"
        else:
            touches = any(
                start < e and end > s for s, e in work.windows or ((work.start, work.end),)
            )
            label = "work window" if touches else "between"
        if aligned.reason[i] and label in ("before", "after"):
            label = "set aside"
        labels.append(label)
    return tuple(labels)


def codes(labels: tuple[str, ...]) -> NDArray[np.uint8]:
    """(n,) side codes for the kernels."""
    code = {"before": BEFORE, "after": AFTER}
    return np.array([code.get(label, UNUSED) for label in labels], dtype=np.uint8)
