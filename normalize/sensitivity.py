"""How far the answer moves with another weather station or another normal year."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from normalize.savings.results import Estimate
    from normalize.site import Site, SiteResult


@dataclass(frozen=True, slots=True)
class Moved:
    """One account's answer with other weather.

    name : of the station and year; changes : "as chosen", "station" or "long-term year".
    normalized, avoided : the answer then; unavailable : why there is none at all.
    """

    account: str
    name: str
    changes: str
    normalized: Estimate | None
    avoided: Estimate | None
    unavailable: str = ""


def how_far(site: Site, result: SiteResult) -> tuple[Moved, ...]:
    """The job repeated with every station and every long-term year that the site offers.

    The first row of each account is the answer as chosen.  One thing changes at a time.  An
    alternative that cannot be read carries its reason.
    """
    from normalize.site import assess
    from normalize.weather.alternatives import alternatives

    chosen_year = result.site.year
    out = [
        Moved(a.account, _name(site), "as chosen", a.savings.normalized, a.savings.avoided)
        for a in result.accounts
    ]
    if chosen_year is None or site.weather_plan is None:
        return tuple(out)
    plan = site.weather_plan
    others = alternatives(
        site.weather,
        chosen_year,
        stations=plan.also,
        years=plan.long_term_also,
        n_years=None if plan.long_term_file is not None else plan.long_term_years,
        reader=plan.reader,
    )
    for other in others:
        if other.weather is None or other.year is None:
            out += [
                Moved(a.account, other.name, other.changes, None, None, other.unavailable)
                for a in result.accounts
            ]
            continue
        moved = assess(
            replace(site, weather=other.weather, year=other.year), confidence=result.confidence
        )
        out += [
            Moved(a.account, other.name, other.changes, a.savings.normalized, a.savings.avoided)
            for a in moved.accounts
        ]
    return tuple(out)


def _name(site: Site) -> str:
    year = site.year.name if site.year is not None else "no long-term year"
    return f"{site.weather.station}, {year}"
