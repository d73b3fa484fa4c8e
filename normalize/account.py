"""One account of a site, assessed: align, compare, price, check, and lay out for reports."""

from __future__ import annotations

from dataclasses import replace
from functools import partial
from typing import TYPE_CHECKING, Any

import numpy as np

from normalize.account_drivers import Laid, added_use, lay, weather_only
from normalize.bills.deliveries import fill_words, k_factor
from normalize.errors import NormalizeError
from normalize.fitting.align import Aligned
from normalize.savings.again import Asked
from normalize.savings.break_words import caution_sentences
from normalize.savings.breaks import breaks_of
from normalize.savings.cautions import Circumstances, cautions_of
from normalize.savings.checks import checks_of, moved_before
from normalize.savings.compare import Comparison, compare
from normalize.savings.components import Equipment
from normalize.savings.expectation import House, expectation_of
from normalize.savings.guesses import SideOfWork, guess_caution, sway_of
from normalize.savings.heat_loss import heat_loss_of
from normalize.savings.offer import forms_offered
from normalize.savings.parts import parts_of
from normalize.savings.results import Estimate, Price, Savings
from normalize.savings.scrutiny import Scrutiny, scrutinise
from normalize.savings.sides import REASONS, Work
from normalize.savings.taken_apart import Parts
from normalize.savings.with_and_without import with_and_without
from normalize.savings.worth import price_of
from normalize.site import AccountResult, Curve, KFactorRow, PeriodRow, Site
from normalize.sitefile import AccountPlan
from normalize.units import FUELS, Factor, co2_kg_per_unit, mmbtu_per_unit

if TYPE_CHECKING:
    from normalize.bills.periods import Bills
    from normalize.fitting.results import Fit
    from normalize.savings.break_results import Breaks

NEAR_WORK_DAYS = 60
DEALERS_BASE_F = 65.0  # of the degree-days in a dealer's K factor (common practice, no source)
CURVE_POINTS = 121


def unread_account(plan: AccountPlan, problem: str, confidence: float) -> AccountResult:
    """An account whose bills could not be read at all."""
    reason = f"its bills could not be read: {problem}"
    none = Estimate.none(reason, confidence=confidence)
    return AccountResult(
        account=plan.name,
        fuel=plan.fuel,
        unit=plan.unit or "",
        bills=None,
        unavailable=reason,
        periods=(),
        tried_before=(),
        tried_after=(),
        savings=Savings(None, None, none, none, none, none, reason, reason),
        curve_before=None,
        curve_after=None,
        price=Price(plan.price, "site file" if plan.price is not None else "", None),
        co2=None,
        mmbtu_per_unit=None,
        checks=(),
        cautions=(),
    )


def assess_account(
    site: Site, plan: AccountPlan, bills: Bills, confidence: float, *, closely: bool = True
) -> AccountResult:
    """One account before and after the upgrades that touch it.

    closely : with the evidence behind its checks, the parts and the expectation; without, only
    the answer is of use.
    """
    work = work_on(site, plan.name)
    forms = forms_offered(plan.fuel, space_heating=plan.space_heating, asked=plan.forms)
    net = plan.net_metered and not bills.gross
    laid = lay(site, plan, bills, work, forms, net=net)
    aligned = laid.aligned
    ask = partial(
        compare,
        work=work,
        year=site.year,
        confidence=confidence,
        forms=forms,
        occupied_since=plan.occupied_since,
        net_metered=net,
        year_unavailable=site.year_unavailable,
        delivered=bills.kind == "delivery",
    )
    found = ask(aligned)
    savings = _unfit(found.savings, bills.unfit, confidence) if bills.unfit else found.savings
    close, changed = Scrutiny(), None
    if closely and not bills.unfit:
        asked = Asked(aligned, site.year, forms, confidence, net, found.stated_f is not None)
        close = scrutinise(asked, found, work_start=work.start, delivered=bills.kind == "delivery")
        changed = _breaks(site, plan, weather_only(laid, found), found, work, net)
    result = _laid_out(site, plan, bills, laid, found, savings, work, close, changed)
    if not closely:
        return result
    return replace(
        result,
        drivers=with_and_without(laid.chosen, found, ask) if laid.chosen else None,
        **_read_closely(site, plan, bills, aligned, found, savings, confidence),
    )


def _laid_out(
    site: Site,
    plan: AccountPlan,
    bills: Bills,
    laid: Laid,
    found: Comparison,
    savings: Savings,
    work: Work,
    close: Scrutiny,
    changed: Breaks | None,
) -> AccountResult:
    """The answer with its price, checks, cautions and all that a report draws."""
    aligned = laid.aligned
    price = price_of(bills.periods, stated=plan.price, delivered=bills.kind == "delivery")
    rows = period_rows(bills, laid, found)
    unavailable = ""
    if not savings.normalized.available and not savings.avoided.available:
        unavailable = savings.normalized.unavailable or ""
    return AccountResult(
        account=plan.name,
        fuel=bills.fuel,
        unit=bills.unit,
        bills=bills,
        unavailable=unavailable,
        periods=rows,
        tried_before=found.tried_before,
        tried_after=found.tried_after,
        savings=savings,
        curve_before=_curve(savings.before, aligned),
        curve_after=_curve(savings.after, aligned),
        price=price,
        co2=_co2(plan, bills),
        mmbtu_per_unit=_mmbtu(bills),
        checks=checks_of(
            savings,
            close.evidence,
            n_after=sum(1 for label in found.labels if label == "after"),
            without=close.without,
            placebo=close.placebo,
        ),
        cautions=(
            *caution_sentences(changed, work.start, work.end, bills.unit),
            *cautions_of(savings, price, _circumstances(site, plan, bills, found, work, rows)),
            *moved_before(close.placebo),
        ),
        k_factors=_k_factors(bills, aligned, found),
        work_start=work.start,
        work_end=work.end,
        evidence=close.evidence,
        without=close.without,
        placebo=close.placebo,
        breaks=changed,
    )


def _breaks(
    site: Site, plan: AccountPlan, aligned: Aligned, found: Comparison, work: Work, net: bool
) -> Breaks:
    """When use changed, over the account's whole history."""
    fits = (found.savings.before, found.savings.after)
    return breaks_of(
        aligned,
        found.labels,
        work,
        site.year,
        forms=forms_offered(plan.fuel, space_heating=plan.space_heating, asked=plan.forms),
        chosen=[fit.form for fit in fits if fit is not None],
        net=net,
        stated_f=found.stated_f,
        declared=[(c.what, c.since, c.until) for c in site.changes],
    )


def _read_closely(
    site: Site,
    plan: AccountPlan,
    bills: Bills,
    aligned: Aligned,
    found: Comparison,
    savings: Savings,
    confidence: float,
) -> dict[str, Any]:
    """Parts of the savings, the heat loss behind the slope, and what the work should have saved."""
    heat = _mmbtu(bills)
    btu = None if heat is None else heat.value * 1e6
    mine = sorted(
        (u for u in site.upgrades if not u.accounts or plan.name in u.accounts),
        key=lambda u: u.start,
    )
    components = [c for u in mine for c in u.components]
    new = [c.efficiency_after for c in components if isinstance(c, Equipment) and c.share == 1.0]
    if bills.unfit:
        parts = Parts(unavailable=bills.unfit)
    else:
        parts = parts_of(aligned, found, site.year, confidence=confidence)
    house = House(
        fuel=bills.fuel,
        btu_per_unit=btu,
        setpoint_f=site.heating_setpoint_f,
        efficiency=plan.efficiency,
        heating_share=plan.heating_share,
        other_heaters=_other_heaters(site, plan),
    )
    return {
        "parts": parts,
        "heat_loss": heat_loss_of(
            parts,
            btu_per_unit=btu,
            efficiency=plan.efficiency,
            efficiency_after=new[-1] if new else None,
            floor_area_ft2=site.floor_area_ft2,
        ),
        "expectation": expectation_of(
            savings.before,
            site.year,
            components,
            house,
            savings.normalized,
            nac_before=savings.nac_before.value,
            undescribed=[u.name for u in mine if not u.components],
        ),
    }


def _other_heaters(site: Site, plan: AccountPlan) -> tuple[str, ...]:
    """Other accounts whose fuel is burned for heat: they share the house's heat loss."""
    return tuple(
        a.name
        for a in site.accounts
        if a.name != plan.name
        and a.space_heating
        and a.fuel in FUELS
        and FUELS[a.fuel].heating_only
    )


def work_on(site: Site, account: str) -> Work:
    """From the first to the last day of the upgrades that touch an account."""
    mine = [u for u in site.upgrades if not u.accounts or account in u.accounts]
    touching = mine or list(site.upgrades)
    return Work(
        start=min(u.start for u in touching),
        end=max(u.end for u in touching),
        windows=tuple((u.start, u.end) for u in touching),
    )


def period_rows(bills: Bills, laid: Laid, found: Comparison) -> tuple[PeriodRow, ...]:
    """Every period with its side, its fitted use and what it would have been without the work."""
    p, aligned = bills.periods, laid.aligned
    added = added_use(laid, found)
    own = {"before": found.savings.before, "after": found.savings.after}
    rows = []
    for i in range(p.n):
        label = found.labels[i]
        days = int(p.end[i] - p.start[i])
        cut = slice(
            int(p.start[i]) - aligned.weather.first_day, int(p.end[i]) - aligned.weather.first_day
        )
        temp = aligned.weather.temp_f[cut] if not np.isnan(aligned.mean_temp_f[i]) else None
        rows.append(
            PeriodRow(
                number=i + 1,
                start=int(p.start[i]),
                end=int(p.end[i]),
                use=float(p.use[i]),
                cost=float(p.cost[i]),
                estimated=bool(p.estimated[i]),
                joined=int(p.joined[i]),
                side=label,
                reason=aligned.reason[i] if label == "set aside" else REASONS[label],
                mean_temp_f=float(aligned.mean_temp_f[i]),
                use_per_day=float(p.use[i]) / days,
                fitted_per_day=_expected(own.get(label), temp) + float(added[i, 0]),
                without_work_per_day=_expected(found.savings.before, temp) + float(added[i, 1]),
                drivers_per_day=float(added[i, 0]),
            )
        )
    return tuple(rows)


def _expected(fit: Fit | None, temp: np.ndarray | None) -> float:
    if fit is None or temp is None:
        return float("nan")
    return float(fit.predict(temp).mean())


def _curve(fit: Fit | None, aligned: Aligned) -> Curve | None:
    if fit is None:
        return None
    seen = aligned.weather.temp_f[~np.isnan(aligned.weather.temp_f)]
    if seen.shape[0] == 0:
        return None
    grid = np.linspace(float(seen.min()), float(seen.max()), CURVE_POINTS)
    knees = [t for t in (fit.balance_heating_f, fit.balance_cooling_f) if t is not None]
    grid = np.unique(np.append(grid, knees))
    return Curve(grid, fit.predict(grid))


def _used_nothing(bills: Bills, found: Comparison) -> bool:
    after = [
        float(bills.periods.use[i]) for i, label in enumerate(found.labels) if label == "after"
    ]
    return bool(after) and all(use == 0.0 for use in after)


def _circumstances(
    site: Site,
    plan: AccountPlan,
    bills: Bills,
    found: Comparison,
    work: Work,
    rows: tuple[PeriodRow, ...],
) -> Circumstances:
    near = any(
        row.estimated and row.end is not None and abs(row.end - work.start) <= NEAR_WORK_DAYS
        for row in bills.rows
    )
    return Circumstances(
        fuel=bills.fuel,
        by_bill=site.weather.by_bill,
        delivered=bills.kind == "delivery",
        estimated_near_work=near,
        changes=tuple(c.what for c in site.changes),
        unsure=found.unsure,
        stated_f=found.stated_f,
        works=len(work.windows),
        between=found.labels.count("between"),
        water_only=not plan.space_heating,
        tried_before=found.tried_before,
        used_nothing=_used_nothing(bills, found),
        bill_cautions=(*_guesses(bills, found, rows), *bills.cautions),
        fill_words=_fills(bills, rows),
    )


def _fills(bills: Bills, rows: tuple[PeriodRow, ...]) -> str:
    """How far fills that are not quite full can move the use of either side."""
    if bills.kind != "delivery":
        return ""
    before, after = (sum(r.use for r in rows if r.side == s) for s in ("before", "after"))
    left_out = {(e.file, e.line) for e in bills.ledger if e.fate == "left out"}
    kept = (r.use for r in bills.rows if (r.file, r.line) not in left_out)
    largest = max((use for use in kept if use is not None), default=0.0)
    return fill_words(largest, bills.unit, before, after)


def _guesses(bills: Bills, found: Comparison, rows: tuple[PeriodRow, ...]) -> tuple[str, ...]:
    """A caution where metered bills sway about their fits as guessed readings do."""
    if bills.kind == "delivery":
        return ()  # fills that are not quite full sway alike, and are told of elsewhere
    sides = []
    for label, fit in (("before", found.savings.before), ("after", found.savings.after)):
        mine = [r for r in rows if r.side == label and not np.isnan(r.fitted_per_day)]
        if fit is None or not mine:
            continue
        start, end = (np.array([getattr(r, name) for r in mine]) for name in ("start", "end"))
        use, fitted = (np.array([getattr(r, name) for r in mine])
                       for name in ("use_per_day", "fitted_per_day"))  # fmt: skip
        taus = (fit.balance_heating_f, fit.balance_cooling_f)
        k = len(fit.terms) + sum(1 for tau in taus if tau is not None)
        sides.append(SideOfWork(start, end, use, fitted, k))
    return guess_caution(sway_of(sides))


def _unfit(savings: Savings, reason: str, confidence: float) -> Savings:
    """No answer at all, where the use cannot answer to weather in the way of this method."""
    none = Estimate.none(reason, confidence=confidence)
    return Savings(None, None, none, none, none, none, reason, reason)


def _k_factors(bills: Bills, aligned: Aligned, found: Comparison) -> tuple[KFactorRow, ...]:
    """The dealers' factor of either side, at base 65 °F, for fuel that is delivered."""
    if bills.kind != "delivery":
        return ()
    out = []
    for side in ("before", "after"):
        mine = [i for i, label in enumerate(found.labels) if label == side]
        base = np.concatenate(
            [_days_of(aligned, i) for i in mine] or [np.empty(0, dtype=np.float64)]
        )
        used = sum(float(bills.periods.use[i]) for i in mine)
        factor = k_factor(used, float(np.maximum(DEALERS_BASE_F - base, 0.0).sum()))
        if factor is not None:
            out.append((side, factor.degree_days_per_unit, factor.unit_per_degree_day))
    return tuple(out)


def _days_of(aligned: Aligned, i: int) -> np.ndarray:
    first = aligned.weather.first_day
    days: np.ndarray = aligned.weather.temp_f[
        int(aligned.start[i]) - first : int(aligned.end[i]) - first
    ]
    return days


def _co2(plan: AccountPlan, bills: Bills) -> Factor | None:
    if plan.co2_kg_per_unit is not None:
        return Factor(plan.co2_kg_per_unit, f"kg/{bills.unit}", "site file", "")
    try:
        return co2_kg_per_unit(bills.fuel, bills.unit)
    except NormalizeError:
        return None


def _mmbtu(bills: Bills) -> Factor | None:
    try:
        return mmbtu_per_unit(bills.fuel, bills.unit)
    except NormalizeError:
        return None
