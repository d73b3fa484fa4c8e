"""Parts, heat loss and expectation as JSON (docs/json.md)."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from collections.abc import Callable

    from normalize.savings.expectation import Expectation
    from normalize.savings.heat_loss import HeatLoss
    from normalize.savings.results import Estimate
    from normalize.site import AccountResult

Json = dict[str, Any]


def close_reading(account: AccountResult, estimate: Callable[[Estimate], Json]) -> Json:
    """The keys ``parts``, ``heat_loss`` and ``expectation`` of an account.

    estimate : how an Estimate is written.
    """
    found = account.parts
    return {
        "parts": None
        if found is None
        else {
            "parts": [{"part": p.name, **estimate(p.estimate)} for p in found.parts],
            "unavailable": found.unavailable,
            "caution": found.caution,
            "rough": found.rough,
        },
        "heat_loss": None if account.heat_loss is None else _heat_loss(account.heat_loss),
        "expectation": None if account.expectation is None else _expectation(account.expectation),
    }


def _number(value: float | None) -> float | None:
    return float(value) if value is not None and math.isfinite(value) else None


def _rate(e: Estimate | None) -> Json | None:
    if e is None:
        return None
    keys = ("value", "low", "high", "plain_low", "plain_high")
    return {key: _number(getattr(e, key)) for key in keys}


def _heat_loss(heat: HeatLoss) -> Json:
    return {
        "effective_btu_per_h_f": {
            "before": _rate(heat.before),
            "after": _rate(heat.after),
            "change": _rate(heat.change),
        },
        "efficiency": _number(heat.efficiency),
        "efficiency_after": _number(heat.efficiency_after),
        "ua_btu_per_h_f": {
            "before": _rate(heat.ua_before),
            "after": _rate(heat.ua_after),
            "change": _rate(heat.ua_change),
        },
        "intensity_btu_per_ft2_f_day": {
            "before": _rate(heat.intensity_before),
            "after": _rate(heat.intensity_after),
            "change": _rate(heat.intensity_change),
        },
        "reading": heat.reading,
    }


EXPECTATION_NUMBERS = (
    "saved",
    "fraction",
    "balance_held",
    "ua_before",
    "ua_after",
    "balance_before_f",
    "balance_after_f",
    "setpoint_f",
    "efficiency",
    "ratio",
    "ratio_low",
    "ratio_high",
)


def _expectation(wanted: Expectation) -> Json:
    return {
        **{key: _number(getattr(wanted, key)) for key in EXPECTATION_NUMBERS},
        "components": [
            {
                "name": s.name,
                "kind": s.kind,
                "saved": _number(s.saved),
                "ua": _number(s.ua),
                "balance_f": _number(s.balance_f),
            }
            for s in wanted.steps
        ],
        "assumed": list(wanted.assumed),
        "cautions": list(wanted.cautions),
        "unavailable": wanted.unavailable,
    }
