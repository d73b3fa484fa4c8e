"""The answer with one thing changed: each row is the comparison asked otherwise.

Identities: a variation equals what compare() or the fits say when asked so directly.  The
average's formula: Buckland, Burnham & Augustin 1997, Biometrics 53:603-618, worked by hand.
"""

from __future__ import annotations

import math
from dataclasses import replace
from statistics import NormalDist

import numpy as np
import pytest

from normalize.fitting.align import align
from normalize.fitting.columns import BIC, STATUS
from normalize.fitting.fit import chosen_of, fit_periods
from normalize.savings.again import Asked
from normalize.savings.compare import Comparison, compare
from normalize.savings.results import Estimate
from normalize.savings.sides import Work
from normalize.savings.variations import (
    AVERAGED,
    CRITERION,
    ONE_BILL,
    OTHER_FORMS,
    SAME_FORM,
    WEIGHTS,
    WINDOW,
    Variation,
    average,
    form_weights,
    variations,
)
from tests.savings.test_answers import STATION, house, year

pytestmark = pytest.mark.kernel
FORMS = ("flat", "heating")


def varied(
    before: int = 24, after: int = 18, noise: float = 0.08, forms: tuple[str, ...] = FORMS
) -> tuple[tuple[Variation, ...], Comparison, Asked, Work]:
    bills, work = house(before, after, noise=noise)
    aligned = align(bills.periods, STATION)
    found = compare(aligned, work, year(), forms=forms)
    asked = Asked(aligned, year(), forms, 0.90)
    return variations(asked, found.labels, work, found.savings), found, asked, work


def kinds(rows: tuple[Variation, ...], changes: str) -> list[Variation]:
    return [v for v in rows if v.changes == changes]


def test_every_kind_is_there_and_each_bill_once() -> None:
    rows, found, _, _ = varied()
    assert {v.changes for v in rows} == {SAME_FORM, WEIGHTS, CRITERION, ONE_BILL, WINDOW}
    used = [i + 1 for i, label in enumerate(found.labels) if label in ("before", "after")]
    assert [v.number for v in kinds(rows, ONE_BILL)] == used


def test_a_form_that_fits_far_worse_is_shown_and_is_no_rival() -> None:
    rows, _, _, _ = varied()
    flat = next(v for v in rows if v.name == "flat on both sides")
    assert "far worse" in flat.far
    assert flat.normalized.available
    assert not any(v.far for v in rows if v.changes != SAME_FORM)


def test_the_same_form_on_both_sides_is_what_compare_says_when_forms_differ() -> None:
    """Enough noise that the two sides choose differently, as a flip of form does."""
    for noise in (0.25, 0.3, 0.35, 0.4, 0.45, 0.5):
        rows, found, _, _ = varied(12, 12, noise, ("flat", "heating", "heating and cooling"))
        if found.savings.same_form:
            break
    assert found.savings.same_form
    mine = {v.form_before: v.normalized for v in kinds(rows, SAME_FORM)}
    for form, estimate in found.savings.same_form:
        if estimate.available:
            assert mine[form] == estimate


def test_weights_and_criterion_are_those_of_a_fit_asked_so() -> None:
    rows, _, asked, work = varied()
    al = asked.aligned
    before = al.only(al.end <= work.start, "after")
    after = al.only(al.start >= work.end, "before")
    sides = [chosen_of(fit_periods(side, forms=FORMS, weights="equal")) for side in (before, after)]
    assert sides[0] is not None
    assert sides[1] is not None
    (equal,) = kinds(rows, WEIGHTS)
    expected = sides[0].nac(year()) - sides[1].nac(year())
    assert equal.normalized.value == pytest.approx(expected, rel=1e-9)
    (aicc,) = kinds(rows, CRITERION)
    chosen = chosen_of(fit_periods(before, forms=FORMS, criterion="aicc"))
    assert chosen is not None
    assert aicc.form_before == chosen.form


def test_a_wider_window_is_the_comparison_with_longer_work() -> None:
    rows, found, asked, work = varied()
    al = asked.aligned
    last = [i for i, label in enumerate(found.labels) if label == "before"][-1]
    first = next(i for i, label in enumerate(found.labels) if label == "after")
    wider = Work(int(al.start[last]), int(al.end[first]))
    expected = compare(al, wider, year(), forms=FORMS).savings
    row = next(v for v in rows if v.name.startswith("one more bill"))
    assert row.normalized == expected.normalized
    assert row.avoided.value == expected.avoided.value
    assert wider.start < work.start


def test_a_shorter_baseline_leaves_the_other_side_alone() -> None:
    rows, _, asked, work = varied(24, 18)
    row = next(v for v in rows if v.name == "a baseline of 12 months")
    ends = asked.aligned.end[asked.aligned.end <= work.start]
    middle = 0.5 * (asked.aligned.start + asked.aligned.end)
    keep = (middle >= ends.max() - 12 * 30.4375) | (asked.aligned.start >= work.end)
    short = asked.aligned.only(keep, "too old")
    assert row.normalized == compare(short, work, year(), forms=FORMS).savings.normalized


def test_weights_of_forms_follow_their_bic() -> None:
    """exp(−½ΔBIC), by hand: 1 : e⁻¹ : 0 (11 worse) and nothing for a form set aside."""
    rows = np.full((6, 24), np.nan)
    rows[[0, 1, 2, 3], STATUS] = (0, 0, 0, 3)
    rows[[0, 1, 2, 3], BIC] = (5.0, 7.0, 16.0, 4.0)
    weight = form_weights(rows, np.ones(6, dtype=bool))
    e = math.exp(-1.0)
    assert weight.tolist() == pytest.approx([1 / (1 + e), e / (1 + e), 0, 0, 0, 0])


def estimate(value: float, half: float) -> Estimate:
    return Estimate(
        value=value, low=value - half, high=value + half, plain_low=value - half,
        plain_high=value + half, confidence=0.90,
    )  # fmt: skip


def test_the_average_by_hand() -> None:
    """Three estimates; se = Σ w √(se² + (θ − θ̄)²), the range θ̄ ± z·se."""
    z = NormalDist().inv_cdf(0.95)
    share = (0.5, 0.3, 0.2)
    values, halves = (10.0, 20.0, 0.0), (3.0, 4.0, 5.0)
    found = average([estimate(v, h) for v, h in zip(values, halves, strict=True)], share, over=50.0)
    assert found.value == pytest.approx(11.0)
    se = 0.5 * math.hypot(3 / z, 1) + 0.3 * math.hypot(4 / z, 9) + 0.2 * math.hypot(5 / z, 11)
    assert found.low == pytest.approx(11.0 - z * se)
    assert found.high == pytest.approx(11.0 + z * se)
    assert found.fraction == pytest.approx(0.22)


def test_the_average_of_forms_that_cannot_be_told_apart_is_wider_than_either_alone() -> None:
    """A weak heating signal: flat and heating are both alive, and disagree."""
    found = ()
    for noise in (0.4, 0.5, 0.6, 0.7, 0.8, 0.9, 1.0):
        rows, _, _, _ = varied(12, 12, noise)
        found = kinds(rows, AVERAGED)
        if found:
            break
    assert found
    assert found[0].normalized.available
    assert kinds(rows, OTHER_FORMS) or kinds(rows, SAME_FORM)
    low, high = found[0].normalized.low, found[0].normalized.high
    assert low is not None
    assert high is not None
    assert low < (found[0].normalized.value or 0.0) < high


def test_what_the_answer_does_not_know_no_variation_claims_to_know() -> None:
    bills, work = house(24, 5, noise=0.08)
    aligned = align(bills.periods, STATION)
    found = compare(aligned, work, year(), forms=FORMS)
    assert not found.savings.normalized.available
    rows = variations(Asked(aligned, year(), FORMS, 0.90), found.labels, work, found.savings)
    assert rows
    assert all(v.normalized == found.savings.normalized for v in rows)
    assert any(v.avoided.available for v in rows)


def test_a_stated_balance_temperature_leaves_bills_and_windows() -> None:
    bills, work = house(10, 10, noise=0.5)
    aligned = align(bills.periods, STATION)
    found = compare(aligned, work, year(), forms=FORMS, delivered=True)
    assert found.stated_f is not None
    asked = Asked(aligned, year(), FORMS, 0.90, stated=True)
    rows = variations(asked, found.labels, work, found.savings)
    assert {v.changes for v in rows} <= {ONE_BILL, WINDOW}
    assert len(kinds(rows, ONE_BILL)) == 20


def test_twice_the_same() -> None:
    first, _, _, _ = varied()
    second, _, _, _ = varied()
    assert first == second
    assert replace(first[0]) == second[0]
