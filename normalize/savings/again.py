"""One account's comparison asked again of other choices of its bills, all in one batch.

Used by the answer without each bill and by invented work dates.  Asked of the bills that
the answer itself rests on, it gives that answer, bit for bit.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from normalize.fitting import forms as f
from normalize.fitting.align import Aligned
from normalize.fitting.batch import Batch, Stations, wanted_mask
from normalize.fitting.columns import BEFORE, UNUSED
from normalize.fitting.fit import batch_of_one
from normalize.savings.compare import run_batch
from normalize.savings.estimates import estimate_at, normalized_of
from normalize.savings.kernel import AVOIDED, NORMALIZED, PREDICTED, UNSURE_AFTER, UNSURE_BEFORE
from normalize.savings.methods import Methods
from normalize.savings.results import Estimate
from normalize.savings.stated import STATED_F, STATED_RANGE_F, held_at, widen
from normalize.weather.year import LongTermYear

NO_FIT = "without it no form fits the bills that are left"
NO_YEAR = "there is no long-term year"
NO_AFTER = "there are no usable bills after the work"


@dataclass(frozen=True, slots=True)
class Asked:
    """What stays the same in every repetition of an account's comparison.

    aligned : its periods over the weather.  forms : names offered to the choice.
    net : generation may outweigh use.  stated : the balance temperature was stated, not
    found (docs/method.md §5.5).
    """

    aligned: Aligned
    year: LongTermYear | None
    forms: tuple[str, ...]
    confidence: float
    net: bool = False
    stated: bool = False


@dataclass(frozen=True, slots=True)
class Answers:
    """The kernel's tables of every repetition: fits, forms chosen, answers."""

    asked: Asked
    fits: NDArray[np.float64]
    chosen: NDArray[np.int8]
    answers: NDArray[np.float64]

    def form(self, i: int, which: int) -> str:
        """The form that repetition i chose before (0) or after (1) the work; "" for none."""
        code = int(self.chosen[i, which])
        return f.BY_CODE[code].name if code >= 0 else ""

    def normalized(self, i: int) -> Estimate:
        """Normalized savings of repetition i."""
        row, confidence = self.answers[i], self.asked.confidence
        if np.isnan(row[NORMALIZED]):
            reason = NO_YEAR if self.asked.year is None else NO_FIT
            return Estimate.none(reason, confidence=confidence)
        return normalized_of(row, confidence, self._methods(i).both, self.asked.net)

    def avoided(self, i: int) -> Estimate:
        """Avoided use of repetition i."""
        row, confidence = self.answers[i], self.asked.confidence
        if np.isnan(row[AVOIDED]):
            reason = NO_FIT if np.isnan(row[PREDICTED]) and self.chosen[i, 0] < 0 else NO_AFTER
            return Estimate.none(reason, confidence=confidence)
        over = float(row[PREDICTED])
        return estimate_at(row, AVOIDED, over, confidence, self._methods(i).avoided, self.asked.net)

    def _methods(self, i: int) -> Methods:
        unsure = (self.answers[i, UNSURE_BEFORE] == 1.0, self.answers[i, UNSURE_AFTER] == 1.0)
        return Methods.of(unsure, self.asked.stated)


def ask_again(asked: Asked, sides: NDArray[np.uint8], *, also: Sequence[str] = ()) -> Answers:
    """The comparison repeated with other bills on either side.

    sides : (repetitions, periods) codes as in fitting/columns.py; periods that cannot be
    used are never used.  also : forms to fit and show beside those offered.
    """
    aligned = asked.aligned
    codes = np.where(aligned.usable, sides, UNUSED).astype(np.uint8)
    keep = (codes != UNUSED).any(axis=0)
    batch, table = _batch(asked, codes[:, keep], keep)
    if asked.stated:
        return Answers(asked, *_at_stated(batch, table, asked))
    tried = wanted_mask(tuple(also))[None, :] if also else None
    found = run_batch(batch, table, [asked.year], confidence=asked.confidence, tried=tried)
    return Answers(asked, *found)


def _batch(
    asked: Asked, codes: NDArray[np.uint8], keep: NDArray[np.bool_]
) -> tuple[Batch, Stations]:
    times, n = codes.shape
    used = np.where(keep, BEFORE, UNUSED).astype(np.uint8)
    one, table = batch_of_one(asked.aligned, used, asked.forms, asked.net)
    batch = Batch(
        start=np.tile(one.start[keep], times),
        end=np.tile(one.end[keep], times),
        use=np.tile(one.use[keep], times),
        side=codes.ravel(),
        offsets=n * np.arange(times + 1, dtype=np.int64),
        station=np.zeros(times, dtype=np.int32),
        wanted=np.tile(one.wanted, (times, 1)),
        net=np.tile(one.net, times),
        drivers=None if one.drivers is None else np.tile(one.drivers[keep], (times, 1)),
        n_drivers=None if one.n_drivers is None else np.tile(one.n_drivers, times),
    )
    return batch, table


def _at_stated(
    batch: Batch, table: Stations, asked: Asked
) -> tuple[NDArray[np.float64], NDArray[np.int8], NDArray[np.float64]]:
    """As savings/stated.py: the value at the stated τ, the range the hull over the others."""
    middle = held_at(batch, table, asked.year, STATED_F, asked.confidence)
    hull = middle[2].copy()
    for tau in STATED_RANGE_F:
        widen(hull.T, held_at(batch, table, asked.year, tau, asked.confidence)[2].T)
    return middle[0], middle[1], hull
