"""Which form, when bills are few: one picked by a criterion, or an average over all?

Judged by the error and the coverage of NAC and savings.  Averaging is by weights
∝ exp(−½ BIC) over the forms that pass the screens, with the standard error of Buckland,
Burnham & Augustin 1997, Biometrics 53:603-618: Σ w √(se² + (θ − θ̄)²).
"""

from __future__ import annotations

from dataclasses import asdict, dataclass, replace

import numpy as np
from numpy.typing import NDArray

from normalize.defaults import CONFIDENCE
from normalize.fitting import forms as f
from normalize.fitting.columns import AFTER, AICC, BEFORE, BIC, STATUS, UNUSED
from normalize.fitting.columns import N as COUNT
from normalize.fitting.student import t_quantile
from normalize.savings.compare import run_batch
from normalize.savings.kernel import NAC_BEFORE, NORMALIZED
from tests.prove.calibration.answers import answers_of
from tests.prove.calibration.cells import Cell
from tests.prove.calibration.homes import Homes, simulate
from tests.prove.calibration.measures import covered, truth_of

PICK_BIC, PICK_AICC = "BIC", "AICc"
ALONE, AVERAGED = "BIC, sides apart", "averaged"
WAYS = (PICK_BIC, PICK_AICC, ALONE, AVERAGED)

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Score:
    """How a way of choosing did. rms, width : shares of true NAC; n : homes judged."""

    n: int
    right_form: float
    rms_nac: float
    rms_savings: float
    coverage_nac: float
    coverage_savings: float
    width_savings: float


@dataclass(frozen=True, slots=True)
class Choice:
    """A cell's scores by way of choosing."""

    cell: Cell
    homes: int
    scores: dict[str, Score]

    def as_json(self) -> dict[str, object]:
        """Plain numbers for the cache."""
        return asdict(self)

    @classmethod
    def from_json(cls, data: dict[str, object]) -> Choice:
        """A cached result."""
        cell = Cell(**data["cell"])  # type: ignore[arg-type]
        scores = {k: Score(**v) for k, v in data["scores"].items()}  # type: ignore
        return cls(cell, data["homes"], scores)  # type: ignore[arg-type]


@dataclass(frozen=True)
class _Side:
    """One side, every form: NAC, its range and weight. All (homes, forms)."""

    value: Array
    middle: Array
    se: Array
    t: Array
    bic: Array


def compare_ways(cell: Cell, homes: int) -> Choice:
    """All ways of choosing on the same homes; each is judged where all give an answer."""
    made = simulate(cell, homes)
    truth = truth_of(made)
    sides = [_side(made, code) for code in (BEFORE, AFTER)]
    estimates = {}
    right = {}
    for name, criterion in ((PICK_BIC, BIC), (PICK_AICC, AICC)):
        found = answers_of(made, criterion=criterion)
        rows = np.where(found.known[:, None], found.rows, np.nan)
        estimates[name] = (rows[:, NAC_BEFORE : NAC_BEFORE + 3], rows[:, NORMALIZED:][:, :3])
        right[name] = found.chosen[:, 0] == f.form_named(cell.form).code
    picked = [_one_hot(s.bic) for s in sides]
    weights = [_weights(s.bic) for s in sides]
    estimates[ALONE] = _of_sides(sides, picked)
    estimates[AVERAGED] = _of_sides(sides, weights)
    right[ALONE] = right[AVERAGED] = right[PICK_BIC]
    known = np.ones(homes, bool)
    for nac, savings in estimates.values():
        known &= np.isfinite(nac).all(axis=1) & np.isfinite(savings).all(axis=1)
    scores = {
        way: _score(*estimates[way], truth, made.nac[:, 0], known, right[way]) for way in WAYS
    }
    return Choice(cell, homes, scores)


def _score(
    nac: Array, savings: Array, truth: dict[str, Array], size: Array,
    known: NDArray[np.bool_], right: NDArray[np.bool_],
) -> Score:  # fmt: skip
    def rms(estimate: Array, true: Array) -> float:
        return float(np.sqrt((((estimate[:, 0] - true) / size)[known] ** 2).mean()))

    def coverage(estimate: Array, true: Array) -> float:
        return covered(estimate[known, 1], estimate[known, 2], true[known])[0]

    return Score(
        n=int(known.sum()),
        right_form=float(right[known].mean()),
        rms_nac=rms(nac, truth["nac before"]),
        rms_savings=rms(savings, truth["normalized"]),
        coverage_nac=coverage(nac, truth["nac before"]),
        coverage_savings=coverage(savings, truth["normalized"]),
        width_savings=float(((savings[:, 2] - savings[:, 1]) / size)[known].mean()),
    )


def _side(homes: Homes, code: int) -> _Side:
    """Every offered form on one side alone, forced in turn."""
    batch = homes.batch
    side = np.where(np.asarray(batch.side) == code, BEFORE, UNUSED).astype(np.uint8)
    alone = replace(batch, side=side)
    shape = (homes.nac.shape[0], f.N_FORMS)
    nothing = [np.full(shape, np.nan) for _ in range(4)]
    out = _Side(nothing[0], nothing[1], nothing[2], nothing[3], np.full(shape, np.inf))
    for form in (f.FORMS[name] for name in homes.cell.offered):
        only = np.zeros_like(batch.wanted)
        only[:, form.code] = True
        fits, _, rows = run_batch(
            replace(alone, wanted=only), homes.table, homes.years, confidence=CONFIDENCE,
            forced=(form.code, -1),
        )  # fmt: skip
        fit = fits[:, 0, form.code]
        passed = (fit[:, STATUS] == f.FITTED) & np.isfinite(rows[:, NAC_BEFORE + 1])
        if not passed.any():
            continue
        low, high = rows[:, NAC_BEFORE + 1], rows[:, NAC_BEFORE + 2]
        df = np.maximum(fit[:, COUNT] - form.parameters, 1)
        t = np.array([t_quantile(0.5 + 0.5 * CONFIDENCE, int(d)) for d in df])
        keep = np.flatnonzero(passed)
        out.value[keep, form.code] = rows[keep, NAC_BEFORE]
        out.middle[keep, form.code] = 0.5 * (low + high)[keep]
        out.se[keep, form.code] = (0.5 * (high - low) / t)[keep]
        out.t[keep, form.code] = t[keep]
        out.bic[keep, form.code] = fit[keep, BIC]
    return out


def _weights(bic: Array) -> Array:
    """(homes, forms) ∝ exp(−½ BIC); rows without any form are NaN.

    >>> import numpy as np
    >>> _weights(np.array([[0.0, 2.0 * np.log(3.0), np.inf]]))
    array([[0.75, 0.25, 0.  ]])
    """
    with np.errstate(invalid="ignore"):
        raw = np.exp(-0.5 * (bic - bic.min(axis=1, keepdims=True)))
        out: Array = raw / raw.sum(axis=1, keepdims=True)
    return out


def _one_hot(bic: Array) -> Array:
    out = np.where(np.arange(bic.shape[1]) == bic.argmin(axis=1)[:, None], 1.0, 0.0)
    out[~np.isfinite(bic).any(axis=1)] = np.nan
    return out


def average(side: _Side, weight: Array) -> tuple[Array, Array, Array]:
    """(homes,) value, middle and half-width of the range, averaged over forms."""
    value, middle, se, t = (
        np.where(weight > 0.0, x, 0.0) for x in (side.value, side.middle, side.se, side.t)
    )
    mean = (weight * value).sum(axis=1)
    centre = (weight * middle).sum(axis=1)
    spread = np.sqrt(se * se + (value - mean[:, None]) ** 2)
    half = (weight * t).sum(axis=1) * (weight * spread).sum(axis=1)
    return mean, centre, half


def _of_sides(sides: list[_Side], weights: list[Array]) -> tuple[Array, Array]:
    """(homes, 3) value, low, high of NAC before and of savings; the sides' errors independent."""
    (value, middle, half), after = (average(s, w) for s, w in zip(sides, weights, strict=True))
    nac = np.stack([value, middle - half, middle + half], axis=1)
    both = np.sqrt(half * half + after[2] ** 2)
    centre = middle - after[1]
    return nac, np.stack([value - after[0], centre - both, centre + both], axis=1)
