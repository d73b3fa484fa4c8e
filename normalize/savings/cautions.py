"""How people get fooled, said where it applies."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from normalize.fitting.results import Fit, FormTried
from normalize.savings.results import Price, Savings
from normalize.savings.stated import STATED_RANGE_F
from normalize.savings.worth import AVERAGE

POOR_TAU_F = 8.0  # a profile range wider than this is worth a word
WARM_F, COOL_F = 68.0, 48.0  # usual balance temperatures lie well inside (common practice)
FOLLOWS_COLD_R2 = 0.75  # of a heating form: cold inlet water alone explains less (our choice)
UNEVEN_CV = 0.35  # of the flat form: hot water is steadier than that (our choice)
BIG_CHANGE = 0.50  # program evaluation reviews changes beyond 50-65 % (memory)


@dataclass(frozen=True, slots=True)
class Circumstances:
    """What cautions depend on, beyond the savings themselves.

    by_bill : temperatures are the bills' own means.  delivered : dealer deliveries.
    estimated_near_work : an estimated reading ended within 60 days of the work.
    changes : what else the site file says changed.
    unsure : the bills do not place the balance temperature (before, after).
    """

    fuel: str
    by_bill: bool
    delivered: bool
    estimated_near_work: bool
    changes: tuple[str, ...]
    unsure: tuple[bool, bool]
    bill_cautions: tuple[str, ...] = ()
    stated_f: float | None = None
    works: int = 1  # upgrades that touch the account
    between: int = 0  # bills between two of them, which took no part
    water_only: bool = False  # site.toml says that the account heats no rooms
    tried_before: tuple[FormTried, ...] = ()
    used_nothing: bool = False  # every bill after the work says zero
    fill_words: str = ""  # of delivered fuel: what fills that are not quite full can do


def cautions_of(savings: Savings, price: Price, about: Circumstances) -> tuple[str, ...]:
    """Cautions of one account, the most important first."""
    out: list[str] = []
    out += _works(about)
    out += _water_only(savings, about)
    out += _forms(savings)
    out += _size(savings)
    for which, fit, unsure in zip(
        ("before", "after"), (savings.before, savings.after), about.unsure, strict=True
    ):
        if fit is not None:
            out += _fit(which, fit, unsure and about.stated_f is None)
    if about.estimated_near_work:
        out.append(
            "An estimated reading fell near the work: its error moves use from one side to the "
            "other until the next actual reading."
        )
    if about.stated_f is not None:
        low, high = STATED_RANGE_F
        out.append(
            f"The deliveries do not show at which temperature heating starts, so "
            f"{about.stated_f:.0f}\u00a0°F was taken; the range covers {low:.0f} to "
            f"{high:.0f}\u00a0°F."
        )
    if about.by_bill:
        out.append(
            "Temperatures are the means printed on the bills: a mean hides the days on either "
            "side of the balance temperature, so slopes are a little off in mild months."
        )
    if about.delivered:
        out.append(
            about.fill_words
            or "Fuel was delivered, not metered: use is known only between full fills, and a "
            "“full” tank is full to within a few units."
        )
    if price.source == AVERAGE:
        out.append(
            "The price is the bills' average and contains the fixed charge, which no saving "
            "saves: money is overstated. Give the price of the last unit as price = …."
        )
    for change in about.changes:
        out.append(f"Something else changed too: {change}. It is in the number.")
    out += about.bill_cautions
    return tuple(dict.fromkeys(out))


def _works(about: Circumstances) -> list[str]:
    out = []
    if about.used_nothing:
        out.append(
            "Every bill after the work says zero: make sure that the account was not closed, the "
            "building not empty and the meter not stopped before calling that a saving."
        )
    if about.works > 1:
        left = f"; {about.between} bills between them took no part" if about.between else ""
        out.append(f"The change is of all {about.works} upgrades together{left}.")
    return out


def _water_only(savings: Savings, about: Circumstances) -> list[str]:
    """Said to heat only water, but use follows the cold as a heated house's does."""
    if not about.water_only or savings.before is None:
        return []
    heating = next((t.fit for t in about.tried_before if t.form == "heating"), None)
    if heating is None or heating.r2 < FOLLOWS_COLD_R2 or savings.before.cv_rmse < UNEVEN_CV:
        return [
            "As site.toml says, this account heats no rooms, so none of its use was taken for "
            "heating: colder inlet water in winter would otherwise have passed for it. Nothing is "
            "set right for cold weather; whole years on both sides keep winters and summers in "
            "balance."
        ]
    return [
        "Use follows the cold far more than hot water does, so this account seems to heat rooms: "
        "is space_heating = false right? With it, two unlike winters are not set right."
    ]


def _forms(savings: Savings) -> list[str]:
    if savings.before is None or savings.after is None:
        return []
    if savings.before.form == savings.after.form or not savings.same_form:
        return []
    answers = []
    for form, e in savings.same_form:
        if e.value is None or e.low is None or e.high is None:
            answers.append(f"“{form}” on both sides: {e.unavailable}")
        else:
            answers.append(
                f"“{form}” on both sides: {_whole(e.value)} ({_whole(e.low)} to {_whole(e.high)})"
            )
    return [
        f"The form changed from “{savings.before.form}” before to “{savings.after.form}” after "
        "the work, so part of the difference may be the change of form. " + "; ".join(answers) + "."
    ]


def _whole(number: float) -> str:
    """A whole number with a minus sign that is one.

    >>> _whole(-1234.4)
    '−1,234'
    """
    return f"{number:,.0f}".replace("-", "−")


def _size(savings: Savings) -> list[str]:
    share = savings.normalized.fraction
    if share is None:
        share = savings.avoided.fraction
    if share is None or abs(share) < BIG_CHANGE:
        return []
    if share > 0:
        return [
            "Use fell by more than half: make sure that this is the work and not an empty "
            "building, a failed heating system or another fuel taking over."
        ]
    return [
        "Use rose by more than half: look for another fuel that it replaced, and read energy, "
        "cost and carbon of all fuels together."
    ]


def _fit(which: str, fit: Fit, unsure: bool) -> list[str]:
    out = []
    if unsure:
        out.append(
            f"The bills {which} the work do not place the balance temperature well, so the range "
            "allows for every value that it may have, and is the wider for it."
        )
    for kind, tau, span in (
        ("heating", fit.balance_heating_f, fit.balance_heating_range_f),
        ("cooling", fit.balance_cooling_f, fit.balance_cooling_range_f),
    ):
        if tau is None:
            continue
        if span is not None and span[1] - span[0] > POOR_TAU_F:
            out.append(
                f"The balance temperature for {kind} {which} the work is poorly placed: "
                f"anything from {span[0]:.0f} to {span[1]:.0f} °F fits about as well."
            )
        if kind == "heating" and not COOL_F <= tau <= WARM_F:
            out.append(
                f"A balance temperature of {tau:.0f} °F for heating is unusual (55–65 °F is "
                "customary): check the bills and the weather station."
            )
    if fit.on_bound:
        out.append(
            f"A balance temperature {which} the work lies on the edge of where it may be; read "
            "it as “at or beyond”."
        )
    return out


def site_cautions(saved: Sequence[tuple[str, Savings]]) -> tuple[str, ...]:
    """Cautions that need all accounts of a site side by side."""
    fell = [n for n, s in saved if s.normalized.verdict == "reduction"]
    rose = [n for n, s in saved if s.normalized.verdict == "increase"]
    out = []
    if fell and rose:
        out.append(
            f"{' and '.join(fell)} fell while {' and '.join(rose)} rose: the fuels traded "
            "places, so look at energy, cost and carbon together."
        )
    if any(s.normalized.available or s.avoided.available for _, s in saved):
        out.append(
            "If the work was done because a bill had been unusually high, use would have come "
            "down somewhat without it."
        )
    return tuple(out)
