"""Miss rate of the two-temperature search against every pair of cells."""

from __future__ import annotations

import numpy as np

from normalize.fitting.batch import fit_batch
from normalize.fitting.columns import RSS
from normalize.fitting.fit import batch_of_one
from normalize.fitting.forms import HEATING_AND_COOLING
from tests.fitting import brute
from tests.fitting.accounts import Account, rough

TOLERANCE = 1e-9
CASES = ((12, 600), (24, 100))  # bills, accounts


def prove() -> str:
    """A table of misses: accounts whose RSS is above the exhaustive search's by more than 1e-9."""
    lines = [
        "## Two balance temperatures against an exhaustive search\n",
        "Rough accounts (noise 2-50 %, outliers, odd lengths, some without signal). Compared: "
        "those whose best has two positive slopes.\n",
        "| bills | accounts | compared | misses | worst excess of RSS |",
        "| --: | --: | --: | --: | --: |",
    ]
    for bills, accounts in CASES:
        compared, misses, worst = _case(bills, accounts)
        lines.append(f"| {bills} | {accounts} | {compared} | {misses} | {worst:.1e} |")
    return "\n".join(lines) + "\n"


def _case(bills: int, accounts: int) -> tuple[int, int, float]:
    rng = np.random.default_rng(5000 + bills)
    compared = misses = 0
    worst = 0.0
    for _ in range(accounts):
        account = rough(rng, n=bills)
        best = brute.two_tau_rss(account)
        if not best < brute.one_slope_rss(account) * (1 - TOLERANCE):
            continue
        compared += 1
        found = _rss(account)
        if not found <= best * (1 + TOLERANCE):
            misses += 1
            worst = max(worst, found / best - 1 if np.isfinite(found) else np.inf)
    return compared, misses, worst


def _rss(account: Account) -> float:
    aligned = account.aligned
    batch, table = batch_of_one(aligned, np.zeros(aligned.n, np.uint8), ("heating and cooling",))
    return float(fit_batch(batch, table, 0)[0][0, HEATING_AND_COOLING, RSS])
