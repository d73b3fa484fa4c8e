"""The exact sweep against three usual ways of finding a balance temperature.

Peers, on the same accounts and in the same run: a 1 °F grid of statsmodels WLS fits, pwlf
(a piecewise-linear fit on mean temperatures: another model, so its RSS is only shown), and
scipy.optimize on the profiled sum of squares.
"""

from __future__ import annotations

import time
import warnings
from collections.abc import Callable

import numpy as np

from normalize.fitting.batch import Batch, fit_batch, stations, wanted_mask
from normalize.fitting.columns import HIGH_H, LOW_H, RSS
from normalize.fitting.forms import HEATING
from tests.fitting.accounts import Account, days_of, make, weather

ACCOUNTS = 400
FEW = 12  # of them for the slow peers
Row = tuple[str, float, str]


def _accounts() -> tuple[list[Account], Batch, object]:
    rng = np.random.default_rng(1)
    temp = weather(rng, 26 * 36)
    made = [
        make(rng, n=24, b=float(rng.uniform(0.5, 2)), noise=0.1, temp=temp) for _ in range(ACCOUNTS)
    ]
    batch = Batch(
        start=np.concatenate([a.start for a in made]),
        end=np.concatenate([a.end for a in made]),
        use=np.concatenate([a.use for a in made]),
        side=np.zeros(24 * ACCOUNTS, np.uint8),
        offsets=24 * np.arange(ACCOUNTS + 1),
        station=np.zeros(ACCOUNTS, int),
        wanted=np.tile(wanted_mask(["heating"]), (ACCOUNTS, 1)),
        net=np.zeros(ACCOUNTS, bool),
    )
    return made, batch, stations([(0, temp)], 0, len(temp))


def _best(repeat: int, job: Callable[[], object]) -> float:
    times = []
    for _ in range(repeat):
        begin = time.perf_counter()
        job()
        times.append(time.perf_counter() - begin)
    return min(times)


def _columns(account: Account, tau: float) -> np.ndarray:
    return np.array([np.maximum(tau - t, 0).mean() for t in days_of(account)])


def _grid(account: Account, low: float, high: float) -> float:
    """Least RSS of WLS fits on a 1 °F grid."""
    import statsmodels.api as sm

    days = (account.end - account.start).astype(float)
    best = np.inf
    for tau in np.arange(np.ceil(low), np.floor(high) + 1):
        x = sm.add_constant(_columns(account, tau))
        found = sm.WLS(account.use / days, x, weights=days).fit()
        if len(found.params) == 2 and found.params[1] > 0:
            best = min(best, found.ssr)
    return float(best)


def _optimize(account: Account, low: float, high: float) -> float:
    """Least RSS by scipy's bounded scalar minimiser on the profiled sum of squares."""
    from scipy.optimize import minimize_scalar

    days = (account.end - account.start).astype(float)
    root, y = np.sqrt(days), account.use / days

    def rss(tau: float) -> float:
        x = np.column_stack([np.ones_like(y), _columns(account, tau)]) * root[:, None]
        left = y * root - x @ np.linalg.lstsq(x, y * root, rcond=None)[0]
        return float(left @ left)

    return float(minimize_scalar(rss, bounds=(low, high), method="bounded").fun)


def _pwlf(account: Account) -> float:
    """RSS of two joined lines on mean temperatures (another model)."""
    import pwlf

    days = (account.end - account.start).astype(float)
    mean = np.array([t.mean() for t in days_of(account)])
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        model = pwlf.PiecewiseLinFit(mean, account.use / days, weights=np.sqrt(days), seed=1)
        model.fit(2)
        left = account.use / days - model.predict(mean)
    return float((days * left**2).sum())


def measure() -> list[Row]:
    """Ratios of time per account, and the worst ratio of sums of squares."""
    made, batch, table = _accounts()
    fit_batch(batch, table, 0)  # compiled or loaded outside the timing
    ours = _best(5, lambda: fit_batch(batch, table, 0)) / ACCOUNTS
    rows = fit_batch(batch, table, 0)[0][:, HEATING]
    out: list[Row] = [("sweep, µs an account", ours * 1e6, "in a batch, all of the heating form")]
    for name, peer, wanted in (
        ("1 °F grid of statsmodels WLS", _grid, "higher is better; 500 wanted"),
        ("scipy.optimize", _optimize, "higher is better"),
    ):
        peer(made[-1], rows[-1, LOW_H], rows[-1, HIGH_H])  # imports stay outside the timing
        begin = time.perf_counter()
        found = [peer(made[i], rows[i, LOW_H], rows[i, HIGH_H]) for i in range(FEW)]
        each = (time.perf_counter() - begin) / FEW
        worst = max(rows[i, RSS] / found[i] for i in range(FEW))
        out.append((f"time of {name} ÷ sweep", each / ours, wanted))
        out.append((f"RSS of sweep ÷ {name}, worst", worst, "never above 1"))
    _pwlf(made[-1])
    begin = time.perf_counter()
    found = [_pwlf(made[i]) for i in range(FEW)]
    each = (time.perf_counter() - begin) / FEW
    out.append(("time of pwlf ÷ sweep", each / ours, "higher is better"))
    worst = max(rows[i, RSS] / found[i] for i in range(FEW))
    out.append(("RSS of sweep ÷ pwlf, worst", worst, "another model: shown, not judged"))
    return out
