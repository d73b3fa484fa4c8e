"""Guessed readings nobody marked: bills that sway about their fit.

The rates at which the caution speaks are measured by tests/prove/bills_guesses.py.
"""

from __future__ import annotations

import numpy as np
import pytest

from normalize.savings.guesses import SideOfWork, guess_caution, sway_of


def side(use: np.ndarray, fitted: np.ndarray, gap: int = -1) -> SideOfWork:
    start = np.arange(use.shape[0]) * 30
    end = start + 30
    if gap >= 0:
        start[gap + 1 :] += 60
        end[gap + 1 :] += 60
    return SideOfWork(start, end, use, fitted, 3)


def test_lag_one_correlation_is_that_of_statsmodels() -> None:
    """Reference: statsmodels.tsa.stattools.acf, on residuals with mean zero."""
    from statsmodels.tsa.stattools import acf

    rng = np.random.default_rng(1)
    fitted = np.full(40, 10.0)
    resid = rng.normal(size=40)
    resid -= resid.mean()
    found = sway_of([side(fitted + resid, fitted)])
    assert found is not None
    assert found.correlation == pytest.approx(acf(resid, nlags=1)[1], abs=1e-12)
    assert found.pairs == 39


@pytest.mark.parametrize("power", [0.0, 1.0])
def test_bills_without_guesses_are_left_alone_however_their_scatter_grows(power: float) -> None:
    """Nominal 2.3 % (two spreads, one side); guesses of 15 % are found far more often."""
    fitted = 50.0 + 45.0 * np.cos(np.arange(48) * np.pi / 6)
    false = found = 0
    for seed in range(300):
        rng = np.random.default_rng(seed)
        resid = 50.0 * (fitted / 50.0) ** power * rng.normal(0.0, 0.08, 48)
        calm = sway_of([side(fitted + resid, fitted)])
        at = np.arange(0, 47, 2)
        error = fitted[at] * rng.normal(0.0, 0.15, at.shape)
        resid[at] += error
        resid[at + 1] -= error
        guessed = sway_of([side(fitted + resid, fitted)])
        assert calm is not None
        assert guessed is not None
        false += calm.suspicious
        found += guessed.suspicious
    assert false <= 18  # 300 × 2.3 % is 7; true parameters are not fitted here, so more
    assert found >= 100  # regression, not truth


def test_a_gap_parts_neighbours_and_few_bills_say_nothing() -> None:
    swaying = 10.0 + np.tile([1.0, -1.0], 12)
    flat = np.full(24, 10.0)
    whole, parted = sway_of([side(swaying, flat)]), sway_of([side(swaying, flat, gap=11)])
    assert whole is not None
    assert parted is not None
    assert (whole.pairs, parted.pairs) == (23, 22)
    assert sway_of([side(swaying[:17], flat[:17])]) is None
    assert sway_of([]) is None
    assert sway_of([side(flat, flat)]) is None  # a perfect fit does not sway


def test_both_sides_of_the_work_count_together_and_apart() -> None:
    """The last bill before the work and the first after it are no neighbours."""
    swaying, flat = 10.0 + np.tile([1.0, -1.0], 6), np.full(12, 10.0)
    both = sway_of([side(swaying, flat), side(swaying, flat)])
    assert both is not None
    assert both.pairs == 22


def test_the_words_say_what_it_means_and_what_to_do() -> None:
    swaying, flat = 10.0 + np.tile([1.0, -1.0], 12), np.full(24, 10.0)
    (said,) = guess_caution(sway_of([side(swaying, flat)]))
    assert "correlation −0.96 over 23 pairs" in said
    assert "Ask the supplier which readings were estimated" in said
    rng = np.random.default_rng(3)
    calm = sway_of([side(10.0 + rng.normal(size=24).cumsum() * 0.1, flat)])
    assert guess_caution(calm) == ()
    assert guess_caution(None) == ()
