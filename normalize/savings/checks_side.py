"""Checks of one side's fit."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, Protocol

from normalize.days import iso
from normalize.savings.cautions import POOR_TAU_F
from normalize.savings.cook import LOOK_COOK, STRONG_COOK
from normalize.savings.guideline import GUIDELINE, cv_limit
from normalize.savings.results import Check

if TYPE_CHECKING:
    from normalize.savings.evidence import SideEvidence

IPMVP = "IPMVP (memory)"
CUSTOM = "common practice, no source"
OWN = "this program's own rule"
MAX_BIAS = 5e-5
MIN_READINGS = 9
MIN_DAYS = 365 - 15  # twelve bills are rarely 365 days to the day
MAX_OUTSIDE = 0.10
DW_RANGE = (1.0, 3.0)
MIN_P = 0.05  # of the portmanteau test


class _Bill(Protocol):
    @property
    def start(self) -> int: ...
    @property
    def end(self) -> int: ...


def percent(share: float) -> str:
    """A share in whole percent, or with one decimal below ten.

    >>> percent(0.0712).replace("\\xa0", " "), percent(0.25).replace("\\xa0", " ")
    ('7.1 %', '25 %')
    """
    value = 100.0 * share
    return f"{value:.0f}\u00a0%" if abs(value) >= 9.95 else f"{value:.1f}\u00a0%"


def bill_words(bill: _Bill) -> str:
    """A bill named by its dates: the day of its first and of its closing reading."""
    return f"the bill from {iso(bill.start)} until {iso(bill.end)}"


def side_checks(evidence: SideEvidence, reporting_days: int) -> list[Check]:
    """All checks of a side. reporting_days : of the reporting period, for Guideline 14."""
    return [
        *_scatter(evidence, reporting_days),
        *_readings(evidence),
        *_weather(evidence),
        *_slopes(evidence),
        *_balance(evidence),
        *_errors(evidence),
        *_influence(evidence),
    ]


def _scatter(e: SideEvidence, reporting_days: int) -> list[Check]:
    fit, limit = e.fit, cv_limit(reporting_days)
    known = math.isfinite(fit.cv_rmse)
    told = f"by about {percent(fit.cv_rmse)} of mean use" if known else "by an unknown amount"
    return [
        Check(
            "CV(RMSE)", e.side, fit.cv_rmse if known else None, limit,
            fit.cv_rmse <= limit if known else None,
            f"a bill usually misses what weather alone would make it {told}",
            "Look for bills that are not this building's usual use; the range already allows "
            "for the scatter.",
            GUIDELINE,
        ),
        Check(
            "net bias", e.side, abs(fit.bias), MAX_BIAS, abs(fit.bias) <= MAX_BIAS,
            "fitted and billed use add up to the same; they do so by construction when bills "
            "count by their days, so this checks arithmetic only",
            "Report it as a fault of the program.",
            GUIDELINE,
        ),
    ]  # fmt: skip


def _readings(e: SideEvidence) -> list[Check]:
    fit = e.fit
    span = e.last - e.first
    gaps = span - fit.n_days
    missing = f"; {gaps} of those days are in no usable bill" if gaps > 0 else ""
    return [
        Check(
            "number of bills", e.side, float(fit.n_periods), float(MIN_READINGS),
            fit.n_periods >= MIN_READINGS,
            f"the fit rests on {fit.n_periods} bills",
            "Add older or later bills; the range already allows for their being few.",
            GUIDELINE,
        ),
        Check(
            "days of bills", e.side, float(fit.n_days), float(MIN_DAYS), fit.n_days >= MIN_DAYS,
            f"the bills run from {iso(e.first)} until {iso(e.last)}, {span} days{missing}; a "
            "whole year shows every season",
            "A season is missing: wait for it or add older bills.",
            GUIDELINE,
        ),
    ]  # fmt: skip


def _weather(e: SideEvidence) -> list[Check]:
    seen = e.seen
    if seen is None:
        return []
    out = [
        Check(
            "temperatures seen", e.side, seen.high_f - seen.low_f, None, None,
            f"the days of these bills went from {seen.low_f:.0f} to {seen.high_f:.0f}\u00a0°F, "
            f"their means from {e.low_mean_f:.0f} to {e.high_mean_f:.0f}\u00a0°F; of weather "
            "beyond that the fit knows nothing from experience",
            "", GUIDELINE,
        )
    ]  # fmt: skip
    shares = (
        ("weather not seen", seen.days, "days"),
        ("heating degree-days not seen", seen.heating, "heating degree-days"),
        ("cooling degree-days not seen", seen.cooling, "cooling degree-days"),
    )
    for name, share, what in shares:
        if share is not None:
            out.append(
                Check(
                    name, e.side, share, MAX_OUTSIDE, share <= MAX_OUTSIDE,
                    f"{percent(share)} of the normal year's {what} belong to days colder or "
                    "warmer than any day of these bills",
                    "The normal year is partly beyond experience: add bills from a colder or "
                    "hotter season.",
                    CUSTOM,
                )
            )  # fmt: skip
    return out


def _slopes(e: SideEvidence) -> list[Check]:
    checks = []
    for term, t in list(zip(e.fit.terms, e.fit.t, strict=True))[1:]:
        known = math.isfinite(t)
        checks.append(
            Check(
                f"|t| of the {term}", e.side, abs(t) if known else None, 2.0,
                abs(t) >= 2.0 if known else True,
                "use does answer to weather: the slope in its own standard errors, balance "
                "temperature taken as found" if not known or abs(t) >= 2.0 else
                "it cannot be told whether use answers to weather: the slope is less than two "
                "of its standard errors",
                "Treat the account as a flat load.",
                IPMVP,
            )
        )  # fmt: skip
    return checks


def _balance(e: SideEvidence) -> list[Check]:
    fit = e.fit
    if fit.form in ("flat", "line"):
        return []
    out = [
        Check(
            "balance temperature inside its range", e.side, 1.0 if fit.on_bound else 0.0, 0.0,
            not fit.on_bound,
            "the outdoor temperature at which heating or cooling starts ended on the edge of "
            "where it may lie" if fit.on_bound else
            "the outdoor temperature at which heating or cooling starts was found inside the "
            "range where it may lie",
            "Read it as “at or beyond”; the slope is then less sure than it looks.",
            CUSTOM,
        )
    ]  # fmt: skip
    spans = (
        ("heating", fit.balance_heating_f, fit.balance_heating_range_f),
        ("cooling", fit.balance_cooling_f, fit.balance_cooling_range_f),
    )
    for kind, tau, span in spans:
        if tau is None or span is None or (kind == "cooling" and fit.form == "two slopes"):
            continue
        width = span[1] - span[0]
        held = "; the range allows for any of them" if e.held or e.unsure else ""
        out.append(
            Check(
                f"balance temperature for {kind} well placed", e.side, width, POOR_TAU_F,
                width <= POOR_TAU_F and not e.held,
                f"anything from {span[0]:.0f} to {span[1]:.0f}\u00a0°F describes these bills "
                f"about as well as {tau:.0f}\u00a0°F (the spread is the value){held}",
                "Trust the normal year's use and the change, which hardly depend on it, more "
                "than the balance temperature or the slope; bills of spring and autumn place it.",
                f"{OWN}; range by F at 90\u00a0%, errors taken as independent",
            )
        )  # fmt: skip
    return out


def _errors(e: SideEvidence) -> list[Check]:
    out = []
    if math.isfinite(e.fit.durbin_watson):
        low, high = DW_RANGE
        value = e.fit.durbin_watson
        out.append(
            Check(
                "Durbin–Watson", e.side, value, low, low <= value <= high,
                "whether one bill's error tells the next one's: 2 is not at all, below "
                f"{low:g} the errors last from bill to bill, above {high:g} they take turns",
                "Nothing: the range allows for it. The plain range beside it does not.",
                CUSTOM,
            )
        )  # fmt: skip
    if e.alike is not None:
        a = e.alike
        out.append(
            Check(
                "bills err independently, p", e.side, a.p, MIN_P, a.p >= MIN_P,
                "how easily errors that have nothing to do with one another would look as "
                f"alike as these; neighbours correlate by {a.lag1:.2f} "
                f"(Ljung–Box over {a.lags} lag{'s' if a.lags > 1 else ''})",
                "Nothing: the range allows for errors that last. Any formula that takes bills "
                "as independent promises too much here.",
                f"Ljung & Box 1978 (memory); {CUSTOM}",
            )
        )  # fmt: skip
    return out


def _influence(e: SideEvidence) -> list[Check]:
    known = [w for w in e.weights if math.isfinite(w.cook)]
    if not known:
        return []
    top = max(known, key=lambda w: (w.cook, -w.number))
    n = len(e.weights)
    look = [w for w in known if w.cook > LOOK_COOK / n]
    place = {w.number: s for w, s in zip(e.weights, e.spans, strict=True)}
    first, last = place[top.number]
    are = "is" if len(look) == 1 else "are"
    several = f"; {len(look)} of {n} {are} over 4/n, which is worth a look" if look else ""
    return [
        Check(
            "influence of single bills", e.side, top.cook, STRONG_COOK, top.cook <= STRONG_COOK,
            f"the bill from {iso(first)} until {iso(last)} pulls this fit most (Cook's distance, "
            f"balance temperature included; leverage {top.leverage:.2f}, DFFITS "
            f"{top.dffits:.1f}){several}",
            "Look at that bill: is it an actual reading of ordinary use? It stays in: a bill of "
            "the coldest month rightly weighs much. The answer without it is in the table.",
            "Cook & Weisberg 1982 (memory) for 1; 4/n common practice, no source",
        )
    ]  # fmt: skip
