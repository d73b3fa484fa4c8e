"""Delivered fuels: what tank levels add, what dealers call a K factor, what is still missing.

What belongs here: arithmetic of tanks and fills.  Use belongs to the interval *before* a fill,
because the fuel that is put in replaces what was burned since the last one.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from normalize.bills.layouts import Record

FILLS_BEYOND_PARAMETERS = 3  # a fit needs its parameters and so many more (design.md, Defaults)
FULL_WITHIN = 0.05  # of the tank: how full a "full" one is (common practice, no source)
NUMBER_WORDS = ("no", "one", "two", "three", "four", "five", "six", "seven", "eight", "nine")


@dataclass(frozen=True, slots=True)
class KFactor:
    """Degree-days per unit of fuel, as most dealers quote it, and its inverse, as some do.

    degree_days_per_unit : [°F·day per unit].  unit_per_degree_day : [unit per °F·day].
    """

    degree_days_per_unit: float
    unit_per_degree_day: float


def k_factor(amount: float, degree_days: float) -> KFactor | None:
    """Both ways round; None where either number is not above zero.

    amount : fuel burned between two full fills.  degree_days : of the same days, base 65 °F by
    custom.  Source: common practice of dealers; the check value is practice.md's.

    >>> k_factor(200, 1300)
    KFactor(degree_days_per_unit=6.5, unit_per_degree_day=0.15384615384615385)
    """
    if not (amount > 0 and degree_days > 0):
        return None
    return KFactor(degree_days / amount, amount / degree_days)


def fills_missing(periods: int, *, parameters: int = 3) -> int:
    """How many more full fills one side of the work needs for a fit.

    periods : intervals between full fills that there are.  parameters : of the fit (three for
    heating: base load, slope, balance temperature).

    >>> fills_missing(2), fills_missing(9)
    (4, 0)
    """
    return max(0, parameters + FILLS_BEYOND_PARAMETERS - periods)


def fills_sentence(periods: int, *, parameters: int = 3) -> str:
    """What is missing, in words; "" if nothing is.

    >>> fills_sentence(2)
    'four more full fills are needed'
    """
    missing = fills_missing(periods, parameters=parameters)
    if missing == 0:
        return ""
    word = NUMBER_WORDS[missing] if missing < len(NUMBER_WORDS) else str(missing)
    return f"{word} more full {'fill is' if missing == 1 else 'fills are'} needed"


def fill_error(tank: float, used: float) -> float:
    """The most by which use over a run of full fills can be off, as a fraction of it.

    tank : what the tank holds, or at least its largest delivery.  used : over the whole run.
    What one fill lacks the next one adds, so that only the first and the last fill count, each
    off by ``FULL_WITHIN`` of the tank, however many lie between.

    >>> round(fill_error(250.0, 1250.0), 3)
    0.02
    """
    return 2.0 * FULL_WITHIN * tank / used if used > 0.0 else float("inf")


def fill_words(tank: float, unit: str, before: float, after: float) -> str:
    """What a fill that is not quite full can do, with numbers; "" where nothing is known.

    before, after : use of either side, 0 where there is none.
    """
    sides = [
        f"{100 * fill_error(tank, used):.1f} % of all use {name} the work"
        for name, used in (("before", before), ("after", after))
        if used > 0.0
    ]
    if not sides or not tank > 0.0:
        return ""
    return (
        f"Fuel was delivered, not metered, and a \u201cfull\u201d tank is full to within about "
        f"{FULL_WITHIN:.0%} of what it holds. Taking the largest delivery ({tank:,.0f} {unit}) for "
        f"the tank, use between two fills can be off by {2 * FULL_WITHIN * tank:,.0f} {unit}; as "
        f"what one fill lacks the next one adds, that comes to at most {' and '.join(sides)}. The "
        "range holds the scatter of the fills, not this."
    )


@dataclass(slots=True)
class Tank:
    """One delivery with the level of its tank.

    percent : of the tank, 0 to 100, or None.  after : true if taken after the delivery.
    size : what the full tank holds, in the unit of the delivery.
    """

    record: Record
    percent: float | None
    after: bool
    size: float

    @property
    def known(self) -> bool:
        """Whether the level is known."""
        return (
            self.percent is not None
            and 0.0 <= self.percent <= 110.0
            and self.record.use is not None
        )

    def level_after(self) -> float:
        """What the tank held after the delivery."""
        level = (self.percent or 0.0) / 100.0 * self.size
        return level if self.after else level + (self.record.use or 0.0)


def open_by_levels(tanks: Sequence[Tank]) -> None:
    """A delivery whose tank level is known measures use whether it filled the tank or not."""
    for tank in tanks:
        if tank.known:
            tank.record.estimated = False


def use_by_levels(tanks: Sequence[Tank]) -> int:
    """Turn amounts delivered into amounts used, in place; returns how many changed.

    use = level after the delivery before + delivered - level after this one.
    """
    levels = {t.record.end: t for t in tanks if t.known and t.record.end is not None}
    amounts = {id(t): t.level_after() for t in tanks if t.known}
    changed = 0
    for tank in tanks:
        start = tank.record.start
        before = levels.get(start) if start is not None else None
        if before is None or not tank.known or tank.record.problem:
            continue
        delivered = tank.record.use or 0.0
        used = amounts[id(before)] + delivered - amounts[id(tank)]
        if used < 0:
            tank.record.blame("the levels of the tank and the amount delivered disagree")
            continue
        if used != delivered:
            tank.record.note = f"{delivered:g} delivered, {used:g} used by the levels of the tank"
        tank.record.use = used
        changed += 1
    return changed
