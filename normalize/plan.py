"""Will an upgrade show in a site's bills?  Asked of the bills before the work alone."""

from __future__ import annotations

from dataclasses import dataclass, replace
from datetime import date
from typing import TYPE_CHECKING, Final

from normalize import defaults
from normalize.days import date_of, day_of

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

    from normalize.bills.periods import Bills
    from normalize.fitting.align import Aligned
    from normalize.fitting.results import Fit
    from normalize.savings.planning import Prospect
    from normalize.savings.sides import Work
    from normalize.site import Site
    from normalize.sitefile import AccountPlan
    from normalize.weather.temperature import DailyTemperature

MOST_YEARS: Final = 10  # whole years of the record, where the long-term year names none
LEAST_DAYS: Final = 20  # of a bill; shorter ones are readings
DAILY: Final = (
    "its readings are closer together than bills, and bills are what is planned for: sum them "
    'to months first (sum_to = "month")'
)
STATED: Final = (
    "its bills do not place a balance temperature, and at a stated one the range cannot be foretold"
)


@dataclass(frozen=True, slots=True)
class Outlook:
    """What more bills of one account could tell.

    unavailable : why nothing can be said; "" where ``prospects`` are known.
    fit : of the baseline; first, last : its days, half-open; length : days of its typical bill.
    delivered : bills are full fills of a tank.  starts : first day of the bills to come;
    work_named : it follows the work in site.toml.
    years : calendar years whose weather stands for the months to come.
    """

    account: str
    fuel: str
    unit: str
    unavailable: str
    fit: Fit | None = None
    nac: float | None = None
    first: int | None = None
    last: int | None = None
    length: int = 0
    delivered: bool = False
    unsure: bool = False  # the bills place its balance temperature badly
    starts: int | None = None
    work_named: bool = False
    years: tuple[int, ...] = ()
    prospects: tuple[Prospect, ...] = ()


@dataclass(frozen=True, slots=True)
class SiteOutlook:
    """The outlooks of a site's accounts."""

    site: Site
    confidence: float
    accounts: tuple[Outlook, ...]


def outlook(site: Site, *, confidence: float = defaults.CONFIDENCE) -> SiteOutlook:
    """The smallest saving that 3 to 36 more bills could tell from no change, for every account.

    Only bills before the work count; where site.toml names none, all of them do, and one
    bill's length is allowed for the work.  confidence : two-sided, 0.5 to 0.999.
    """
    failed = dict(site.read_errors)
    return SiteOutlook(
        site,
        confidence,
        tuple(
            _of(site, plan, bills, failed.get(plan.name, ""), confidence)
            for plan, bills in zip(site.accounts, site.bills, strict=True)
        ),
    )


def _of(
    site: Site, plan: AccountPlan, bills: Bills | None, problem: str, confidence: float
) -> Outlook:
    import numpy as np

    from normalize.account_drivers import lay_over, weather_only
    from normalize.fitting.align import align
    from normalize.savings.compare import compare
    from normalize.savings.offer import forms_offered
    from normalize.savings.planning import COUNTS, Ahead, Baseline, prospects

    if bills is None:
        reason = f"its bills could not be read: {problem}"
        return Outlook(plan.name, plan.fuel, plan.unit or "", reason)
    none = Outlook(plan.name, bills.fuel, bills.unit, "")
    if bills.unfit:
        return replace(none, unavailable=bills.unfit)
    whole = align(bills.periods, site.weather)
    work = _work(site, plan.name, whole)
    before = whole.only(whole.end <= work.start, "it is not before the work")
    forms = forms_offered(plan.fuel, space_heating=plan.space_heating, asked=plan.forms)
    net = plan.net_metered and not bills.gross
    laid = lay_over(before, site, plan, bills, work, forms, net=net)
    found = compare(
        laid.aligned,
        work,
        site.year,
        confidence=confidence,
        forms=forms,
        occupied_since=plan.occupied_since,
        net_metered=net,
        year_unavailable=site.year_unavailable,
        delivered=bills.kind == "delivery",
    )
    fit = found.savings.before
    if fit is None:
        return replace(none, unavailable=found.savings.before_unavailable)
    if found.stated_f is not None:
        return replace(none, unavailable=STATED)
    before = weather_only(laid, found)
    mine = np.flatnonzero(np.array([label == "before" for label in found.labels]))
    length = int(np.median(before.days[mine]))
    if length < LEAST_DAYS:
        return replace(none, unavailable=DAILY)
    starts = work.end if site.upgrades else work.end + length
    years = _years(site)
    temp = _months_to_come(site.weather, years, starts, max(COUNTS) * length)
    if temp is None:
        return replace(none, unavailable="the weather record holds no whole year")
    baseline = Baseline.of(before, mine, fit, held=found.held[0])
    return replace(
        none,
        fit=fit,
        nac=fit.nac(site.year) if site.year is not None else None,
        first=int(before.start[mine].min()),
        last=int(before.end[mine].max()),
        length=length,
        delivered=bills.kind == "delivery",
        unsure=bool(found.unsure[0]),
        starts=starts,
        work_named=bool(site.upgrades),
        years=years,
        prospects=prospects(
            baseline, Ahead(starts, length, temp, years), site.year, confidence=confidence
        ),
    )


def _work(site: Site, account: str, aligned: Aligned) -> Work:
    """The work in site.toml, or a day after the last bill."""
    from normalize.account import work_on
    from normalize.savings.sides import Work

    if site.upgrades:
        return work_on(site, account)
    last = int(aligned.end[aligned.usable].max()) if aligned.usable.any() else 0
    return Work(last, last + 1)


def _years(site: Site) -> tuple[int, ...]:
    """The calendar years of the long-term year; of a typical one, the record's last whole ones."""
    weather = site.weather
    first, last = date_of(weather.first_day), date_of(weather.last_day)
    whole = [
        y
        for y in range(first.year, last.year + 1)
        if day_of(date(y, 1, 1)) >= weather.first_day
        and day_of(date(y + 1, 1, 1)) <= weather.last_day
    ]
    named = site.year.years if site.year is not None else ()
    return tuple(y for y in named if y in whole) or tuple(whole[-MOST_YEARS:])


def _months_to_come(
    weather: DailyTemperature, years: tuple[int, ...], first: int, days: int
) -> NDArray[np.float64] | None:
    """(years, days) °F of the same days of each year; None where no year knows a day."""
    import numpy as np

    if not years:
        return None
    ahead = (first + np.arange(days)).astype("datetime64[D]")
    of_year = (ahead - ahead.astype("datetime64[Y]")).astype(np.int64)
    rows = []
    for year in years:
        at = day_of(date(year, 1, 1)) + np.minimum(of_year, 364) - weather.first_day
        rows.append(weather.temp_f[at])
    temp = np.stack(rows)
    return None if np.isnan(temp).all(axis=0).any() else temp


__all__ = ["Outlook", "SiteOutlook", "outlook"]
