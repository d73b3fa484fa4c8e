"""Checks of an answer against published or customary limits, each in words first.

Limits marked (memory) were not re-read in their document.  No check withholds an answer, and
none looks at R²: a flat load has R² = 0 and may be known very well.
"""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from normalize.fitting.forms import form_named
from normalize.fitting.student import t_quantile
from normalize.savings.checks_side import CUSTOM, IPMVP, OWN, bill_words, percent, side_checks
from normalize.savings.guideline import (
    DAYS_A_MONTH,
    FSU_CONFIDENCE,
    FSU_K,
    FSU_LIMIT,
    PERFORMANCE,
    cv_limit,
    effective_bills,
    fractional_uncertainty,
    k_of_months,
)
from normalize.savings.placebo import size_of
from normalize.savings.results import Check, Estimate, Savings

if TYPE_CHECKING:
    from collections.abc import Sequence

    from normalize.fitting.results import Fit
    from normalize.savings.evidence import SideEvidence
    from normalize.savings.influence import Without
    from normalize.savings.placebo import Placebo

MIN_SHARE = 0.10  # of use: the smallest change that whole-meter bills show well
MIN_ERRORS = 2.0  # the change in standard errors of the baseline: IPMVP (memory)
MOST_MOVED = 1.0  # half-widths of the range by which one bill may move the answer
MOST_ANNOUNCED = 0.30  # of invented dates; unchanged homes exceed it about one time in ten


def checks_of(
    savings: Savings,
    evidence: Sequence[SideEvidence],
    *,
    n_after: int,
    without: Sequence[Without] = (),
    placebo: Placebo | None = None,
) -> tuple[Check, ...]:
    """All checks of an account, side by side and then of the change.

    evidence : of the sides that have a fit.  n_after : reporting periods in use.
    without : the answer without each bill.
    """
    out: list[Check] = []
    for side in evidence:
        out += side_checks(side, savings.reporting_days)
    out += _size(savings)
    out += _standard_errors(savings, evidence)
    out += _guideline(savings, n_after)
    out += _without(savings, without)
    out += _placebo(savings, placebo)
    return tuple(out)


def _size(savings: Savings) -> list[Check]:
    fraction = savings.normalized.fraction
    if fraction is None:
        return []
    return [
        Check(
            "size of the change", "both", abs(fraction), MIN_SHARE, abs(fraction) >= MIN_SHARE,
            "whole-meter bills show changes above about a tenth of use best; smaller ones drown "
            "in the ordinary ups and downs of a household",
            "Trust the range rather than the single number, and look again with more bills.",
            CUSTOM,
        )
    ]  # fmt: skip


def _standard_errors(savings: Savings, evidence: Sequence[SideEvidence]) -> list[Check]:
    """Avoided use against the standard error of what the baseline predicts, ρ = 0."""
    avoided, fit = savings.avoided, savings.before
    if fit is None or avoided.value is None or avoided.plain_low is None:
        return []
    held = any(e.held for e in evidence if e.side == "before")
    columns = len(fit.terms) if held else form_named(fit.form).parameters
    half = avoided.value - avoided.plain_low
    t = t_quantile(0.5 + 0.5 * avoided.confidence, max(fit.n_periods - columns, 1))
    if not half > 0.0:
        return []
    value = abs(avoided.value) * t / half
    return [
        Check(
            "change in standard errors", "both", value, MIN_ERRORS, value > MIN_ERRORS,
            f"the change since the work is {value:.1f} times the usual error of what the "
            "earlier bills lead one to expect, if bills err independently of one another",
            "The change is lost in the ordinary scatter so far: wait for more bills.",
            IPMVP,
        )
    ]  # fmt: skip


def _guideline(savings: Savings, n_after: int) -> list[Check]:
    """Fractional savings uncertainty, with the constant factor and with that of the months."""
    avoided, before = savings.avoided, savings.before
    if before is None or avoided.fraction is None or avoided.fraction == 0.0:
        return []
    rho = min(max(before.rho, 0.0), 0.9)
    df = max(before.n_periods - form_named(before.form).parameters, 1)
    months = savings.reporting_days / DAYS_A_MONTH
    beyond = n_after > before.n_periods
    factors = (
        ("", FSU_K, "k = 1.26"),
        (", k by months", k_of_months(months), "k by months: Sun & Baltazar 2013 (memory)"),
    )
    out = []
    for name, k, source in factors:
        value = fractional_uncertainty(
            n=before.n_periods,
            m=max(n_after, 1),
            rho=rho,
            cv=before.cv_rmse,
            fraction=abs(avoided.fraction),
            t=t_quantile(0.5 + 0.5 * FSU_CONFIDENCE, df),
            k=k,
        )
        if not math.isfinite(value):
            continue
        means = _guideline_words(value, before, rho, k, beyond)
        out.append(
            Check(
                f"fractional savings uncertainty at 68 %{name}", "both", value, FSU_LIMIT,
                value <= FSU_LIMIT, means,
                "Wait for more bills, or report the range as it is.",
                f"{PERFORMANCE}; Reddy & Claridge 2000, HVAC&R Research 6(1), {source}",
            )
        )  # fmt: skip
    return out


def _guideline_words(value: float, before: Fit, rho: float, k: float, beyond: bool) -> str:
    bills = effective_bills(before.n_periods, rho)
    return (
        f"by the guideline's formula the change since the work is known to within "
        f"{percent(value)} of itself, about two times in three. It counts the "
        f"{before.n_periods} bills before the work as {bills:.1f} independent ones "
        f"(serial correlation {rho:.2f}; k = {k:.2f})"
    ) + (
        "; it says too little where more bills are compared than the baseline has, as here"
        if beyond
        else ""
    )


def _without(savings: Savings, without: Sequence[Without]) -> list[Check]:
    """How far the answer moves without the one bill that moves it most."""
    whole = savings.normalized if savings.normalized.available else savings.avoided
    kind = "normalized" if savings.normalized.available else "avoided"
    if whole.value is None or whole.low is None or whole.high is None:
        return []
    half = 0.5 * (whole.high - whole.low)
    moved = [(abs(e.value - whole.value), w, e) for w in without
             if (e := getattr(w, kind)).value is not None]  # fmt: skip
    if not moved or not half > 0.0:
        return []
    by, bill, answer = max(moved, key=lambda m: (m[0], -m[1].number))
    turned = [w for _, w, e in moved if e.verdict != whole.verdict]
    lost = len(without) - len(moved)
    means = f"the bill that matters most is {bill_words(bill)}: without it {_now(answer, whole)}"
    if turned:
        means += (
            f". Without {_named(turned)} the finding itself would be another, so it "
            "rests on few bills"
        )
    if lost:
        means += f". Without {lost} of the bills there would be no answer at all"
    return [
        Check(
            "answer without any one bill", "both", by / half, MOST_MOVED,
            by <= MOST_MOVED * half and not turned, means,
            "Look at that bill: is it an actual reading of ordinary use? It stays in unless "
            "you know better; take it out of the file only with a reason that you can give.",
            OWN,
        )
    ]  # fmt: skip


def _named(bills: Sequence[Without]) -> str:
    if len(bills) == 1:
        return bill_words(bills[0])
    return f"any one of {len(bills)} bills (first {bill_words(bills[0])})"


def _now(answer: Estimate, whole: Estimate) -> str:
    if answer.fraction is None or whole.fraction is None:
        unit = "in the bills' unit"
        return f"the change would be {answer.value:.4g} instead of {whole.value:.4g}, {unit}"
    return f"the change would be {_told(answer.fraction)} instead of {_told(whole.fraction)}"


def _told(fraction: float) -> str:
    """A change with its direction in words.

    >>> _told(0.1234).replace("\\xa0", " "), _told(-0.05).replace("\\xa0", " ")
    ('12.3 % less', '5.0 % more')
    """
    return f"{100.0 * abs(fraction):.1f}\u00a0% {'less' if fraction >= 0.0 else 'more'}"


def _placebo(savings: Savings, placebo: Placebo | None) -> list[Check]:
    """Invented work dates: how many would have announced a change."""
    if placebo is None or savings.before is None:
        return []
    name, source = "invented work dates", OWN
    share, largest = placebo.share, placebo.largest
    if share is None or largest is None:
        means = f"not made: {placebo.unavailable}"
        return [Check(name, "before", None, MOST_ANNOUNCED, None, means, "", source)]
    announced, k = len(placebo.announced), len(placebo.dates)
    means = (
        f"{announced} of {k} invented work dates in the bills before the work, when nothing was "
        "done, would have announced a change"
    )
    fraction = largest.normalized.fraction
    if savings.normalized.available and fraction is not None:
        smaller = size_of(largest.normalized) < size_of(savings.normalized)
        beside = "smaller than" if smaller else "as large as"
        means += f"; the largest, {_told(fraction)}, is {beside} the real one"
    return [
        Check(
            name, "before", share, MOST_ANNOUNCED, share <= MOST_ANNOUNCED, means,
            "Use changed in these bills before anything was done: ask what (people, equipment, "
            "hours), and leave out the bills from before that with occupied_since = ….",
            source,
        )
    ]  # fmt: skip


def moved_before(placebo: Placebo | None) -> tuple[str, ...]:
    """The caution that use moved by itself before the work; empty where it hardly did."""
    if placebo is None or placebo.share is None or placebo.share <= MOST_ANNOUNCED:
        return ()
    return (
        f"Use moved by itself before the work: {len(placebo.announced)} of "
        f"{len(placebo.dates)} invented work dates, when nothing was done, would have announced "
        "a change. Part of the real change may be more of the same.",
    )


__all__ = [
    "FSU_CONFIDENCE",
    "FSU_K",
    "FSU_LIMIT",
    "checks_of",
    "cv_limit",
    "fractional_uncertainty",
    "moved_before",
]
