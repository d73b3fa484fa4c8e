"""The answer without each bill, and what each bill weighs in a fit."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from normalize.bills.periods import Periods
from normalize.fitting.align import align
from normalize.savings.again import Asked, ask_again
from normalize.savings.compare import compare
from normalize.savings.influence import MOST_SINGLE, without_each
from normalize.savings.sides import codes
from tests.savings.test_answers import STATION, TEMP, house, year

pytestmark = pytest.mark.kernel


def one_less(p: Periods, at: int) -> Periods:
    keep = np.arange(p.n) != at
    return replace(
        p, start=p.start[keep], end=p.end[keep], use=p.use[keep], cost=p.cost[keep],
        estimated=p.estimated[keep], joined=p.joined[keep],
    )  # fmt: skip


@pytest.mark.parametrize("delivered", [False, True])
def test_asked_of_the_same_bills_it_gives_the_same_answer(delivered: bool) -> None:
    bills, work = house(24, 18, noise=0.08)
    if delivered:  # too few and too noisy to place a balance temperature
        bills, work = house(10, 10, noise=0.5)
    aligned = align(bills.periods, STATION)
    found = compare(aligned, work, year(), forms=("flat", "heating"), delivered=delivered)
    assert (found.stated_f is not None) == delivered
    asked = Asked(aligned, year(), ("flat", "heating"), 0.90, stated=found.stated_f is not None)
    again = ask_again(asked, codes(found.labels)[None, :])
    assert again.avoided(0).value == found.savings.avoided.value
    assert again.avoided(0).low == found.savings.avoided.low
    if found.savings.normalized.available:
        assert again.normalized(0) == found.savings.normalized


def test_without_each_is_the_comparison_with_the_bill_taken_away() -> None:
    """A bill taken out of the file and one left out of the batch leave the same numbers."""
    bills, work = house(20, 16, noise=0.08)
    aligned = align(bills.periods, STATION)
    found = compare(aligned, work, year(), forms=("flat", "heating"))
    asked = Asked(aligned, year(), ("flat", "heating"), 0.90)
    without = without_each(asked, found.labels)
    assert [w.number for w in without] == list(range(1, 37))
    assert [w.side for w in without] == ["before"] * 20 + ["after"] * 16
    for at in (0, 7, 19, 20, 35):
        left = align(one_less(bills.periods, at), STATION)
        alone = compare(left, work, year(), forms=("flat", "heating")).savings
        assert without[at].normalized == alone.normalized
        assert without[at].avoided.value == alone.avoided.value
        assert without[at].avoided.high == alone.avoided.high


def test_a_bill_that_is_not_used_has_no_row() -> None:
    bills, work = house(24, 18, noise=0.05)
    aligned = align(bills.periods, STATION)
    found = compare(
        aligned, work, year(), forms=("flat",), occupied_since=int(bills.periods.start[3])
    )
    rows = without_each(Asked(aligned, year(), ("flat",), 0.90), found.labels)
    assert rows[0].number == 4
    assert len(rows) == 39


def test_daily_readings_are_not_left_out_one_by_one() -> None:
    """Of a thousand readings no single one weighs much, and each would cost a refit."""
    start = 300 + np.arange(900, dtype=np.int32)
    use = 0.6 + 0.12 * np.maximum(61 - TEMP[start], 0)
    daily = Periods(
        start, start + 1, use, np.full(900, np.nan), np.zeros(900, bool), np.ones(900, np.int32)
    )
    aligned = align(daily, STATION)
    labels = ("before",) * 450 + ("after",) * 450
    assert without_each(Asked(aligned, year(), ("flat",), 0.90), labels) == ()
    assert MOST_SINGLE < 900
