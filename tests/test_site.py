"""The whole pipeline on the sample sites: truth inside the ranges, cautions on the weather.

The truth is what made the sample bills (sample_data/truth.json, written by their script).
"""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path

import pytest

from normalize.savings.results import Estimate
from normalize.site import Site, SiteResult, assess, read_site

pytestmark = pytest.mark.kernel
SAMPLES = Path(__file__).resolve().parent.parent / "sample_data"
SITES = ("quince_street", "harrow_farm", "mill_library", "tarn_lane_school")
TRUTH = json.loads((SAMPLES / "truth.json").read_text(encoding="utf-8"))


@pytest.fixture(scope="module", params=SITES)
def assessed(request: pytest.FixtureRequest) -> tuple[str, SiteResult]:
    return request.param, assess(read_site(SAMPLES / request.param), confidence=0.99)


def test_the_true_saving_lies_in_the_range(assessed: tuple[str, SiteResult]) -> None:
    """At 99 %, seven accounts together miss by chance in about one run of fifteen drawn anew;
    these are fixed.
    """
    site, result = assessed
    for account in result.accounts:
        truth = TRUTH["sites"][site][account.account]
        found = account.savings.normalized
        assert found.low is not None
        assert found.high is not None
        assert found.low <= truth["normalized"] <= found.high
        assert found.verdict != ("increase" if truth["normalized"] > 0 else "reduction")


def test_every_row_has_one_fate_and_every_period_one_side(
    assessed: tuple[str, SiteResult],
) -> None:
    for account in assessed[1].accounts:
        assert account.bills is not None
        rows = {(e.file, e.line) for e in account.bills.ledger}
        assert rows >= {(r.file, r.line) for r in account.bills.rows}
        assert len(account.periods) == account.bills.periods.n
        used = sum(p.side in ("before", "after") for p in account.periods)
        fits = (account.savings.before, account.savings.after)
        assert used == sum(f.n_periods for f in fits if f is not None)


@pytest.fixture(scope="module")
def house() -> Site:
    return read_site(SAMPLES / "quince_street")


def test_a_year_of_other_day_means_is_cautioned(house: Site) -> None:
    assert house.year is not None
    other = replace(house, year=replace(house.year, method="mean of hours"))
    assert "differ" in " ".join(assess(other).cautions)
    assert "mean of hours" not in " ".join(assess(house).cautions)


def test_fewer_years_than_asked_for_are_cautioned(house: Site) -> None:
    assert house.year is not None
    thin = replace(house, year=replace(house.year, years=house.year.years[-3:]))
    assert "only 3 of the 10" in " ".join(assess(thin).cautions)


def test_solar_that_hides_use_gives_no_answer_but_its_reason(house: Site) -> None:
    bills = house.bills[1]
    assert bills is not None
    hidden = replace(house, bills=(house.bills[0], replace(bills, unfit="panels hide the use")))
    account = assess(hidden).accounts[1]
    for estimate in (account.savings.normalized, account.savings.avoided):
        assert isinstance(estimate, Estimate)
        assert estimate.unavailable == "panels hide the use"


def test_the_dealers_factor_stands_both_ways_round(assessed: tuple[str, SiteResult]) -> None:
    """Degree-days a gallon and gallons a degree-day are inverses (common practice)."""
    for account in assessed[1].accounts:
        delivered = account.bills is not None and account.bills.kind == "delivery"
        assert len(account.k_factors) == (2 if delivered else 0)
        for _, per_unit, per_degree_day in account.k_factors:
            assert per_unit * per_degree_day == pytest.approx(1.0)
            assert 1.0 < per_unit < 100.0
