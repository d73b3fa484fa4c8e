"""The sentences: what changed after the work, in plain words, with its range.

A sentence speaks of a change in use after the work and never of its cause.  A change whose
range includes zero "could not be told from no change"; an increase is called one.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Final, NamedTuple

from normalize.report import numbers as n
from normalize.units import FUELS

if TYPE_CHECKING:
    from normalize.savings.results import Estimate
    from normalize.site import AccountResult, SiteResult
    from normalize.units import Factor

UNIT_WORDS: Final = {
    "therm": ("therm", "therms"),
    "gal": ("gallon", "gallons"),
    "imp gal": ("imperial gallon", "imperial gallons"),
    "L": ("liter", "liters"),
    "m3": ("m³", "m³"),
    "cf": ("cubic foot", "cubic feet"),
    "lb": ("pound", "pounds"),
    "cord": ("cord", "cords"),
    "short ton": ("short ton", "short tons"),
    "tonne": ("tonne", "tonnes"),
}
NORMAL_YEAR: Final = "in a normal year"
MAX_DIGITS: Final = 4  # a range so tight that more would be needed is shown as it rounds
DAYS_A_MONTH: Final = 30.4375  # for saying how long, never for computing


class Range(NamedTuple):
    """A value with its range, ready to be spoken; None where unknown."""

    value: float | None
    low: float | None
    high: float | None

    def times(self, factor: float) -> Range:
        """The same range in another unit: money, CO₂ or percent."""
        ends = [None if x is None else x * factor for x in (self.low, self.high)]
        if factor < 0:
            ends.reverse()
        return Range(None if self.value is None else self.value * factor, ends[0], ends[1])


class Form(NamedTuple):
    """How a number is spoken: with its unit, and without where the sentence has given it."""

    full: Callable[[float, int], str]
    bare: Callable[[float, int], str]


def percent_form() -> Form:
    """Percent; the sign stays at both ends of a range."""
    return Form(n.percent, n.percent)


def unit_form(word: str) -> Form:
    """A number and a word."""
    return Form(lambda v, d: f"{n.significant(v, d)}{n.NBSP}{word}", n.significant)


def money_form(currency: str) -> Form:
    """An amount of money; its sign stays at both ends of a range."""
    return Form(lambda v, d: n.money(v, currency, d), lambda v, d: n.money(v, currency, d))


def fuel_word(fuel: str) -> str:
    """What a homeowner calls the fuel.

    >>> fuel_word("natural gas"), fuel_word("heating oil")
    ('gas', 'oil')
    """
    known = FUELS.get(fuel)
    return n.name(fuel) if known is None else known.plain


def account_title(account: AccountResult) -> str:
    """The fuel, and the account's own name where it says more."""
    title, name = upper(n.name(account.fuel)), n.name(account.account)
    told = {account.fuel.lower(), fuel_word(account.fuel).lower()}
    return title if name.lower() in told else f"{title}, account {name}"


def unit_word(unit: str, *, one: bool = False) -> str:
    """The unit in a sentence.

    >>> unit_word("therm"), unit_word("gal", one=True), unit_word("kWh")
    ('therms', 'gallon', 'kWh')
    """
    pair = UNIT_WORDS.get(unit, (unit, unit))
    return n.name(pair[0] if one else pair[1])


def confidence_word(confidence: float) -> str:
    """How sure a range is.

    >>> confidence_word(0.9)
    '90\\xa0%'
    """
    text = n.plain(100.0 * confidence, 2).rstrip("0").rstrip(".")
    return f"{text}{n.NBSP}%"


def in_percent(estimate: Estimate) -> Range:
    """The estimate as a fraction of what it is measured against."""
    return Range(estimate.fraction, estimate.fraction_low, estimate.fraction_high)


def in_units(estimate: Estimate) -> Range:
    """The estimate in the account's own unit."""
    return Range(estimate.value, estimate.low, estimate.high)


def verdict_of(spread: Range) -> str:
    """One of "reduction", "increase", "cannot tell", "no range", "unknown".

    >>> verdict_of(Range(3.0, -1.0, 7.0))
    'cannot tell'
    """
    if not n.known(spread.value):
        return "unknown"
    if spread.low is None or spread.high is None or not (n.known(spread.low + spread.high)):
        return "no range"
    if spread.low > 0.0:
        return "reduction"
    return "increase" if spread.high < 0.0 else "cannot tell"


def signed(value: float | None, form: Form, digits: int = 2) -> str:
    """A number with its direction in words: "3.1 % less", "5.2 % more", "no change"."""
    if value is None or not n.known(value):
        return n.UNKNOWN
    if value == 0.0:
        return "no change"
    return f"{form.full(abs(value), digits)} {'less' if value > 0 else 'more'}"


def span_words(spread: Range, form: Form, digits: int) -> str:
    """The range in words; without its direction where the sentence already gives it."""
    low, high = spread.low, spread.high
    if low is None or high is None or not n.known(low) or not n.known(high):
        return "its range is not known"
    if low > 0.0 or high < 0.0:
        near, far = sorted((abs(low), abs(high)))
        return f"between {form.bare(near, digits)} and {form.bare(far, digits)}"
    first, last = signed(low, form, digits), signed(high, form, digits)
    return f"between {first} and {last}"


def digits_for(spread: Range, form: Form) -> int:
    """Two significant digits, more only where they would make value and ends look alike."""
    points = [p for p in spread if p is not None and n.known(p)]
    for digits in range(2, MAX_DIGITS):
        if len({form.bare(p, digits) for p in points}) == len(set(points)):
            return digits
    return MAX_DIGITS


def finding(estimate: Estimate, fuel: str, unit: str) -> str:
    """The finding as a title: "19 % less gas", "electricity: no change could be told".

    >>> from normalize.savings.results import Estimate
    >>> finding(Estimate(1, .8, 1.2, .186, .145, .227), "natural gas", "therm")
    '19\\xa0% less gas'
    """
    spread, form = _spoken(estimate, unit)
    fuel = fuel_word(fuel)
    verdict = verdict_of(spread)
    if verdict == "unknown":
        return f"{upper(fuel)}: not known"
    if verdict == "cannot tell":
        return f"{upper(fuel)}: could not be told from no change"
    return f"{signed(spread.value, form, digits_for(spread, form))} {fuel}"


def normalized_sentence(
    estimate: Estimate, fuel: str, unit: str, *, subject: str = "This site", which: str = ""
) -> str:
    """What changed in a normal year.

    >>> from normalize.savings.results import Estimate
    >>> print(normalized_sentence(Estimate(151.3, 118., 184.6, .186, .145, .227),
    ...     "natural gas", "therm", subject="Your house").replace(n.NBSP, " "))
    Your house used 19 % less gas in a normal year after the work (between 14 % and 23 %).
    """
    spread, form = _spoken(estimate, unit)
    fuel = fuel_word(fuel)
    digits = digits_for(spread, form)
    verdict = verdict_of(spread)
    if verdict == "unknown":
        return _not_known(f"the change in {fuel} use {NORMAL_YEAR}{which}", estimate)
    ranged = span_words(spread, form, digits)
    if verdict == "cannot tell":
        return (
            f"{upper(fuel)} use {NORMAL_YEAR}{which} could not be told from no change: it is "
            f"somewhere {ranged}."
        )
    return (
        f"{subject} used {signed(spread.value, form, digits)} {fuel} {NORMAL_YEAR} after the "
        f"work{which} ({ranged})."
    )


def avoided_sentence(
    estimate: Estimate,
    fuel: str,
    unit: str,
    days: int,
    *,
    subject: str = "This site",
    which: str = "",
) -> str:
    """What changed in the weather that really came, since the work."""
    spread, form = _spoken(estimate, unit)
    fuel = fuel_word(fuel)
    digits = digits_for(spread, form)
    verdict = verdict_of(spread)
    if verdict == "unknown":
        return _not_known(f"the change in {fuel} use since the work{which}", estimate)
    ranged = span_words(spread, form, digits)
    when = f"In the {how_long(days)} billed since the work" if days > 0 else "Since the work"
    if estimate.so_far:
        when = f"So far, {_lower_first(when)}"
    if verdict == "cannot tell":
        return (
            f"{when}, {fuel} use{which} could not be told from what the earlier bills lead one to "
            f"expect in the same weather: it is somewhere {ranged}."
        )
    return (
        f"{when}, {_lower_first(subject)} used {signed(spread.value, form, digits)} {fuel}{which} "
        f"than the earlier bills lead one to expect in the same weather ({ranged})."
    )


def how_long(days: int) -> str:
    """A length of time: days up to two months, then months.

    >>> how_long(31), how_long(731)
    ('31 days', '24 months')
    """
    if days < 2 * DAYS_A_MONTH:
        return "1 day" if days == 1 else f"{days} days"
    return f"{round(days / DAYS_A_MONTH)} months"


def energy_sentence(estimate: Estimate, unit: str, *, per: str = " a year") -> str:
    """The same change in the unit of the bills; empty when there is none to give."""
    where = "In a normal year" if per == " a year" else "Since the work"
    return _also(where, in_units(estimate), unit_form(unit_word(unit)), "")


def money_sentence(
    estimate: Estimate,
    per_unit: float | None,
    currency: str,
    unit: str,
    source: str = "",
    *,
    per: str = " a year",
) -> str:
    """What the change is worth at the price of the last unit; empty when unknown."""
    if per_unit is None or not n.known(per_unit):
        return ""
    at = f"At {n.price(per_unit, currency)} a {unit_word(unit, one=True)}"
    at += f" ({n.clean(source)})" if source else ""
    return _also(at, in_units(estimate).times(per_unit), money_form(currency), per)


def carbon_sentence(estimate: Estimate, kg_per_unit: float | None, *, per: str = " a year") -> str:
    """What the change is in carbon dioxide; empty when unknown. The source is in the table."""
    if kg_per_unit is None or not n.known(kg_per_unit):
        return ""
    return _also("In carbon dioxide", in_units(estimate).times(kg_per_unit), unit_form("kg"), per)


def answer(
    account: AccountResult, *, subject: str = "This site", which: str = ""
) -> tuple[str, ...]:
    """The sentences that answer for one account, the most useful first."""
    if account.unavailable:
        return (
            f"For {fuel_word(account.fuel)}{which} there is no answer: "
            f"{stop(n.clean(account.unavailable))}",
        )
    save = account.savings
    normal = normalized_sentence(
        save.normalized, account.fuel, account.unit, subject=subject, which=which
    )
    avoided = avoided_sentence(
        save.avoided,
        account.fuel,
        account.unit,
        save.reporting_days,
        subject=subject,
        which=which,
    )
    if not save.normalized.available and save.avoided.available:
        return (avoided, normal)
    if not save.avoided.available and save.avoided.unavailable == save.normalized.unavailable:
        return (normal,)
    return (normal, avoided)


def headline(account: AccountResult, *, subject: str = "This site", which: str = "") -> str:
    """The one sentence that answers for the account."""
    return answer(account, subject=subject, which=which)[0]


def which_of(account: AccountResult, result: SiteResult, *, show_accounts: bool = False) -> str:
    """The account's name as " on the account shop" where accounts share a fuel; else nothing."""
    same = [a for a in result.accounts if fuel_word(a.fuel) == fuel_word(account.fuel)]
    if len(same) < 2:
        return ""
    label = n.name(account.account)
    return f" on the account {label if show_accounts else n.mask(label)}"


def worth(account: AccountResult, currency: str) -> tuple[str, ...]:
    """The change in units, money and carbon: normal year if known, else so far."""
    save = account.savings
    normal = save.normalized.available
    estimate = save.normalized if normal else save.avoided
    per = " a year" if normal else " since the work"
    co2 = account.co2
    sentences = (
        energy_sentence(estimate, account.unit, per=per),
        money_sentence(
            estimate,
            account.price.per_unit,
            currency,
            account.unit,
            account.price.source,
            per=per,
        ),
        carbon_sentence(estimate, None if co2 is None else co2.value, per=per),
    )
    return tuple(s for s in sentences if s)


def factor_source(factor: Factor) -> str:
    """Where a factor comes from, with its year; "(memory)" if it was not checked.

    >>> from normalize.units import Factor
    >>> factor_source(Factor(53.06, "kg CO2/MMBtu", "EPA", "2024", memory=True))
    'EPA, 2024 (memory)'
    """
    source = n.clean(factor.source)
    if factor.year and factor.year not in source:
        source = f"{source}, {n.clean(factor.year)}" if source else n.clean(factor.year)
    return f"{source} (memory)".strip() if factor.memory and "(memory)" not in source else source


def _spoken(estimate: Estimate, unit: str) -> tuple[Range, Form]:
    """Percent where there is one, the account's unit where there is none to divide by."""
    share = in_percent(estimate)
    said = verdict_of(share)
    if said not in ("unknown", "no range") and said == verdict_of(in_units(estimate)):
        return share, percent_form()
    return in_units(estimate), unit_form(unit_word(unit))


def _also(start: str, spread: Range, form: Form, per: str) -> str:
    verdict = verdict_of(spread)
    if verdict == "unknown":
        return ""
    digits = digits_for(spread, form)
    ranged = span_words(spread, form, digits)
    if verdict == "cannot tell":
        return f"{start} that is somewhere {ranged}{per}."
    return f"{start} that is {signed(spread.value, form, digits)}{per} ({ranged})."


def _not_known(what: str, estimate: Estimate) -> str:
    why = n.clean(estimate.unavailable or "no finite number came out of the computation")
    if estimate.known_from is None:
        return f"{upper(what)} is not known: {stop(why)}"
    when = n.long_date(estimate.known_from)
    return (
        f"{upper(what)} is not known yet: {stop(why)} It will be known from about {when}, if "
        "bills keep coming."
    )


def upper(text: str) -> str:
    """Text with its first letter as a capital.

    >>> upper("gas use")
    'Gas use'
    """
    return text[:1].upper() + text[1:]


def _lower_first(text: str) -> str:
    """Subjects such as "This site" move into the sentence; names keep their capital."""
    for word in ("This ", "Your ", "The ", "In ", "Since "):
        if text.startswith(word):
            return word.lower() + text[len(word) :]
    return text


def stop(text: str) -> str:
    """Text that ends as a sentence.

    >>> stop("one bill"), stop("which?")
    ('one bill.', 'which?')
    """
    return text if text.endswith((".", "?", "!")) else f"{text}."
