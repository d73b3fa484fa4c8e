"""The parts of the savings, the heat loss and the expectation, as sentences and tables."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final, NamedTuple

from normalize.report import numbers as n
from normalize.report import tables, words

if TYPE_CHECKING:
    from normalize.savings.expectation import Expectation
    from normalize.savings.heat_loss import HeatLoss
    from normalize.savings.results import Estimate
    from normalize.savings.taken_apart import Part
    from normalize.site import AccountResult

HEAT_LOSS: Final = "Btu/h·°F"
INTENSITY: Final = "Btu/ft²·°F·day"
PARTS_CAPTION: Final = (
    "Each part is the change of one parameter, the others at the mean of before and after; the "
    "parts add up to the change but for rounding, their ranges do not"
)


class CloseReading(NamedTuple):
    """What a report says of how the answer is made up; empty where there is nothing to say."""

    parts: tuple[str, ...]
    heat_loss: tuple[str, ...]
    expectation: tuple[str, ...]
    cautions: tuple[str, ...]
    parts_table: tables.Table | None
    heat_loss_table: tables.Table | None
    expectation_table: tables.Table | None


def close_reading(account: AccountResult) -> CloseReading:
    """Sentences and tables of one account."""
    found, heat, wanted = account.parts, account.heat_loss, account.expectation
    several = found is not None and len(found.parts) > 1
    return CloseReading(
        parts=parts_sentences(account),
        heat_loss=() if heat is None else heat_loss_sentences(heat),
        expectation=() if wanted is None else expectation_sentences(account, wanted),
        cautions=() if wanted is None else wanted.cautions,
        parts_table=parts_table(account) if several else None,
        heat_loss_table=None if heat is None else heat_loss_table(heat),
        expectation_table=expectation_table(account, wanted)
        if wanted is not None and wanted.available
        else None,
    )


def parts_sentences(account: AccountResult) -> tuple[str, ...]:
    """What the change is made of, with the caution; or why it is not taken apart."""
    found = account.parts
    if found is None or not account.savings.normalized.available:
        return ()
    if found.unavailable is not None:
        return (f"The change is not taken apart: {words.stop(n.clean(found.unavailable))}",)
    if len(found.parts) < 2:
        return ()
    unit = words.unit_word(account.unit)
    told = "; ".join(f"{part.name} {part_words(part)}" for part in found.parts)
    first = f"In {unit} of a normal year the change is made up of: {told}."
    reading = account.heat_loss.reading if account.heat_loss is not None else ""
    return tuple(s for s in (first, reading, found.caution, found.rough) if s)


def part_words(part: Part, digits: int = 2) -> str:
    """One part with its range, without its unit.

    >>> from normalize.savings.taken_apart import Part
    >>> from normalize.savings.results import Estimate
    >>> part_words(Part("base load", Estimate(57.0, 2.2, 107.0)))
    '57 less (2.2 to 110)'
    >>> part_words(Part("base load", Estimate(57.0, -3.0, 107.0)))
    '3 more to 110 less'
    """
    spread = words.in_units(part.estimate)
    verdict = words.verdict_of(spread)
    if verdict == "unknown" or spread.low is None or spread.high is None:
        return "not known"
    if verdict == "cannot tell":
        return f"{_signed(spread.low, digits)} to {_signed(spread.high, digits)}"
    near, far = (_short(x, digits) for x in sorted((abs(spread.low), abs(spread.high))))
    return f"{_signed(spread.value, digits)} ({near} to {far})"


def _signed(value: float | None, digits: int = 2) -> str:
    if value is None:
        return n.UNKNOWN
    return f"{_short(abs(value), digits)} {'less' if value >= 0.0 else 'more'}"


def _short(value: float, digits: int = 2) -> str:
    """Significant digits without zeros that follow the point."""
    text = n.significant(value, digits)
    whole, point, decimals = text.partition(".")
    return whole if point and not decimals.strip("0") else text


def parts_table(account: AccountResult) -> tables.Table:
    """Every part with both ranges, and their sum."""
    found = account.parts
    parts = () if found is None else found.parts
    rows = [(part.name, *_five(part.estimate, 2)) for part in parts]
    rows.append(("all together", *_five(account.savings.normalized, 2)))
    unit = words.unit_word(account.unit)
    head = ("part", "value", "low", "high", "plain low", "plain high")
    caption = f"{PARTS_CAPTION}. Values in {unit} of a normal year; less is positive."
    return tables.Table(caption, head, tuple(rows), frozenset(range(1, 6)))


def _five(e: Estimate | None, decimals: int) -> tuple[str, ...]:
    if e is None:
        return (n.UNKNOWN,) * 5
    return tuple(n.plain(x, decimals) for x in (e.value, e.low, e.high, e.plain_low, e.plain_high))


def _around(e: Estimate) -> str:
    return f"{n.significant(e.value, 3)} ({n.significant(e.low, 3)} to {n.significant(e.high, 3)})"


def heat_loss_sentences(heat: HeatLoss) -> tuple[str, ...]:
    """The heating slope as a rate of heat loss."""
    before, after, change = heat.before, heat.after, heat.change
    if before is None:
        return ()
    text = f"The heating slope before the work amounts to {_around(before)} {HEAT_LOSS}"
    if after is not None:
        text += f", after it to {_around(after)}"
    first = (
        f"{text}: the rate at which this account's fuel makes up for heat lost, its heating "
        "efficiency not taken out."
    )
    told = [first if change is None else f"{first} {_changed(change, HEAT_LOSS)}."]
    if heat.ua_before is not None and heat.efficiency is not None:
        ua = (
            f"With the stated efficiency of {heat.efficiency:.2f} the heat lost was "
            f"{_around(heat.ua_before)} {HEAT_LOSS}"
        )
        if heat.ua_after is not None:
            later = heat.efficiency_after or heat.efficiency
            new = f" (efficiency {later:.2f})" if later != heat.efficiency else ""
            ua += f", after the work{new} {_around(heat.ua_after)}"
        told.append(f"{ua}.")
    return tuple(told)


def _changed(e: Estimate, unit: str) -> str:
    spread = words.in_units(e)
    low, high = spread.low, spread.high
    if words.verdict_of(spread) == "cannot tell":
        return (
            "Its change could not be told from none: it is somewhere between "
            f"{_signed(low)} and {_signed(high)}, {unit}"
        )
    near, far = (_short(x) for x in sorted((abs(low or 0.0), abs(high or 0.0))))
    verb = "fell" if (spread.value or 0.0) > 0.0 else "rose"
    return f"It {verb} by {n.significant(abs(spread.value or 0.0))} ({near} to {far}) {unit}"


def heat_loss_table(heat: HeatLoss) -> tables.Table | None:
    """Heat-loss rates and intensities with both ranges."""
    rows = []
    for name, unit, of in (
        ("effective heat loss, UA/η", HEAT_LOSS, (heat.before, heat.after, heat.change)),
        ("heat loss, UA", HEAT_LOSS, (heat.ua_before, heat.ua_after, heat.ua_change)),
        (
            "intensity",
            INTENSITY,
            (heat.intensity_before, heat.intensity_after, heat.intensity_change),
        ),
    ):
        for side, e in zip(("before", "after", "change"), of, strict=True):
            if e is not None:
                rows.append((f"{name}, {side}, {unit}", *_five(e, 3 if unit == INTENSITY else 1)))
    head = ("rate", "value", "low", "high", "plain low", "plain high")
    caption = "The heating slope as a rate of heat loss; a fall is positive in the rows of change"
    return tables.Table(caption, head, tuple(rows), frozenset(range(1, 6))) if rows else None


def expectation_sentences(account: AccountResult, wanted: Expectation) -> tuple[str, ...]:
    """What the described work should have saved, beside what the bills show."""
    fuel = words.fuel_word(account.fuel)
    if wanted.unavailable is not None:
        why = words.stop(n.clean(wanted.unavailable))
        return (f"What the described work should have saved in {fuel} cannot be said: {why}",)
    unit = words.unit_word(account.unit)
    saved = wanted.saved or 0.0
    share = (
        "" if wanted.fraction is None else f", {n.percent(abs(wanted.fraction))} of the use before"
    )
    told = [
        f"As described, the work should have saved about {n.significant(saved)} {unit} of {fuel} "
        f"in a normal year{share}: an engineer's steady-state calculation from areas, R-values, "
        f"airflow and efficiency, starting from the heat loss that the bills before the work show.",
        f"In it the heat loss goes from {n.significant(wanted.ua_before, 3)} to "
        f"{n.significant(wanted.ua_after, 3)} {HEAT_LOSS}, and the balance temperature from "
        f"{n.plain(wanted.balance_before_f, 1)} to {n.plain(wanted.balance_after_f, 1)} °F, "
        "because a house that loses less needs heat only in colder weather.",
    ]
    if wanted.ratio is not None:
        told.append(_ratio_sentence(wanted))
    if wanted.assumed:
        told.append(f"Assumed, where site.toml does not say: {'; '.join(wanted.assumed)}.")
    return tuple(told)


def _ratio_sentence(wanted: Expectation) -> str:
    low, high = wanted.ratio_low or 0.0, wanted.ratio_high or 0.0
    between = f"between {n.significant(low)} and {n.significant(high)}"
    own = "this range is that of the bills alone, the expectation has errors of its own"
    if high < 0.0:
        return "The bills show an increase where a saving was expected."
    if low <= 0.0:
        return (
            "The bills show a change that could not be told from none: it is somewhere "
            f"{between} of what was expected ({own})."
        )
    return f"The bills show {n.significant(wanted.ratio)} of what was expected ({between}; {own})."


def expectation_table(account: AccountResult, wanted: Expectation) -> tables.Table:
    """Component by component, with the heat loss and balance temperature that each leaves."""
    unit = words.unit_word(account.unit)
    rows = [
        (
            "as the bills show it",
            n.UNKNOWN,
            n.plain(wanted.ua_before, 1),
            n.plain(wanted.balance_before_f, 2),
        )
    ]
    rows += [
        (
            n.name(s.name) if s.kind == s.name else f"{n.name(s.name)} ({s.kind})",
            n.plain(s.saved, 2),
            n.plain(s.ua, 1),
            n.plain(s.balance_f, 2),
        )
        for s in wanted.steps
    ]
    total = n.plain(wanted.saved, 2)
    rows.append(("all together", total, n.plain(wanted.ua_after, 1),
                 n.plain(wanted.balance_after_f, 2)))  # fmt: skip
    rows.append(("the same, balance held", n.plain(wanted.balance_held, 2), "", ""))
    head = ("component", f"{unit} saved", f"heat loss, {HEAT_LOSS}", "balance, °F")
    caption = (
        f"What the described work should have saved in a normal year, each component on what those "
        f"above it left; indoors {n.plain(wanted.setpoint_f, 1)} °F, efficiency before "
        f"{n.plain(wanted.efficiency, 2)}"
    )
    return tables.Table(caption, head, tuple(rows), frozenset({1, 2, 3}))
