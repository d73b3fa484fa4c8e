"""At the balance temperature found, coefficients and errors are statsmodels' WLS."""

from __future__ import annotations

import numpy as np
import pytest
import statsmodels.api as sm
from statsmodels.stats.stattools import durbin_watson

from normalize.fitting.fit import fit_periods
from tests.fitting.accounts import Account, days_of, make

pytestmark = pytest.mark.kernel


def design(account: Account, fit) -> np.ndarray:
    columns = [np.ones(account.start.shape[0])]
    if fit.line_slope is not None:
        columns.append(np.array([t.mean() for t in days_of(account)]))
    if fit.heating_slope is not None:
        tau = fit.balance_heating_f
        columns.append(np.array([np.maximum(tau - t, 0).mean() for t in days_of(account)]))
    if fit.cooling_slope is not None:
        tau = fit.balance_cooling_f
        columns.append(np.array([np.maximum(t - tau, 0).mean() for t in days_of(account)]))
    return np.column_stack(columns)


@pytest.mark.parametrize("weights", ["days", "equal"])
@pytest.mark.parametrize("seed", range(8))
def test_coefficients_and_errors_are_those_of_wls(seed: int, weights: str) -> None:
    """Source: statsmodels WLS, τ held at the value found."""
    account = make(
        np.random.default_rng(seed), b=1.2, c=0.9, noise=0.08, lengths=(20, 45), n=20 + seed
    )
    days = (account.end - account.start).astype(float)
    compared = 0
    for tried in fit_periods(account.aligned, weights=weights):
        fit = tried.fit
        if fit is None:
            continue
        compared += 1
        w = days if weights == "days" else np.ones_like(days)
        ref = sm.WLS(account.use / days, design(account, fit), weights=w).fit()
        slopes = [fit.line_slope, fit.heating_slope, fit.cooling_slope]
        coefs = [fit.base_load, *[s for s in slopes if s is not None]]
        np.testing.assert_allclose(coefs, ref.params, rtol=1e-9)
        np.testing.assert_allclose(fit.se, ref.bse, rtol=1e-9)
        np.testing.assert_allclose(fit.t, ref.tvalues, rtol=1e-8)
        assert fit.r2 == pytest.approx(ref.rsquared, rel=1e-9, abs=1e-12)
        assert fit.durbin_watson == pytest.approx(durbin_watson(ref.wresid), rel=1e-9)
        if weights == "days":
            assert fit.rss == pytest.approx(float((days * ref.resid**2).sum()), rel=1e-9)
    assert compared >= 4


def test_errors_with_the_balance_temperature_are_wider() -> None:
    """Source: the delta method; they equal WLS on the Jacobian with the τ column in it."""
    account = make(np.random.default_rng(2), b=1.2, noise=0.08)
    days = (account.end - account.start).astype(float)
    fit = next(t.fit for t in fit_periods(account.aligned) if t.form == "heating")
    assert fit is not None
    assert fit.se_full is not None
    tau = fit.balance_heating_f
    cold = np.array([(t < tau).mean() for t in days_of(account)])
    x = np.column_stack([design(account, fit), fit.heating_slope * cold])
    ref = sm.WLS(account.use / days, x, weights=days).fit()
    scale = fit.rss / (fit.n_periods - 3)
    expected = np.sqrt(np.diag(ref.normalized_cov_params)[:2] * scale)
    np.testing.assert_allclose(fit.se_full, expected, rtol=1e-8)
    assert fit.se_full[1] > fit.se[1]
