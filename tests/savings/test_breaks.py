"""The scan for dates of change, against statsmodels, published critical values and truth.

Critical values of sup F: Andrews 1993, Econometrica 61:821-856, table I, 15 % trimming, 5 %
(memory): 8.85 for one parameter that changes, 11.79 for two; 8.68 and 11.72 in his
corrigendum of 2003 (memory).
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from statsmodels.regression.linear_model import OLS
from statsmodels.stats.diagnostic import breaks_cusumolsresid
from statsmodels.stats.outliers_influence import OLSInfluence

from normalize.days import day_of_iso
from normalize.fitting.align import Aligned
from normalize.savings.break_design import Declared
from normalize.savings.break_history import history_of
from normalize.savings.break_results import Breaks
from normalize.savings.break_scan import candidates, changing, odd_ones, scan, whitened
from normalize.savings.break_words import (
    caution_sentences,
    claim_sentences,
    odd_sentences,
    other_sentences,
)
from normalize.savings.breaks import breaks_of
from normalize.savings.sides import Work, label_periods
from tests.fitting.accounts import weather
from tests.prove.changes import FORMS, Cell, Home, home

ZERO = (0.0,)  # the grid of ρ on which the textbook's tests stand


def series(n: int, shift: float = 0.0, seed: int = 3) -> tuple[np.ndarray, np.ndarray]:
    rng = np.random.default_rng(seed)
    x = np.column_stack([np.ones(n), rng.normal(size=n)])
    return x, x @ [1.0, 2.0] + shift * (np.arange(n) >= n // 2) + rng.normal(size=n)


@pytest.mark.parametrize("k", [12, 20, 31])
def test_f_at_a_known_date_is_chows(k: int) -> None:
    """statsmodels' F test of the regression with both coefficients new from k on."""
    x, y = series(40, shift=1.0)
    block = changing(x, [k], 40)
    found = scan(x, y, block, np.arange(40.0), grid=ZERO)
    reference, _, _ = OLS(y, np.hstack([x, block[0]])).fit().compare_f_test(OLS(y, x).fit())
    assert found is not None
    assert found.f[0] == pytest.approx(reference, rel=1e-9)


def test_p_at_a_known_date_is_that_of_the_f_distribution() -> None:
    x, y = series(60, shift=0.55)
    block = changing(x, [30], 60)
    _, p, _ = OLS(y, np.hstack([x, block[0]])).fit().compare_f_test(OLS(y, x).fit())
    found = scan(x, y, block, np.arange(60.0), grid=ZERO)
    assert found is not None
    assert found.p == pytest.approx(p, abs=4.0 * np.sqrt(p * (1.0 - p) / 499))


@pytest.mark.parametrize(("q", "published"), [(1, 8.68), (2, 11.72)])
def test_the_threshold_is_andrews_in_a_long_series(q: int, published: float) -> None:
    """q·sup F of independent errors; 499 draws and 250 periods leave an error of about 0.6."""
    x, y = series(250, shift=2.0)
    x = x[:, :q]
    at = candidates(0, 250, q)
    assert at[0] == 38  # 15 % of 250, rounded up
    found = scan(x, y, changing(x, at, 250), np.arange(250.0), grid=ZERO)
    assert found is not None
    assert q * found.threshold == pytest.approx(published, abs=1.0)


@pytest.mark.parametrize(("shift", "broken"), [(0.0, False), (1.5, True)])
def test_the_scan_and_statsmodels_cusum_agree_on_plain_cases(shift: float, broken: bool) -> None:
    x, y = series(80, shift=shift)
    result = OLS(y, x).fit()
    _, p, _ = breaks_cusumolsresid(result.resid, ddof=2)
    at = candidates(0, 80, 2)
    found = scan(x, y, changing(x, at, 80), np.arange(80.0))
    assert found is not None
    assert bool(p <= 0.05) == broken
    assert bool(found.p <= 0.05) == broken
    if broken:
        assert abs(at[found.best] - 40) <= 2


def test_odd_ones_are_statsmodels_outlier_test() -> None:
    x, y = series(30)
    y[7] += 5.0
    reference = OLSInfluence(OLS(y, x).fit())
    t, p = odd_ones(x, y)
    assert t == pytest.approx(reference.resid_studentized_external, rel=1e-9)
    table = np.asarray(OLS(y, x).fit().outlier_test(method="bonferroni"))
    assert p == pytest.approx(table[:, 2], rel=1e-8)
    assert p[7] <= 0.05


def test_whitening_respects_gaps() -> None:
    """It must turn the covariance ρ^|distance| into a multiple of the identity."""
    place = np.array([0.0, 1.0, 2.0, 5.0, 6.0, 9.0])
    for rho in (-0.3, 0.45):
        steps = np.abs(place[:, None] - place[None, :])
        covariance = np.sign(rho) ** steps * abs(rho) ** steps
        rows, log_scale = whitened(np.eye(6), place, np.array([rho]))
        white = rows[0] @ covariance @ rows[0].T
        assert white == pytest.approx((1.0 - rho**2) * np.eye(6), abs=1e-12)
        _, det = np.linalg.slogdet(rows[0])
        assert log_scale[0] == pytest.approx(det, abs=1e-12)


def simulated(cell: Cell, seed: int = 8) -> Home:
    rng = np.random.default_rng(seed)
    return home(rng, cell, weather(rng, 400 + 35 * cell.bills))


def scanned(one: Home, declared: tuple[Declared, ...] = ()) -> Breaks:
    work = Work(one.work, one.work + 1)
    labels = label_periods(one.aligned, work)
    return breaks_of(one.aligned, labels, work, None, forms=FORMS, declared=declared)


MOVED = Cell(48, noise=0.04, work=0.8, other=1.2)


def test_a_change_that_nobody_mentioned_is_found_beside_the_work() -> None:
    one = simulated(MOVED)
    found = scanned(one)
    (change,) = found.changes
    assert change.low <= one.other <= change.high
    assert change.side == "before"
    assert change.fraction == pytest.approx(0.2, abs=0.08)  # the truth; its date lies months off
    assert change.mixed
    (sentence,) = other_sentences(found, "therm")
    assert sentence.startswith("Use also rose by about ")
    assert "which site.toml does not mention" in sentence
    assert caution_sentences(found, one.work, one.work + 1, "therm") == (sentence,)


def test_a_declared_change_explains_it_and_is_no_caution() -> None:
    one = simulated(MOVED)
    found = scanned(one, (("a tenant upstairs", round(one.other), None),))
    assert found.changes[0].explained == "a tenant upstairs"
    assert "a tenant upstairs" in other_sentences(found, "therm")[0]
    assert caution_sentences(found, one.work, one.work + 1, "therm") == ()


def test_the_bills_place_the_work_where_it_was() -> None:
    one = simulated(Cell(48, noise=0.05, work=0.8))
    found = scanned(one)
    assert found.claimed is not None
    assert found.claimed.announced
    assert found.claimed.meets
    assert found.claimed.low <= one.work <= found.claimed.high
    assert found.claimed.p == pytest.approx(1 / 500)
    assert not found.changes
    (sentence,) = claim_sentences(found, one.work, one.work + 1)
    assert sentence.startswith("The bills themselves, without being told of the work, place")
    assert scanned(one) == found  # the same in every run


def test_an_empty_month_is_an_odd_bill_and_no_change() -> None:
    one = simulated(Cell(48, noise=0.04))
    use = one.aligned.use.copy()
    coldest = int(np.argmax(use[:20]))
    use[coldest] *= 0.5
    found = scanned(replace(one, aligned=replace(one.aligned, use=use)))
    assert [o.numbers for o in found.odd] == [(coldest + 1,)]
    assert not found.changes
    assert "below what its weather" in odd_sentences(found)[0]


@pytest.mark.parametrize("use", [0.0, 1.0])
def test_bills_without_any_scatter_announce_nothing(use: float) -> None:
    one = simulated(Cell(36))
    flat = use * one.aligned.days.astype(float)
    found = scanned(replace(one, aligned=replace(one.aligned, use=flat)))
    assert found.claimed is None
    assert not found.changes
    assert not found.odd
    assert claim_sentences(found, one.work, one.work + 1)


def test_too_short_a_history_says_what_is_missing() -> None:
    one = simulated(Cell(9))
    found = scanned(one)
    assert found.claimed is None
    assert found.unavailable == (
        "there are 9 usable bills and 10 are needed to look for a date of change, 5 on either "
        "side: 1 more"
    )


def test_daily_data_are_joined_to_months_that_do_not_cross_the_work() -> None:
    one = simulated(Cell(24, noise=0.05))
    first, last = int(one.aligned.start[0]), int(one.aligned.end[-1])
    start = np.arange(first, last, dtype=np.int32)
    use = np.repeat(one.aligned.use / one.aligned.days, one.aligned.days)
    n = start.shape[0]
    daily = Aligned(start, start + 1, use, np.zeros(n), ("",) * n, one.aligned.weather)
    work = Work(one.work + 11, one.work + 15)
    history = history_of(daily, label_periods(daily, work), work)
    assert history.joined
    assert history.days.max() <= 28
    assert sum(len(g) for g in history.numbers) >= n - 3 * 10
    inside = (history.start < work.end) & (history.end > work.start)
    assert not inside.any()  # four days of work are too short to be a period of their own
    assert history.use.sum() == pytest.approx(
        sum(float(use[list(g)].sum()) for g in history.numbers), rel=1e-12
    )


def test_months_are_told_once_where_they_are_the_same() -> None:
    from normalize.savings.break_words import months

    day = day_of_iso
    assert months(day("2022-11-20"), day("2023-02-03")).replace("\u00a0", " ") == (
        "between November 2022 and February 2023"
    )
