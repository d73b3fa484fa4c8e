"""What stands behind a chosen fit: full standard errors, profile ranges of τ, correlation.

For one account at a time; a batch that only needs the numbers of a result never comes here.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from normalize.fitting import forms as f
from normalize.fitting.columns import (
    AICC,
    BASE,
    BIC,
    DAYS,
    MEAN,
    ON_BOUND,
    RSS,
    SE_BASE,
    SE_C,
    SE_H,
    SE_LINE,
    SLOPE_C,
    SLOPE_H,
    SLOPE_LINE,
    STATUS,
    TAU_C,
    TAU_H,
    TSS,
    WORST_T,
    N,
)
from normalize.fitting.correlation import through_rho, weights_of, well_determined
from normalize.fitting.linear import linearise_with
from normalize.fitting.profile import profile_gains
from normalize.fitting.results import Fit, FormTried
from normalize.fitting.rho import RHO
from normalize.fitting.spread import rows_of
from normalize.fitting.student import t_quantile
from normalize.fitting.sweep import SHIFT_F

PROFILE_STEP_F = 0.1
PROFILE_CONFIDENCE = 0.90


@dataclass(frozen=True, slots=True)
class SideData:
    """One side's arrays as ``take_side`` returns them, and the drivers of its periods (n, k)."""

    ts: NDArray[np.float64]
    ps: NDArray[np.int32]
    y: NDArray[np.float64]
    d: NDArray[np.float64]
    w: NDArray[np.float64]
    start: NDArray[np.float64]
    end: NDArray[np.float64]
    drivers: NDArray[np.float64] | None = None

    @property
    def columns(self) -> NDArray[np.float64]:
        """(n, k) drivers; (n, 0) where there are none."""
        return self.drivers if self.drivers is not None else np.empty((self.y.shape[0], 0))


def _number(value: float) -> float | None:
    return None if np.isnan(value) else float(value)


def as_fit(form_code: int, row: NDArray[np.float64], side: SideData, set_aside: int = 0) -> Fit:
    """A kernel's row as a Fit, with the diagnostics that one account deserves."""
    form = f.BY_CODE[form_code]
    n = int(row[N])
    drivers = side.columns
    k = drivers.shape[1]
    jac, resid, coef, held = linearise_with(
        row, form_code, side.ts, side.ps, side.y, side.d, side.w, drivers, False
    )
    both = np.column_stack([jac, resid])
    found, _, weight, place = rows_of(both, side.d, side.w, side.start, side.end)
    rows, errors = np.ascontiguousarray(found[:, :-1]), np.ascontiguousarray(found[:, -1])
    like, _, _, _ = through_rho(rows, errors, weight, place, np.zeros((1, jac.shape[1])))
    root = resid * np.sqrt(side.w)
    square = float((root * root).sum())
    mean, rss, tss = float(row[MEAN]), float(row[RSS]), float(row[TSS])
    df = n - form.parameters - k
    cv = np.sqrt(rss / side.w.mean() / df) / abs(mean) if mean != 0.0 else float("nan")
    se = _standard_errors(row, form_code)
    ranges = _profile_ranges(form_code, row, side, df)
    return Fit(
        form=form.name,
        balance_heating_f=_number(row[TAU_H]),
        balance_cooling_f=_number(row[TAU_C]),
        base_load=float(row[BASE]),
        heating_slope=_number(row[SLOPE_H]),
        cooling_slope=_number(row[SLOPE_C]),
        line_slope=_number(row[SLOPE_LINE]),
        n_periods=n,
        n_days=int(row[DAYS]),
        rss=rss,
        r2=1.0 - rss / tss if tss > 0.0 else 0.0,
        cv_rmse=float(cv),
        bias=float((side.w * resid).sum() / (side.w * side.y).sum()) if mean != 0.0 else 0.0,
        terms=form.terms,
        se=se,
        se_full=None
        if held
        else _full_errors(rows, errors, weight, _places(len(form.terms), k), form_code),
        t=tuple(
            c / e if e > 0.0 else float("inf")
            for c, e in zip(_coefs(row, form_code), se, strict=True)
        ),
        aicc=float(row[AICC]),
        bic=float(row[BIC]),
        mean_use=mean,
        balance_heating_range_f=ranges[0],
        balance_cooling_range_f=ranges[1],
        on_bound=bool(row[ON_BOUND] == 1.0),
        rho=float((weights_of(like) * RHO).sum()),
        durbin_watson=float((np.diff(root) ** 2).sum() / square) if square > 0.0 else float("nan"),
        set_aside=set_aside,
        driver_effects=tuple(coef[1 : 1 + k].tolist()),
    )


def _places(terms: int, k: int) -> tuple[int, ...]:
    """Where the base load and the slopes stand among the columns, k drivers between them."""
    return (0, *range(1 + k, terms + k))


def _columns(form_code: int) -> tuple[tuple[int, int], ...]:
    base = ((BASE, SE_BASE),)
    if form_code == f.LINE:
        return (*base, (SLOPE_LINE, SE_LINE))
    heating = ((SLOPE_H, SE_H),) if form_code == f.HEATING or form_code >= f.TWO_SLOPES else ()
    cooling = ((SLOPE_C, SE_C),) if form_code == f.COOLING or form_code >= f.TWO_SLOPES else ()
    return (*base, *heating, *cooling)


def _coefs(row: NDArray[np.float64], form_code: int) -> tuple[float, ...]:
    return tuple(float(row[value]) for value, _ in _columns(form_code))


def _standard_errors(row: NDArray[np.float64], form_code: int) -> tuple[float, ...]:
    return tuple(float(row[error]) for _, error in _columns(form_code))


def _full_errors(
    jac: NDArray[np.float64],
    resid: NDArray[np.float64],
    w: NDArray[np.float64],
    places: tuple[int, ...],
    form_code: int,
) -> tuple[float, ...] | None:
    """Standard errors of the coefficients with the balance temperatures' own included."""
    n, k = jac.shape
    if n <= k:
        return None
    try:
        cov = np.linalg.inv(jac.T @ (jac * w[:, None]))
    except np.linalg.LinAlgError:
        return None
    scale = float((w * resid * resid).sum()) / (n - k)
    if form_code == f.LINE:
        at_zero = np.array([1.0, -SHIFT_F])
        line = cov[np.ix_(places, places)]
        return (
            float(np.sqrt(at_zero @ line @ at_zero * scale)),
            float(np.sqrt(line[1, 1] * scale)),
        )
    return tuple(float(np.sqrt(max(cov[i, i], 0.0) * scale)) for i in places)


def _profile_ranges(
    form_code: int, row: NDArray[np.float64], side: SideData, df: int
) -> tuple[tuple[float, float] | None, tuple[float, float] | None]:
    """All τ whose RSS the data cannot tell from the least (method §5), for heating, cooling."""
    if form_code <= f.LINE or df < 1:
        return None, None
    heating = cooling = None
    if form_code != f.COOLING:
        heating = _range_of(form_code, row, side, df, False)
    if form_code in (f.COOLING, f.HEATING_AND_COOLING):
        cooling = _range_of(form_code, row, side, df, True)
    return heating, heating if form_code == f.TWO_SLOPES else cooling


def _range_of(
    form_code: int, row: NDArray[np.float64], side: SideData, df: int, cooling: bool
) -> tuple[float, float]:
    from normalize.fitting.columns import HIGH_C, HIGH_H, LOW_C, LOW_H

    low, high = (row[LOW_C], row[HIGH_C]) if cooling else (row[LOW_H], row[HIGH_H])
    best = float(row[TAU_C] if cooling else row[TAU_H])
    steps = np.arange(np.ceil(low / PROFILE_STEP_F), np.floor(high / PROFILE_STEP_F) + 1)
    taus = np.unique(np.append(steps * PROFILE_STEP_F, best))
    t = t_quantile(0.5 + 0.5 * PROFILE_CONFIDENCE, df)
    limit = float(row[RSS]) * (1.0 + t * t / df)
    left = _rss_along(form_code, row, side, taus, cooling)
    inside = taus[(left <= limit) | (taus == best)]
    return float(inside.min()), float(inside.max())


def _rss_along(
    form_code: int,
    row: NDArray[np.float64],
    side: SideData,
    taus: NDArray[np.float64],
    cooling: bool,
) -> NDArray[np.float64]:
    """Sum of squares at each held τ.  With drivers and two balance temperatures, the drivers'
    effects are held as found.
    """
    from normalize.fitting.columns import HIGH_C, HIGH_H, LOW_C, LOW_H

    y, total = side.y, float(row[TSS])
    if side.columns.shape[1]:
        if form_code != f.HEATING_AND_COOLING:
            return np.array([_rss_at(form_code, row, side, tau) for tau in taus.tolist()])
        drivers = side.columns
        _, _, coef, _ = linearise_with(
            row, form_code, side.ts, side.ps, y, side.d, side.w, drivers, True
        )
        y = y - drivers @ coef[1 : 1 + drivers.shape[1]]
        mean = float((side.w * y).sum() / side.w.sum())
        total = float((side.w * (y - mean) ** 2).sum())
    gains = profile_gains(
        form_code, side.ts, side.ps, y, side.d, side.w, taus - SHIFT_F, cooling,
        np.array([row[LOW_H], row[HIGH_H], row[LOW_C], row[HIGH_C]]) - SHIFT_F,
    )  # fmt: skip
    return np.asarray(total - gains)


def _rss_at(form_code: int, row: NDArray[np.float64], side: SideData, tau: float) -> float:
    """Sum of squares with one τ held and drivers free."""
    there = row.copy()
    there[TAU_H] = there[TAU_C] = tau
    _, resid, _, _ = linearise_with(
        there, form_code, side.ts, side.ps, side.y, side.d, side.w, side.columns, True
    )
    return float((side.w * resid * resid).sum())


def as_tried(
    rows: NDArray[np.float64],
    offered: NDArray[np.bool_],
    chosen: int,
    side: SideData,
    set_aside: int,
    criterion: str,
) -> tuple[FormTried, ...]:
    """Every form of a side with its numbers, and why it was set aside."""
    out = []
    for code, form in enumerate(f.BY_CODE):
        row = rows[code]
        has_fit = not np.isnan(row[BASE])
        fit = as_fit(code, row, side, set_aside) if has_fit else None
        reason = "" if code == chosen else _reason(code, row, offered, chosen, criterion)
        out.append(FormTried(form=form.name, fit=fit, chosen=code == chosen, reason=reason))
    return tuple(out)


def _reason(
    code: int, row: NDArray[np.float64], offered: NDArray[np.bool_], chosen: int, criterion: str
) -> str:
    status = int(row[STATUS])
    form = f.BY_CODE[code]
    if status == f.NOT_TRIED or (not offered[code] and status == f.FITTED):
        return f.REASONS[f.NOT_TRIED]
    if status == f.TOO_FEW:
        return f.REASONS[status].format(needed=form.parameters + 3, n=int(row[N]))
    if status == f.WEAK_SLOPE:
        return f.REASONS[status].format(t=float(row[WORST_T]))
    if status != f.FITTED:
        return f.REASONS[status]
    if chosen < 0:
        return "no form was chosen"
    return (
        f"the form “{f.BY_CODE[chosen].name}” describes the bills better for its number of "
        f"parameters ({criterion.upper()})"
    )


__all__ = ["SideData", "as_fit", "as_tried", "well_determined"]
