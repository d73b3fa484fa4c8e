"""Drivers on simulated schools: kept when real, left out when not, and the saving they hide.

A school heats with gas and uses more on school days.  The work saves 15 % of the heating slope.
After it the school is open on fewer days, which alone lowers use by a tenth of a normal year:
an answer from the weather alone takes that for a saving.
"""

from __future__ import annotations

import dataclasses
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from normalize.fitting.align import Aligned
from normalize.fitting.drivers import DailyAmounts
from normalize.savings.compare import compare
from normalize.savings.drivers import choose_drivers
from normalize.savings.results import Estimate
from normalize.savings.sides import Work, label_periods
from normalize.weather.temperature import DailyTemperature
from normalize.weather.year import LongTermYear, year_from_sample
from tests.fitting.accounts import weather

PAGE = Path(__file__).parent.parent.parent / "docs" / "evidence-drivers.md"
HOMES = 500
BILLS = (12, 24)
RHOS = (0.0, 0.3)
NOISE = 0.05
BASE, SLOPE, BALANCE = 3.0, 0.5, 60.0
SAVED = 0.15  # of the heating slope
DAYS_BEFORE, DAYS_AFTER = 185, 115  # school days a year
HIDDEN = 0.10  # of NAC before, by which fewer school days alone lower use
FORMS = ("flat", "heating")
WORK_DAYS = 31


@dataclasses.dataclass(frozen=True)
class School:
    """One simulated account."""

    aligned: Aligned
    work: Work
    driver: DailyAmounts
    truth: float


@dataclasses.dataclass(frozen=True)
class Tally:
    """What became of a cell's schools."""

    kept: float
    covered_with: float
    covered_without: float
    moved: float  # median move of the answer by the driver's choice, in half-widths


def long_term(rng: np.random.Generator) -> tuple[NDArray[np.float64], LongTermYear]:
    """Temperatures of twelve years, and their last ten as the long-term year."""
    temp = weather(rng, 12 * 365, mean=50.0)
    return temp, year_from_sample("ten years", temp[-3650:], np.full(3650, 0.1))


def calendar(rng: np.random.Generator, days: int, turn: int) -> NDArray[np.float64]:
    """School days: none at weekends or in summer; after the turn whole weeks drop out."""
    day = np.arange(days)
    of_year, of_week = day % 365, day % 7
    term = ((of_year < 160) | (of_year > 240)) & (of_week < 5)
    open_ = np.ones(days, dtype=np.bool_)
    weeks = days // 7 + 1
    for share, when in ((DAYS_BEFORE, day < turn), (DAYS_AFTER, day >= turn)):
        full = 365 * float(term.mean())
        dropped = rng.random(weeks) > share / full
        open_ &= ~(when & dropped[day // 7])
    return (term & open_).astype(np.float64)


def school(
    rng: np.random.Generator,
    temp: NDArray[np.float64],
    year: LongTermYear,
    *,
    bills: int,
    rho: float,
    real: bool,
) -> School:
    """One school's bills; real : school days drive its use, else they do nothing."""
    n = 2 * bills
    lengths = rng.integers(28, 34, n)
    first = int(rng.integers(0, 365))
    gaps = np.where(np.arange(n) == bills, WORK_DAYS, 0)
    start = first + np.concatenate([[0], np.cumsum(lengths[:-1])]) + np.cumsum(gaps)
    end = start + lengths
    turn = int(end[bills - 1])
    amount = calendar(rng, temp.shape[0], turn + WORK_DAYS // 2)
    nac = 365 * BASE + SLOPE * year.heating(BALANCE)
    each = HIDDEN * nac / (DAYS_BEFORE - DAYS_AFTER) if real else 0.0
    cold = np.maximum(BALANCE - temp, 0.0)
    error = np.empty(n)
    use = np.empty(n)
    for i in range(n):
        fresh = rng.normal()
        starts = i in (0, bills)
        error[i] = fresh if starts else rho * error[i - 1] + np.sqrt(1 - rho * rho) * fresh
        span = slice(int(start[i]), int(end[i]))
        slope = SLOPE * (1 - SAVED) if i >= bills else SLOPE
        expected = BASE + slope * cold[span].mean() + each * amount[span].mean()
        use[i] = (expected + NOISE * nac / 365 * error[i]) * lengths[i]
    weather_ = DailyTemperature("x", 0, temp, np.zeros(temp.shape, dtype=np.bool_))
    means = np.array([temp[a:b].mean() for a, b in zip(start, end, strict=True)])
    aligned = Aligned(start.astype(np.int32), end.astype(np.int32), use, means, ("",) * n, weather_)
    driver = DailyAmounts("school days", 0, amount, "day type", "terms")
    work = Work(turn, turn + WORK_DAYS)
    return School(aligned, work, driver, SAVED * SLOPE * year.heating(BALANCE))


def tally(*, bills: int, rho: float, real: bool, homes: int = HOMES) -> Tally:
    """What became of that many schools."""
    rng = np.random.default_rng(4000 + 100 * bills + int(10 * rho) + int(real))
    temp, year = long_term(rng)
    kept, with_, without, moved = [], [], [], []
    for _ in range(homes):
        home = school(rng, temp, year, bills=bills, rho=rho, real=real)
        labels = label_periods(home.aligned, home.work)
        chosen = choose_drivers(home.aligned, labels, [home.driver], forms=FORMS)
        alone = compare(home.aligned, home.work, year, forms=FORMS).savings.normalized
        own = alone
        if chosen.kept:
            own = compare(chosen.aligned, home.work, year, forms=FORMS).savings.normalized
        kept.append(bool(chosen.kept))
        if own.value is None or alone.value is None:
            continue
        with_.append(holds(own, home.truth))
        without.append(holds(alone, home.truth))
        if own.low is not None and own.high is not None:
            moved.append(abs(own.value - alone.value) / (0.5 * (own.high - own.low)))
    return Tally(
        float(np.mean(kept)), float(np.mean(with_)), float(np.mean(without)),
        float(np.median(moved)),
    )  # fmt: skip


def holds(estimate: Estimate, truth: float) -> bool:
    """Whether the range holds the truth."""
    return estimate.low is not None and estimate.high is not None and (
        estimate.low <= truth <= estimate.high
    )  # fmt: skip


def prove() -> str:
    """A table of real and irrelevant drivers, with Monte Carlo error."""
    lines = [
        "## Drivers\n",
        f"Simulated schools, {HOMES} a row, bills with {NOISE:.0%} noise. The work saves "
        f"{SAVED:.0%} of the heating slope; school days fall from {DAYS_BEFORE} to {DAYS_AFTER} a "
        f"year after it. Where school days are real they alone lower use by {HIDDEN:.0%} of NAC, "
        "which is no saving of the work. “Covered”: share of nominal 90 % ranges that hold the "
        "true normalized saving, with the driver where it earned its place, and from the weather "
        f"alone; ± {np.sqrt(0.09 / HOMES):.3f}.\n",
        "| school days | bills a side | lag-1 correlation | kept | covered, as reported | covered, "
        "weather alone | median move, half-widths |",
        "| --- | --: | --: | --: | --: | --: | --: |",
    ]
    for real in (True, False):
        for bills in BILLS:
            for rho in RHOS:
                got = tally(bills=bills, rho=rho, real=real)
                lines.append(
                    f"| {'real' if real else 'do nothing'} | {bills} | {rho:g} | {got.kept:.3f} | "
                    f"{got.covered_with:.3f} | {got.covered_without:.3f} | {got.moved:.2f} |"
                )
    return "\n".join(lines) + "\n"


def main() -> None:
    """Measure, and write the page of its own."""
    from tests.prove.__main__ import heading

    head = heading().replace("# Evidence", "# Evidence: drivers", 1)
    PAGE.write_text(f"{head}\n{prove()}", encoding="utf-8")


if __name__ == "__main__":
    main()
