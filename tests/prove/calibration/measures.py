"""What is counted in a cell: coverage, width, bias, alarms, forms, by method."""

from __future__ import annotations

from dataclasses import asdict, dataclass, field

import numpy as np
from numpy.typing import NDArray

from normalize.fitting.columns import ON_BOUND
from normalize.fitting.forms import form_named
from normalize.savings.kernel import (
    AVOIDED,
    HELD_AFTER,
    HELD_BEFORE,
    NAC_BEFORE,
    NORMALIZED,
    PREDICTED,
    RHO_MEAN,
    UNSURE_AFTER,
    UNSURE_BEFORE,
)
from tests.prove.calibration.answers import Answers, answers_of
from tests.prove.calibration.cells import Cell
from tests.prove.calibration.guideline import half_widths
from tests.prove.calibration.homes import Homes, simulate

#: Quantities and the methods that speak of them.
QUANTITIES = ("nac before", "normalized", "avoided")
METHODS = ("default", "plain", "guideline", "guideline, no correlation")
COLUMN = {"nac before": NAC_BEFORE, "normalized": NORMALIZED, "avoided": AVOIDED}

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Range:
    """How one method's ranges did. n : homes with a range.  coverage, alarms : shares.

    width : mean of high − low as a share of true NAC; median_width.
    """

    n: int
    coverage: float
    width: float
    median_width: float
    alarms: float

    @property
    def error(self) -> float:
        """Monte Carlo standard error of the coverage."""
        return monte_carlo_error(self.coverage, self.n)


@dataclass(frozen=True, slots=True)
class Result:
    """One cell measured.

    ranges : (quantity, method) → Range, keyed "quantity/method".  bias, rms : of the values,
    as shares of true NAC.  right_form : share of homes with an answer whose baseline was given
    its true form.  unavailable, held, on_bound, stated : shares of homes.  parts : coverage of
    the default's normalized savings and number of homes, among those with … ; for diagnosis.
    """

    cell: Cell
    homes: int
    ranges: dict[str, Range]
    bias: dict[str, float]
    rms: dict[str, float]
    right_form: float
    unavailable: float
    held: float
    on_bound: float
    stated: float
    rho: float
    parts: dict[str, tuple[float, int]] = field(default_factory=dict)

    def of(self, quantity: str, method: str = "default") -> Range:
        """The range of a quantity by a method."""
        return self.ranges[f"{quantity}/{method}"]

    def as_json(self) -> dict[str, object]:
        """Plain numbers for the cache."""
        return asdict(self)

    @classmethod
    def from_json(cls, data: dict[str, object]) -> Result:
        """A cached result."""
        made = dict(data)
        made["cell"] = Cell(**data["cell"])  # type: ignore[arg-type]
        made["ranges"] = {k: Range(**v) for k, v in data["ranges"].items()}  # type: ignore
        made["parts"] = {k: (v[0], v[1]) for k, v in data["parts"].items()}  # type: ignore
        return cls(**made)  # type: ignore[arg-type]


def monte_carlo_error(share: float, n: int) -> float:
    """Standard error of a share counted in n homes.

    >>> round(monte_carlo_error(0.9, 2000), 4)
    0.0067
    """
    return float(np.sqrt(share * (1.0 - share) / n)) if n else float("nan")


def covered(low: Array, high: Array, truth: Array) -> tuple[float, int]:
    """Share of the known ranges that hold the truth, and how many are known.

    >>> import numpy as np
    >>> covered(np.array([0.0, 2.0, np.nan]), np.array([1.0, 3.0, 1.0]), np.array([0.5, 1.0, 0.0]))
    (0.5, 2)
    """
    known = np.isfinite(low) & np.isfinite(high)
    n = int(known.sum())
    inside = (low[known] <= truth[known]) & (truth[known] <= high[known])
    return (float(inside.mean()) if n else float("nan")), n


def measure(cell: Cell, homes: int) -> Result:
    """A cell's homes with a change, and as many where nothing was done for the alarms."""
    made = simulate(cell, homes)
    found = answers_of(made)
    bounds = bounds_of(made, found)
    nothing = simulate(cell, homes, placebo=True)
    placebo = bounds_of(nothing, answers_of(nothing))
    truth = truth_of(made)
    ranges = {}
    for key, (low, high) in bounds.items():
        quantity = key.split("/")[0]
        alarms = _alarms(*placebo[key]) if quantity != "nac before" else float("nan")
        ranges[key] = _range(low, high, truth[quantity], made.nac[:, 0], alarms)
    error = {
        q: np.where(found.known, found.rows[:, at] - truth[q], np.nan) / made.nac[:, 0]
        for q, at in COLUMN.items()
    }
    right = found.chosen[:, 0] == form_named(cell.form).code
    held = (found.rows[:, HELD_BEFORE] == 1.0) | (found.rows[:, HELD_AFTER] == 1.0)
    unsure = (found.rows[:, UNSURE_BEFORE] == 1.0) | (found.rows[:, UNSURE_AFTER] == 1.0)
    edge = found.before()[:, ON_BOUND] == 1.0
    normal = bounds["normalized/default"]
    parts = {
        name: covered(normal[0][which], normal[1][which], truth["normalized"][which])
        for name, which in (
            ("right form before", right), ("other form before", ~right),
            ("same form on both sides", found.chosen[:, 0] == found.chosen[:, 1]),
            ("τ on its bound", edge), ("τ held", held), ("τ stated", found.stated),
            ("τ integrated over", unsure),
        )
    }  # fmt: skip
    return Result(
        cell=cell,
        homes=homes,
        ranges=ranges,
        bias={q: _mean(e) for q, e in error.items()},
        rms={q: float(np.sqrt(_mean(e * e))) for q, e in error.items()},
        right_form=_mean(right[found.known]),
        unavailable=float((~found.known).mean()),
        held=_mean(held[found.known]),
        on_bound=_mean(edge[found.known]),
        stated=float(found.stated.mean()),
        rho=_mean(found.rows[:, RHO_MEAN]),
        parts=parts,
    )


def truth_of(homes: Homes) -> dict[str, Array]:
    """(homes,) the true value of each quantity."""
    return {
        "nac before": homes.nac[:, 0],
        "normalized": homes.nac[:, 0] - homes.nac[:, 1],
        "avoided": homes.avoided,
    }


def bounds_of(homes: Homes, found: Answers) -> dict[str, tuple[Array, Array]]:
    """Low and high of every quantity by every method; NaN where the program gives no answer."""
    out = {}
    for quantity, at in COLUMN.items():
        for method, column in (("default", at + 1), ("plain", at + 3)):
            low = np.where(found.known, found.rows[:, column], np.nan)
            high = np.where(found.known, found.rows[:, column + 1], np.nan)
            out[f"{quantity}/{method}"] = (low, high)
    value = np.where(found.known, found.rows[:, AVOIDED], np.nan)
    half = half_widths(homes, found.before(), found.chosen[:, 0], found.rows[:, PREDICTED])
    for j, method in enumerate(METHODS[2:]):
        out[f"avoided/{method}"] = (value - half[:, j], value + half[:, j])
    return out


def _range(low: Array, high: Array, truth: Array, nac: Array, alarms: float) -> Range:
    share, n = covered(low, high, truth)
    width = ((high - low) / nac)[np.isfinite(low)]
    return Range(n, share, _mean(width), float(np.median(width)) if n else float("nan"), alarms)


def _alarms(low: Array, high: Array) -> float:
    """Share of ranges that exclude zero where nothing was done."""
    share, _ = covered(low, high, np.zeros(low.shape[0]))
    return 1.0 - share


def _mean(values: Array) -> float:
    known = values[np.isfinite(values)] if values.dtype.kind == "f" else values
    return float(known.mean()) if known.size else float("nan")
