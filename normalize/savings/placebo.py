"""Invented work dates inside a baseline, where nothing was done: would they announce a change?

Every boundary between two bills that leaves enough on either side is taken for the work, and
the whole comparison repeated, choice of form included, in one batch.  A 90 % range should
exclude zero at about a tenth of such dates.  Neighbouring dates share nearly all their bills,
so their answers are not independent (docs/method.md §6).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from normalize.defaults import (
    CONFIDENCE,
    FEW_INTERVALS,
    MIN_ABS_T,
    MIN_DAYS_A_SIDE,
    POOLED_WINDOW_DAYS,
    WINDOW_DAYS,
)
from normalize.fitting.batch import Batch, Stations, wanted_mask
from normalize.fitting.columns import AFTER, BASE, BEFORE, SE_LINE, SLOPE_LINE, STATUS, UNUSED
from normalize.fitting.forms import FLAT, LINE, NO_BALANCE, TOO_FEW
from normalize.savings.again import NO_YEAR, Asked, ask_again
from normalize.savings.compare import run_batch
from normalize.savings.kernel import NAC_BEFORE, NORMALIZED

if TYPE_CHECKING:
    from collections.abc import Sequence

    from numpy.typing import NDArray

    from normalize.savings.results import Estimate
    from normalize.weather.year import LongTermYear

MOST_DATES = 48  # more boundaries than this are thinned evenly: they add hardly anything
FEWEST_DATES = 8  # tried of daily readings, of which a date costs more
MOST_ROWS = 6_000  # dates times readings, above which dates are thinned further
NO_DATE = (
    "no invented date leaves bills on both sides that show how use answers to weather: a few "
    "more months of older bills would help"
)
ROWS_AT_ONCE = 200_000  # of a program's batch, so that memory stays small


@dataclass(frozen=True, slots=True)
class InventedDate:
    """One invented work date: its day number, the bills on either side, the change it found."""

    day: int
    n_before: int
    n_after: int
    normalized: Estimate


@dataclass(frozen=True, slots=True)
class Placebo:
    """What invented work dates would have announced in a baseline where nothing was done.

    dates : those with an answer, in order of time.  without_answer : admissible dates whose
    bills gave none.  first, last : the stretch of bills used, half-open day numbers.
    unavailable : why there is none, and how much longer the baseline must be; else "".
    """

    dates: tuple[InventedDate, ...] = ()
    without_answer: int = 0
    first: int | None = None
    last: int | None = None
    unavailable: str = ""

    @property
    def announced(self) -> tuple[InventedDate, ...]:
        """The dates whose range excludes no change."""
        told = ("reduction", "increase")
        return tuple(d for d in self.dates if d.normalized.verdict in told)

    @property
    def largest(self) -> InventedDate | None:
        """The date with the largest change either way, as a fraction where there is one."""
        return max(self.dates, key=lambda d: size_of(d.normalized), default=None)

    @property
    def share(self) -> float | None:
        """Share of the dates that would have announced a change."""
        return len(self.announced) / len(self.dates) if self.dates else None


def size_of(estimate: Estimate) -> float:
    """How large a change is, whichever its direction: of NAC before, or in units."""
    value = estimate.fraction if estimate.fraction is not None else estimate.value
    return abs(value) if value is not None else 0.0


def placebo_of(
    asked: Asked, labels: Sequence[str], *, work_start: int, delivered: bool = False
) -> Placebo:
    """The placebo of one account, over all usable bills of this occupant before the work.

    labels : (periods,) as ``Comparison.labels``: "before" and "older" take part.
    """
    aligned = asked.aligned
    own = np.array([label in ("before", "older") for label in labels], dtype=np.bool_)
    mine = own & aligned.usable & (aligned.end <= work_start)
    if asked.year is None:
        return Placebo(unavailable=NO_YEAR)
    days, sides = invented_dates(
        aligned.start, aligned.end, mine,
        window_days=_window(aligned.days[mine], delivered), most=dates_of(int(mine.sum())),
    )  # fmt: skip
    if days.shape[0] == 0:
        return Placebo(unavailable=_too_short(int(aligned.days[mine].sum())))
    found = ask_again(asked, sides, also=("line",))
    sure = believed(found.fits, found.chosen, wanted_mask(asked.forms))
    dates = tuple(
        InventedDate(
            int(day),
            int((sides[i] == BEFORE).sum()),
            int((sides[i] == AFTER).sum()),
            found.normalized(i),
        )
        for i, day in enumerate(days)
        if sure[i] and not np.isnan(found.answers[i, NORMALIZED])
    )
    if not dates:
        return Placebo(without_answer=int(days.shape[0]), unavailable=NO_DATE)
    first, last = int(aligned.start[mine].min()), int(aligned.end[mine].max())
    return Placebo(dates, int(days.shape[0]) - len(dates), first, last)


def dates_of(readings: int, most: int = MOST_DATES) -> int:
    """How many invented dates are tried of so many readings.

    >>> dates_of(60), dates_of(1460)
    (48, 8)
    """
    return min(most, max(MOST_ROWS // max(readings, 1), FEWEST_DATES))


def _window(lengths: NDArray[np.int32], delivered: bool) -> int:
    """Days used on either side, as for the real work: deliveries that are few are pooled."""
    if delivered and lengths.shape[0] and WINDOW_DAYS / float(np.median(lengths)) < FEW_INTERVALS:
        return POOLED_WINDOW_DAYS
    return WINDOW_DAYS


def _too_short(days: int) -> str:
    needed = 2 * MIN_DAYS_A_SIDE
    more = max(needed - days, 0)
    if more == 0:
        return (
            f"no boundary between its bills leaves {MIN_DAYS_A_SIDE} days on either side: the "
            "usable bills before the work have gaps"
        )
    months = -(-more // 30)
    return (
        f"there are {days} days of usable bills before the work and {needed} are needed, "
        f"{MIN_DAYS_A_SIDE} on either side of an invented date: about {months} more "
        f"month{'' if months == 1 else 's'} of older bills"
    )


def invented_dates(
    start: NDArray[np.int32],
    end: NDArray[np.int32],
    mine: NDArray[np.bool_],
    *,
    window_days: int = WINDOW_DAYS,
    most: int = MOST_DATES,
) -> tuple[NDArray[np.int64], NDArray[np.uint8]]:
    """The admissible invented dates of one account and who is on which side of each.

    mine : (n,) the periods that may take part.  Returns days (k,) and sides (k, n).  Either
    side has at least 270 days within ``window_days`` of the date, as the real work needs.
    """
    days = np.unique(end[mine]).astype(np.int64)
    middle = 0.5 * (start + end)
    total = np.concatenate([[0], np.cumsum(np.where(mine, end - start, 0).astype(np.int64))])
    # Periods stand in order of time and never overlap, so either side is one stretch of them.
    first = np.searchsorted(middle, days - window_days, side="left")
    turn = np.searchsorted(end, days, side="right")
    last = np.searchsorted(middle, days + window_days, side="left")
    enough = np.minimum(total[turn] - total[first], total[last] - total[turn]) >= MIN_DAYS_A_SIDE
    kept = np.flatnonzero(enough)
    if kept.shape[0] > most:
        # Evenly, the middle of each of so many equal parts.
        kept = kept[((np.arange(most) + 0.5) * kept.shape[0] / most).astype(np.intp)]
    place = np.arange(start.shape[0])
    before = (place >= first[kept, None]) & (place < turn[kept, None]) & mine
    after = (place >= turn[kept, None]) & (place < last[kept, None]) & mine
    sides = np.where(before, BEFORE, np.where(after, AFTER, UNUSED))
    return days[kept], sides.astype(np.uint8)


def believed(
    fits: NDArray[np.float64], chosen: NDArray[np.int8], wanted: NDArray[np.bool_]
) -> NDArray[np.bool_]:
    """(accounts,) whether both sides have a form that may be believed.

    As savings/enough.py: a flat load is not, where no slope could be tried and yet the line
    (which must have been fitted) shows weather.  wanted : (N_FORMS,) or (accounts, N_FORMS).
    """
    sloped = np.array(wanted, dtype=np.bool_, copy=True)
    sloped[..., [FLAT, LINE]] = False
    sloped = np.broadcast_to(sloped, (fits.shape[0], sloped.shape[-1]))[:, None, :]
    status = fits[..., STATUS]
    starved = (sloped & ((status == NO_BALANCE) | (status == TOO_FEW))).any(axis=2)
    fitted = (sloped & ~np.isnan(fits[..., BASE])).any(axis=2)
    with np.errstate(divide="ignore", invalid="ignore"):
        t = np.abs(fits[:, :, LINE, SLOPE_LINE] / fits[:, :, LINE, SE_LINE])
    blind = (chosen == FLAT) & starved & ~fitted & (t >= MIN_ABS_T)
    good: NDArray[np.bool_] = ((chosen >= 0) & ~blind).all(axis=1)
    return good


@dataclass(frozen=True, slots=True)
class PlaceboCounts:
    """A batch's placebo, one entry an account: (accounts,) arrays.

    dates : invented dates with an answer.  reductions, increases : of those, how many would
    have announced one.  largest : the largest change as a fraction of NAC before, with its
    sign (positive: a reduction); NaN where there is no date.
    """

    dates: NDArray[np.int64]
    reductions: NDArray[np.int64]
    increases: NDArray[np.int64]
    largest: NDArray[np.float64]

    @property
    def alarms(self) -> NDArray[np.int64]:
        """(accounts,) dates that would have announced a change."""
        total: NDArray[np.int64] = self.reductions + self.increases
        return total


def placebo_counts(
    batch: Batch,
    table: Stations,
    years: Sequence[LongTermYear | None],
    *,
    confidence: float = CONFIDENCE,
    most: int = MOST_DATES,
    window_days: int = WINDOW_DAYS,
) -> PlaceboCounts:
    """The placebo of every account of a batch, over its periods coded BEFORE.

    For a program's comparison homes code every period BEFORE; for participants only those
    before their work.  most : invented dates an account; 1 takes the middle one.
    """
    accounts = batch.offsets.shape[0] - 1
    out = PlaceboCounts(
        np.zeros(accounts, np.int64), np.zeros(accounts, np.int64), np.zeros(accounts, np.int64),
        np.full(accounts, np.nan),
    )  # fmt: skip
    pieces: list[tuple[int, slice, NDArray[np.uint8]]] = []
    rows = 0
    for i in range(accounts):
        cut = slice(int(batch.offsets[i]), int(batch.offsets[i + 1]))
        mine = batch.side[cut] == BEFORE
        _, sides = invented_dates(
            batch.start[cut], batch.end[cut], mine,
            window_days=window_days, most=dates_of(int(mine.sum()), most),
        )  # fmt: skip
        if sides.shape[0]:
            pieces.append((i, cut, sides))
            rows += sides.size
        if rows >= ROWS_AT_ONCE:
            _count(out, batch, table, years, pieces, confidence)
            pieces, rows = [], 0
    if pieces:
        _count(out, batch, table, years, pieces, confidence)
    return out


def _count(
    out: PlaceboCounts,
    batch: Batch,
    table: Stations,
    years: Sequence[LongTermYear | None],
    pieces: list[tuple[int, slice, NDArray[np.uint8]]],
    confidence: float,
) -> None:
    """Adds the answers of these accounts' invented dates to ``out``."""
    times = [sides.shape[0] for _, _, sides in pieces]
    owner = np.repeat([i for i, _, _ in pieces], times)
    sizes = np.repeat([sides.shape[1] for _, _, sides in pieces], times)
    many = Batch(
        start=np.concatenate([np.tile(batch.start[c], s.shape[0]) for _, c, s in pieces]),
        end=np.concatenate([np.tile(batch.end[c], s.shape[0]) for _, c, s in pieces]),
        use=np.concatenate([np.tile(batch.use[c], s.shape[0]) for _, c, s in pieces]),
        side=np.concatenate([s.ravel() for _, _, s in pieces]),
        offsets=np.concatenate([[0], np.cumsum(sizes)]).astype(np.int64),
        station=batch.station[owner],
        wanted=batch.wanted[owner],
        net=batch.net[owner],
        drivers=None
        if batch.drivers is None
        else np.concatenate([np.tile(batch.drivers[c], (s.shape[0], 1)) for _, c, s in pieces]),
        n_drivers=None if batch.n_drivers is None else batch.n_drivers[owner],
    )
    line = np.zeros_like(many.wanted)
    line[:, LINE] = True
    fits, chosen, answers = run_batch(many, table, years, confidence=confidence, tried=line)
    known = believed(fits, chosen, many.wanted) & ~np.isnan(answers[:, NORMALIZED])
    np.add.at(out.dates, owner[known], 1)
    np.add.at(out.reductions, owner[known & (answers[:, NORMALIZED + 1] > 0.0)], 1)
    np.add.at(out.increases, owner[known & (answers[:, NORMALIZED + 2] < 0.0)], 1)
    with np.errstate(divide="ignore", invalid="ignore"):
        fraction = answers[:, NORMALIZED] / answers[:, NAC_BEFORE]
    for i, value in zip(owner[known].tolist(), fraction[known].tolist(), strict=True):
        if not abs(value) <= abs(out.largest[i]):  # NaN gives way
            out.largest[i] = value
