"""One account's periods with the drivers that earn their place, and what they add to use."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from normalize.fitting.align import Aligned, align
from normalize.fitting.drivers import period_means
from normalize.savings.compare import labels_of
from normalize.savings.drivers import Chosen, choose_drivers

if TYPE_CHECKING:
    from normalize.bills.periods import Bills
    from normalize.fitting.drivers import DailyAmounts
    from normalize.fitting.results import Fit
    from normalize.savings.compare import Comparison
    from normalize.savings.sides import Work
    from normalize.site import Site
    from normalize.sitefile import AccountPlan


@dataclass(frozen=True, slots=True)
class Laid:
    """aligned : periods over weather, with the drivers kept.  chosen : None without drivers."""

    aligned: Aligned
    chosen: Chosen | None = None


def lay(
    site: Site, plan: AccountPlan, bills: Bills, work: Work, forms: tuple[str, ...], *, net: bool
) -> Laid:
    """An account's periods over the site's weather and the drivers that site.toml names."""
    return lay_over(align(bills.periods, site.weather), site, plan, bills, work, forms, net=net)


def lay_over(
    aligned: Aligned,
    site: Site,
    plan: AccountPlan,
    bills: Bills,
    work: Work,
    forms: tuple[str, ...],
    *,
    net: bool,
) -> Laid:
    """The same for periods that are over the weather already."""
    drivers = drivers_named(site, plan)
    if not drivers or bills.unfit:
        return Laid(aligned)
    labels = labels_of(aligned, work, plan.occupied_since, bills.kind == "delivery")
    chosen = choose_drivers(aligned, labels, drivers, forms=forms, net=net)
    return Laid(chosen.aligned, chosen)


def drivers_named(site: Site, plan: AccountPlan) -> tuple[DailyAmounts, ...]:
    """The drivers of one account."""
    for account, drivers in zip(site.accounts, site.drivers, strict=False):
        if account.name == plan.name:
            return drivers
    return ()


def added_use(laid: Laid, found: Comparison) -> NDArray[np.float64]:
    """(n, 2) use a day that drivers add in each period: by its own side's fit, and by the
    baseline's; NaN where a kept driver's amount is not known.
    """
    chosen, n = laid.chosen, laid.aligned.n
    added = np.zeros((n, 2))
    if chosen is None or not chosen.kept:
        return added
    by_side = [
        _effects(laid.aligned, fit) + chosen.rhythm[:, which]
        for which, fit in enumerate((found.savings.before, found.savings.after))
    ]
    after = np.array([label == "after" for label in found.labels], dtype=np.bool_)
    added[:, 0] = np.where(after, by_side[1], by_side[0])
    added[:, 1] = by_side[0]
    for amounts in chosen.amounts:
        if amounts.name in chosen.kept:
            _, missing = period_means(amounts, laid.aligned.start, laid.aligned.end)
            added[missing > 0] = np.nan
    return added


def _effects(aligned: Aligned, fit: Fit | None) -> NDArray[np.float64]:
    """(n,) use a day that the drivers of a fit add, from their normal levels."""
    if aligned.drivers is None or fit is None or not fit.driver_effects:
        return np.zeros(aligned.n)
    total: NDArray[np.float64] = aligned.drivers.values @ np.array(fit.driver_effects)
    return total


def weather_only(laid: Laid, found: Comparison) -> Aligned:
    """The same periods with the drivers' effects taken off their use: what weather is left.

    For looks at the whole history that know no drivers; effects are taken as found, those of
    the baseline up to the work and those after it from then on.
    """
    aligned = laid.aligned
    if aligned.drivers is None:
        return aligned
    before, after = (_effects(aligned, fit) for fit in (found.savings.before, found.savings.after))
    sides = np.array([label in ("after", "later") for label in found.labels], dtype=np.bool_)
    if found.savings.after is None:
        after = before
    added = np.where(sides, after, before)
    return replace(aligned, use=aligned.use - added * aligned.days, drivers=None)
