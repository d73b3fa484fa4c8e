"""The sentences on a whole site: totals, weather, cautions, and what ranges mean."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from normalize.report import numbers as n
from normalize.report import words

if TYPE_CHECKING:
    from normalize.savings.results import Amount, Total
    from normalize.site import SiteResult

CAUSE: Final = (
    "This is a change in use after the work. Bills cannot say what caused it: whatever else "
    "changed at the same time is in the number too."
)
SAFETY: Final = (
    "This is an estimate from bills, not a guarantee.",
    "Work on burners, flues, gas lines, wiring and the building's envelope belongs in the hands of "
    "licensed people and follows local codes; nothing here replaces them.",
    "A house that was made tighter needs its ventilation checked, and its combustion appliances "
    "checked for safe draft.",
    "A drop in use in an occupied home in winter may mean that the heating has failed: make sure "
    "that it works before calling the drop a saving.",
)


def cautions_of(result: SiteResult) -> tuple[str, ...]:
    """The site's cautions, then the usual ones of safety, each once."""
    answered = any(a.has_answer for a in result.accounts)
    every = [n.clean(c) for c in result.cautions] + (list(SAFETY) if answered else [])
    return tuple(dict.fromkeys(every))


def upgrade_sentences(result: SiteResult) -> tuple[str, ...]:
    """What was done, when, and for how much."""
    told = []
    for u in result.site.upgrades:
        cost = "" if u.cost is None else f", {n.amount(u.cost, result.site.currency)}"
        only = f" (touches {listed(u.accounts)})" if u.accounts else ""
        told.append(f"Work: {n.name(u.name)}{only}, {n.span(u.start, u.end)}{cost}.")
    return tuple(told)


def change_sentences(result: SiteResult) -> tuple[str, ...]:
    """What else changed, as the site file says."""
    told = []
    for c in result.site.changes:
        since = "" if c.since is None else f", since {n.long_date(c.since)}"
        until = "" if c.until is None else f", until {n.long_date(c.until)}"
        told.append(f"{n.name(c.what)}{since}{until}")
    return tuple(told)


def method_sentences(result: SiteResult) -> tuple[str, ...]:
    """How the ranges were made, each way once."""
    methods: dict[str, list[str]] = {}
    for account in result.accounts:
        for kind, e in (
            ("normal year", account.savings.normalized),
            ("since the work", account.savings.avoided),
        ):
            if e.available and e.method:
                methods.setdefault(n.clean(e.method), []).append(kind)
    return tuple(
        f"Range ({' and '.join(dict.fromkeys(kinds))}): {words.stop(method)}"
        for method, kinds in methods.items()
    )


def totals_of(result: SiteResult) -> tuple[str, ...]:
    """The sentences on all accounts together; none where only one account has an answer."""
    if sum(a.has_answer for a in result.accounts) < 2:
        return ()
    total, normal = result.total_normalized, True
    if total.energy_mmbtu.unavailable is not None:
        total, normal = result.total_avoided, False
    return total_sentences(total, result.site.currency, normal=normal)


def weather_sentences(result: SiteResult) -> tuple[str, ...]:
    """Whose weather, what was done to it, and which normal year."""
    weather, year = result.site.weather, result.site.year
    days = "1 day" if weather.days_filled == 1 else f"{weather.days_filled:,} days"
    first, last = n.short_date(weather.first_day), n.short_date(weather.last_day - 1)
    told = [
        f"Weather: {n.name(weather.station)}, {first} to {last}, {n.clean(weather.method)}; "
        f"{days} filled.",
        *(words.stop(words.upper(n.clean(note))) for note in weather.notes),
    ]
    if year is None:
        why = n.clean(result.site.year_unavailable) or "no reason given"
        return (*told, f"There is no normal year: {words.stop(why)}")
    station = f", {n.name(year.station)}" if year.station else ""
    told.append(f"Normal year: {n.clean(year.name)}{station}.")
    told += [
        f"The year {y} is left out of it: {words.stop(n.clean(why))}" for y, why in year.left_out
    ]
    told += [words.stop(words.upper(n.clean(note))) for note in year.notes]
    return tuple(told)


def total_sentences(total: Total, currency: str, *, normal: bool = True) -> tuple[str, ...]:
    """All accounts together: energy, money, carbon, each with both ranges."""
    when = words.NORMAL_YEAR if normal else "since the work"
    parts = (
        ("energy", total.energy_mmbtu, words.unit_form("million Btu")),
        ("cost", total.cost, words.money_form(currency)),
        ("carbon dioxide", total.co2_kg, words.unit_form("kg")),
    )
    return tuple(total_sentence(what, amount, form, when) for what, amount, form in parts)


def total_sentence(
    what: str, amount: Amount, form: words.Form, when: str = words.NORMAL_YEAR
) -> str:
    """One total in words, with what it leaves out."""
    spread = words.Range(amount.value, amount.low, amount.high)
    out = f" This leaves out {listed(amount.missing)}." if amount.missing else ""
    if amount.unavailable is not None or words.verdict_of(spread) == "unknown":
        why = n.clean(amount.unavailable or "no finite number came out")
        return f"The total {what} {when} is not known: {words.stop(why)}{out}"
    digits = words.digits_for(spread, form)
    ranged = words.span_words(spread, form, digits)
    worst = words.Range(amount.value, amount.worst_low, amount.worst_high)
    if n.known(worst.low) and n.known(worst.high):
        ranged += f"; if all errors lean the same way, {words.span_words(worst, form, digits)}"
    if words.verdict_of(spread) == "cannot tell":
        same = "could not be told from no change"
        return f"All accounts together, {what} {when} {same} ({ranged}).{out}"
    changed = words.signed(spread.value, form, digits)
    return f"All accounts together, {what} {when}: {changed} ({ranged}).{out}"


def range_note(confidence: float) -> str:
    """What the ranges mean."""
    return (
        f"Ranges are {words.confidence_word(confidence)} ranges. They speak of the scatter of the "
        "bills, with bills that err together allowed for; not of the people, the weather station "
        "or the choice of the normal year."
    )


def listed(items: tuple[str, ...]) -> str:
    """Names in a sentence.

    >>> listed(("gas", "oil", "wood"))
    'gas, oil and wood'
    """
    names = [n.mask(n.name(item)) for item in items]
    if len(names) < 2:
        return "".join(names)
    return f"{', '.join(names[:-1])} and {names[-1]}"
