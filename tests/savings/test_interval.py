"""The default interval: coverage on simulated homes, and the reference it must equal.

Coverage is judged against the truth that made the bills, with a binomial bound; the larger
study is `make prove`.  At fixed ρ the whitening is statsmodels' GLSAR.
"""

from __future__ import annotations

import os

import numpy as np
import pytest
import statsmodels.api as sm
from scipy import stats

from normalize.fitting.correlation import positions, through_rho
from normalize.fitting.rho import RHO, RHO_ZERO
from normalize.savings.kernel import NORMALIZED
from tests.savings.homes import simulate

pytestmark = pytest.mark.kernel
# With bounds checked the same instructions run many times slower, so fewer homes pass.
HOMES = 60 if os.environ.get("NUMBA_BOUNDSCHECK") else 400
WANTED = (0.87, 0.97)  # of a nominal 90 % (the project's own target)


@pytest.mark.parametrize("rho", [0.0, 0.3, 0.5])
@pytest.mark.parametrize("bills", [12, 24])
def test_the_default_range_covers_what_it_says(bills: int, rho: float) -> None:
    homes = simulate(HOMES, bills=bills, rho=rho, noise=0.10, seed=100 * bills + int(10 * rho))
    answer = homes.answers()
    low, high = answer[:, NORMALIZED + 1], answer[:, NORMALIZED + 2]
    known = np.isfinite(low)
    assert known.mean() > 0.95
    inside = int(((low <= homes.truth) & (homes.truth <= high))[known].sum())
    # 99.9 % binomial bounds around the target band, so that chance alone rarely fails this.
    n = int(known.sum())
    assert inside >= stats.binom.ppf(0.001, n, WANTED[0])
    assert inside <= stats.binom.ppf(0.999, n, WANTED[1])


def test_the_plain_range_fails_where_bills_err_together() -> None:
    """What the default is for: at ρ = 0.5 the delta method covers far less than 90 %."""
    homes = simulate(HOMES, bills=24, rho=0.5, noise=0.10, seed=9)
    answer = homes.answers()
    plain = answer[:, NORMALIZED + 3], answer[:, NORMALIZED + 4]
    covered = np.nanmean((plain[0] <= homes.truth) & (homes.truth <= plain[1]))
    assert covered < 0.80


def test_nothing_changed_is_rarely_called_a_change() -> None:
    """Placebo: a 90 % range excludes zero in about 10 % of homes where nothing was done."""
    homes = simulate(HOMES, bills=24, rho=0.3, noise=0.10, seed=77, effect=0.0)
    answer = homes.answers()
    alarms = int(((answer[:, NORMALIZED + 1] > 0) | (answer[:, NORMALIZED + 2] < 0)).sum())
    assert alarms <= stats.binom.ppf(0.999, HOMES, 0.12)


@pytest.mark.parametrize("rho", [-0.3, 0.0, 0.25, 0.6])
def test_at_a_fixed_correlation_it_is_generalised_least_squares(rho: float) -> None:
    """Source: statsmodels GLS with the AR(1) covariance written out, gaps and all."""
    rng = np.random.default_rng(4)
    n, gap_at = 24, 10
    start = np.arange(n) * 30.0
    start[gap_at:] += 61.0  # two bills missing
    end = start + 30.0
    days = np.full(n, 30.0)
    jac = np.column_stack([np.ones(n), rng.uniform(0, 30, n), rng.uniform(0, 1, n)])
    resid = rng.normal(size=n)
    target = np.array([[365.0, 5000.0, 100.0]])
    place = positions(start, end)
    assert place[gap_at] - place[gap_at - 1] == 3
    like, shift, scale2, innovation = through_rho(jac, resid, days, place, target)
    i = int(np.argmin(np.abs(RHO - rho)))
    far = np.abs(place[:, None] - place[None, :])
    sigma = RHO[i] ** far
    ref = sm.GLS(resid, jac, sigma=sigma).fit()
    assert shift[i, 0] == pytest.approx(float(target[0] @ ref.params), rel=1e-8)
    variance = float(target[0] @ ref.cov_params() @ target[0])
    assert scale2[i, 0] == pytest.approx(variance, rel=1e-8)
    assert innovation[i] / (1 - RHO[i] ** 2) == pytest.approx(ref.scale, rel=1e-8)
    # Restricted likelihood, written out from its definition, up to a constant.
    inverse = np.linalg.inv(sigma)

    def restricted(k: int) -> float:
        v = RHO[k] ** far
        vi = np.linalg.inv(v)
        m = jac.T @ vi @ jac
        b = np.linalg.solve(m, jac.T @ vi @ resid)
        s = (resid - jac @ b) @ vi @ (resid - jac @ b)
        return -0.5 * (np.linalg.slogdet(v)[1] + np.linalg.slogdet(m)[1] + (n - 3) * np.log(s))

    assert inverse.shape == (n, n)
    assert like[i] - like[RHO_ZERO] == pytest.approx(restricted(i) - restricted(RHO_ZERO), abs=1e-8)
