"""Limits and formulas of ASHRAE Guideline 14, for those who must show them."""

from __future__ import annotations

import math

from normalize.defaults import SHORT_YEAR_DAYS

GUIDELINE = "ASHRAE Guideline 14-2014, whole building, prescriptive (memory)"
PERFORMANCE = "ASHRAE Guideline 14-2014, performance (memory)"
FSU_LIMIT = 0.50
FSU_CONFIDENCE = 0.68
FSU_K = 1.26
FSU_K_BY_MONTHS = (-0.00022, 0.03306, 0.94054)  # of M², M, 1: Sun & Baltazar 2013 (memory)
DAYS_A_MONTH = 365.25 / 12.0


def cv_limit(reporting_days: int) -> float:
    """Guideline 14's limit of CV(RMSE) by length of the reporting period. (memory)

    >>> cv_limit(200), cv_limit(400), cv_limit(2000)
    (0.2, 0.25, 0.3)
    """
    # Twelve bills are rarely 365 days to the day.
    if reporting_days < SHORT_YEAR_DAYS:
        return 0.20
    return 0.25 if reporting_days <= 5 * 366 else 0.30


def effective_bills(n: int, rho: float) -> float:
    """n′: how many independent bills n correlated ones are worth (Reddy & Claridge 2000).

    >>> effective_bills(24, 0.2)
    16.0
    """
    return n * (1.0 - rho) / (1.0 + rho)


def k_of_months(months: float) -> float:
    """The factor k for monthly bills by the months of reporting (Sun & Baltazar 2013 (memory)).

    >>> round(k_of_months(12.0), 4)
    1.3056
    """
    square, linear, constant = FSU_K_BY_MONTHS
    return (square * months + linear) * months + constant


def fractional_uncertainty(
    *, n: int, m: int, rho: float, cv: float, fraction: float, t: float, k: float = FSU_K
) -> float:
    """Fractional savings uncertainty ΔS/S after Reddy & Claridge 2000, HVAC&R Research 6(1).

    n, m : baseline and reporting periods; cv, fraction : of use.  n′ = n(1−ρ)/(1+ρ).

    >>> round(fractional_uncertainty(n=12, m=12, rho=0.0, cv=0.1, fraction=0.1, t=1.0), 3)
    0.393
    """
    effective = effective_bills(n, rho)
    inner = (n / effective) * (1.0 + 2.0 / effective) / m
    return t * k * cv * math.sqrt(inner) / fraction
