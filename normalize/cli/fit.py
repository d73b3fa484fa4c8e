"""``normalize fit FOLDER``: the fits alone, every form that was tried."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import click

from normalize.cli.console import say, show
from normalize.cli.options import (
    FOLDER,
    NO_WORK,
    STDOUT,
    assess_folder,
    input_files,
    json_option,
    write_json,
)
from normalize.cli.tables import paragraph, table
from normalize.defaults import CONFIDENCE

if TYPE_CHECKING:
    from normalize.fitting.results import Fit, FormTried
    from normalize.site import AccountResult, SiteResult

DIGITS = 4  # significant; all are in the JSON
HEAD = (
    "form",
    "base load",
    "heating",
    "below °F",
    "cooling",
    "above °F",
    "line",
    "R²",
    "CV(RMSE)",
    "BIC",
)


@click.command(
    "fit",
    epilog="Example: normalize fit my-house",
    short_help="The fits alone: every form that was tried, before and after.",
)
@click.argument("folder", type=FOLDER)
@json_option
def command(folder: Path, json_to: str | None) -> int | None:
    """Show how use answers to outdoor temperature in FOLDER, before and after the work.

    Every form that was tried is listed with its numbers; the chosen one is marked, the others
    carry the reason why they were set aside.
    """
    result = assess_folder(folder, confidence=CONFIDENCE, without_work=True)
    if json_to is not None:
        write_json(to_json(result), json_to, inputs=input_files(result))
    if json_to != STDOUT:
        show(to_text(result))
    if any(chosen(a.tried_before) or chosen(a.tried_after) for a in result.accounts):
        return None
    say("no account could be fitted; the reasons are given above")
    return 1


def chosen(tried: tuple[FormTried, ...]) -> Fit | None:
    """The fit of the chosen form, or None."""
    return next((form.fit for form in tried if form.chosen), None)


def to_text(result: SiteResult) -> str:
    """Every form tried on either side of every account, as tables."""
    from normalize.report.numbers import mask, name

    blocks = [mask(name(result.site.name))]
    for account in result.accounts:
        blocks.append(_heading(account))
        if account.unavailable and not chosen(account.tried_before):
            blocks.append(paragraph(account.unavailable, indent="  "))
            continue
        for side, tried, reason in _sides(account, result):
            blocks.append(_side_text(side, tried, reason))
    blocks.append(
        "Use is per day; heating, cooling and line are slopes, per °F and day; * marks the chosen "
        "form.\nR² never sets a form aside."
    )
    return "\n\n".join(blocks)


def _heading(account: AccountResult) -> str:
    from normalize.report.numbers import mask, name

    words = [mask(name(account.account)), account.fuel, account.unit and f"in {account.unit}"]
    return ", ".join(dict.fromkeys(word for word in words if word))  # no word twice


def _sides(
    account: AccountResult, result: SiteResult
) -> tuple[tuple[str, tuple[FormTried, ...], str], ...]:
    savings = account.savings
    if any(u.name == NO_WORK for u in result.site.upgrades):
        return (("the last 24 months", account.tried_before, savings.before_unavailable),)
    return (
        ("before the work", account.tried_before, savings.before_unavailable),
        ("after the work", account.tried_after, savings.after_unavailable),
    )


def _side_text(side: str, tried: tuple[FormTried, ...], reason: str) -> str:
    lines = [f"  {side}"]
    if reason:
        lines.append(paragraph(reason, indent="  "))
    fitted = [(form, form.fit) for form in tried if form.fit is not None]
    if fitted:
        n = max(fit.n_periods for _, fit in fitted)
        lines[0] += f", {n} periods"
        grid = table(HEAD, [_row(form, fit) for form, fit in fitted])
        lines += [f"  {line}" for line in grid.splitlines()]
    lines += [
        paragraph(f"{form.form}: set aside because {form.reason}.", indent="  ")
        for form in tried
        if form.reason
    ]
    return "\n".join(lines)


def _row(form: FormTried, fit: Fit) -> list[str]:
    from normalize.report.numbers import plain, significant

    return [
        f"{form.form} *" if form.chosen else form.form,
        significant(fit.base_load, DIGITS),
        _slope(fit.heating_slope),
        _balance(fit.balance_heating_f),
        _slope(fit.cooling_slope),
        _balance(fit.balance_cooling_f),
        _slope(fit.line_slope),
        plain(fit.r2, 3),
        plain(fit.cv_rmse, 3),
        plain(fit.bic, 1),
    ]


def _slope(value: float | None) -> str:
    from normalize.report.numbers import significant

    return "" if value is None else significant(value, DIGITS)


def _balance(value: float | None) -> str:
    from normalize.report.numbers import plain

    return "" if value is None else plain(value, 1)


def to_json(result: SiteResult) -> str:
    """The same as JSON, schema 1; the keys are those of ``Fit``."""
    import json
    from dataclasses import asdict

    def one(form: FormTried) -> dict[str, object]:
        numbers = asdict(form.fit) if form.fit is not None else None
        return {
            "form": form.form,
            "chosen": form.chosen,
            "reason": form.reason or None,
            "fit": finite(numbers),
        }

    accounts = [
        {
            "account": account.account,
            "fuel": account.fuel,
            "unit": account.unit,
            "unavailable": account.unavailable or None,
            "before": [one(form) for form in account.tried_before],
            "after": [one(form) for form in account.tried_after],
        }
        for account in result.accounts
    ]
    whole = {"schema": 1, "site": result.site.name, "accounts": accounts}
    return json.dumps(whole, indent=2, ensure_ascii=False, allow_nan=False)


def finite(value: object) -> object:
    """The same with null for every number that is not finite, which JSON cannot carry.

    >>> finite({"a": (1.0, float("nan"))})
    {'a': [1.0, None]}
    """
    if isinstance(value, dict):
        return {key: finite(item) for key, item in value.items()}
    if isinstance(value, list | tuple):
        return [finite(item) for item in value]
    if isinstance(value, float) and not abs(value) < float("inf"):
        return None
    return value
