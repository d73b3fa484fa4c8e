"""How often the ranges cover the truth, on simulated homes that are not used elsewhere."""

from __future__ import annotations

import numpy as np

from normalize.savings.kernel import NORMALIZED
from tests.savings.homes import simulate

HOMES = 2000
BILLS = (12, 24)
RHOS = (0.0, 0.3, 0.5)
NOISE = 0.10


def prove() -> str:
    """A table of coverage by bills a side and serial correlation, with Monte Carlo error."""
    lines = [
        "## Coverage of a nominal 90 % range\n",
        f"Gas homes with a true change of slope and balance temperature, {NOISE:.0%} noise, "
        f"{HOMES:,} homes a cell; forms offered: flat and heating. “Plain” is the delta method "
        "that takes bills as independent. “Alarms”: share of homes where nothing was done whose "
        "range excludes zero. ± is one Monte Carlo standard error.\n",
        "| bills a side | lag-1 correlation | default | plain | mean width ÷ saving | alarms, "
        "default | alarms, plain |",
        "| --: | --: | --: | --: | --: | --: | --: |",
    ]
    lines += [_row(bills, rho) for bills in BILLS for rho in RHOS]
    lines.append(
        "\nThe ranges speak of the bills' noise, not of occupants, the station or the choice of "
        "long-term year.\n"
    )
    return "\n".join(lines)


def _row(bills: int, rho: float) -> str:
    seed = 7000 + 10 * bills + int(10 * rho)
    homes = simulate(HOMES, bills=bills, rho=rho, noise=NOISE, seed=seed)
    answer = homes.answers()
    default = _share(answer, NORMALIZED + 1, NORMALIZED + 2, homes.truth)
    plain = _share(answer, NORMALIZED + 3, NORMALIZED + 4, homes.truth)
    width = np.nanmean(answer[:, NORMALIZED + 2] - answer[:, NORMALIZED + 1]) / homes.truth
    nothing = simulate(HOMES, bills=bills, rho=rho, noise=NOISE, seed=seed + 1, effect=0.0)
    placebo = nothing.answers()
    alarm = 1 - _share(placebo, NORMALIZED + 1, NORMALIZED + 2, 0.0)
    alarm_plain = 1 - _share(placebo, NORMALIZED + 3, NORMALIZED + 4, 0.0)
    error = np.sqrt(0.09 / HOMES)
    return (
        f"| {bills} | {rho:g} | {default:.3f} ± {error:.3f} | {plain:.3f} | {width:.2f} | "
        f"{alarm:.3f} ± {error:.3f} | {alarm_plain:.3f} |"
    )


def _share(answer: np.ndarray, low: int, high: int, truth: float) -> float:
    known = np.isfinite(answer[:, low])
    inside = (answer[known, low] <= truth) & (truth <= answer[known, high])
    return float(inside.mean())
