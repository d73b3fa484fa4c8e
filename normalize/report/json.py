"""Results as JSON, schema 1: the keys that other programs rely on (docs/json.md).

Keys stand in a fixed order, floats round-trip, days are ISO dates.  A number that is not
known is null, never NaN, and the reason stands beside it.
"""

from __future__ import annotations

import json
import math
from typing import TYPE_CHECKING, Any, Final

from normalize.days import iso
from normalize.report import breaks
from normalize.report.drivers import drivers_json
from normalize.report.parts_json import close_reading

if TYPE_CHECKING:
    from normalize.fitting.results import Fit, FormTried
    from normalize.savings.influence import BillWeight
    from normalize.savings.placebo import Placebo
    from normalize.savings.results import Amount, Check, Estimate, Price, Total
    from normalize.sensitivity import Moved
    from normalize.site import AccountResult, PeriodRow, Site, SiteResult
    from normalize.units import Factor

SCHEMA: Final = 1
NOT_FINITE: Final = "no finite number came out of the computation"
WEATHER_CHANGES: Final = ("as chosen", "station", "long-term year")

Json = dict[str, Any]


def to_json(result: SiteResult) -> str:
    """The whole result as text; the same result gives the same bytes."""
    return json.dumps(to_dict(result), indent=2, ensure_ascii=True, allow_nan=False) + "\n"


def to_dict(result: SiteResult) -> Json:
    """The whole result as plain dicts, lists, text, numbers and None."""
    site = result.site
    return {
        "schema": SCHEMA,
        "site": site.name,
        "confidence": _number(result.confidence),
        "currency": site.currency,
        "floor_area_ft2": _number(site.floor_area_ft2),
        "weather": _weather(site),
        "upgrades": [
            {
                "name": u.name,
                "start": iso(u.start),
                "end": iso(u.end),
                "cost": _number(u.cost),
                "accounts": list(u.accounts),
            }
            for u in site.upgrades
        ],
        "changes": [
            {"what": c.what, "since": _day(c.since), "until": _day(c.until)} for c in site.changes
        ],
        "accounts": [_account(a) for a in result.accounts],
        "total": {
            "normalized": _total(result.total_normalized),
            "avoided": _total(result.total_avoided),
        },
        "sensitivity": [_moved(m, result) for m in result.moved],
        "cautions": list(result.cautions),
        "settings": dict(result.settings),
        "versions": dict(result.versions),
        "inputs": [{"file": file, "sha256": digest} for file, digest in site.inputs],
    }


def _moved(m: Moved, result: SiteResult) -> Json:
    """The answer with one thing changed; rows of bills left out name their period."""
    chosen = next(r for r in result.moved if r.account == m.account)
    weather = m.name if m.changes in WEATHER_CHANGES else chosen.name
    return {
        "account": m.account,
        "weather": weather,
        "changes": m.changes,
        "name": m.name,
        "normalized": None if m.normalized is None else _estimate(m.normalized),
        "avoided": None if m.avoided is None else _estimate(m.avoided),
        "unavailable": m.unavailable or None,
        "form_before": m.form_before or None,
        "form_after": m.form_after or None,
        "no_rival": m.far or None,
        "period": m.number,
    }


def _number(value: float | None) -> float | int | None:
    """A plain number, or None when there is no finite one."""
    if value is None:
        return None
    if isinstance(value, int):
        return int(value)
    return float(value) if math.isfinite(value) else None


def _day(day: int | None) -> str | None:
    return None if day is None else iso(day)


def _weather(site: Site) -> Json:
    weather, year = site.weather, site.year
    return {
        "station": weather.station,
        "observed": weather.method,
        "long_term": None if year is None else year.name,
        "long_term_unavailable": site.year_unavailable or None,
        "long_term_years": [] if year is None else [int(y) for y in year.years],
        "long_term_left_out": []
        if year is None
        else [{"year": int(y), "reason": why} for y, why in year.left_out],
        "first_day": iso(weather.first_day),
        "last_day": iso(weather.last_day - 1),
        "days_filled": weather.days_filled,
        "from_bills": weather.by_bill,
        "notes": list(weather.notes) + ([] if year is None else list(year.notes)),
    }


def _account(account: AccountResult) -> Json:
    save = account.savings
    bills = account.bills
    work = {"start": _day(account.work_start), "end": _day(account.work_end)}
    return {
        "account": account.account,
        "fuel": account.fuel,
        "unit": account.unit,
        "unavailable": account.unavailable or None,
        "work": work,
        "before": _fit(save.before, save.nac_before, save.before_unavailable),
        "after": _fit(save.after, save.nac_after, save.after_unavailable),
        "normalized": _estimate(save.normalized),
        "avoided": {
            **_estimate(save.avoided),
            "predicted_use": _number(save.predicted_use),
            "actual_use": _number(save.actual_use),
            "reporting_days": save.reporting_days,
        },
        "same_form": [{"form": form, **_estimate(e)} for form, e in save.same_form],
        "price": _price(account.price),
        "co2": {"kg_per_unit": _value(account.co2), **_source(account.co2)},
        "heat": {
            "mmbtu_per_unit": _value(account.mmbtu_per_unit),
            **_source(account.mmbtu_per_unit),
        },
        "ledger": []
        if bills is None
        else [
            {"file": e.file, "line": e.line, "fate": e.fate, "note": e.note} for e in bills.ledger
        ],
        "reading": [] if bills is None else list(bills.reading),
        "periods": [_period(p) for p in account.periods],
        "forms": {
            "before": [_tried(t) for t in account.tried_before],
            "after": [_tried(t) for t in account.tried_after],
        },
        "checks": [_check(c) for c in account.checks],
        "bill_weights": [_weight(w) for e in account.evidence for w in e.weights],
        "placebo": _placebo(account.placebo),
        "k_factors": [
            {"side": side, "degree_days_per_unit": a, "unit_per_degree_day": b}
            for side, a, b in account.k_factors
        ],
        "flags": [
            {"period": f.period, "what": f.what, "note": f.note}
            for f in (account.bills.flags if account.bills else ())
        ],
        **close_reading(account, _estimate),
        "drivers": drivers_json(account, _estimate),
        "breaks": breaks.as_json(account.breaks),
        "cautions": list(account.cautions),
    }


FIT_NUMBERS: Final = (
    "balance_heating_f",
    "balance_cooling_f",
    "base_load",
    "heating_slope",
    "cooling_slope",
    "line_slope",
    "n_periods",
    "n_days",
    "set_aside",
    "r2",
    "cv_rmse",
    "bias",
    "rss",
    "aicc",
    "bic",
    "mean_use",
    "rho",
    "durbin_watson",
)


def _fit(fit: Fit | None, nac: Estimate, unavailable: str) -> Json:
    """A side's fit with its normal year; all keys are there even without a fit."""
    numbers = {key: _number(getattr(fit, key, None)) for key in FIT_NUMBERS}
    year = _estimate(nac)
    reasons = {
        key: NOT_FINITE
        for key in FIT_NUMBERS
        if numbers[key] is None and getattr(fit, key, None) is not None
    }
    if fit is not None and year["unavailable"] is not None:
        reasons |= dict.fromkeys(("nac", "nac_low", "nac_high"), str(year["unavailable"]))
    return {
        "form": None if fit is None else fit.form,
        **numbers,
        "balance_heating_range_f": _pair(None if fit is None else fit.balance_heating_range_f),
        "balance_cooling_range_f": _pair(None if fit is None else fit.balance_cooling_range_f),
        "on_bound": None if fit is None else fit.on_bound,
        "terms": [] if fit is None else _terms(fit),
        "nac": year["value"],
        "nac_low": year["low"],
        "nac_high": year["high"],
        "unavailable": None if fit is not None else (unavailable or year["unavailable"]),
        "null_reasons": reasons,
    }


def _terms(fit: Fit) -> list[Json]:
    """se_full : null where it could not be found (a singular matrix)."""
    full = fit.se_full or (None,) * len(fit.terms)
    return [
        {"term": term, "se": _number(se), "se_full": _number(wide), "t": _number(t)}
        for term, se, wide, t in zip(fit.terms, fit.se, full, fit.t, strict=False)
    ]


def _pair(pair: tuple[float, float] | None) -> list[float | int | None] | None:
    return None if pair is None else [_number(pair[0]), _number(pair[1])]


def _estimate(e: Estimate) -> Json:
    value = _number(e.value)
    reason = e.unavailable if e.unavailable is not None or value is not None else NOT_FINITE
    return {
        "value": value,
        "low": _number(e.low),
        "high": _number(e.high),
        "fraction": _number(e.fraction),
        "fraction_low": _number(e.fraction_low),
        "fraction_high": _number(e.fraction_high),
        "plain_low": _number(e.plain_low),
        "plain_high": _number(e.plain_high),
        "confidence": _number(e.confidence),
        "method": e.method,
        "verdict": e.verdict,
        "so_far": e.so_far,
        "unavailable": reason,
        "known_from": _day(e.known_from),
    }


def _price(price: Price) -> Json:
    value = _number(price.per_unit)
    reason = price.unavailable
    if value is None and reason is None:
        reason = NOT_FINITE if price.per_unit is not None else "no price is known"
    return {"per_unit": value, "source": price.source, "unavailable": reason}


def _value(factor: Factor | None) -> float | int | None:
    return None if factor is None else _number(factor.value)


def _source(factor: Factor | None) -> Json:
    if factor is None:
        return {"source": None, "year": None, "memory": None, "unavailable": "no factor is known"}
    reason = None if _number(factor.value) is not None else NOT_FINITE
    return {
        "source": factor.source,
        "year": factor.year or None,
        "memory": factor.memory,
        "unavailable": reason,
    }


def _period(p: PeriodRow) -> Json:
    return {
        "number": p.number,
        "start": iso(p.start),
        "end": iso(p.end),
        "days": int(p.end - p.start),
        "use": _number(p.use),
        "cost": _number(p.cost),
        "estimated": bool(p.estimated),
        "joined": int(p.joined),
        "side": p.side,
        "reason": p.reason,
        "mean_temp_f": _number(p.mean_temp_f),
        "use_per_day": _number(p.use_per_day),
        "fitted_per_day": _number(p.fitted_per_day),
        "without_work_per_day": _number(p.without_work_per_day),
    }


def _tried(tried: FormTried) -> Json:
    fit = tried.fit
    numbers = {key: _number(getattr(fit, key, None)) for key in FIT_NUMBERS}
    return {"form": tried.form, "chosen": tried.chosen, "reason": tried.reason, **numbers}


def _check(c: Check) -> Json:
    return {
        "name": c.name,
        "side": c.side,
        "value": _number(c.value),
        "limit": _number(c.limit),
        "meets": None if c.meets is None else bool(c.meets),
        "means": c.means,
        "do": c.do,
        "source": c.source,
    }


def _weight(w: BillWeight) -> Json:
    return {
        "period": w.number,
        "side": w.side,
        "leverage": _number(w.leverage),
        "cook": _number(w.cook),
        "dffits": _number(w.dffits),
    }


def _placebo(p: Placebo | None) -> Json | None:
    """Invented work dates; null where the bills could not be read or used at all."""
    if p is None:
        return None
    return {
        "unavailable": p.unavailable or None,
        "dates": [
            {
                "day": iso(d.day),
                "n_before": d.n_before,
                "n_after": d.n_after,
                "normalized": _estimate(d.normalized),
            }
            for d in p.dates
        ],
        "announced": len(p.announced),
        "without_answer": p.without_answer,
        "largest_day": _day(p.largest.day if p.largest is not None else None),
        "first_day": _day(p.first),
        "last_day": None if p.last is None else iso(p.last - 1),
    }


def _total(total: Total) -> Json:
    return {
        "energy_mmbtu": _amount(total.energy_mmbtu),
        "cost": _amount(total.cost),
        "co2_kg": _amount(total.co2_kg),
    }


def _amount(a: Amount) -> Json:
    value = _number(a.value)
    reason = a.unavailable if a.unavailable is not None or value is not None else NOT_FINITE
    return {
        "value": value,
        "low": _number(a.low),
        "high": _number(a.high),
        "worst_low": _number(a.worst_low),
        "worst_high": _number(a.worst_high),
        "missing": list(a.missing),
        "unavailable": reason,
    }
