"""Which drivers earn their place: the same ones before and after the work.

A driver is refused where the bills cannot show what it does (it does not change, it moves with
the weather or with another driver, it is known for too few bills).  The rest are added one at
a time, each time the one that lowers the information criterion of both sides together most,
as long as one's effect can be told from zero on a side and points the same way on both
(docs/method.md §3.1).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Final

import numpy as np
from numpy.typing import NDArray

from normalize.defaults import (
    MAX_SHARED_VARIATION,
    MIN_ABS_T,
    MIN_DAY_TYPE_SPREAD,
    MIN_DAYS_A_SIDE,
)
from normalize.fitting.align import Aligned
from normalize.fitting.batch import Batch, Stations
from normalize.fitting.columns import AFTER, BEFORE, UNUSED
from normalize.fitting.driver_fit import (
    DriverFit,
    block_lengths,
    block_means,
    fit_with,
    shared_with,
)
from normalize.fitting.drivers import (
    DailyAmounts,
    as_drivers,
    normal_level,
    period_means,
)
from normalize.fitting.fit import batch_of_one, side_data
from normalize.savings.sides import codes

EVEN_SHARE: Final = 0.02  # of a driver's variance that is left between blocks
SIDES: Final = (("before", BEFORE), ("after", AFTER))


@dataclass(frozen=True, slots=True)
class Effect:
    """What one more of a driver adds to use on one side: value, standard error, t."""

    value: float
    error: float
    t: float


@dataclass(frozen=True, slots=True)
class DriverTrial:
    """One driver, tried.

    kept : it earned its place; reason : why not, "" when it did.  normal : its amount a day in
    a normal year, and normal_from how that was settled.  before, after : its effect with it
    (and every driver kept) in the fit; None where there is no such fit.  bic_with, bic_without
    : of both sides together, with and without this one.
    """

    name: str
    kind: str
    source: str
    reading: tuple[str, ...]
    kept: bool
    reason: str
    normal: float
    normal_from: str
    before: Effect | None = None
    after: Effect | None = None
    bic_with: float | None = None
    bic_without: float | None = None


@dataclass(frozen=True, slots=True)
class Chosen:
    """The drivers that earned their place.

    trials : every driver, in the order of site.toml.  aligned : the periods with the drivers
    kept, those without a known amount of one set aside.  rhythm : (n, 2) use a day that was
    taken off daily readings for kinds of days that come round evenly, by the effects
    before and after the work; a period's own side's was taken off.
    original : the periods as they came.  amounts, normals : of every driver.
    """

    trials: tuple[DriverTrial, ...]
    aligned: Aligned
    rhythm: NDArray[np.float64]
    original: Aligned
    labels: tuple[str, ...]
    amounts: tuple[DailyAmounts, ...]
    normals: tuple[float, ...]
    _days: _Bench
    _fast: tuple[int, ...]

    @property
    def kept(self) -> tuple[str, ...]:
        """Names of the drivers kept."""
        return tuple(trial.name for trial in self.trials if trial.kept)

    def with_only(self, names: Sequence[str]) -> Aligned:
        """The same periods with other drivers, in the order of site.toml."""
        at = [j for j, amounts in enumerate(self.amounts) if amounts.name in names]
        fast = tuple(j for j in at if j in self._fast)
        slow = [j for j in at if j not in self._fast]
        aligned = replace(self.original, reason=self.aligned.reason)
        calm, _ = _without_rhythm(self._days, aligned, self.labels, fast)
        return with_drivers(calm, [self.amounts[j] for j in slow], [self.normals[j] for j in slow])


def with_drivers(
    aligned: Aligned, drivers: Sequence[DailyAmounts], normals: Sequence[float]
) -> Aligned:
    """Periods with these drivers; those without a known amount of one are set aside."""
    if not drivers:
        return replace(aligned, drivers=None)
    found, reasons = as_drivers(drivers, aligned.start, aligned.end, normals)
    return replace(_set_aside(aligned, reasons), drivers=found)


@dataclass(frozen=True, slots=True)
class _Bench:
    """One account on the bench: its batch, and fits of both sides for any set of drivers."""

    batch: Batch
    table: Stations
    values: NDArray[np.float64]
    done: dict[tuple[int, ...], tuple[DriverFit | None, DriverFit | None]]
    by_blocks: bool = False

    def fits(self, names: tuple[int, ...]) -> tuple[DriverFit | None, DriverFit | None]:
        if names not in self.done:
            x = np.ascontiguousarray(self.values[:, list(names)])
            before, after = (
                fit_with(self.batch, self.table, code, x, by_blocks=self.by_blocks)
                for _, code in SIDES
            )
            self.done[names] = (before, after)
        return self.done[names]

    def columns(self, code: int) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """(rows, drivers) of a side as its fits see them, and the days of each row."""
        mine = self.batch.side == code
        x = np.ascontiguousarray(self.values[mine])
        days = (self.batch.end - self.batch.start)[mine].astype(np.float64)
        if not self.by_blocks:
            return x, days
        side = side_data(self.batch, self.table, code)
        return block_means(side, x), block_lengths(side)

    def bic(self, names: tuple[int, ...]) -> float:
        """Of both sides together; of those that can be fitted without any driver."""
        total = 0.0
        for bare, fit in zip(self.fits(()), self.fits(names), strict=True):
            if bare is not None:
                total += fit.bic if fit is not None else float("inf")
        return total

    def best_t(self, j: int, names: tuple[int, ...]) -> float:
        """The larger |t| of a driver over the sides, in a fit that holds it."""
        at = names.index(j)
        return max((abs(fit.t[at]) for fit in self.fits(names) if fit is not None), default=0.0)

    def agrees(self, j: int, names: tuple[int, ...]) -> bool:
        """Whether its effect has the same sign on both sides, as far as there are two."""
        at = names.index(j)
        return len({fit.coef[at] > 0.0 for fit in self.fits(names) if fit is not None}) == 1


def choose_drivers(
    aligned: Aligned,
    labels: tuple[str, ...],
    drivers: Sequence[DailyAmounts],
    *,
    forms: Sequence[str],
    net: bool = False,
) -> Chosen:
    """The drivers that earn their place, with everything that was tried.

    labels : the side of every period, as savings/sides.py has them.  forms : offered to the
    choice.  Source: docs/method.md §3.1.
    """
    spans = {side: _span(aligned, labels, side) for side, _ in SIDES}
    levels = [normal_level(d, spans["before"], spans["after"]) for d in drivers]
    refused = [_known_too_little(d, aligned, labels) for d in drivers]
    open_ = [j for j, reason in enumerate(refused) if not reason]
    tried_on = with_drivers(aligned, [drivers[j] for j in open_], [levels[j][0] for j in open_])
    side = np.where(tried_on.usable, codes(labels), UNUSED).astype(np.uint8)
    values = np.zeros((aligned.n, len(drivers)))
    if tried_on.drivers is not None:
        values[:, open_] = tried_on.drivers.values
    days = _bench(tried_on, side, values, forms, net)
    fast = tuple(j for j in open_ if _comes_round(days, j))
    kept_fast = _screened(days, drivers, fast, refused)
    calm, rhythm = _without_rhythm(days, tried_on, labels, kept_fast)
    bench = _bench(calm, side, values, forms, net, by_blocks=True)
    kept_slow = _screened(bench, drivers, [j for j in open_ if j not in fast], refused)
    trials = tuple(
        _trial(days, d, j, refused[j], levels[j], kept_fast)
        if j in fast
        else _trial(bench, d, j, refused[j], levels[j], kept_slow)
        for j, d in enumerate(drivers)
    )
    kept = sorted((*kept_fast, *kept_slow))
    known = with_drivers(aligned, [drivers[j] for j in kept], [levels[j][0] for j in kept])
    calm, rhythm = _without_rhythm(days, replace(known, drivers=None), labels, kept_fast)
    return Chosen(
        trials=trials,
        aligned=with_drivers(
            calm, [drivers[j] for j in kept_slow], [levels[j][0] for j in kept_slow]
        ),
        rhythm=rhythm,
        original=aligned,
        labels=labels,
        amounts=tuple(drivers),
        normals=tuple(level for level, _ in levels),
        _days=days,
        _fast=fast,
    )


def _bench(
    aligned: Aligned,
    side: NDArray[np.uint8],
    values: NDArray[np.float64],
    forms: Sequence[str],
    net: bool,
    *,
    by_blocks: bool = False,
) -> _Bench:
    bare = replace(aligned, drivers=None)
    batch, table = batch_of_one(bare, side, tuple(forms), net)
    return _Bench(batch, table, values, {}, by_blocks)


def _screened(
    bench: _Bench, drivers: Sequence[DailyAmounts], tried: Sequence[int], refused: list[str]
) -> tuple[int, ...]:
    """The drivers kept; reasons against those refused are written down."""
    for j in tried:
        earlier = [i for i in tried if i < j and not refused[i]]
        refused[j] = _collinear(bench, drivers, j, earlier)
    return _forward(bench, [j for j in tried if not refused[j]])


def _comes_round(bench: _Bench, j: int) -> bool:
    """Whether a driver of daily readings comes round so evenly that blocks all have as much
    of it, as weekends do.  Its effect shows from day to day; a year's total hardly knows it.
    """
    side = side_data(bench.batch, bench.table, BEFORE)
    x = bench.values[bench.batch.side == BEFORE][:, [j]]
    means = block_means(side, x) if x.shape[0] else x
    if means.shape[0] == x.shape[0]:
        return False
    return float(means.var()) < EVEN_SHARE * float(x.var())


def _without_rhythm(
    days: _Bench, aligned: Aligned, labels: tuple[str, ...], fast: tuple[int, ...]
) -> tuple[Aligned, NDArray[np.float64]]:
    """Periods with the effect of evenly recurring kinds of days taken off, and (n, 2) what is
    taken off a day, by the effects of either side.

    About each side's own mean, so that a side's total stays what was billed.
    """
    rhythm = np.zeros((aligned.n, 2))
    if not fast:
        return aligned, rhythm
    x = days.values[:, list(fast)]
    own = np.zeros(aligned.n)
    lengths = aligned.days.astype(np.float64)
    for which, ((side, _), fit) in enumerate(zip(SIDES, days.fits(fast), strict=True)):
        mine = np.array([label == side for label in labels], dtype=np.bool_) & aligned.usable
        if fit is None or not mine.any():
            continue
        centre = np.average(x[mine], axis=0, weights=lengths[mine])
        rhythm[:, which] = (x - centre) @ np.array(fit.coef)
        own[mine] = rhythm[mine, which]
    return replace(aligned, use=aligned.use - own * lengths), rhythm


def _span(aligned: Aligned, labels: tuple[str, ...], side: str) -> tuple[int, int] | None:
    mine = [i for i, label in enumerate(labels) if label == side]
    if not mine:
        return None
    return int(aligned.start[mine].min()), int(aligned.end[mine].max())


def _set_aside(aligned: Aligned, reasons: tuple[str, ...]) -> Aligned:
    both = tuple(old or new for old, new in zip(aligned.reason, reasons, strict=True))
    return replace(aligned, reason=both)


def _known_too_little(driver: DailyAmounts, aligned: Aligned, labels: tuple[str, ...]) -> str:
    """Why a driver cannot be tried: its amounts are known for too few days of bills."""
    _, missing = period_means(driver, aligned.start, aligned.end)
    for side, _ in SIDES:
        mine = np.array([label == side for label in labels], dtype=np.bool_)
        if not mine.any():
            continue
        days = int(aligned.days[mine].sum())
        known = int(aligned.days[mine & (missing == 0)].sum())
        if known == 0 or (known < MIN_DAYS_A_SIDE <= days):
            n, all_ = int((mine & (missing == 0)).sum()), int(mine.sum())
            return (
                f"its amounts are known for all days of only {n} of the {all_} bills {side} the "
                "work"
            )
    return ""


def _collinear(
    bench: _Bench, drivers: Sequence[DailyAmounts], j: int, earlier: Sequence[int]
) -> str:
    """Why the bills cannot show what a driver does; "" where they can."""
    for (side, code), bare in zip(SIDES, bench.fits(()), strict=True):
        if bare is None:
            continue
        x, days = bench.columns(code)
        if shared_with(x[:, j], np.empty((x.shape[0], 0)), days) >= 1.0:
            return f"it is the same in every bill {side} the work"
        mean = float((days * x[:, j]).sum() / days.sum())
        spread = float(np.sqrt((days * (x[:, j] - mean) ** 2).sum() / days.sum()))
        if drivers[j].kind == "day type" and spread < MIN_DAY_TYPE_SPREAD:
            return (
                f"every bill {side} the work has nearly the same share of them "
                f"(it varies by {100 * spread:.1f} % of a bill's days)"
            )
        share = shared_with(x[:, j], bare.weather, days)
        if share >= MAX_SHARED_VARIATION:
            return (
                f"it moves with the weather: {share:.0%} of how it varies {side} the work goes "
                "with degree-days, so the two cannot be told apart"
            )
        share = shared_with(x[:, j], np.column_stack([bare.weather, x[:, list(earlier)]]), days)
        if share >= MAX_SHARED_VARIATION:
            names = " and ".join(drivers[i].name for i in earlier)
            return (
                f"it moves with {names}: {share:.0%} of how it varies {side} the work goes with "
                "it and the weather, so they cannot be told apart"
            )
    return ""


def _forward(bench: _Bench, able: Sequence[int]) -> tuple[int, ...]:
    """Drivers added one at a time while the best one left earns its place; in file order."""
    kept: tuple[int, ...] = ()
    while True:
        best, gain = None, 0.0
        for j in able:
            if j in kept:
                continue
            names = tuple(sorted((*kept, j)))
            better = bench.bic(kept) - bench.bic(names)
            if better > gain and bench.best_t(j, names) >= MIN_ABS_T and bench.agrees(j, names):
                best, gain = j, better
        if best is None:
            break
        kept = tuple(sorted((*kept, best)))
    while kept:  # one that others made needless goes again
        weak = [j for j in kept if bench.best_t(j, kept) < MIN_ABS_T]
        if not weak:
            break
        worst = min(weak, key=lambda j: bench.best_t(j, kept))
        kept = tuple(j for j in kept if j != worst)
    return kept


def _trial(
    bench: _Bench,
    driver: DailyAmounts,
    j: int,
    refused: str,
    level: tuple[float, str],
    kept: tuple[int, ...],
) -> DriverTrial:
    trial = DriverTrial(
        name=driver.name,
        kind=driver.kind,
        source=driver.source,
        reading=driver.reading,
        kept=j in kept,
        reason=refused,
        normal=level[0],
        normal_from=level[1],
    )
    if refused:
        return trial
    with_it = tuple(sorted({*kept, j}))
    without = tuple(i for i in with_it if i != j)
    at = with_it.index(j)
    before, after = (
        None if fit is None else Effect(fit.coef[at], fit.se[at], fit.t[at])
        for fit in bench.fits(with_it)
    )
    bic_with, bic_without = bench.bic(with_it), bench.bic(without)
    reason = ""
    if j not in kept:
        reason = _why_not(before, after, bic_with, bic_without)
    return replace(
        trial,
        reason=reason,
        before=before,
        after=after,
        bic_with=bic_with if np.isfinite(bic_with) else None,
        bic_without=bic_without if np.isfinite(bic_without) else None,
    )


def _why_not(
    before: Effect | None, after: Effect | None, bic_with: float, bic_without: float
) -> str:
    if not np.isfinite(bic_with):
        return "there are too few bills for one more thing to be found from them"
    seen = [
        f"{abs(effect.t):.1f} {side}"
        for side, effect in (("before", before), ("after", after))
        if effect is not None
    ]
    strongest = max((abs(e.t) for e in (before, after) if e is not None), default=0.0)
    if strongest < MIN_ABS_T:
        return (
            f"its effect cannot be told from none (|t| {', '.join(seen)} the work; "
            f"{MIN_ABS_T:g} is wanted)"
        )
    if before is not None and after is not None and (before.value > 0.0) != (after.value > 0.0):
        return "it seems to raise use on one side of the work and to lower it on the other"
    return (
        "the bills are described no better with it for one more number to find "
        f"(BIC {bic_with:.1f} with it, {bic_without:.1f} without)"
    )
