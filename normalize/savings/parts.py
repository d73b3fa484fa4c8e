"""The savings taken apart: what base load, slopes and balance temperatures each account for.

Every parameter of the form has one part: its own change, with the others at the mean of
before and after.  The parts add up to the normalized savings exactly.  They err together,
slope and balance temperature strongly, so each has its own, wider range (docs/method.md §7).
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

import numpy as np
from numpy.typing import NDArray

from normalize.fitting.align import Aligned
from normalize.fitting.batch import Batch, Stations, driver_gate, gate
from normalize.fitting.fit import batch_of_one
from normalize.fitting.forms import form_named
from normalize.savings.cautions import POOR_TAU_F
from normalize.savings.compare import Comparison
from normalize.savings.estimates import estimate_at
from normalize.savings.parts_kernel import (
    FORMS_DIFFER,
    HELD,
    NO_FIT,
    NO_YEAR,
    SLOPE_AFTER,
    SLOPE_BEFORE,
    SLOPE_CHANGE,
    parts_batch,
)
from normalize.savings.results import Estimate, Savings
from normalize.savings.sides import codes
from normalize.savings.taken_apart import Part, Parts
from normalize.weather.year import LongTermYear

# Names of a form's parts, in the order of its parameters.
PARTS: Final[dict[str, tuple[str, ...]]] = {
    "flat": ("base load",),
    "line": ("level at 60 °F", "slope"),
    "heating": ("base load", "heating slope", "heating balance temperature"),
    "cooling": ("base load", "cooling slope", "cooling balance temperature"),
    "two slopes": ("base load", "heating slope", "cooling slope", "balance temperature"),
    "heating and cooling": (
        "base load",
        "heating slope",
        "cooling slope",
        "heating balance temperature",
        "cooling balance temperature",
    ),
}
# The order in which they are read: each balance temperature beside its slope.
READ_AS: Final[dict[str, tuple[int, ...]]] = {"heating and cooling": (0, 1, 3, 2, 4)}

REASONS: Final[dict[int, str]] = {
    NO_FIT: "there is no fit on both sides of the work",
    FORMS_DIFFER: "the bills before and after the work were given different forms, whose "
    "parameters are not of one kind",
    HELD: "the bills do not place the balance temperature on one side, so what it changed "
    "cannot be told from what the slope changed",
    NO_YEAR: "there is no long-term year",
}
METHOD: Final = (
    "each part as a straight line about both fits, balance temperatures included; serial "
    "correlation of the bills integrated over (restricted likelihood, Student t)"
)
Arrays = tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.int8]]


def run_parts(
    batch: Batch,
    table: Stations,
    years: Sequence[LongTermYear | None],
    fits: NDArray[np.float64],
    chosen: NDArray[np.int8],
    *,
    confidence: float,
    weights: str = "days",
    hold: bool = False,
) -> Arrays:
    """Parts over a ragged batch, from the fits and choices that ``run_batch`` returned.

    Returns parts (accounts, 5, 5), in the order of ``PARTS`` of each account's form, heating
    slopes (accounts, 3, 5), and (accounts,) why there are no parts, a key of ``REASONS`` or 0.
    Each row of five: value, low, high, plain low, plain high; NaN where unknown.
    """
    temp = [y.temp_f if y else np.empty(0) for y in years]
    days = [y.cum_days if y else np.zeros(1) for y in years]
    degrees = [y.cum_degrees if y else np.zeros(1) for y in years]
    found: Arrays = parts_batch(
        *gate(batch),
        *driver_gate(batch),
        np.ascontiguousarray(fits, dtype=np.float64),
        np.ascontiguousarray(chosen, dtype=np.int8),
        table.temp, table.order, table.offsets, table.first_day,
        np.concatenate(temp).astype(np.float64), _offsets(temp),
        np.concatenate(days).astype(np.float64), np.concatenate(degrees).astype(np.float64),
        _offsets(days), weights == "equal", hold, float(confidence),
    )  # fmt: skip
    return found


def _offsets(arrays: Sequence[NDArray[np.float64]]) -> NDArray[np.int64]:
    return np.concatenate([[0], np.cumsum([a.shape[0] for a in arrays])]).astype(np.int64)


def parts_of(
    aligned: Aligned, found: Comparison, year: LongTermYear | None, *, confidence: float
) -> Parts:
    """The parts of one account's normalized savings, from its comparison.

    The same compiled instructions as ``run_parts``, so an account alone and among many has
    the same bits.
    """
    savings = found.savings
    if savings.before is None or found.fits is None:
        return Parts(unavailable=savings.before_unavailable or REASONS[NO_FIT])
    chosen = np.full((1, 2), np.int8(-1))
    for side, fit in enumerate((savings.before, savings.after)):
        if fit is not None:
            chosen[0, side] = form_named(fit.form).code
    batch, table = batch_of_one(aligned, codes(found.labels), (savings.before.form,))
    parts, slopes, why = run_parts(
        batch, table, [year], found.fits, chosen, confidence=confidence,
        hold=found.stated_f is not None,
    )  # fmt: skip
    return _assembled(found, parts[0], slopes[0], int(why[0]), confidence)


def _assembled(
    found: Comparison,
    parts: NDArray[np.float64],
    slopes: NDArray[np.float64],
    why: int,
    confidence: float,
) -> Parts:
    savings = found.savings
    reason: str | None = REASONS.get(why)
    if not savings.normalized.available:
        reason = savings.normalized.unavailable
    elif why == HELD and found.stated_f is not None:
        reason = (
            f"the balance temperature was stated ({found.stated_f:g} °F), not found, so its part "
            "is not known"
        )

    def slope(row: int) -> Estimate | None:
        if np.isnan(slopes[row, 0]):
            return None
        return estimate_at(slopes[row], 0, None, confidence, METHOD)

    told: tuple[Part, ...] = ()
    if reason is None and savings.before is not None:
        names = PARTS[savings.before.form]
        over = savings.nac_before.value
        told = tuple(
            Part(names[i], estimate_at(parts[i], 0, over, confidence, METHOD, net=True))
            for i in READ_AS.get(savings.before.form, tuple(range(len(names))))
        )
    return Parts(
        parts=told,
        unavailable=reason,
        rough=_rough(savings) if told else "",
        slope_before=slope(SLOPE_BEFORE),
        slope_after=slope(SLOPE_AFTER),
        slope_change=slope(SLOPE_CHANGE),
    )


def _rough(savings: Savings) -> str:
    """Which balance temperatures the bills place only roughly."""
    told = []
    for side, fit in (("before", savings.before), ("after", savings.after)):
        if fit is None:
            continue
        for kind, span in (
            ("heating", fit.balance_heating_range_f),
            ("cooling", fit.balance_cooling_range_f),
        ):
            if span is not None and span[1] - span[0] > POOR_TAU_F:
                told.append(
                    f"for {kind} {side} the work between {span[0]:.0f} and {span[1]:.0f} °F"
                )
    if not told:
        return ""
    return (
        f"The bills place the balance temperature only roughly ({'; '.join(told)}), so the parts "
        "are rough, and so are their ranges: trust the whole more than its parts."
    )
