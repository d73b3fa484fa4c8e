"""The report as one HTML file: no script, nothing fetched, the same bytes for the same result."""

from __future__ import annotations

import base64
import hashlib
from functools import cache
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final, NamedTuple

from normalize.errors import UnwritableReport
from normalize.fitting.forms import FORMS
from normalize.report import (
    breaks,
    drivers,
    look,
    parts,
    placebo_words,
    site_words,
    spread,
    svg,
    tables,
    words,
)
from normalize.report import numbers as n
from normalize.report.figure_breaks import breaks_figure
from normalize.report.figure_placebo import placebo_figure
from normalize.report.figure_spread import spread_figure
from normalize.report.figures import figures_of

if TYPE_CHECKING:
    from collections.abc import Callable

    from jinja2 import Environment

    from normalize.fitting.results import Fit, FormTried
    from normalize.report.tables import Table
    from normalize.site import AccountResult, SiteResult

TEMPLATES: Final = Path(__file__).parent / "templates"
POLICY: Final = "default-src 'none'; style-src 'sha256-{}'; base-uri 'none'; form-action 'none'"


class _Drawn(NamedTuple):
    """A figure as the template wants it: markup and the sentence beneath."""

    svg: Any
    caption: str


class _Side(NamedTuple):
    """One side's fit as the template wants it."""

    side: str
    sentence: str
    equation: str
    coefficients: Table | None
    tried: Table | None


def write_html(
    result: SiteResult, path: Path, *, show_accounts: bool = False, subject: str = "This site"
) -> None:
    """The report at that path. Raises UnwritableReport where it cannot be written."""
    text = to_html(result, show_accounts=show_accounts, subject=subject)
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_bytes(text.encode("utf-8"))
    except OSError as problem:
        raise UnwritableReport(
            f"the report cannot be written: {problem.strerror or problem}",
            where=str(path),
            next_step="Name another folder with --report.",
        ) from problem


def to_html(result: SiteResult, *, show_accounts: bool = False, subject: str = "This site") -> str:
    """The report as text. show_accounts : account numbers in full."""
    from markupsafe import Markup

    def say(text: str) -> str:
        return tables.hide_accounts(n.clean(text), show_accounts=show_accounts)

    classes: dict[str, str] = {}
    accounts = [
        _account(a, result, i, say, classes, show_accounts=show_accounts, subject=subject)
        for i, a in enumerate(result.accounts, start=1)
    ]
    css = f"\n{_tokens()}\n{_sheet()}{svg.style_rules(classes)}\n"
    digest = base64.b64encode(hashlib.sha256(css.encode("utf-8")).digest()).decode("ascii")
    page = _environment().get_template("report.html.j2")
    return page.render(
        policy=POLICY.format(digest),
        css=Markup(css),  # noqa: S704  our own style sheet; no user's text is in it
        accounts=accounts,
        **_site(result, say, show_accounts=show_accounts),
    )


def _site(result: SiteResult, say: Callable[[str], str], *, show_accounts: bool) -> dict[str, Any]:
    """What the page says of the whole site."""
    site = result.site
    return {
        "site": say(n.name(site.name)),
        "upgrades": [say(u) for u in site_words.upgrade_sentences(result)],
        "changes": [say(c) for c in site_words.change_sentences(result)],
        "totals": [say(t) for t in site_words.totals_of(result)],
        "answered": any(a.has_answer for a in result.accounts),
        "range_note": site_words.range_note(result.confidence),
        "cause": site_words.CAUSE,
        "cautions": [say(c) for c in site_words.cautions_of(result)],
        "equations": _equations(result),
        "methods": [say(m) for m in site_words.method_sentences(result)],
        "weather": [say(w) for w in site_words.weather_sentences(result)],
        "totals_table": _hidden(tables.totals_table(result), say),
        "settings": tables.pairs_table("Settings that mattered", result.settings, "setting"),
        "versions": tables.pairs_table("Versions", result.versions, "program"),
        "inputs": tables.inputs_table(result, show_accounts=show_accounts),
    }


def _account(
    account: AccountResult,
    result: SiteResult,
    number: int,
    say: Callable[[str], str],
    classes: dict[str, str],
    *,
    show_accounts: bool,
    subject: str,
) -> dict[str, Any]:
    """What the page says of one account."""
    which = words.which_of(account, result, show_accounts=show_accounts)
    answer = [say(s) for s in words.answer(account, subject=subject, which=which)]
    worth = [say(w) for w in words.worth(account, result.site.currency)]
    first = next((i for i, w in enumerate(worth) if w.startswith("At ")), 0)  # money if known
    save = account.savings
    has_bills = account.bills is not None
    return {
        "key": f"a{number}",
        "title": say(words.account_title(account)),
        "headline": answer[0],
        "sentences": [*answer[1:], *worth[:first], *worth[first + 1 :]] or answer,
        "worth_first": worth[first] if worth else "",
        "figures": _figures(account, result, number, classes),
        "years": _hidden(tables.years_table(account), say) if has_bills else None,
        "periods": _hidden(tables.periods_table(account), say) if account.periods else None,
        "cautions": [say(c) for c in account.cautions],
        "fits": [
            _side(
                "before", save.before, save.before_unavailable, account.tried_before, account, say
            ),
            _side("after", save.after, save.after_unavailable, account.tried_after, account, say),
        ]
        if has_bills
        else [],
        **_firm(account, result, number, say, classes),
        **_placebo(account, number, say, classes),
        **_drivers(account, say),
        **_breaks(account, number, say, classes),
        **_close(account, say),
        **_behind(account, result, say),
    }


def _firm(
    account: AccountResult,
    result: SiteResult,
    number: int,
    say: Callable[[str], str],
    classes: dict[str, str],
) -> dict[str, Any]:
    """How firm the answer is: sentences, picture and tables."""
    drawn = spread_figure(account, result, f"a{number}-spread")
    table, bills = spread.table_of(account, result), spread.bills_table(account, result)
    return {
        "firm": [say(s) for s in spread.sentences(account, result)],
        "firm_figure": _shown(drawn, classes),
        "firm_table": _hidden(table, say) if table is not None else None,
        "firm_bills": _hidden(bills, say) if bills is not None else None,
    }


def _placebo(
    account: AccountResult, number: int, say: Callable[[str], str], classes: dict[str, str]
) -> dict[str, Any]:
    """Invented work dates: sentences, picture and table."""
    table = placebo_words.table_of(account)
    return {
        "placebo": [say(s) for s in placebo_words.sentences(account)],
        "placebo_figure": _shown(placebo_figure(account, f"a{number}-placebo"), classes),
        "placebo_table": _hidden(table, say) if table is not None else None,
    }


def _breaks(
    account: AccountResult, number: int, say: Callable[[str], str], classes: dict[str, str]
) -> dict[str, Any]:
    """When use changed: sentences, picture and table."""
    table = breaks.table_of(account)
    return {
        "breaks": [say(s) for s in breaks.sentences(account)],
        "breaks_figure": _shown(breaks_figure(account, f"a{number}-breaks"), classes),
        "breaks_table": _hidden(table, say) if table is not None else None,
    }


def _drivers(account: AccountResult, say: Callable[[str], str]) -> dict[str, Any]:
    """What drives use beside the weather: sentences and tables."""
    told = drivers.reading_of(account)
    return {
        "drivers": [say(s) for s in told.sentences] if told else [],
        "drivers_answers": _hidden(told.answers, say) if told else None,
        "drivers_tried": _hidden(told.tried, say) if told else None,
    }


def _close(account: AccountResult, say: Callable[[str], str]) -> dict[str, Any]:
    """What the change is made of, the heat loss, and what the work should have saved."""
    told = parts.close_reading(account)

    def hidden(table: Table | None) -> Table | None:
        return None if table is None else _hidden(table, say)

    return {
        "parts": [say(s) for s in told.parts],
        "heat_loss": [say(s) for s in told.heat_loss],
        "expectation": [say(s) for s in told.expectation],
        "expectation_cautions": [say(s) for s in told.cautions],
        "parts_table": hidden(told.parts_table),
        "heat_loss_table": hidden(told.heat_loss_table),
        "expectation_table": hidden(told.expectation_table),
    }


def _shown(picture: svg.Picture | None, classes: dict[str, str]) -> _Drawn | None:
    """A picture as the template wants it."""
    from markupsafe import Markup

    if picture is None:
        return None
    body = svg.with_classes(picture.inline(), classes)
    return _Drawn(Markup(body), n.clean(picture.caption))  # noqa: S704  escaped in svg.Picture


def _behind(
    account: AccountResult, result: SiteResult, say: Callable[[str], str]
) -> dict[str, Any]:
    """What stands behind one account's answer, for those who check it."""
    save = account.savings
    has_bills = account.bills is not None
    return {
        "statistics": _hidden(tables.statistics_table(account), say)
        if save.before is not None or save.after is not None
        else None,
        "same_form": _hidden(tables.same_form_table(account), say) if save.same_form else None,
        "checks": _hidden(tables.checks_table(account.checks), say) if account.checks else None,
        "weights": tables.weights_table(account),
        "checks_summary": say(_checks_summary(account)),
        "factors": _hidden(tables.factors_table(account, result.site.currency), say),
        "ledger": _hidden(tables.ledger_table(account), say) if has_bills else None,
        "ledger_summary": f"Ledger: {tables.ledger_summary(account)}",
        "reading": say("; ".join(account.bills.reading)) if account.bills is not None else "",
    }


def _figures(
    account: AccountResult, result: SiteResult, number: int, classes: dict[str, str]
) -> dict[str, _Drawn | None]:
    drawn = figures_of(account, result.site.year, number)
    return {
        "temperature": _shown(drawn.temperature, classes),
        "years": _shown(drawn.years, classes),
        "time": _shown(drawn.time, classes),
        "residuals": _shown(drawn.residuals, classes),
        "parts": _shown(drawn.parts, classes),
    }


def _side(
    side: str,
    fit: Fit | None,
    why: str,
    tried: tuple[FormTried, ...],
    account: AccountResult,
    say: Callable[[str], str],
) -> _Side:
    forms = _hidden(tables.forms_table(tried, side), say) if tried else None
    if fit is None:
        reason = say(why) or "no reason was given"
        return _Side(
            side, f"There is no fit {side} the work: {words.stop(reason)}", "", None, forms
        )
    unit = words.unit_word(account.unit)
    from_bills = f"{fit.n_periods} periods, {fit.n_days:,} days"
    aside = f", {fit.set_aside} set aside" if fit.set_aside else ""
    sentence = f"{words.upper(side)} the work ({from_bills}{aside}): {tables.form_words(fit.form)}."
    table = _hidden(tables.coefficients_table(fit, unit, side), say)
    return _Side(side, sentence, equation(fit, account.unit), table, forms)


def equation(fit: Fit, unit: str) -> str:
    """A fit as an equation with its numbers."""
    text = f"{words.unit_word(unit)} a day = {n.short(fit.base_load)}"
    terms = (
        (fit.line_slope, "T"),
        (fit.heating_slope, f"({n.plain(fit.balance_heating_f, 1)} − T)⁺"),
        (fit.cooling_slope, f"(T − {n.plain(fit.balance_cooling_f, 1)})⁺"),
    )
    for slope, of in terms:
        if slope is not None:
            sign = n.MINUS if slope < 0 else "+"
            text += f" {sign} {n.short(abs(slope))}·{of}"
    return text


def _equations(result: SiteResult) -> list[str]:
    """The forms that were chosen anywhere, each once, in the order of the list of forms."""
    fits = [f for a in result.accounts for f in (a.savings.before, a.savings.after)]
    chosen = {f.form for f in fits if f is not None}
    return [f"{form.name}: {form.equation}" for form in FORMS.values() if form.name in chosen]


def _checks_summary(account: AccountResult) -> str:
    missed = [
        c.name if c.side == "both" else f"{c.name} {c.side}".strip()
        for c in account.checks
        if c.meets is False
    ]
    met = sum(c.meets is True for c in account.checks)
    if not missed:
        return f"Checks: {met} met, none missed"
    return f"Checks: {met} met, {len(missed)} not met ({', '.join(missed)})"


def _hidden(table: Table, say: Callable[[str], str]) -> Table:
    """The table with every cell cleaned and account numbers masked."""
    rows = tuple(tuple(say(cell) for cell in row) for row in table.rows)
    return tables.Table(table.caption, table.header, rows, table.figures)


def _tokens() -> str:
    """The look's tokens as CSS: light, and dark on screens that ask for it."""
    light = "".join(f"--{name}:{pair[0]};" for name, pair in look.TOKENS.items())
    dark = "".join(f"--{name}:{pair[1]};" for name, pair in look.TOKENS.items())
    return (
        f":root{{{light}--serif:{look.SERIF};}}\n"
        f"@media screen and (prefers-color-scheme: dark){{:root{{{dark}}}}}"
    )


@cache
def _sheet() -> str:
    return (TEMPLATES / "report.css").read_text(encoding="utf-8")


@cache
def _environment() -> Environment:
    from jinja2 import Environment, FileSystemLoader, StrictUndefined

    return Environment(
        loader=FileSystemLoader(TEMPLATES, encoding="utf-8"),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=False,
        auto_reload=False,
    )
