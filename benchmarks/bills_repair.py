"""Repair of many accounts: one compiled call against the same rules account by account.

``python benchmarks/bills_repair.py``.  The comparison is the call for one account, as a single
site makes it, over the same bills; the ratio says what a program gains by one batch.
"""

from __future__ import annotations

import time

import numpy as np

ACCOUNTS = 20_000
ONE_BY_ONE = 500
BILLS = 36


def bills(accounts: int) -> dict[str, np.ndarray]:
    """Invented monthly bills, a tenth of them estimated, a few doubled."""
    rng = np.random.default_rng(3)
    lengths = rng.integers(28, 34, (accounts, BILLS))
    ends = 18_000 + np.cumsum(lengths, axis=1)
    starts = ends - lengths
    starts[:, 7] -= 2  # a small overlap
    starts[:, 20], ends[:, 20] = starts[:, 19], ends[:, 19]  # a bill twice
    use = np.round(rng.gamma(4.0, 20.0, (accounts, BILLS)), 1)
    use[:, 20] = use[:, 19]
    return {
        "start": starts.ravel(), "end": ends.ravel(), "use": use.ravel(),
        "cost": np.round(use.ravel() * 1.2, 2),
        "estimated": rng.random(accounts * BILLS) < 0.1,
    }  # fmt: skip


def measure() -> list[tuple[str, float, str]]:
    """(name, ratio, what): time an account alone over its time in a batch."""
    from normalize.bills.repair import repair_batch

    many = bills(ACCOUNTS)
    offsets = np.arange(ACCOUNTS + 1) * BILLS
    repair_batch(**many, offsets=offsets)
    begin = time.perf_counter()
    repair_batch(**many, offsets=offsets)
    batch = (time.perf_counter() - begin) / ACCOUNTS
    begin = time.perf_counter()
    for a in range(ONE_BY_ONE):
        cut = slice(a * BILLS, (a + 1) * BILLS)
        repair_batch(**{k: v[cut] for k, v in many.items()}, offsets=[0, BILLS])
    alone = (time.perf_counter() - begin) / ONE_BY_ONE
    what = f"{batch * 1e6:.1f} µs an account in a batch, {alone * 1e6:.1f} µs alone"
    return [(f"repair of {BILLS} bills an account", alone / batch, what)]


if __name__ == "__main__":
    for name, ratio, what in measure():
        print(f"{name}: {ratio:.1f} ({what})")
