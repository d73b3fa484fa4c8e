"""When bills do not place the balance temperature: a stated one, and what that costs.

Deliveries are long and few.  Where no balance temperature stands out, the fit is made at a
customary one and again at either end of the customary range; the range reported is the hull
of all three, so that not knowing τ widens it (docs/method.md §5).
"""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import NDArray

from normalize.fitting.batch import Batch, Stations, settings
from normalize.fitting.columns import BASE, ON_BOUND
from normalize.fitting.forms import HEATING
from normalize.fitting.results import FormTried
from normalize.fitting.side import S_COLD, S_H_HIGH, S_H_LOW, S_MILD, S_SPARE
from normalize.savings.kernel import AVOIDED, NAC_AFTER, NAC_BEFORE, NORMALIZED
from normalize.weather.year import LongTermYear

STATED_F: Final = 60.0  # °F: the middle of the customary 55-65 (common practice, no source)
STATED_RANGE_F: Final = (55.0, 65.0)
FLAT_PROFILE_F: Final = 20.0  # °F: a profile this wide places nothing
FEWEST: Final = 5  # intervals: two coefficients and three to spare

Answer = tuple[NDArray[np.float64], NDArray[np.int8], NDArray[np.float64]]


def needs_stated(tried: tuple[FormTried, ...], held: bool) -> bool:
    """Whether a side's deliveries leave the balance temperature open."""
    heating = next(t for t in tried if t.form == "heating")
    chosen = next((t for t in tried if t.chosen), None)
    if heating.fit is None:
        return True
    if chosen is None or chosen.form != "heating":
        return False
    span = heating.fit.balance_heating_range_f
    return held or (span is not None and span[1] - span[0] > FLAT_PROFILE_F)


def at_stated(
    batch: Batch, table: Stations, year: LongTermYear | None, *, confidence: float
) -> Answer | None:
    """Fits at the stated balance temperature, and the hull of the ranges over 55-65 °F.

    None when even that cannot be fitted on the baseline.
    """
    middle: Answer | None = None
    hull: NDArray[np.float64] | None = None
    for tau in (STATED_F, *STATED_RANGE_F):
        found = held_at(batch, table, year, tau, confidence)
        if np.isnan(found[0][0, 0, HEATING, BASE]):
            return None
        if middle is None:
            middle, hull = found, found[2].copy()
        elif hull is not None:
            widen(hull[0], found[2][0])
    if middle is None or hull is None:
        return None
    middle[0][..., ON_BOUND] = 0.0  # where it was put, not where it ended
    return middle[0], middle[1], hull


def held_at(
    batch: Batch, table: Stations, year: LongTermYear | None, tau: float, confidence: float
) -> Answer:
    """The answers of a whole batch with heating's balance temperature put at ``tau``, °F."""
    from normalize.savings.compare import run_batch

    fixed = settings()
    fixed[S_H_LOW] = fixed[S_H_HIGH] = tau
    fixed[S_COLD], fixed[S_MILD] = 2.0, 1.0
    fixed[S_SPARE] = FEWEST - 3.0  # the form's three parameters count one that is not fitted here
    only = np.zeros_like(batch.wanted)
    only[:, HEATING] = True
    return run_batch(
        batch, table, [year], confidence=confidence, tried=only, forced=(HEATING, HEATING),
        settings_=fixed, hold=True,
    )  # fmt: skip


def widen(hull: NDArray[np.float64], other: NDArray[np.float64]) -> None:
    """Widens the ranges of one answer, in place, to those of another."""
    for at in (NAC_BEFORE, NAC_AFTER, NORMALIZED, AVOIDED):
        for low in (at + 1, at + 3):
            hull[low] = np.fmin(hull[low], other[low])
            hull[low + 1] = np.fmax(hull[low + 1], other[low + 1])
