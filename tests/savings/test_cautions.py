"""Cautions appear where they apply, and only there."""

from __future__ import annotations

import pytest

from normalize.savings.cautions import Circumstances, cautions_of, site_cautions
from normalize.savings.results import Estimate, Price, Savings
from normalize.savings.worth import AVERAGE, FROM_BILLS

NONE = Estimate.none("nothing yet")
PLAIN = Circumstances("natural gas", False, False, False, (), (False, False))


def saved(fraction: float) -> Savings:
    e = Estimate(
        value=100 * fraction, low=100 * fraction - 5, high=100 * fraction + 5, fraction=fraction
    )
    return Savings(None, None, NONE, NONE, e, NONE)


def told(about: Circumstances, *, fraction: float = 0.2, source: str = FROM_BILLS) -> str:
    return " ".join(cautions_of(saved(fraction), Price(1.0, source), about))


def with_(**changes: object) -> Circumstances:
    from dataclasses import replace

    return replace(PLAIN, **changes)


@pytest.mark.parametrize(
    ("about", "words"),
    [
        (with_(by_bill=True), "means printed on the bills"),
        (with_(delivered=True), "between full fills"),
        (with_(estimated_near_work=True), "estimated reading"),
        (with_(changes=("a baby",)), "a baby"),
        (with_(stated_f=60.0), "60\u00a0°F was taken"),
        (with_(works=2, between=7), "all 2 upgrades together; 7 bills between"),
        (with_(used_nothing=True), "says zero"),
        (with_(bill_cautions=("odd",)), "odd"),
    ],
)
def test_each_circumstance_has_its_caution(about: Circumstances, words: str) -> None:
    assert words in told(about)
    assert words not in told(PLAIN)


def test_a_plain_account_has_no_caution() -> None:
    assert told(PLAIN) == ""


def test_an_average_price_is_called_overstated() -> None:
    assert "overstated" in told(PLAIN, source=AVERAGE)


def test_a_change_by_more_than_half_is_questioned() -> None:
    assert "fell by more than half" in told(PLAIN, fraction=0.6)
    assert "rose by more than half" in told(PLAIN, fraction=-0.6)


def test_fuels_that_trade_places_are_named() -> None:
    pair = [("oil", saved(0.6)), ("electricity", saved(-0.6))]
    assert "traded places" in " ".join(site_cautions(pair))
    assert site_cautions([("oil", Savings(None, None, NONE, NONE, NONE, NONE))]) == ()
