"""The exact sweep against exhaustive searches that share no code with it (tests/fitting/brute.py).

The reference is the definition of the optimum itself: the least sum of squares over a fine
grid, and over every pair of cells, under the same constraints (docs/method.md §2).
"""

from __future__ import annotations

import os

import numpy as np
import pytest

from normalize.fitting.batch import fit_batch
from normalize.fitting.columns import RSS
from normalize.fitting.fit import batch_of_one
from normalize.fitting.forms import COOLING, HEATING, HEATING_AND_COOLING
from tests.fitting import brute
from tests.fitting.accounts import Account, rough

pytestmark = pytest.mark.kernel

TOLERANCE = 1e-9
# With bounds checked, fewer: the same instructions, many times slower.
CHECKED = bool(os.environ.get("NUMBA_BOUNDSCHECK"))
SINGLE = 40 if CHECKED else 500
PAIRS = 6 if CHECKED else 40  # 500 and more in `make prove`
MAX_MISSES = 0.001


def rows(account: Account) -> np.ndarray:
    aligned = account.aligned
    batch, table = batch_of_one(aligned, np.zeros(aligned.n, np.uint8), ("heating and cooling",))
    fits, _ = fit_batch(batch, table, 0)
    return fits[0]


def test_one_balance_temperature_never_worse_than_a_fine_grid() -> None:
    """500 rough accounts, heating and cooling, against a 0.01 °F grid."""
    rng = np.random.default_rng(20261201)
    compared = 0
    for i in range(SINGLE):
        account = rough(rng, n=10 + i % 15)
        found = rows(account)
        mirrored = Account(account.start, account.end, account.use, -account.temp)
        for side, form, low, high in (
            (account, HEATING, 40.0, 80.0),
            (mirrored, COOLING, -85.0, -50.0),
        ):
            lo, hi = brute.allowed(side, low, high)
            grid = np.arange(lo, hi, 0.01) if hi - lo < 2 else np.arange(lo, hi, 0.01)[i % 5 :: 5]
            if not len(grid):
                continue
            best = brute.one_tau_rss(side, grid).min()
            if np.isfinite(best):
                compared += 1
                assert found[form, RSS] <= best * (1 + TOLERANCE)
    assert compared > SINGLE


def test_two_balance_temperatures_against_every_pair_of_cells() -> None:
    rng = np.random.default_rng(20261202)
    misses = compared = 0
    for _ in range(PAIRS):
        account = rough(rng, n=12)
        best = brute.two_tau_rss(account)
        if not best < brute.one_slope_rss(account) * (1 - TOLERANCE):
            continue  # the best has one slope at zero: no heating-and-cooling fit to compare
        compared += 1
        misses += not rows(account)[HEATING_AND_COOLING, RSS] <= best * (1 + TOLERANCE)
    assert compared >= PAIRS // 2
    assert misses <= MAX_MISSES * compared
