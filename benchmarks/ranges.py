"""What the default ranges cost: 10,000 accounts with them, against the fits alone.

The peer is this program's own compiled fits of both sides, on the same accounts in the same
run, the two taken in turn and the best of each kept.
"""

from __future__ import annotations

import time
from collections.abc import Callable

from normalize.fitting.batch import fit_batch
from normalize.fitting.columns import AFTER, BEFORE
from tests.savings.homes import simulate

ACCOUNTS = 10_000
TURNS = 3
ELECTRIC = ("flat", "heating", "cooling", "heating and cooling")
Row = tuple[str, float, str]


def _ratio(name: str, bills: int, forms: tuple[str, ...], cool: float) -> list[Row]:
    homes = simulate(
        ACCOUNTS, bills=bills, rho=0.3, noise=0.1, seed=9, forms=forms, cool=cool, mean_f=55.0
    )

    def fits() -> None:
        for side in (BEFORE, AFTER):
            fit_batch(homes.batch, homes.table, side)

    best = {"fits": float("inf"), "ranges": float("inf")}
    jobs: tuple[tuple[str, Callable[[], object]], ...] = (("fits", fits), ("ranges", homes.answers))
    for _ in range(TURNS):
        for job, run in jobs:
            begin = time.perf_counter()
            run()
            best[job] = min(best[job], time.perf_counter() - begin)
    each = 1e6 * best["fits"] / ACCOUNTS
    return [
        (f"{name}: fits of both sides, µs an account", each, "in a batch"),
        (f"{name}: with default ranges ÷ fits alone", best["ranges"] / best["fits"], "5 wanted"),
    ]


def measure() -> list[Row]:
    """Ratios for a heating fuel and for electricity, 12 and 24 bills a side."""
    simulate(2, bills=12, rho=0.0, noise=0.1, seed=1).answers()  # compiled outside the timing
    return [
        row
        for name, forms, cool in (("gas", ("flat", "heating"), 0.0), ("electricity", ELECTRIC, 0.1))
        for bills in (12, 24)
        for row in _ratio(f"{name}, {bills} bills", bills, forms, cool)
    ]
