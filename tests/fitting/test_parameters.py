"""Noise-free bills return what made them; invariants of the fit.

The expected values are the parameters that generated the bills (a mathematical identity,
docs/method.md §10), not results of this program.
"""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from normalize.fitting.fit import chosen_of, fit_periods
from normalize.fitting.results import Fit
from tests.fitting.accounts import TRUTH, Account, make

pytestmark = pytest.mark.kernel


def fitted(account: Account, form: str) -> Fit:
    tried = {t.form: t for t in fit_periods(account.aligned, forms=(form,))}
    found = tried[form].fit
    assert found is not None, tried[form].reason
    return found


@pytest.mark.parametrize("form", TRUTH)
@pytest.mark.parametrize("seed", range(6))
def test_noise_free_bills_return_their_parameters(form: str, seed: int) -> None:
    rng = np.random.default_rng(seed)
    account = make(rng, n=12 + 6 * (seed % 3), **{"th": 58.37, **TRUTH[form]})
    if form == "two slopes":
        account = make(np.random.default_rng(seed), n=24, b=1.3, c=0.4, th=58.37, tc=58.37)
    found = fitted(account, form)
    assert found.base_load == pytest.approx(11.0, rel=1e-6)
    for value, key in (
        (found.heating_slope, "b"),
        (found.cooling_slope, "c"),
        (found.line_slope, "line"),
    ):
        if key in TRUTH[form]:
            assert value == pytest.approx(TRUTH[form][key], rel=1e-6)
    if "b" in TRUTH[form]:
        assert found.balance_heating_f == pytest.approx(58.37, abs=1e-6)
    if form in ("cooling", "heating and cooling"):
        assert found.balance_cooling_f == pytest.approx(67.14, abs=1e-6)


@pytest.mark.parametrize("form", ["flat", "heating", "cooling", "heating and cooling"])
def test_noise_free_bills_are_given_their_own_form(form: str) -> None:
    account = make(np.random.default_rng(11), n=24, **TRUTH[form])
    best = chosen_of(fit_periods(account.aligned))
    assert best is not None
    assert best.form == form


@given(k=st.floats(1e-4, 1e5), seed=st.integers(0, 200))
@settings(max_examples=25, deadline=None)
def test_scaling_use_scales_slopes_and_leaves_the_balance_temperature(k: float, seed: int) -> None:
    account = make(np.random.default_rng(seed), b=1.1, noise=0.1)
    one, other = fitted(account, "heating"), fitted(account.scaled(k), "heating")
    assert other.balance_heating_f == pytest.approx(one.balance_heating_f, abs=1e-7)
    assert other.heating_slope == pytest.approx(k * one.heating_slope, rel=1e-9)
    assert other.rss == pytest.approx(k * k * one.rss, rel=1e-9)


@given(shift=st.floats(-8, 8), seed=st.integers(0, 200))
@settings(max_examples=25, deadline=None)
def test_shifting_temperatures_shifts_the_balance_temperature(shift: float, seed: int) -> None:
    account = make(np.random.default_rng(seed), b=1.1, noise=0.08)
    one = fitted(account, "heating")
    assert one.balance_heating_f is not None
    if one.on_bound or not 50 < one.balance_heating_f < 70:
        return
    moved = Account(account.start, account.end, account.use, account.temp + shift)
    other = fitted(moved, "heating")
    assert other.balance_heating_f == pytest.approx(one.balance_heating_f + shift, abs=1e-6)
    assert other.rss == pytest.approx(one.rss, rel=1e-8)


@given(seed=st.integers(0, 300))
@settings(max_examples=25, deadline=None)
def test_cooling_is_heating_on_minus_t(seed: int) -> None:
    account = make(np.random.default_rng(seed), c=0.9, tc=66.0, noise=0.08)
    mirrored = Account(account.start, account.end, account.use, 126.0 - account.temp)
    cool, heat = fitted(account, "cooling"), fitted(mirrored, "heating")
    if cool.on_bound or heat.on_bound:  # the allowed ranges are not mirror images
        return
    assert heat.balance_heating_f == pytest.approx(126.0 - cool.balance_cooling_f, abs=1e-6)
    assert heat.heating_slope == pytest.approx(cool.cooling_slope, rel=1e-9)


def test_daily_use_goes_through_the_same_kernel() -> None:
    """Each day a period: the balance temperature is found among 730 days."""
    rng = np.random.default_rng(3)
    account = make(rng, n=730, b=1.3, c=0.8, lengths=(1, 2))
    found = fitted(account, "heating and cooling")
    assert found.balance_heating_f == pytest.approx(58.37, abs=1e-6)
    assert found.balance_cooling_f == pytest.approx(67.14, abs=1e-6)


def test_rejected_forms_keep_their_numbers_and_reasons() -> None:
    account = make(np.random.default_rng(5), b=1.1, noise=0.1)
    tried = fit_periods(account.aligned, forms=("flat", "heating"))
    assert [t.form for t in tried] == list(TRUTH)
    assert sum(t.chosen for t in tried) == 1
    for t in tried:
        assert t.chosen or t.reason


def test_few_bills_say_how_many_are_needed() -> None:
    account = make(np.random.default_rng(5), n=5, b=1.1)
    tried = {t.form: t for t in fit_periods(account.aligned)}
    assert tried["heating"].fit is None
    assert "needs 6 and there are 5" in tried["heating"].reason
