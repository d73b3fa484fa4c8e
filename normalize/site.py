"""One site's folder, read and assessed: the whole pipeline in one place, top to bottom."""

from __future__ import annotations

import os
import platform
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from normalize import defaults
from normalize.days import iso
from normalize.errors import NormalizeError, NoUpgrade
from normalize.sitefile import (
    AccountPlan,
    Change,
    SiteFile,
    Upgrade,
    WeatherPlan,
    read_site_file,
)

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

    from normalize.bills.periods import Bills
    from normalize.fitting.drivers import DailyAmounts
    from normalize.fitting.results import FormTried
    from normalize.savings.break_results import Breaks
    from normalize.savings.evidence import SideEvidence
    from normalize.savings.expectation import Expectation
    from normalize.savings.heat_loss import HeatLoss
    from normalize.savings.influence import Without
    from normalize.savings.placebo import Placebo
    from normalize.savings.results import Check, Price, Savings, Total
    from normalize.savings.taken_apart import Parts
    from normalize.savings.with_and_without import DriverReport
    from normalize.sensitivity import Moved
    from normalize.units import Factor
    from normalize.weather.temperature import DailyTemperature
    from normalize.weather.year import LongTermYear


@dataclass(frozen=True, slots=True)
class Site:
    """A site folder, read: everything that assess() needs.

    read_errors : (account, message) of accounts whose bills could not be read at all.
    """

    name: str
    folder: Path
    weather: DailyTemperature
    year: LongTermYear | None
    year_unavailable: str
    accounts: tuple[AccountPlan, ...]
    bills: tuple[Bills | None, ...]
    read_errors: tuple[tuple[str, str], ...]
    upgrades: tuple[Upgrade, ...]
    changes: tuple[Change, ...] = ()
    floor_area_ft2: float | None = None
    currency: str = "USD"
    inputs: tuple[tuple[str, str], ...] = ()  # (file, SHA-256) of every input
    heating_setpoint_f: float | None = None  # mean indoor temperature, where site.toml says it
    weather_plan: WeatherPlan | None = None  # other stations and years that site.toml offers
    drivers: tuple[tuple[DailyAmounts, ...], ...] = ()  # of each account, in their order


@dataclass(frozen=True, slots=True)
class PeriodRow:
    """One usage period as a report shows it.

    side : "before", "after", "work window", "older", "later", "between", "set aside" or
        "earlier occupant".
    reason : why it is not used, empty for before/after periods that are.
    mean_temp_f : mean of its days.  use_per_day, fitted_per_day (own side's fit),
    without_work_per_day (the baseline fit at this period's weather); NaN where unknown.
    drivers_per_day : of the fitted use, what drivers add from their normal levels.
    """

    number: int
    start: int
    end: int
    use: float
    cost: float
    estimated: bool
    joined: int
    side: str
    reason: str
    mean_temp_f: float
    use_per_day: float
    fitted_per_day: float
    without_work_per_day: float
    drivers_per_day: float = 0.0


@dataclass(frozen=True, slots=True)
class Curve:
    """A fit as a line to draw: temp_f, use_per_day both (m,)."""

    temp_f: NDArray[np.float64]
    use_per_day: NDArray[np.float64]


# Side, degree-days (base 65 °F) a unit, units a degree-day: the dealers' K factor both ways.
KFactorRow = tuple[str, float, float]


@dataclass(frozen=True, slots=True)
class AccountResult:
    """One account, assessed, with all that a report draws.

    bills : None when they could not be read; ``unavailable`` then says why.
    periods : every period in order of time, used or not.
    tried_before, tried_after : every form with its numbers or its reason.
    cautions : sentences; the first are the most important.
    """

    account: str
    fuel: str
    unit: str
    bills: Bills | None
    unavailable: str
    periods: tuple[PeriodRow, ...]
    tried_before: tuple[FormTried, ...]
    tried_after: tuple[FormTried, ...]
    savings: Savings
    curve_before: Curve | None
    curve_after: Curve | None
    price: Price
    co2: Factor | None
    mmbtu_per_unit: Factor | None
    checks: tuple[Check, ...]
    cautions: tuple[str, ...]
    k_factors: tuple[KFactorRow, ...] = ()  # delivered fuel only
    work_start: int | None = None
    work_end: int | None = None
    parts: Parts | None = None  # of the normalized savings; None when bills could not be read
    heat_loss: HeatLoss | None = None  # None where the account shows no heating slope
    expectation: Expectation | None = None  # None where no components are described
    evidence: tuple[SideEvidence, ...] = ()  # of the sides that have a fit
    without: tuple[Without, ...] = ()  # the answer without each bill in use
    placebo: Placebo | None = None  # invented work dates before the work, or why there are none
    drivers: DriverReport | None = None  # None where site.toml names no driver for the account
    breaks: Breaks | None = None  # when use changed; None where it was not asked

    @property
    def has_answer(self) -> bool:
        """Whether normalized savings or avoided use is known."""
        return self.savings.normalized.available or self.savings.avoided.available


@dataclass(frozen=True, slots=True)
class SiteResult:
    """A site, assessed, with its inputs, so that a report can draw without computing."""

    site: Site
    confidence: float
    accounts: tuple[AccountResult, ...]
    total_normalized: Total
    total_avoided: Total
    cautions: tuple[str, ...]
    settings: tuple[tuple[str, str], ...]  # the defaults that mattered, name and value
    versions: tuple[tuple[str, str], ...]  # normalize, python, numpy, numba
    moved: tuple[Moved, ...] = ()  # the answer with one choice changed at a time


def read_site(folder: str | os.PathLike[str]) -> Site:
    """Read a site's folder: site.toml, weather, the long-term year and every account's bills.

    Bills that cannot be read make their account unavailable, with the reason, and end
    nothing; site.toml and the weather must be readable.
    Errors: SiteError, WeatherError and their kinds.
    """
    from normalize.site_drivers import read_site_drivers

    plan = read_site_file(folder)
    bills, problems = _read_bills(plan)
    drivers, driver_files = read_site_drivers(plan, bills)
    weather = _weather(plan, bills)
    year, why_not = _year(plan, weather)
    inputs = [("site.toml", plan.sha256), *weather.source]
    inputs += year.source if year is not None else ()
    inputs += [pair for b in bills if b is not None for pair in b.source]
    inputs += driver_files
    return Site(
        name=plan.name,
        folder=plan.folder,
        weather=weather,
        year=year,
        year_unavailable=why_not,
        accounts=plan.accounts,
        bills=tuple(bills),
        read_errors=tuple(problems),
        upgrades=plan.upgrades,
        changes=plan.changes,
        floor_area_ft2=plan.floor_area_ft2,
        currency=plan.currency,
        inputs=tuple(dict.fromkeys(inputs)),
        weather_plan=plan.weather,
        heating_setpoint_f=plan.heating_setpoint_f,
        drivers=drivers,
    )


def _read_bills(plan: SiteFile) -> tuple[list[Bills | None], list[tuple[str, str]]]:
    from normalize.bills.read import read_bills

    bills: list[Bills | None] = []
    problems: list[tuple[str, str]] = []
    for account in plan.accounts:
        try:
            bills.append(
                read_bills(
                    account.bills,
                    fuel=account.fuel,
                    unit=account.unit,
                    account=account.name,
                    net_metered=account.net_metered,
                    currency=plan.currency,
                    **account.reader,  # type: ignore[arg-type]
                )
            )
        except NormalizeError as err:
            bills.append(None)
            problems.append((account.name, str(err)))
    return bills, problems


def _weather(plan: SiteFile, bills: list[Bills | None]) -> DailyTemperature:
    from normalize.weather.from_bills import temperature_of_bills
    from normalize.weather.read import read_weather

    if plan.weather.observed is not None:
        return read_weather(plan.weather.observed, **plan.weather.reader)  # type: ignore[arg-type]
    for b in bills:
        mean = b.periods.mean_temp_f if b is not None else None
        if b is not None and mean is not None:
            return temperature_of_bills(b.periods.start, b.periods.end, mean, source=b.source)
    from normalize.errors import MissingWeather

    raise MissingWeather(
        "site.toml asks for the temperatures printed on the bills, and no bills carry any",
        where="site.toml",
        wanted="a column of mean temperatures in a bill file, or a weather station's file",
        next_step='Name a station file: observed = "station.csv" under [weather].',
    )


def _year(plan: SiteFile, weather: DailyTemperature) -> tuple[LongTermYear | None, str]:
    from normalize.weather.year import long_term_year, read_long_term_year

    try:
        if plan.weather.long_term_file is not None:
            return read_long_term_year(plan.weather.long_term_file), ""
        return long_term_year(weather, years=plan.weather.long_term_years), ""
    except NormalizeError as err:
        return None, f"there is no long-term year: {err}"


def assess(site: Site, *, confidence: float = defaults.CONFIDENCE) -> SiteResult:
    """Every account of a site before and after the work, with totals.

    confidence : two-sided, 0.5 to 0.999.  Errors: NoUpgrade when site.toml names no work.
    An account without an answer carries its reason and ends nothing.
    """
    from normalize.sensitivity import how_firm

    if not site.upgrades:
        raise NoUpgrade(
            "names no upgrade",
            where="site.toml",
            wanted="an [[upgrade]] with a name and a start",
            next_step='Add [[upgrade]] with name = "…", start = 2023-09-11, end = 2023-09-22.',
        )
    failed = dict(site.read_errors)
    accounts = tuple(
        _assess_account(site, plan, bills, failed.get(plan.name, ""), confidence)
        for plan, bills in zip(site.accounts, site.bills, strict=True)
    )
    return SiteResult(
        site=site,
        confidence=confidence,
        accounts=accounts,
        total_normalized=_total(accounts, "normalized"),
        total_avoided=_total(accounts, "avoided"),
        cautions=_site_cautions(site, accounts),
        settings=(*_settings(site, confidence), *_driver_settings(accounts)),
        versions=_versions(),
        moved=how_firm(site, accounts, confidence),
    )


def _assess_account(
    site: Site, plan: AccountPlan, bills: Bills | None, problem: str, confidence: float
) -> AccountResult:
    from normalize.account import assess_account, unread_account

    if bills is None:
        return unread_account(plan, problem, confidence)
    return assess_account(site, plan, bills, confidence)


def _total(accounts: tuple[AccountResult, ...], kind: str) -> Total:
    from normalize.savings.totals import Share, total_of

    return total_of(
        [
            Share(
                a.account,
                getattr(a.savings, kind),
                a.mmbtu_per_unit.value if a.mmbtu_per_unit else None,
                a.price.per_unit,
                # Carbon of wood is told apart from fossil carbon, never added to it.
                a.co2.value if a.co2 and not _biogenic(a.fuel) else None,
            )
            for a in accounts
        ]
    )


def _biogenic(fuel: str) -> bool:
    from normalize.units import FUELS

    return fuel in FUELS and FUELS[fuel].biogenic


def _few_years(site: Site) -> str:
    plan, year = site.weather_plan, site.year
    if plan is None or year is None or plan.long_term_file is not None or not year.years:
        return ""
    if len(year.years) >= plan.long_term_years:
        return ""
    return (
        f"The normal year is the mean of only {len(year.years)} of the {plan.long_term_years} "
        "years asked for, so it is less normal than it should be: a longer record would help."
    )


def _site_cautions(site: Site, accounts: tuple[AccountResult, ...]) -> tuple[str, ...]:
    from normalize.savings.cautions import site_cautions
    from normalize.weather.methods import mismatch

    thin = _few_years(site)
    differs = mismatch(site.weather, site.year) if site.year is not None else ""
    return (
        *site_cautions([(a.account, a.savings) for a in accounts]),
        *filter(None, [thin, differs]),
    )


def _settings(site: Site, confidence: float) -> tuple[tuple[str, str], ...]:
    low, high = defaults.HEATING_RANGE_F
    cool_low, cool_high = defaults.COOLING_RANGE_F
    upgrades = "; ".join(f"{u.name}: {iso(u.start)} to {iso(u.end - 1)}" for u in site.upgrades)
    return (
        ("confidence, two-sided", f"{confidence:.0%}"),
        ("work", upgrades),
        ("baseline and reporting period", "up to the 24 months next to the work"),
        ("bills needed on a side", f"{defaults.MIN_DAYS_A_SIDE} days, parameters + 3 bills"),
        ("balance temperature, heating", f"{low:g} to {high:g} °F"),
        ("balance temperature, cooling", f"{cool_low:g} to {cool_high:g} °F"),
        ("weights", "days of each bill"),
        ("choice of form", "Bayesian information criterion (BIC)"),
        ("long-term year", site.year.name if site.year else site.year_unavailable),
    )


def _driver_settings(accounts: tuple[AccountResult, ...]) -> tuple[tuple[str, str], ...]:
    """Of each account with drivers: which were kept, and what a normal year has of them."""
    rows = []
    for a in accounts:
        for t in a.drivers.trials if a.drivers else ():
            kept = "kept" if t.kept else "not kept"
            level = f"{t.normal:.4g} a day" if t.kind == "level" else f"{365 * t.normal:.4g} a year"
            rows.append((f"driver, {a.account}", f"{t.name}, {kept}; normal: {level}"))
    return tuple(rows)


def _versions() -> tuple[tuple[str, str], ...]:
    import numba
    import numpy

    import normalize

    return (
        ("normalize", normalize.__version__),
        ("python", platform.python_version()),
        ("numpy", numpy.__version__),
        ("numba", numba.__version__),
    )
