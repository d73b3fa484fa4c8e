"""A scan for dates of change in plain words: dates, sizes, what to do; never a cause."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from normalize.days import date_of
from normalize.savings.break_results import LEVEL

if TYPE_CHECKING:
    from normalize.savings.break_results import Breaks, ClaimedDate, FoundChange, OddPeriod

MONTHS: Final = (
    "January", "February", "March", "April", "May", "June", "July", "August", "September",
    "October", "November", "December",
)  # fmt: skip
MOST_ODD: Final = 3  # told one by one; more are counted
NBSP: Final = "\u00a0"


def month(day: int) -> str:
    """A day's month and year.

    >>> month(19611).replace(NBSP, " ")
    'September 2023'
    """
    when = date_of(day)
    return f"{MONTHS[when.month - 1]}{NBSP}{when.year}"


def months(low: int, high: int) -> str:
    """From one day's month to another's, the year said once where it is the same.

    >>> months(19420, 19520).replace(NBSP, " "), months(19420, 19425).replace(NBSP, " ")
    ('between March and June 2023', 'in March 2023')
    """
    first, last = date_of(low), date_of(high)
    if month(low) == month(high):
        return f"in {month(low)}"
    if first.year == last.year:
        return f"between {MONTHS[first.month - 1]} and {month(high)}"
    return f"between {month(low)} and {month(high)}"


def _date(day: int) -> str:
    when = date_of(day)
    return f"{when.day}{NBSP}{MONTHS[when.month - 1]}{NBSP}{when.year}"


def percent(share: float) -> str:
    """The size of a share, two digits at most, without its sign.

    >>> percent(-0.0912).replace(NBSP, " "), percent(0.186).replace(NBSP, " ")
    ('9 %', '19 %')
    """
    return f"{abs(100.0 * share):,.0f}{NBSP}%"


def _signed(share: float) -> str:
    return f"{'−' if share < 0 else '+'}{percent(share)}"


def claim_sentences(found: Breaks, work_start: int, work_end: int) -> list[str]:
    """What the bills say of the date of the work."""
    if found.unavailable:
        return [f"When use changed could not be looked for: {found.unavailable}."]
    claimed = found.claimed
    if claimed is None:
        return ["When use changed could not be looked for: no date can be tried with these bills."]
    work = months(work_start, work_end - 1)
    if not claimed.announced:
        out = "Without being told of the work, the bills do not single out a date of change"
        return [f"{out}. {_told(claimed, work)}".rstrip()]
    span = months(claimed.low, claimed.high)
    likely = f", most likely around {month(claimed.day)}" if span[:2] == "be" else ""
    if claimed.meets:
        return [
            f"The bills themselves, without being told of the work, place a change of use {span}"
            f"{likely}; the work was {work}."
        ]
    return [
        f"The bills themselves place the largest change of use {span}{likely}, "
        f"{'before' if claimed.high < work_start else 'after'} the work ({work}): something else "
        f"seems to have changed use more than the work did. {_told(claimed, work)}".rstrip()
    ]


def _told(claimed: ClaimedDate, work: str) -> str:
    if claimed.p is None:
        return ""
    if claimed.p <= LEVEL:
        return f"Told that the work was {work}, they show a change there."
    return f"Even told that the work was {work}, they show no change that can be told from none."


def change_sentence(c: FoundChange, unit: str) -> str:
    """One change beside the work, and what to do about it."""
    size, way = _size(c, unit), "rose" if c.change > 0 else "fell"
    about = (
        f", about when site.toml says “{c.explained}”"
        if c.explained
        else ", which site.toml does not mention"
    )
    out = f"Use also {way} by {size} around {month(c.day)}{about} (the date lies " + (
        f"{months(c.low, c.high)})."
    )
    if not c.mixed:
        return f"{out} The bills that the answer rests on lie on one side of it."
    out += (
        f" Bills from both sides of that date stand {c.side} the work in the answer, "
        "so part of it may be this."
    )
    if c.explained:
        return out
    return (
        f"{out} If you know what happened, add it to site.toml as a [[change]] with what and "
        "since; if other people lived there until then, set occupied_since."
    )


def _size(c: FoundChange, unit: str) -> str:
    if c.fraction is None or c.fraction_low is None or c.fraction_high is None:
        return f"about {abs(c.change):,.0f} {unit} in a normal year"
    return (
        f"about {percent(c.fraction)} of a normal year's use "
        f"({_signed(c.fraction_low)} to {_signed(c.fraction_high)})"
    )


def other_sentences(found: Breaks, unit: str) -> list[str]:
    """Changes beside the work, or that none stands out, or why it was not looked for."""
    out = [change_sentence(c, unit) for c in found.changes]
    if not found.changes and found.p_rest is not None:
        where = "on either side of it" if not found.not_searched else "where it was looked for"
        out.append(f"Beside the work, no other change of use stands out {where}.")
    return out + [f"{text[:1].upper()}{text[1:]}." for text in found.not_searched]


def odd_sentences(found: Breaks) -> list[str]:
    """Single bills that stand out."""
    out = [_odd(o, joined=found.joined) for o in found.odd[:MOST_ODD]]
    if len(found.odd) > MOST_ODD:
        out.append(f"{len(found.odd) - MOST_ODD} more bills stand out; the table names them.")
    return out


def _odd(o: OddPeriod, *, joined: bool) -> str:
    what = "stretch" if joined else "bill"
    way = "above" if o.use_per_day > o.expected_per_day else "below"
    size = ""
    if o.expected_per_day > 0.0:
        size = f"{percent(o.use_per_day / o.expected_per_day - 1.0)} "
    told = (
        f": site.toml says “{o.explained}”."
        if o.explained
        else ". It stays in the answer; an empty house, guests or a wrong reading would look so."
    )
    return (
        f"The {what} from {_date(o.start)} to {_date(o.end - 1)} lies {size}{way} what its weather "
        f"and the other bills lead one to expect{told}"
    )


def caution_sentences(
    found: Breaks | None, work_start: int, work_end: int, unit: str
) -> tuple[str, ...]:
    """Cautions: changes amid the bills used that nobody mentioned; a claim the bills place
    elsewhere.
    """
    if found is None or found.unavailable:
        return ()
    out = [change_sentence(c, unit) for c in found.changes if c.mixed and not c.explained]
    claimed = found.claimed
    if claimed is not None and claimed.announced and not claimed.meets and not out:
        out += claim_sentences(found, work_start, work_end)
    return tuple(out)
