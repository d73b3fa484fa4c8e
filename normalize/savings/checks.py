"""Checks of a fit against published or customary limits, each with what it means.

Limits marked (memory) were not re-read in their document.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from normalize.defaults import SHORT_YEAR_DAYS
from normalize.fitting.forms import form_named
from normalize.fitting.results import Fit
from normalize.fitting.student import t_quantile
from normalize.savings.results import Check, Savings

GUIDELINE = "ASHRAE Guideline 14-2014, whole building, prescriptive (memory)"
PERFORMANCE = "ASHRAE Guideline 14-2014, performance (memory)"
IPMVP = "IPMVP (memory)"
CUSTOM = "common practice, no source"
MAX_BIAS = 5e-5
MIN_READINGS = 9
MIN_DAYS = 365 - 15  # twelve bills are rarely 365 days to the day
MIN_SHARE = 0.10
MAX_OUTSIDE = 0.10
DW_RANGE = (1.0, 3.0)
FSU_LIMIT = 0.50
FSU_CONFIDENCE = 0.68
FSU_K = 1.26


def cv_limit(reporting_days: int) -> float:
    """Guideline 14's limit of CV(RMSE) by length of the reporting period. (memory)

    >>> cv_limit(200), cv_limit(400), cv_limit(2000)
    (0.2, 0.25, 0.3)
    """
    # Twelve bills are rarely 365 days to the day.
    if reporting_days < SHORT_YEAR_DAYS:
        return 0.20
    return 0.25 if reporting_days <= 5 * 366 else 0.30


def fractional_uncertainty(
    *, n: int, m: int, rho: float, cv: float, fraction: float, t: float, k: float = FSU_K
) -> float:
    """Fractional savings uncertainty ΔS/S after Reddy & Claridge 2000, HVAC&R Research 6(1).

    n, m : baseline and reporting periods; cv, fraction : of use.  n′ = n(1−ρ)/(1+ρ).

    >>> round(fractional_uncertainty(n=12, m=12, rho=0.0, cv=0.1, fraction=0.1, t=1.0), 3)
    0.393
    """
    effective = n * (1.0 - rho) / (1.0 + rho)
    inner = (n / effective) * (1.0 + 2.0 / effective) / m
    return t * k * cv * math.sqrt(inner) / fraction


def checks_of(savings: Savings, *, outside_share: float | None, n_after: int) -> tuple[Check, ...]:
    """All checks of an account. outside_share : of the long-term year's weather that lies
    outside the temperatures the baseline saw; n_after : reporting periods in use.
    """
    out: list[Check] = []
    for side, fit in (("before", savings.before), ("after", savings.after)):
        if fit is not None:
            out += _fit_checks(side, fit, savings.reporting_days)
            out += _slope_checks(side, fit)
            out += _error_checks(side, fit)
    if savings.before is not None and outside_share is not None:
        out.append(_outside(outside_share))
    out += _saving_checks(savings, n_after)
    return tuple(out)


def _fit_checks(side: str, fit: Fit, reporting_days: int) -> list[Check]:
    limit = cv_limit(reporting_days)
    ok_cv = fit.cv_rmse <= limit if math.isfinite(fit.cv_rmse) else None
    return [
        Check(
            "CV(RMSE)", side, fit.cv_rmse if math.isfinite(fit.cv_rmse) else None, limit, ok_cv,
            "the bills' scatter about the fit, as a share of mean use",
            "Look for bills that are not this building's usual use; the range already allows "
            "for the scatter.",
            GUIDELINE,
        ),
        Check(
            "net bias", side, abs(fit.bias), MAX_BIAS, abs(fit.bias) <= MAX_BIAS,
            "zero by construction for day weights, so this checks arithmetic only",
            "Report it as a fault of the program.",
            GUIDELINE,
        ),
        Check(
            "number of bills", side, float(fit.n_periods), float(MIN_READINGS),
            fit.n_periods >= MIN_READINGS,
            "how many bills the fit rests on",
            "Add older or later bills; fewer bills are allowed for in the range.",
            GUIDELINE,
        ),
        Check(
            "days of bills", side, float(fit.n_days), float(MIN_DAYS), fit.n_days >= MIN_DAYS,
            "whether a whole year was seen",
            "A season is missing: wait for it or add older bills.",
            GUIDELINE,
        ),
    ]  # fmt: skip


def _slope_checks(side: str, fit: Fit) -> list[Check]:
    checks = []
    for term, t in list(zip(fit.terms, fit.t, strict=True))[1:]:
        checks.append(
            Check(
                f"|t| of the {term}",
                side,
                abs(t) if math.isfinite(t) else None,
                2.0,
                abs(t) >= 2.0 if math.isfinite(t) else True,
                "whether use answers to weather at all (balance temperature taken as found)",
                "Treat the account as a flat load.",
                IPMVP,
            )
        )
    return checks


def _error_checks(side: str, fit: Fit) -> list[Check]:
    """How the bills err, and where the balance temperature ended."""
    checks = []
    if math.isfinite(fit.durbin_watson):
        low, high = DW_RANGE
        checks.append(
            Check(
                "Durbin–Watson",
                side,
                fit.durbin_watson,
                low,
                low <= fit.durbin_watson <= high,
                f"whether neighbouring bills err alike; 2 is none, below {low:g} is strong",
                "Nothing: the range allows for it. The plain range beside it does not.",
                CUSTOM,
            )
        )
    if fit.form not in ("flat", "line"):
        checks.append(
            Check(
                "balance temperature inside its range",
                side,
                1.0 if fit.on_bound else 0.0,
                0.0,
                not fit.on_bound,
                "1 when the balance temperature ended on the edge of where it may lie",
                "Read it as “at or beyond”; the slope is then less sure than it looks.",
                CUSTOM,
            )
        )
    return checks


def _outside(share: float) -> Check:
    return Check(
        "weather not seen",
        "before",
        share,
        MAX_OUTSIDE,
        share <= MAX_OUTSIDE,
        "share of the normal year's days colder or warmer than any day of the baseline",
        "The normal year is partly extrapolated: add bills from a colder or hotter season.",
        CUSTOM,
    )


def _saving_checks(savings: Savings, n_after: int) -> list[Check]:
    out: list[Check] = []
    avoided, normalized, before = savings.avoided, savings.normalized, savings.before
    if normalized.fraction is not None:
        size = abs(normalized.fraction)
        out.append(
            Check(
                "size of the change",
                "both",
                size,
                MIN_SHARE,
                size >= MIN_SHARE,
                "whole-meter bills show changes above about a tenth of use best",
                "Trust the range, and wait for more bills.",
                CUSTOM,
            )
        )
    if before is not None and avoided.fraction is not None and avoided.fraction > 0.0:
        rho = min(max(before.rho, 0.0), 0.9)
        df = max(before.n_periods - form_named(before.form).parameters, 1)
        value = fractional_uncertainty(
            n=before.n_periods,
            m=max(n_after, 1),
            rho=rho,
            cv=before.cv_rmse,
            fraction=avoided.fraction,
            t=t_quantile(0.5 + 0.5 * FSU_CONFIDENCE, df),
        )
        if math.isfinite(value):
            out.append(
                Check(
                    "fractional savings uncertainty at 68 %",
                    "both",
                    value,
                    FSU_LIMIT,
                    value <= FSU_LIMIT,
                    "half-width of the avoided use's range as a share of it, by the guideline's "
                    "formula with this account's serial correlation",
                    "Wait for more bills, or report the range as it is.",
                    PERFORMANCE + "; Reddy & Claridge 2000, HVAC&R Research 6(1), k = 1.26",
                )
            )
    return out


def share_outside(
    year_temp_f: NDArray[np.float64],
    year_weight: NDArray[np.float64],
    seen_temp_f: NDArray[np.float64],
) -> float:
    """Share of the long-term year's days outside the daily temperatures that were seen."""
    if seen_temp_f.shape[0] == 0:
        return 1.0
    out = (year_temp_f < seen_temp_f.min()) | (year_temp_f > seen_temp_f.max())
    return float(year_weight[out].sum() / year_weight.sum())
