"""How invented work dates and Cook's distance behave in homes where nothing is wrong."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from normalize.fitting.columns import BASE, BEFORE, SLOPE_H, TAU_H
from normalize.fitting.forms import HEATING
from normalize.savings.checks import MOST_ANNOUNCED
from normalize.savings.cook import LOOK_COOK, STRONG_COOK
from normalize.savings.influence import weigh
from normalize.savings.placebo import placebo_counts
from tests.savings.homes import Homes, simulate

ONE_DATE = 2000
EVERY_DATE = 300
BILLS = (12, 18, 24)  # half of the baseline's
RHOS = (0.0, 0.3, 0.5)
NOISE = 0.10


def prove() -> str:
    """Tables of announcements and of Cook's distance, by bills and serial correlation."""
    lines = [
        "## Invented work dates where nothing changes\n",
        f"Gas homes without any change, {NOISE:.0%} noise; forms offered: flat and heating. One "
        f"date: {ONE_DATE:,} homes, one date in the middle of the baseline each; ± is one Monte "
        f"Carlo standard error. Every date: {EVERY_DATE} homes, every admissible boundary; the "
        "share of dates that would have announced a change, over homes.\n",
        "| bills of the baseline | lag-1 correlation | one date: alarms | every date: mean share | "
        "95th percentile | homes with any | homes over "
        f"{MOST_ANNOUNCED:.0%} |",
        "| --: | --: | --: | --: | --: | --: | --: |",
    ]
    lines += [_row(bills, rho) for bills in BILLS for rho in RHOS]
    lines += [
        "\n## Cook's distance where nothing is wrong\n",
        f"{ONE_DATE:,} homes a row, 24 bills, heating; the largest of a side's Cook's distances, "
        "balance temperature included.\n",
        f"| lag-1 correlation | over {LOOK_COOK:g}/n | over {STRONG_COOK:g} |",
        "| --: | --: | --: |",
    ]
    lines += [_cook(rho) for rho in RHOS]
    return "\n".join(lines) + "\n"


def _quiet(homes: int, bills: int, rho: float, seed: int) -> Homes:
    made = simulate(homes, bills=bills, rho=rho, noise=NOISE, seed=seed, effect=0.0)
    side = np.full_like(made.batch.side, BEFORE)
    return replace(made, batch=replace(made.batch, side=side))


def _row(bills: int, rho: float) -> str:
    seed = 9000 + 10 * bills + int(10 * rho)
    one = _quiet(ONE_DATE, bills, rho, seed)
    single = placebo_counts(one.batch, one.table, [one.year], most=1)
    alarms = single.alarms.sum() / single.dates.sum()
    error = np.sqrt(alarms * (1 - alarms) / single.dates.sum())
    many = _quiet(EVERY_DATE, bills, rho, seed + 1)
    every = placebo_counts(many.batch, many.table, [many.year])
    known = every.dates > 0
    share = every.alarms[known] / every.dates[known]
    return (
        f"| {2 * bills} | {rho:g} | {alarms:.3f} ± {error:.3f} | {share.mean():.3f} | "
        f"{np.quantile(share, 0.95):.2f} | {(share > 0).mean():.2f} | "
        f"{(share > MOST_ANNOUNCED).mean():.2f} |"
    )


def _cook(rho: float) -> str:
    from normalize.fitting.batch import fit_batch

    homes = _quiet(ONE_DATE, 12, rho, 9500 + int(10 * rho))
    fits, _ = fit_batch(homes.batch, homes.table, BEFORE)
    top = [_largest(homes, i, fits[i, HEATING]) for i in range(ONE_DATE)]
    known = np.array([t for t in top if np.isfinite(t)])
    look, strong = (known > LOOK_COOK / 24).mean(), (known > STRONG_COOK).mean()
    return f"| {rho:g} | {look:.2f} | {strong:.3f} |"


def _largest(homes: Homes, i: int, row: np.ndarray) -> float:
    """The largest Cook's distance of a home's heating fit; NaN without one."""
    if np.isnan(row[BASE]):
        return float("nan")
    cut = slice(int(homes.batch.offsets[i]), int(homes.batch.offsets[i + 1]))
    h, below, y, d = [], [], [], []
    for start, end, use in zip(
        homes.batch.start[cut], homes.batch.end[cut], homes.batch.use[cut], strict=True
    ):
        first = int(homes.table.first_day[0])
        temp = homes.table.temp[int(start) - first : int(end) - first]
        h.append(np.maximum(row[TAU_H] - temp, 0.0).mean())
        below.append((temp < row[TAU_H]).mean())
        d.append(float(end - start))
        y.append(use / (end - start))
    jac = np.column_stack([np.ones(len(h)), h, row[SLOPE_H] * np.array(below)])
    resid = np.array(y) - row[BASE] - row[SLOPE_H] * np.array(h)
    return max(b.cook for b in weigh(jac, resid, np.array(d)))
