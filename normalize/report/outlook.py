"""Will it show?  In words and as a table: the smallest saving against the number of bills."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from normalize.days import date_of, iso
from normalize.report import numbers as n
from normalize.report import words
from normalize.report.tables import Table, form_words
from normalize.savings.planning import EVEN, LIKELY, needed

if TYPE_CHECKING:
    from collections.abc import Sequence

    from normalize.plan import Outlook, SiteOutlook
    from normalize.savings.planning import Prospect, Smallest

SHOWN: Final = (3, 6, 9, 12, 18, 24, 36)  # bills in the terminal's table; all are in the JSON
YEAR_DAYS: Final = 365.25
LONG_DAYS: Final = 460  # more than this to the first normal year, and it is said why
LEAST_SHARE: Final = 0.9995  # more than all of it cannot be saved
ODDS: Final = (
    "“Four times in five” and “even odds”: how often a saving of that size would be told from no "
    "change, if it is there."
)
UNSURE: Final = (
    "The bills place the balance temperature badly, so ranges will be wider, and the smallest "
    "saving that shows larger, than is foretold here."
)
SAME_SHARE: Final = (
    "It takes the saving to be the same share of every bill, and bills after the work to err as "
    "those before it do. It cannot foresee other changes in the house."
)


def sentences(outlook: Outlook, confidence: float, hoped: float | None) -> tuple[str, ...]:
    """What more bills could tell of one account, the plainest first."""
    fuel = words.fuel_word(outlook.fuel)
    if outlook.unavailable:
        return (f"For {fuel} nothing can be foretold: {words.stop(n.clean(outlook.unavailable))}",)
    out = [_a_year(outlook, fuel)]
    if hoped is not None:
        out.append(_hoped(outlook, hoped, fuel))
    if outlook.unsure:
        out.append(UNSURE)
    out.append(_basis(outlook, confidence))
    return tuple(out)


def kind_of(length: int, *, delivered: bool = False) -> str:
    """What bills of that length are called.

    >>> kind_of(30), kind_of(61), kind_of(90), kind_of(40, delivered=True)
    ('monthly bill', 'two-monthly bill', '90-day bill', 'full fill')
    """
    if delivered:
        return "full fill"
    if 26 <= length <= 35:
        return "monthly bill"
    return "two-monthly bill" if 52 <= length <= 70 else f"{length}-day bill"


def _a_year(outlook: Outlook, fuel: str) -> str:
    """The smallest saving with about a year of bills."""
    one = min(
        (p for p in outlook.prospects if p.normalized is not None),
        key=lambda p: abs(p.bills * outlook.length - YEAR_DAYS),
        default=None,
    )
    if one is None or one.normalized is None:
        why = outlook.prospects[-1].unavailable
        return f"No number of bills up to 36 makes a normal year of {fuel}: {words.stop(why)}"
    text = (
        f"With {_bills(one.bills, outlook)} a saving of {_share(one.normalized, LIKELY)} of "
        f"{fuel} in a normal year, or more, would show four times in five; "
        f"{_share(one.normalized, EVEN)} at even odds."
    )
    if one.bills * outlook.length > LONG_DAYS:
        why = next((p.unavailable for p in reversed(outlook.prospects) if p.unavailable), "")
        text += f" With fewer there is no normal year: {words.stop(why)}"
    return text


def _hoped(outlook: Outlook, hoped: float, fuel: str) -> str:
    """How many bills the saving hoped for needs."""
    told = f"The {share_word(hoped)} of {fuel} hoped for"
    soon = needed(outlook.prospects, hoped, odds=LIKELY, normalized=False)
    year = needed(outlook.prospects, hoped, odds=LIKELY, normalized=True)
    if soon is None and year is None:
        return f"{told} {_too_small(outlook, hoped)}"
    if soon is not None and (year is None or soon.bills < year.bills):
        most = "at most " if soon is outlook.prospects[0] else ""
        text = f"{told} needs {most}{_bills(soon.bills, outlook)}, about until {month(soon)}"
        text += ", to show as use avoided since the work"
        if year is None:
            return f"{text}; in a normal year it would not show four times in five with 36."
        more = f"{year.bills}, about until {month(year)}"
        return f"{text}; to show in a normal year it needs {more}. Both four times in five."
    assert year is not None  # noqa: S101  the case above has taken the rest
    return (
        f"{told} needs {_bills(year.bills, outlook)}, about until {month(year)}, to show "
        "in a normal year four times in five."
    )


def _too_small(outlook: Outlook, hoped: float) -> str:
    even = needed(outlook.prospects, hoped, odds=EVEN, normalized=False)
    year = needed(outlook.prospects, hoped, odds=EVEN, normalized=True)
    known = [p for p in (even, year) if p is not None]
    if not known:
        return (
            "is too small to show even at even odds within 36 more bills: the bills before the "
            "work scatter too much, or are too few. Older bills would help."
        )
    least = min(known, key=lambda p: p.bills)
    return (
        f"would show at even odds with {_bills(least.bills, outlook)}, about until "
        f"{month(least)}, but not four times in five within 36."
    )


def _basis(outlook: Outlook, confidence: float) -> str:
    fit = outlook.fit
    if fit is None:
        return ""
    span = n.span(outlook.first, outlook.last)
    years = outlook.years
    listed = f"{years[0]}{n.NDASH}{years[-1]}" if len(years) > 1 else f"{years[0]}"
    begin = "the work" if outlook.work_named else "one bill's length is allowed for the work"
    return (
        f"From {fit.n_periods} bills, {span} ({form_words(fit.form)}, CV(RMSE) "
        f"{n.percent(fit.cv_rmse)}). Bills to come are taken as {outlook.length} days long, the "
        f"first from {n.long_date(outlook.starts)} ({'after ' if outlook.work_named else ''}"
        f"{begin}), with the mean weather of the same days in {listed}. "
        f"“Show” means that the {words.confidence_word(confidence)} range leaves out zero."
    )


def month(prospect: Prospect) -> str:
    """The month in which the last bill ends."""
    when = date_of(prospect.until - 1)
    return f"{n.MONTHS[when.month - 1]}{n.NBSP}{when.year}"


def share_word(share: float) -> str:
    """A share as it was asked for.

    >>> share_word(0.12), share_word(0.045)
    ('12\\xa0%', '4.5\\xa0%')
    """
    return f"{100.0 * share:.6g}{n.NBSP}%"


def _bills(count: int, outlook: Outlook) -> str:
    kind = kind_of(outlook.length, delivered=outlook.delivered)
    return f"{count} more {kind}{'' if count == 1 else 's'}"


def _share(smallest: Smallest, odds: float) -> str:
    share = smallest.likely_fraction if odds == LIKELY else smallest.even_fraction
    return n.percent(share) if share <= LEAST_SHARE else "all"


def table_of(outlook: Outlook, counts: Sequence[int] = SHOWN) -> Table | None:
    """The smallest saving for several numbers of bills; None where nothing is known."""
    if not outlook.prospects:
        return None
    rows = [
        (
            f"{p.bills}", n.short_date(p.until), _cell(p.avoided, EVEN), _cell(p.avoided, LIKELY),
            _cell(p.normalized, EVEN), _cell(p.normalized, LIKELY),
        )
        for p in outlook.prospects
        if p.bills in counts
    ]  # fmt: skip
    head = (
        "bills more",
        "until",
        "avoided, even odds",
        "avoided, four in five",
        "normal year, even odds",
        "normal year, four in five",
    )
    caption = (
        "The smallest saving that would show, as a share of what would be used without it"
        f"{_why_not(outlook)}"
    )
    return Table(caption, head, tuple(rows), frozenset((0, 2, 3, 4, 5)))


def _why_not(outlook: Outlook) -> str:
    reasons = dict.fromkeys(p.unavailable for p in outlook.prospects if p.unavailable)
    return f"; {n.NDASH}: {'; '.join(reasons)}" if reasons else ""


def _cell(smallest: Smallest | None, odds: float) -> str:
    if smallest is None:
        return n.UNKNOWN
    share = smallest.likely_fraction if odds == LIKELY else smallest.even_fraction
    return n.percent_plain(share) if share <= LEAST_SHARE else "all of it"


def to_json(found: SiteOutlook, hoped: float | None) -> str:
    """The whole outlook as JSON, schema 1 (docs/json.md)."""
    import json

    whole = {
        "schema": 1,
        "site": found.site.name,
        "confidence": found.confidence,
        "saving_hoped_for": hoped,
        "accounts": [_account(a, hoped) for a in found.accounts],
    }
    return json.dumps(whole, indent=2, ensure_ascii=True, allow_nan=False) + "\n"


def _account(a: Outlook, hoped: float | None) -> dict[str, object]:
    wanted = hoped if hoped is not None and a.prospects else None
    return {
        "account": a.account,
        "fuel": a.fuel,
        "unit": a.unit,
        "unavailable": a.unavailable or None,
        "form": a.fit.form if a.fit is not None else None,
        "n_periods": a.fit.n_periods if a.fit is not None else None,
        "cv_rmse": _finite(a.fit.cv_rmse) if a.fit is not None else None,
        "nac": _finite(a.nac),
        "baseline_start": iso(a.first) if a.first is not None else None,
        "baseline_end": iso(a.last) if a.last is not None else None,
        "days_a_bill": a.length or None,
        "first_bill_starts": iso(a.starts) if a.starts is not None else None,
        "weather_years": list(a.years),
        "needed": None if wanted is None else _needed(a, wanted),
        "prospects": [
            {
                "bills": p.bills,
                "until": iso(p.until),
                "avoided": _smallest(p.avoided),
                "normalized": _smallest(p.normalized),
                "normalized_unavailable": p.unavailable or None,
            }
            for p in a.prospects
        ],
    }


def _needed(a: Outlook, hoped: float) -> dict[str, object]:
    def bills(odds: float, *, normalized: bool) -> int | None:
        one = needed(a.prospects, hoped, odds=odds, normalized=normalized)
        return one.bills if one is not None else None

    return {
        "avoided_even_odds": bills(EVEN, normalized=False),
        "avoided_four_in_five": bills(LIKELY, normalized=False),
        "normalized_even_odds": bills(EVEN, normalized=True),
        "normalized_four_in_five": bills(LIKELY, normalized=True),
    }


def _smallest(s: Smallest | None) -> dict[str, object] | None:
    if s is None:
        return None
    return {
        "even_odds": _finite(s.even),
        "four_in_five": _finite(s.likely),
        "even_odds_fraction": _finite(s.even_fraction),
        "four_in_five_fraction": _finite(s.likely_fraction),
        "of": _finite(s.over),
    }


def _finite(value: float | None) -> float | None:
    return float(value) if value is not None and n.known(value) else None
