"""Drivers in words, tables, JSON and the page; the sample school is read as it is."""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path

import pytest

from normalize.report.drivers import reading_of
from normalize.report.html import to_html
from normalize.report.json import to_json
from normalize.report.text import to_text
from normalize.savings.drivers import DriverTrial, Effect
from normalize.savings.results import Estimate
from normalize.savings.with_and_without import DriverAnswer, DriverReport
from normalize.site import AccountResult, SiteResult, assess, read_site

pytestmark = pytest.mark.kernel
SCHOOL = Path(__file__).resolve().parents[2] / "sample_data" / "tarn_lane_school"
TRUTH = json.loads((SCHOOL.parent / "truth.json").read_text(encoding="utf-8"))


@pytest.fixture(scope="module")
def school() -> SiteResult:
    return assess(read_site(SCHOOL))


def told_of(account: AccountResult) -> str:
    reading = reading_of(account)
    assert reading is not None
    return " ".join(reading.sentences).replace("\u00a0", " ")


def test_the_schools_effects_are_those_it_was_made_with(school: SiteResult) -> None:
    """Within three standard errors of truth.json."""
    drivers = school.accounts[0].drivers
    assert drivers is not None
    (trial,) = drivers.trials
    assert trial.kept
    each = TRUTH["sites"]["tarn_lane_school"]["gas"]["driver_each"]
    for effect, true in zip((trial.before, trial.after), each, strict=True):
        assert effect is not None
        assert effect.value == pytest.approx(true, abs=3 * effect.error)


def test_fitted_use_of_a_bill_holds_its_school_days(school: SiteResult) -> None:
    """Fits pass through the mean of their bills, drivers and all (day weights, an intercept)."""
    for side in ("before", "after"):
        mine = [p for p in school.accounts[0].periods if p.side == side]
        days = [p.end - p.start for p in mine]
        used = sum(p.use for p in mine)
        fitted = sum(p.fitted_per_day * d for p, d in zip(mine, days, strict=True))
        assert fitted == pytest.approx(used, rel=1e-9)


def test_both_answers_are_in_every_report(school: SiteResult) -> None:
    text = to_text(school)
    page = to_html(school)
    for words in ("What drives use beside the weather", "the weather alone", "a normal year has"):
        assert words in " ".join(text.split())
        assert words in page
    assert "at a normal amount of school days" in page
    told = json.loads(to_json(school))["accounts"][0]["drivers"]
    assert told["kept"] == ["school days"]
    assert [a["drivers"] for a in told["answers"]] == [["school days"], []]
    assert ("driver, gas", "school days, kept; normal: 175 a year") in school.settings


def test_an_account_without_drivers_says_nothing_of_them(school: SiteResult) -> None:
    account = replace(school.accounts[0], drivers=None)
    assert reading_of(account) is None


def test_a_driver_without_a_place_is_told_with_its_reason(school: SiteResult) -> None:
    hostile = "<b>units</b>\u202e 12345678"
    trial = DriverTrial(
        hostile, "level", "units.csv", (), False, "it is the same in every bill", 28.0, "said",
        Effect(3.1, 2.0, 1.55), None, 10.0, 9.0,
    )  # fmt: skip
    none = Estimate.none("no reason", confidence=0.9)
    report = DriverReport((trial,), (DriverAnswer((), True, none, none, 24, 24),))
    account = replace(school.accounts[0], drivers=report)
    words = told_of(account)
    assert "does not earn a place in the answer, because it is the same in every bill." in words
    page = to_html(replace(school, accounts=(account,)))
    assert "<b>units" not in page
    assert "\u202e" not in page
    assert "12345678" not in page


@pytest.mark.parametrize(
    ("kind", "value", "says"),
    [
        ("total", 41.0, "each one adds 41 ccf (standard error 2.0) before the work"),
        ("level", 3.14, "each one adds 3.1 ccf a day (standard error 2.0) before the work"),
        ("day type", -6.0, "each one takes off 6.0 ccf (standard error 2.0) before the work"),
    ],
)
def test_an_effect_in_words(school: SiteResult, kind: str, value: float, says: str) -> None:
    drivers = school.accounts[0].drivers
    assert drivers is not None
    trial = replace(
        drivers.trials[0], kind=kind, before=Effect(value, 2.0, value / 2.0), after=None
    )
    account = replace(school.accounts[0], drivers=replace(drivers, trials=(trial,)))
    assert says in told_of(account)
