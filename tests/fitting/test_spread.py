"""Errors that go together and grow with use, against generalised least squares written out.

Source of every expected number: statsmodels GLS and dense matrices of numpy, built from the
definition of the error model (docs/method.md §5), never from our kernels.
"""

from __future__ import annotations

import numpy as np
import pytest
import statsmodels.api as sm

from normalize.fitting.blocks import BLOCK_DAYS, block_of, in_blocks
from normalize.fitting.rho import RHO
from normalize.fitting.spread import LEAST_LEVEL, POWERS, through_errors

pytestmark = pytest.mark.kernel
N, N2 = 24, 7


def side_of(start: np.ndarray, length: float) -> tuple[np.ndarray, ...]:
    n = start.shape[0]
    d = np.full(n, length)
    none = np.empty(0)
    return (none, np.empty(0, np.int32), np.zeros(n), d, d.copy(), start, start + length)


@pytest.fixture(name="made")
def _made() -> dict[str, np.ndarray]:
    rng = np.random.default_rng(8)
    start = np.arange(N) * 30.0
    start[10:] += 61.0  # two bills missing
    return {
        "start": start,
        "jac": np.column_stack([np.ones(N), rng.uniform(0, 30, N), rng.uniform(0, 1, N)]),
        "fitted": rng.uniform(0.02, 4.0, N),
        "resid": rng.normal(size=N),
        "targets": np.array([[365.0, 5000.0, 100.0], [210.0, 900.0, 40.0]]),
        "rep_start": 2000.0 + 30.0 * np.arange(N2),
        "rep_fitted": rng.uniform(0.1, 3.0, N2),
    }


def dense(made: dict[str, np.ndarray], power: float, rho: float) -> tuple[float, ...]:
    """(restricted log-likelihood, shifts, scales²) of one way of erring, from its definition."""
    place = np.round(made["start"] / 30.0)
    far = np.abs(place[:, None] - place[None, :])
    level = np.maximum(made["fitted"] / made["fitted"].mean(), LEAST_LEVEL)
    sigma = rho**far * np.outer(level**power, level**power)
    jac, resid = made["jac"], made["resid"]
    ref = sm.GLS(resid, jac, sigma=sigma).fit()
    inverse = np.linalg.inv(sigma)
    rss = (resid - jac @ ref.params) @ inverse @ (resid - jac @ ref.params)
    dets = np.linalg.slogdet(sigma)[1] + np.linalg.slogdet(jac.T @ inverse @ jac)[1]
    like = -0.5 * (dets + (N - 3) * np.log(rss))
    shift = made["targets"] @ ref.params
    scale2 = np.einsum("tk,kl,tl->t", made["targets"], ref.cov_params(), made["targets"])
    rep_level = np.maximum(made["rep_fitted"] / made["fitted"].mean(), LEAST_LEVEL) ** power
    far2 = np.abs(np.subtract.outer(np.arange(N2), np.arange(N2)))
    noise = 30.0**2 * rep_level @ (rho**far2) @ rep_level * ref.scale
    return like, shift, scale2 + np.array([0.0, noise])


def test_both_ways_of_erring_are_weighed_as_their_likelihood_says(
    made: dict[str, np.ndarray],
) -> None:
    rep = side_of(made["rep_start"], 30.0)
    like, shift, scale2, plain2 = through_errors(
        made["jac"], made["resid"], made["fitted"], side_of(made["start"], 30.0),
        made["targets"], rep, made["rep_fitted"],
    )  # fmt: skip
    at = [0, 8, 14, 22]
    found, expected = [], []
    for i in at:
        ways = [dense(made, float(p), float(RHO[i])) for p in POWERS]
        likes = np.array([w[0] for w in ways])
        share = np.exp(likes - likes.max())
        centre = sum(s * w[1] for s, w in zip(share, ways, strict=True)) / share.sum()
        within = sum(s * w[2] for s, w in zip(share, ways, strict=True)) / share.sum()
        between = sum(s * (w[1] - centre) ** 2 for s, w in zip(share, ways, strict=True))
        np.testing.assert_allclose(shift[i], centre, rtol=1e-8)
        np.testing.assert_allclose(scale2[i], within + between / share.sum(), rtol=1e-8)
        found.append(like[i])
        expected.append(likes.max() + np.log(share.sum()))
    # Up to one constant for all.
    np.testing.assert_allclose(np.diff(found), np.diff(expected), atol=1e-8)
    zero = dense(made, 0.0, 0.0)
    np.testing.assert_allclose(plain2, zero[2], rtol=1e-8)


def test_a_block_of_days_is_what_one_bill_of_those_days_would_be() -> None:
    """Truth: means of the days themselves; a gap is counted in blocks."""
    rng = np.random.default_rng(2)
    start = np.concatenate([np.arange(200), np.arange(260, 460)]).astype(float)
    which, place = block_of(start, start + 1.0)
    expected = (start // BLOCK_DAYS).astype(int)
    np.testing.assert_array_equal(place, np.unique(expected))
    np.testing.assert_array_equal(place[which], expected)
    columns = rng.normal(size=(400, 2))
    means, days = in_blocks(columns, np.ones(400), which, place.shape[0])
    for b, block in enumerate(np.unique(expected)):
        np.testing.assert_allclose(means[b], columns[expected == block].mean(axis=0), rtol=1e-12)
        assert days[b] == (expected == block).sum()


def test_bills_are_not_put_into_blocks() -> None:
    start = np.arange(24) * 30.0
    which, place = block_of(start, start + 30.0)
    np.testing.assert_array_equal(which, np.arange(24))
    np.testing.assert_array_equal(place, np.arange(24))
