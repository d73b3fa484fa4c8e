"""How far the answer moves with choices that could have been others.

Quick ones, in every report: the forms, their average, weights, criterion, each bill, the
stretch of bills.  Slow ones, when asked for: other weather stations, other normal years.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Final

if TYPE_CHECKING:
    from collections.abc import Sequence

    from normalize.bills.periods import Bills
    from normalize.savings.results import Estimate
    from normalize.savings.variations import Variation
    from normalize.site import AccountResult, Site, SiteResult
    from normalize.sitefile import AccountPlan

AS_CHOSEN: Final = "as chosen"
STATION: Final = "station"
LONG_TERM_YEAR: Final = "long-term year"


@dataclass(frozen=True, slots=True)
class Moved:
    """One account's answer with one thing changed.

    changes : "as chosen", a kind of savings/variations.py, "station" or "long-term year".
    name : what exactly; of the first row the station and year.
    normalized, avoided : the answer then; unavailable : why there is none at all.
    far : why the row is shown but is no rival of the answer; "" where it is one.
    form_before, form_after : of the fits then.  number, side, start, end : of the bill left
    out, its period's number from 1 and its days, half-open.
    """

    account: str
    name: str
    changes: str
    normalized: Estimate | None
    avoided: Estimate | None
    unavailable: str = ""
    far: str = ""
    form_before: str = ""
    form_after: str = ""
    number: int | None = None
    side: str = ""
    start: int | None = None
    end: int | None = None


def how_firm(site: Site, accounts: Sequence[AccountResult], confidence: float) -> tuple[Moved, ...]:
    """Each account's answer, then the same with one choice changed at a time.

    The first row of each account is the answer as chosen.  An account without an answer has
    no rows.
    """
    out: list[Moved] = []
    for plan, bills, account in zip(site.accounts, site.bills, accounts, strict=True):
        if bills is None or not account.has_answer:
            continue
        out.append(_as_chosen(site, account))
        out += [
            _moved(account.account, v) for v in _variations(site, plan, bills, account, confidence)
        ]
    return tuple(out)


def how_far(site: Site, result: SiteResult) -> tuple[Moved, ...]:
    """``how_firm``, and after it the job repeated with every other station and long-term year.

    Only what the site offers; one thing changes at a time.  An alternative that cannot be read
    carries its reason.
    """
    firm = result.moved or how_firm(site, result.accounts, result.confidence)
    weather = _other_weather(site, result)
    out: list[Moved] = []
    for account in result.accounts:
        out += [m for m in firm if m.account == account.account]
        out += [m for m in weather if m.account == account.account]
    return tuple(out)


def _as_chosen(site: Site, account: AccountResult) -> Moved:
    save = account.savings
    return Moved(
        account.account, weather_name(site), AS_CHOSEN, save.normalized, save.avoided,
        form_before=save.before.form if save.before else "",
        form_after=save.after.form if save.after else "",
    )  # fmt: skip


def _moved(account: str, v: Variation) -> Moved:
    return Moved(
        account, v.name, v.changes, v.normalized, v.avoided, "", v.far,
        v.form_before, v.form_after, v.number, v.side, v.start, v.end,
    )  # fmt: skip


def _variations(
    site: Site, plan: AccountPlan, bills: Bills, account: AccountResult, confidence: float
) -> tuple[Variation, ...]:
    from normalize.account import work_on
    from normalize.account_drivers import lay
    from normalize.savings.again import Asked
    from normalize.savings.offer import forms_offered
    from normalize.savings.variations import variations

    save = account.savings
    forms = forms_offered(plan.fuel, space_heating=plan.space_heating, asked=plan.forms)
    net = plan.net_metered and not bills.gross
    asked = Asked(
        aligned=lay(site, plan, bills, work_on(site, plan.name), forms, net=net).aligned,
        year=site.year,
        forms=forms,
        confidence=confidence,
        net=net,
        stated=any("stated balance" in e.method for e in (save.normalized, save.avoided)),
    )
    return variations(
        asked,
        tuple(p.side for p in account.periods),
        work_on(site, plan.name),
        save,
        occupied_since=plan.occupied_since,
        without=account.without,
    )


def _other_weather(site: Site, result: SiteResult) -> list[Moved]:
    """Every account's answer with each other station and each other long-term year."""
    from normalize.account import assess_account
    from normalize.weather.alternatives import alternatives

    plan, year = site.weather_plan, site.year
    if year is None or plan is None:
        return []
    answered = [
        (a.account, p, b)
        for a, p, b in zip(result.accounts, site.accounts, site.bills, strict=True)
        if b is not None and a.has_answer
    ]
    out: list[Moved] = []
    for other in alternatives(
        site.weather,
        year,
        stations=plan.also,
        years=plan.long_term_also,
        n_years=None if plan.long_term_file is not None else plan.long_term_years,
        reader=plan.reader,
    ):
        for name, account, bills in answered:
            if other.weather is None or other.year is None:
                out.append(Moved(name, other.name, other.changes, None, None, other.unavailable))
                continue
            there = replace(site, weather=other.weather, year=other.year)
            moved = assess_account(there, account, bills, result.confidence, closely=False)
            again = _as_chosen(there, moved)
            out.append(replace(again, name=other.name, changes=other.changes))
    return out


def weather_name(site: Site) -> str:
    """The station and the long-term year of a site, as one name."""
    year = site.year.name if site.year is not None else "no long-term year"
    return f"{site.weather.station}, {year}"
