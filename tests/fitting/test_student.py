"""Student's t and quantiles of mixtures, against scipy."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import integrate, optimize, stats

from normalize.fitting.mixture import difference_range, mixture_range
from normalize.fitting.student import t_cdf, t_quantile

pytestmark = pytest.mark.kernel


@pytest.mark.parametrize("df", [1, 2, 3, 4, 5, 9, 20, 21, 40, 41, 60, 150, 700])
def test_distribution_and_quantile_are_scipys(df: int) -> None:
    x = np.linspace(-9, 9, 61)
    ours = [t_cdf(v, df) for v in x]
    np.testing.assert_allclose(ours, stats.t.cdf(x, df), atol=1e-12)
    u = np.array([0.001, 0.05, 0.3, 0.5, 0.7, 0.95, 0.999])
    np.testing.assert_allclose([t_quantile(v, df) for v in u], stats.t.ppf(u, df), rtol=1e-9)


@pytest.mark.parametrize(
    ("df1", "df2", "s1", "s2"),
    [(9, 9, 2.0, 1.5), (20, 9, 2.0, 0.2), (3, 3, 1.0, 1.0), (21, 6, 1.0, 3.0), (9, 9, 1.0, 1e-9)],
)
@pytest.mark.parametrize("confidence", [0.5, 0.8, 0.9, 0.95, 0.99])
def test_difference_of_two_t_against_quadrature(
    df1: int, df2: int, s1: float, s2: float, confidence: float
) -> None:
    """Source: scipy quadrature and root finding. 32 nodes are good to 1e-3 of the width."""
    one = np.ones(1)
    low, high = difference_range(one, 3 * one, s1 * one, df1, one, s2 * one, df2, confidence)
    tail = 0.5 - 0.5 * confidence

    def cdf(z: float) -> float:
        return integrate.quad(
            lambda t: stats.t.cdf((z - 2.0 + s2 * t) / s1, df1) * stats.t.pdf(t, df2),
            -np.inf,
            np.inf,
        )[0]

    expected = [optimize.brentq(lambda z, u=u: cdf(z) - u, -60, 60) for u in (tail, 1 - tail)]
    width = expected[1] - expected[0]
    np.testing.assert_allclose([low, high], expected, atol=1e-3 * width)


def test_mixture_of_t_against_root_finding() -> None:
    rng = np.random.default_rng(1)
    weight = rng.random(27)
    weight /= weight.sum()
    centre, scale = rng.normal(size=27), rng.uniform(0.5, 2.0, 27)
    low, high = mixture_range(weight, centre, scale, 7, 0.8)

    def cdf(z: float) -> float:
        return float((weight * stats.t.cdf((z - centre) / scale, 7)).sum())

    assert low == pytest.approx(optimize.brentq(lambda z: cdf(z) - 0.1, -30, 30), abs=1e-6)
    assert high == pytest.approx(optimize.brentq(lambda z: cdf(z) - 0.9, -30, 30), abs=1e-6)


def test_no_spread_is_a_range_of_no_width() -> None:
    one = np.ones(1)
    assert mixture_range(one, 5.0 * one, 0.0 * one, 9, 0.9) == (5.0, 5.0)
