"""What stands behind one side's fit, bill by bill: residuals, weight of each bill, weather seen.

Plain numpy on one account; the ranges come from the compiled code and never from here.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from normalize.savings.alike import Alike, alike
from normalize.savings.extrapolation import Extrapolation, extrapolation_of
from normalize.savings.influence import BillWeight, weigh

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from normalize.fitting.align import Aligned
    from normalize.fitting.results import Fit
    from normalize.savings.compare import Comparison
    from normalize.weather.year import LongTermYear

MIDDLE_F = 60.0  # a line's temperature is taken about this, so that its columns keep apart


@dataclass(frozen=True, slots=True)
class SideEvidence:
    """One side's bills and how its fit rests on them.

    side : "before" or "after".  first, last : day numbers of its span, half-open.
    low_mean_f, high_mean_f : lowest and highest mean temperature of a bill.
    weights : one a bill; spans : its start and end.  alike : correlation of the errors, or
    None.  held : τ was held.  unsure : the bills do not place it, so that the answer's range
    tries every value it may have.
    """

    side: str
    fit: Fit
    first: int
    last: int
    low_mean_f: float
    high_mean_f: float
    weights: tuple[BillWeight, ...]
    spans: tuple[tuple[int, int], ...]
    alike: Alike | None
    seen: Extrapolation | None
    held: bool
    unsure: bool = False


def evidence_of(
    aligned: Aligned, found: Comparison, year: LongTermYear | None
) -> tuple[SideEvidence, ...]:
    """Evidence of the sides that have a fit, before first."""
    out = []
    sides = (("before", found.savings.before), ("after", found.savings.after))
    for (side, fit), held, unsure in zip(sides, found.held, found.unsure, strict=True):
        mine = np.flatnonzero(np.array([label == side for label in found.labels], dtype=np.bool_))
        if fit is not None and mine.shape[0]:
            out.append(_side(side, fit, aligned, mine, year, bool(held), bool(unsure)))
    return tuple(out)


def _side(
    side: str,
    fit: Fit,
    aligned: Aligned,
    mine: NDArray[np.intp],
    year: LongTermYear | None,
    held: bool,
    unsure: bool,
) -> SideEvidence:
    days, owner = days_of(aligned, mine)
    lengths = aligned.days[mine].astype(np.float64)
    per_day = aligned.use[mine] / lengths
    # A balance temperature on the edge of its range is not free to follow a bill.
    jac = jacobian_of(fit, days, owner, lengths, with_tau=not (held or fit.on_bound))
    fitted = np.bincount(owner, fit.predict(days), lengths.shape[0]) / lengths
    resid = per_day - fitted
    if aligned.drivers is not None and aligned.drivers.k:
        jac, resid = _with_drivers(fit, days, owner, lengths, per_day, jac, aligned, mine)
    means = aligned.mean_temp_f[mine]
    return SideEvidence(
        side=side,
        fit=fit,
        first=int(aligned.start[mine].min()),
        last=int(aligned.end[mine].max()),
        low_mean_f=float(means.min()),
        high_mean_f=float(means.max()),
        weights=weigh(jac, resid, lengths, side=side, numbers=(mine + 1).tolist()),
        spans=tuple(zip(aligned.start[mine].tolist(), aligned.end[mine].tolist(), strict=True)),
        alike=alike(resid * np.sqrt(lengths)),
        seen=extrapolation_of(fit, year, days) if year is not None else None,
        held=held,
        unsure=unsure,
    )


def _with_drivers(
    fit: Fit,
    days: NDArray[np.float64],
    owner: NDArray[np.intp],
    lengths: NDArray[np.float64],
    per_day: NDArray[np.float64],
    jac: NDArray[np.float64],
    aligned: Aligned,
    mine: NDArray[np.intp],
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Jacobian with the drivers' columns, and the residuals of least squares at the τ found."""
    drivers = aligned.drivers.values[mine] if aligned.drivers is not None else jac[:, :0]
    x = np.column_stack([jacobian_of(fit, days, owner, lengths, with_tau=False), drivers])
    root = np.sqrt(lengths)
    coef = np.linalg.lstsq(x * root[:, None], per_day * root, rcond=None)[0]
    return np.column_stack([jac, drivers]), per_day - x @ coef


def days_of(
    aligned: Aligned, mine: NDArray[np.intp]
) -> tuple[NDArray[np.float64], NDArray[np.intp]]:
    """Daily temperatures of the chosen periods end to end, °F, and which period each belongs to."""
    lengths = aligned.days[mine].astype(np.intp)
    owner = np.repeat(np.arange(mine.shape[0]), lengths)
    first = np.cumsum(lengths) - lengths
    start = aligned.start[mine].astype(np.intp) - aligned.weather.first_day
    place = np.arange(int(lengths.sum())) - first[owner] + start[owner]
    return aligned.weather.temp_f[place], owner


def jacobian_of(
    fit: Fit,
    days: NDArray[np.float64],
    owner: NDArray[np.intp],
    lengths: NDArray[np.float64],
    *,
    with_tau: bool,
) -> NDArray[np.float64]:
    """(n, k) derivatives of use per day by every parameter, balance temperatures last.

    As docs/method.md §5 has it; with_tau false leaves their columns out.
    """
    n = lengths.shape[0]

    def mean(values: NDArray[np.float64]) -> NDArray[np.float64]:
        total: NDArray[np.float64] = np.bincount(owner, values, n) / lengths
        return total

    columns, last = [np.ones(n)], []
    if fit.line_slope is not None:
        columns.append(mean(days - MIDDLE_F))
    if fit.heating_slope is not None and fit.balance_heating_f is not None:
        columns.append(mean(np.maximum(fit.balance_heating_f - days, 0.0)))
        last.append(fit.heating_slope * mean((days < fit.balance_heating_f).astype(np.float64)))
    if fit.cooling_slope is not None and fit.balance_cooling_f is not None:
        columns.append(mean(np.maximum(days - fit.balance_cooling_f, 0.0)))
        last.append(-fit.cooling_slope * mean((days > fit.balance_cooling_f).astype(np.float64)))
    if fit.form == "two slopes":  # one τ moves both
        last = [last[0] + last[1]]
    return np.column_stack(columns + (last if with_tau else []))
