"""What invented work dates found, in words and as a table."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from normalize.report import numbers as n
from normalize.report import tables, words

if TYPE_CHECKING:
    from normalize.report.tables import Table
    from normalize.savings.placebo import InventedDate, Placebo
    from normalize.site import AccountResult

TELLS: Final = (
    "Dates next to each other share nearly all their bills, so false announcements come in runs: "
    "none in many buildings, several in a few. A change in use that really happened before the "
    "work announces itself too. This shows how far use in this building moves by itself; it "
    "cannot say what caused the real change."
)
OUTCOMES: Final = {
    "reduction": "would have announced less use",
    "increase": "would have announced more use",
    "cannot tell": "could not be told from no change",
}


def sentences(account: AccountResult) -> tuple[str, ...]:
    """The outcome, what stands beside it, and what it can and cannot tell; or why it is not there.

    Empty where bills could not be read.
    """
    placebo = account.placebo
    if placebo is None:
        return ()
    if not placebo.dates:
        return (f"Invented work dates were not tried: {words.stop(n.clean(placebo.unavailable))}",)
    return tuple(filter(None, (_outcome(placebo), _largest(account, placebo), TELLS)))


def finding(placebo: Placebo) -> str:
    """The outcome as a title."""
    k, told = len(placebo.dates), len(placebo.announced)
    if k == 1:
        return f"One invented work date: {'a' if told else 'no'} change announced"
    many = "None" if told == 0 else f"{told}"
    return f"{many} of {k} invented work dates would have announced a change"


def _outcome(placebo: Placebo) -> str:
    first, last = placebo.dates[0].day, placebo.dates[-1].day
    when = f"between {n.long_date(first)} and {n.long_date(last)}"
    if len(placebo.dates) == 1:
        when = f"on {n.long_date(first)}"
    expected = words.confidence_word(1.0 - placebo.dates[0].normalized.confidence)
    return (
        f"{finding(placebo)}, {when}, before the real work and when nothing was done; about "
        f"{expected} is expected over many buildings in which nothing changes."
    )


def _largest(account: AccountResult, placebo: Placebo) -> str:
    """The largest invented change beside the real one."""
    top, real = placebo.largest, account.savings.normalized
    if top is None or top.normalized.value is None:
        return ""
    found, form = _spoken(account, top)
    text = f"The largest of the invented changes is {words.signed(found, form)}"
    text += f" (invented on {n.long_date(top.day)})"
    beside = real.fraction if top.normalized.fraction is not None else real.value
    if not real.available or beside is None:
        return f"{text}."
    return f"{text}; the real change is {words.signed(beside, form)}."


def _spoken(account: AccountResult, date: InventedDate) -> tuple[float, words.Form]:
    e = date.normalized
    if e.fraction is not None:
        return e.fraction, words.percent_form()
    return float(e.value or 0.0), words.unit_form(words.unit_word(account.unit))


def table_of(account: AccountResult) -> Table | None:
    """Every invented date with its change and range; None where there is none."""
    placebo = account.placebo
    if placebo is None or not placebo.dates:
        return None
    rows = tuple(
        (
            n.short_date(d.day),
            f"{d.n_before}",
            f"{d.n_after}",
            *(n.plain(x, 1) for x in (d.normalized.value, d.normalized.low, d.normalized.high)),
            n.percent_plain(d.normalized.fraction),
            OUTCOMES.get(d.normalized.verdict, d.normalized.verdict),
        )
        for d in placebo.dates
    )
    header = (
        "invented date", "bills before", "bills after", "change", "low", "high", "share", "outcome",
    )  # fmt: skip
    left = placebo.without_answer
    without = f"; {left} more gave no answer" if left else ""
    caption = (
        f"Work dates invented in the bills before the work, change in a normal year, "
        f"{words.unit_word(account.unit)}; less is positive{without}"
    )
    return tables.Table(caption, header, rows, frozenset(range(1, 7)))
