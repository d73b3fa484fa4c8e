"""The tables behind the answer, as rows of text, for HTML and terminal alike."""

from __future__ import annotations

import itertools
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Final

from normalize.fitting.forms import FORMS
from normalize.report import checks_words, words
from normalize.report import numbers as n

if TYPE_CHECKING:
    from collections.abc import Callable, Iterable

    from normalize.fitting.results import Fit, FormTried
    from normalize.savings.results import Amount, Check
    from normalize.site import AccountResult, PeriodRow, SiteResult

STATISTICS: Final = "How the fits sit on their bills; R² never sets a fit aside (a flat load has 0)"
CHECKS: Final = "Each check with its limit, what the outcome means, and who asks for it"
WEIGHTS: Final = "What each bill weighs in its side's fit, balance temperature included"
FACTORS: Final = "What one unit is worth, and where the number comes from"
LEDGER: Final = "What became of every row of the bill files, by file and line"


@dataclass(frozen=True, slots=True)
class Table:
    """A table as text. figures : the numbers of the columns that hold numbers, from 0."""

    caption: str
    header: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    figures: frozenset[int] = field(default=frozenset())


def _table(
    caption: str,
    header: tuple[str, ...],
    rows: Iterable[tuple[str, ...]],
    figures: Iterable[int] = (),
) -> Table:
    return Table(caption, header, tuple(rows), frozenset(figures))


def years_table(account: AccountResult) -> Table:
    """The two normal years, the change, and avoided use, with both kinds of range."""
    save = account.savings
    unit = words.unit_word(account.unit)
    since = f"change since the work, {save.reporting_days} days"
    entries = (
        ("normal year before", save.nac_before),
        ("normal year after", save.nac_after),
        ("change, normal year", save.normalized),
        (since if save.reporting_days else "change since the work", save.avoided),
    )
    rows = [
        (
            name,
            *(n.plain(x, 1) for x in (e.value, e.low, e.high, e.plain_low, e.plain_high)),
            *(n.percent_plain(x) for x in (e.fraction, e.fraction_low, e.fraction_high)),
            n.clean(e.unavailable or ""),
        )
        for name, e in entries
    ]
    header = (
        unit,
        "value",
        "low",
        "high",
        "plain low",
        "plain high",
        "share",
        "low",
        "high",
        "note",
    )
    caption = (
        f"The two normal years and the change, {unit}; less is positive. Ranges: "
        f"{words.confidence_word(save.normalized.confidence)}; plain: as if bills erred "
        "independently."
    )
    return _table(caption, header, rows, range(1, 9))


def coefficients_table(fit: Fit, unit: str, side: str) -> Table:
    """Coefficients with standard errors, and balance temperatures with their ranges."""
    values = {
        "base load": (fit.base_load, "base load, a day"),
        "heating slope": (fit.heating_slope, "heating slope, per °F·day"),
        "cooling slope": (fit.cooling_slope, "cooling slope, per °F·day"),
        "line slope": (fit.line_slope, "slope, a day per °F"),
    }
    rows = [
        (
            values.get(term, (None, term))[1],
            n.full(values.get(term, (None, term))[0]),
            n.full(_at(fit.se, i)),
            n.full(_at(fit.se_full, i)),
            n.plain(_at(fit.t, i), 2),
            "",
        )
        for i, term in enumerate(fit.terms)
    ]
    balances = (
        ("heating below, °F", fit.balance_heating_f, fit.balance_heating_range_f),
        ("cooling above, °F", fit.balance_cooling_f, fit.balance_cooling_range_f),
    )
    for name, at, spread in balances:
        if at is not None:
            shown = "" if spread is None else f"{n.plain(spread[0], 1)} to {n.plain(spread[1], 1)}"
            rows.append((name, n.plain(at, 2), "", "", "", shown))
    header = ("term", "value", "standard error", "same, τ free", "t", "range")
    caption = f"Coefficients {side} the work, {unit}: {form_words(fit.form)}"
    if fit.on_bound:
        caption += "; a balance temperature ended on the edge of its allowed range"
    return _table(caption, header, rows, range(1, 6))


def _at(values: tuple[float, ...] | None, i: int) -> float | None:
    return values[i] if values is not None and i < len(values) else None


def form_words(form: str) -> str:
    """A form's name with the trade's beside it.

    >>> form_words("heating")
    'heating (three-parameter heating)'
    """
    known = FORMS.get(form)
    return form if known is None or known.trade_name == form else f"{form} ({known.trade_name})"


def statistics_table(account: AccountResult) -> Table:
    """How well each side's fit sits on its bills."""
    save = account.savings
    both = (("before", save.before), ("after", save.after))
    fits = [(side, fit) for side, fit in both if fit is not None]
    lines: tuple[tuple[str, Callable[[Fit], str]], ...] = (
        ("form", lambda f: f.form),
        ("periods used", lambda f: f"{f.n_periods}"),
        ("days used", lambda f: f"{f.n_days}"),
        ("periods set aside", lambda f: f"{f.set_aside}"),
        ("CV(RMSE)", lambda f: n.percent_plain(f.cv_rmse, 2)),
        ("R²", lambda f: n.plain(f.r2, 4)),
        ("net bias (a check of arithmetic only)", lambda f: n.percent_plain(f.bias, 4)),
        ("mean use a day", lambda f: n.full(f.mean_use)),
        ("RSS, Σ days·residual²", lambda f: n.full(f.rss)),
        ("correlation from bill to bill, ρ", lambda f: n.plain(f.rho, 2)),
        ("Durbin–Watson", lambda f: n.plain(f.durbin_watson, 2)),
        ("AICc", lambda f: n.plain(f.aicc, 2)),
        ("BIC", lambda f: n.plain(f.bic, 2)),
    )
    rows = [(name, *(of(fit) for _, fit in fits)) for name, of in lines]
    header = ("statistic", *(side for side, _ in fits))
    return _table(STATISTICS, header, rows, range(1, 1 + len(fits)))


def forms_table(tried: tuple[FormTried, ...], side: str) -> Table:
    """Every form with its numbers, and why it was set aside."""
    rows = []
    for one in tried:
        fit = one.fit
        if fit is None:
            told: tuple[str, ...] = (n.UNKNOWN,) * 5
        else:
            told = (
                n.plain(fit.balance_heating_f, 1),
                n.plain(fit.balance_cooling_f, 1),
                n.percent_plain(fit.cv_rmse),
                n.plain(fit.aicc, 1),
                n.plain(fit.bic, 1),
            )
        outcome = "chosen" if one.chosen else f"set aside: {n.clean(one.reason)}"
        rows.append((form_words(one.form), *told, outcome))
    header = (
        "form",
        "heating below, °F",
        "cooling above, °F",
        "CV(RMSE)",
        "AICc",
        "BIC",
        "outcome",
    )
    return _table(f"Forms tried, {side} the work", header, rows, range(1, 6))


def checks_table(checks: tuple[Check, ...]) -> Table:
    """Checks against published or customary limits, with their meaning."""
    rows = [
        (
            n.clean(c.name),
            c.side,
            checks_words.outcome(c),
            checks_words.meaning(c),
            checks_words.number(c.value),
            checks_words.number(c.limit),
            n.clean(c.source),
        )
        for c in checks
    ]
    header = ("check", "side", "outcome", "what it means", "value", "limit", "source")
    return _table(CHECKS, header, rows, (4, 5))


def weights_table(account: AccountResult) -> Table | None:
    """What each bill weighs in its side's fit; None without a fit."""
    rows = checks_words.weight_rows(account.evidence)
    header = (
        "period", "from", "until", "side", "leverage", "Cook's distance", "DFFITS", "note",
    )  # fmt: skip
    return _table(WEIGHTS, header, rows, (0, 4, 5, 6)) if rows else None


def periods_table(account: AccountResult) -> Table:
    """Every usage period, used or not."""
    unit = words.unit_word(account.unit)
    rows = [
        (
            f"{p.number}",
            n.short_date(p.start),
            n.short_date(p.end),
            f"{p.end - p.start}",
            n.plain(p.use, 1),
            n.plain(p.use_per_day, 3),
            n.plain(p.fitted_per_day, 3),
            n.plain(p.without_work_per_day, 3),
            n.plain(p.cost, 2),
            n.plain(p.mean_temp_f, 1),
            p.side,
            period_note(p),
        )
        for p in account.periods
    ]
    header = (
        "period",
        "from",
        "until",
        "days",
        unit,
        "a day",
        "own fit",
        "expected from the bills before",
        "cost",
        "mean °F",
        "side",
        "note",
    )
    caption = (
        "Usage periods. A period runs from one reading until the next; the day of the later "
        "reading belongs to the next period."
    )
    return _table(caption, header, rows, (0, 3, 4, 5, 6, 7, 8, 9))


def period_note(period: PeriodRow) -> str:
    """What is special about a period."""
    parts = []
    if period.estimated:
        parts.append("ends on an estimated reading")
    if period.joined > 1:
        parts.append(f"{period.joined} bills joined")
    if period.reason:
        parts.append(n.clean(period.reason))
    return "; ".join(parts)


def ledger_table(account: AccountResult, *, show_accounts: bool = False) -> Table:
    """What became of every row of the bill files."""
    entries = account.bills.ledger if account.bills is not None else ()
    hide = _shown(show_accounts)
    rows = [(hide(n.name(e.file)), f"{e.line:,}", e.fate, hide(n.clean(e.note))) for e in entries]
    header = ("file", "line", "became", "note")
    return _table(LEDGER, header, rows, (1,))


SIDE_WORDS: Final = {
    "before": "stand before the work",
    "after": "after it",
    "work window": "touch it",
    "between": "lie between two upgrades",
    "older": "are older than those used",
    "later": "are later than those used",
    "earlier occupant": "belong to an earlier occupant",
    "set aside": "were set aside",
}


def ledger_summary(account: AccountResult) -> str:
    """The ledger in a sentence."""
    if account.bills is None:
        return "The bills could not be read, so there is no ledger."
    ledger = account.bills.ledger
    rows = {(e.file, e.line): e.fate for e in ledger}
    out = sum(fate == "left out" for fate in rows.values())
    noted = len({(e.file, e.line) for e in ledger if e.note and e.fate != "left out"})
    periods = account.bills.periods.n
    text = f"{_count(len(account.bills.rows), 'row')} read: {_count(periods, 'usage period')}, "
    text += f"{_count(out, 'row')} left out"
    text = f"{text}, {_count(noted, 'row')} repaired or noted." if noted else f"{text}."
    return f"{text} {sides_summary(account)}".rstrip()


def sides_summary(account: AccountResult) -> str:
    """Which part the periods took, and how many days no bill covers."""
    if not account.periods:
        return ""
    counts: dict[str, int] = {}
    for period in account.periods:
        counts[period.side] = counts.get(period.side, 0) + 1
    parts = [f"{counts[side]} {told}" for side, told in SIDE_WORDS.items() if side in counts]
    gaps = sum(
        max(after.start - before.end, 0) for before, after in itertools.pairwise(account.periods)
    )
    text = f"Of the periods, {', '.join(parts)}."
    return f"{text} {_count(gaps, 'day')} between them have no bill." if gaps else text


def totals_table(result: SiteResult) -> Table:
    """All accounts together."""
    rows = []
    for kind, total in (
        (words.NORMAL_YEAR, result.total_normalized),
        ("since the work", result.total_avoided),
    ):
        rows.append(_amount_row(f"energy {kind}, MMBtu", total.energy_mmbtu, 2))
        rows.append(_amount_row(f"cost {kind}, {n.name(result.site.currency)}", total.cost, 2))
        rows.append(_amount_row(f"carbon dioxide {kind}, kg", total.co2_kg, 1))
    header = (
        "total",
        "value",
        "low",
        "high",
        "low, worst case",
        "high, worst case",
        "leaves out",
    )
    caption = (
        "All accounts together; less is positive. The range takes the accounts to err "
        "independently; the worst case takes all errors to lean the same way, since accounts "
        "share people and weather."
    )
    return _table(caption, header, rows, range(1, 6))


def _amount_row(name: str, amount: Amount, decimals: int) -> tuple[str, ...]:
    values = (amount.value, amount.low, amount.high, amount.worst_low, amount.worst_high)
    missing = ", ".join(n.mask(n.name(m)) for m in amount.missing)
    if amount.unavailable:
        name = f"{name}: {n.clean(amount.unavailable)}"
    return (name, *(n.plain(v, decimals) for v in values), missing)


def factors_table(account: AccountResult, currency: str) -> Table:
    """Price, carbon and heat content of one unit, with their sources."""
    unit = words.unit_word(account.unit, one=True)
    cost = account.price
    rows = [
        (
            f"price of the last {unit}",
            n.price(cost.per_unit, currency),
            n.clean(cost.unavailable or cost.source),
        )
    ]
    factors = (
        (f"carbon dioxide per {unit}, kg", account.co2),
        (f"heat per {unit}, MMBtu", account.mmbtu_per_unit),
    )
    for name, factor in factors:
        source = "no factor is known" if factor is None else words.factor_source(factor)
        rows.append((name, n.full(None if factor is None else factor.value), source))
    many = words.unit_word(account.unit)
    for side, per_unit, per_degree_day in account.k_factors:
        source = f"K factor, base 65 °F; the other way round: {n.full(per_degree_day)} {many} each"
        rows.append((f"degree-days a {unit}, {side} the work", n.full(per_unit), source))
    return _table(FACTORS, ("what", "value", "source"), rows, (1,))


def same_form_table(account: AccountResult) -> Table:
    """The change if both sides had the same form; shown when the forms differ."""
    rows = [
        (
            form_words(form),
            n.plain(e.value, 1),
            n.plain(e.low, 1),
            n.plain(e.high, 1),
            n.clean(e.unavailable or ""),
        )
        for form, e in account.savings.same_form
    ]
    caption = (
        f"The change in a normal year if both sides had the same form, "
        f"{words.unit_word(account.unit)}; a change of form alone cannot make a saving"
    )
    return _table(caption, ("form on both sides", "value", "low", "high", "note"), rows, (1, 2, 3))


def inputs_table(result: SiteResult, *, show_accounts: bool = False) -> Table:
    """Every input file with its fingerprint."""
    hide = _shown(show_accounts)
    rows = [(hide(n.name(file)), digest) for file, digest in result.site.inputs]
    return _table("Input files", ("file", "SHA-256"), rows)


def pairs_table(caption: str, pairs: Iterable[tuple[str, str]], what: str) -> Table:
    """Settings or versions."""
    rows = [(n.clean(name), n.clean(value)) for name, value in pairs]
    return _table(caption, (what, "value"), rows)


def hide_accounts(text: str, *, show_accounts: bool) -> str:
    """Text with account numbers masked, unless they are to be shown."""
    return text if show_accounts else n.mask(text)


def _shown(show_accounts: bool) -> Callable[[str], str]:
    return lambda text: hide_accounts(text, show_accounts=show_accounts)


def _count(number: int, what: str) -> str:
    return f"{number:,} {what}{'' if number == 1 else 's'}"
