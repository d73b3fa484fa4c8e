"""What drives use beside the weather, as sentences, tables and JSON: with and without."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, Any, Final, NamedTuple

from normalize.report import numbers as n
from normalize.report import words
from normalize.report.tables import Table

if TYPE_CHECKING:
    from collections.abc import Callable

    from normalize.savings.drivers import DriverTrial, Effect
    from normalize.savings.results import Estimate
    from normalize.savings.with_and_without import DriverAnswer, DriverReport
    from normalize.site import AccountResult

YEAR: Final = 365  # days of a normal year
SIDE_BY_SIDE: Final = (
    "Whether a driver belongs is judged with the balance temperature as found and with the bills' "
    "errors taken as independent of each other; where they are alike, a driver is kept a little "
    "too easily."
)
Json = dict[str, Any]


class DriverReading(NamedTuple):
    """What a report says of an account's drivers."""

    sentences: tuple[str, ...]
    tried: Table
    answers: Table


def reading_of(account: AccountResult) -> DriverReading | None:
    """Sentences and tables, or None for an account that names no driver."""
    report = account.drivers
    if report is None or not report.trials:
        return None
    return DriverReading(
        sentences(account, report), tried_table(account, report), answers_table(account, report)
    )


def sentences(account: AccountResult, report: DriverReport) -> tuple[str, ...]:
    """What each driver does, what the answer is without it, and why others are left out."""
    out = [_kept(trial, account.unit) for trial in report.trials if trial.kept]
    alone = next((a for a in report.answers if not a.drivers and not a.reported), None)
    if alone is not None and report.kept:
        out.append(f"With the weather alone, the finding would be: {_finding(account, alone)}.")
    for trial in report.trials:
        if not trial.kept:
            why = words.stop(n.clean(trial.reason))
            out.append(f"{_title(trial.name)}: does not earn a place in the answer, because {why}")
    if any(t.before is not None or t.after is not None for t in report.trials):
        out.append(SIDE_BY_SIDE)
    return tuple(out)


def _title(name: str) -> str:
    return words.upper(n.name(name))


def _kept(trial: DriverTrial, unit: str) -> str:
    """What one more does on either side, and how many a normal year has."""
    sides = [
        (side, effect)
        for side, effect in (("before", trial.before), ("after", trial.after))
        if effect is not None
    ]
    told = [f"{_adds(effect, trial.kind, unit)} {side} the work" for side, effect in sides]
    verbs = {effect.value >= 0.0 for _, effect in sides}
    if len(told) == 2 and len(verbs) == 1:
        told[1] = told[1].split(" ", 1)[1].removeprefix("off ")
    normal = f"a normal year has {normal_words(trial)} ({n.clean(trial.normal_from)})"
    return (
        f"{_title(trial.name)} (from {n.clean(trial.source)}): each one {' and '.join(told)}; "
        f"{normal}."
    )


def _adds(effect: Effect, kind: str, unit: str) -> str:
    """What one more does to use: adds 41 kWh (standard error 6.2)."""
    a_day = " a day" if kind == "level" else ""
    verb = "adds" if effect.value >= 0.0 else "takes off"
    amount = n.significant(abs(effect.value))
    error = n.significant(effect.error)
    return f"{verb} {amount} {words.unit_word(unit)}{a_day} (standard error {error})"


def normal_words(trial: DriverTrial) -> str:
    """A driver's normal amount: a year's sum, or the level on a day."""
    if trial.kind == "level":
        return f"{n.short(trial.normal)} on a day"
    return n.short(trial.normal * YEAR)


def _estimate(answer: DriverAnswer, *, normal: bool) -> Estimate:
    return answer.normalized if normal else answer.avoided


def _finding(account: AccountResult, answer: DriverAnswer) -> str:
    """The finding of another set of drivers, with its range."""
    estimate = _estimate(answer, normal=account.savings.normalized.available)
    if not estimate.available:
        return f"none ({n.clean(estimate.unavailable or '')})"
    spread, form = words.in_percent(estimate), words.percent_form()
    if not n.known(spread.value):
        spread, form = words.in_units(estimate), words.unit_form(words.unit_word(account.unit))
    digits = words.digits_for(spread, form)
    told = words.finding(estimate, account.fuel, account.unit)
    return f"{told[:1].lower()}{told[1:]}, {words.span_words(spread, form, digits)}"


def tried_table(account: AccountResult, report: DriverReport) -> Table:
    """Every driver with its effect on either side, its criterion and what became of it."""
    rows = [
        (
            n.name(t.name),
            normal_words(t),
            *_effect(t.before),
            *_effect(t.after),
            n.plain(t.bic_with, 1),
            n.plain(t.bic_without, 1),
            "kept" if t.kept else n.clean(t.reason),
        )
        for t in report.trials
    ]
    head = (
        "driver", "normal year", "effect before", "t", "effect after", "t", "BIC with",
        "BIC without", "outcome",
    )  # fmt: skip
    caption = (
        f"Drivers tried: what one more of each adds to use, {words.unit_word(account.unit)} (a "
        "day, for a level). BIC is that of both sides together; less is better."
    )
    return Table(caption, head, tuple(rows), frozenset(range(2, 8)))


def _effect(effect: Effect | None) -> tuple[str, str]:
    if effect is None:
        return n.UNKNOWN, n.UNKNOWN
    return n.short(effect.value), n.plain(effect.t, 1)


def answers_table(account: AccountResult, report: DriverReport) -> Table:
    """The answer with and without each driver, the reported one first."""
    normal = account.savings.normalized.available
    rows = []
    for answer in report.answers:
        e = _estimate(answer, normal=normal)
        forms = [f for f in (answer.form_before, answer.form_after) if f]
        rows.append(
            (
                label(answer),
                n.plain(e.value, 1),
                n.plain(e.low, 1),
                n.plain(e.high, 1),
                n.percent_plain(e.fraction),
                n.percent_plain(answer.cv_before),
                n.percent_plain(answer.cv_after),
                f"{answer.n_before}",
                f"{answer.n_after}",
                ", then ".join(dict.fromkeys(forms)),
            )
        )
    head = (
        "with", "change", "low", "high", "share", "CV before", "CV after", "bills before",
        "bills after", "form",
    )  # fmt: skip
    when = "in a normal year" if normal else "since the work"
    caption = (
        f"The change {when} with and without each driver, {words.unit_word(account.unit)}; less "
        "is positive. CV is CV(RMSE)."
    )
    return Table(caption, head, tuple(rows), frozenset(range(1, 9)))


def label(answer: DriverAnswer) -> str:
    """Which drivers an answer has."""
    names = ", ".join(n.name(d) for d in answer.drivers) or "the weather alone"
    return f"{names} (as reported)" if answer.reported else names


def drivers_json(account: AccountResult, estimate: Callable[[Estimate], Json]) -> Json | None:
    """The key ``drivers`` of an account (docs/json.md).  estimate : how an Estimate is written."""
    report = account.drivers
    if report is None:
        return None
    return {
        "kept": list(report.kept),
        "tried": [_trial_json(t) for t in report.trials],
        "answers": [
            {
                "drivers": list(a.drivers),
                "reported": a.reported,
                "normalized": estimate(a.normalized),
                "avoided": estimate(a.avoided),
                "form_before": a.form_before or None,
                "form_after": a.form_after or None,
                "n_before": a.n_before,
                "n_after": a.n_after,
                "cv_rmse_before": _number(a.cv_before),
                "cv_rmse_after": _number(a.cv_after),
            }
            for a in report.answers
        ],
    }


def _trial_json(t: DriverTrial) -> Json:
    return {
        "name": t.name,
        "kind": t.kind,
        "source": t.source,
        "reading": list(t.reading),
        "kept": t.kept,
        "reason": t.reason or None,
        "normal_a_day": _number(t.normal),
        "normal_from": t.normal_from,
        "before": _effect_json(t.before),
        "after": _effect_json(t.after),
        "bic_with": _number(t.bic_with),
        "bic_without": _number(t.bic_without),
    }


def _effect_json(effect: Effect | None) -> Json | None:
    if effect is None:
        return None
    return {
        "value": _number(effect.value),
        "standard_error": _number(effect.error),
        "t": _number(effect.t),
    }


def _number(value: float | None) -> float | None:
    return float(value) if value is not None and math.isfinite(value) else None
