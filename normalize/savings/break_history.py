"""An account's whole history as a break scan reads it: periods, regressors, weights.

Daily data are joined to about a month, since neighbouring days tell little more than one;
periods of an earlier occupant stay out.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np
from numpy.typing import NDArray

from normalize.fitting.align import Aligned
from normalize.fitting.batch import fit_batch
from normalize.fitting.columns import BEFORE, TAU_C, TAU_H
from normalize.fitting.correlation import positions
from normalize.fitting.fit import batch_of_one
from normalize.fitting.forms import FORMS
from normalize.fitting.sweep import SHIFT_F
from normalize.savings.break_scan import Array, null_likelihood

if TYPE_CHECKING:
    from normalize.savings.sides import Work
    from normalize.weather.year import LongTermYear

SHORT_DAYS: Final = 15  # periods shorter than this in the median are joined
JOINED_DAYS: Final = 28  # to at least this long
LEAST_DAYS: Final = 10  # shorter remainders stay out
POWERS: Final = (0.0, 0.5, 1.0)  # errors as large everywhere, or growing with expected use
NO_BALANCES: Final = (float("nan"), float("nan"))
LEAST_SHARE: Final = 0.10  # of mean use: expected use below it counts as this, in the weights


@dataclass(frozen=True, slots=True)
class History:
    """Periods of a scan, in order of time. start, end, use, days (n,) float64.

    numbers : for each, the positions of the account's periods in it.  side (n,) −1 before
    the work, 0 touching it or between upgrades, 1 after.  aligned : the same over weather.
    """

    start: Array
    end: Array
    use: Array
    numbers: tuple[tuple[int, ...], ...]
    side: NDArray[np.int8]
    aligned: Aligned
    joined: bool

    @property
    def n(self) -> int:
        """How many periods."""
        return int(self.start.shape[0])

    @property
    def days(self) -> Array:
        """(n,) days of each."""
        return self.end - self.start

    @property
    def y(self) -> Array:
        """(n,) use per day."""
        return self.use / self.days

    @property
    def place(self) -> Array:
        """(n,) places in the sequence, gaps counted in median lengths."""
        places: Array = positions(self.start, self.end)
        return places

    def only(self, keep: NDArray[np.bool_]) -> History:
        """The periods that are kept."""
        return self.at(np.flatnonzero(keep))

    def at(self, rows: NDArray[np.intp]) -> History:
        """The periods at those positions."""
        start, end, use = self.start[rows], self.end[rows], self.use[rows]
        numbers = tuple(self.numbers[int(i)] for i in rows)
        laid = _laid(self.aligned, start, end, use)
        return History(start, end, use, numbers, self.side[rows], laid, self.joined)


def history_of(aligned: Aligned, labels: Sequence[str], work: Work) -> History:
    """All usable periods of the present occupant, daily ones joined to months."""
    mine = [
        i for i in range(aligned.n) if not aligned.reason[i] and labels[i] != "earlier occupant"
    ]
    length = np.median(aligned.days[mine]) if mine else 30.0
    short = bool(length < SHORT_DAYS)
    groups = _joined(aligned, mine, work) if short else [[i] for i in mine]
    start = np.array([aligned.start[g[0]] for g in groups], dtype=np.float64)
    end = np.array([aligned.end[g[-1]] for g in groups], dtype=np.float64)
    use = np.array([float(aligned.use[g].sum()) for g in groups], dtype=np.float64)
    side = np.where(end <= work.start, -1, np.where(start >= work.end, 1, 0)).astype(np.int8)
    return History(
        start, end, use, tuple(tuple(g) for g in groups), side,
        _laid(aligned, start, end, use), short,
    )  # fmt: skip


def _laid(aligned: Aligned, start: Array, end: Array, use: Array) -> Aligned:
    n = start.shape[0]
    return Aligned(
        start.astype(np.int32), end.astype(np.int32), use, np.zeros(n), ("",) * n, aligned.weather
    )


def _joined(aligned: Aligned, mine: list[int], work: Work) -> list[list[int]]:
    """Runs of neighbours of about a month; none reaches across the edge of the work."""
    groups: list[list[int]] = []
    edges = (work.start, work.end)
    for i in mine:
        last = groups[-1] if groups else []
        first_day = int(aligned.start[last[0]]) if last else 0
        begin, end = int(aligned.start[i]), int(aligned.end[i])
        apart = not last or begin != int(aligned.end[last[-1]])
        across = any(first_day < edge < end for edge in edges)
        if apart or across or begin - first_day >= JOINED_DAYS:
            groups.append([i])
        else:
            last.append(i)
    return [g for g in groups if aligned.end[g[-1]] - aligned.start[g[0]] >= LEAST_DAYS]


@dataclass(frozen=True, slots=True)
class Model:
    """Regressors of one stretch of a history at its balance temperatures.

    base : (n, q) the columns that may change: 1 and degree-days a day.
    tau : (n, τs) share of days beyond each balance temperature, which lets it move a little.
    heating_f, cooling_f : °F, NaN where there is none.
    """

    base: Array
    tau: Array
    heating_f: float
    cooling_f: float


def model_of(
    history: History, form: str, *, heating_f: float, cooling_f: float, hold: bool
) -> Model:
    """The regressors of a form at given balance temperatures. hold : no column for τ."""
    first = history.aligned.weather.first_day
    starts, ends = history.start.astype(int) - first, history.end.astype(int) - first
    length = ends - starts
    # All days of all periods, end to end, and where each period begins among them.
    begins = np.concatenate([[0], np.cumsum(length)[:-1]]).astype(np.intp)
    days = np.arange(int(length.sum())) + np.repeat(starts - begins, length)
    temp = history.aligned.weather.temp_f[days]

    def mean(daily: NDArray[np.float64]) -> Array:
        out: Array = np.add.reduceat(daily, begins) / length
        return out

    base, tau = [np.ones(history.n)], []
    if form == "line":
        base.append(mean(temp) - SHIFT_F)
    if form in ("heating", "two slopes", "heating and cooling"):
        base.append(mean(np.maximum(heating_f - temp, 0.0)))
        tau.append(mean((temp < heating_f).astype(np.float64)))
    if form in ("cooling", "two slopes", "heating and cooling"):
        base.append(mean(np.maximum(temp - cooling_f, 0.0)))
        tau.append(mean((temp > cooling_f).astype(np.float64)))
    moves = np.column_stack(tau) if tau and not hold else np.empty((history.n, 0))
    return Model(np.column_stack(base), moves, heating_f, cooling_f)


def balances(history: History, form: str, net: bool) -> tuple[float, float] | None:
    """Fitted balance temperatures of a form on these periods; None where none is found."""
    if form in ("flat", "line"):
        return NO_BALANCES
    codes = np.full(history.n, BEFORE, dtype=np.uint8)
    batch, table = batch_of_one(history.aligned, codes, (form,), net)
    fits, _ = fit_batch(batch, table, BEFORE)
    row = fits[0, FORMS[form].code]
    tau = float(row[TAU_H]), float(row[TAU_C])
    return None if np.isnan(tau).all() else tau


def chosen_form(history: History, offered: Sequence[str], net: bool) -> str:
    """The form that the whole history chooses, "" where none passes."""
    codes = np.full(history.n, BEFORE, dtype=np.uint8)
    batch, table = batch_of_one(history.aligned, codes, tuple(offered), net)
    _, chosen = fit_batch(batch, table, BEFORE)
    names = {f.code: name for name, f in FORMS.items()}
    return names.get(int(chosen[0]), "")


def fuller(forms: Sequence[str]) -> str:
    """The form in which all of these are contained.

    >>> fuller(["heating", "flat"]), fuller(["heating", "cooling"])
    ('heating', 'heating and cooling')
    """
    found = {f for f in forms if f}
    if {"heating", "cooling"} <= found:
        return "heating and cooling"
    return max(found, key=lambda f: FORMS[f].parameters, default="")


def row_weights(history: History, x: Array, *, flat: bool = False) -> tuple[Array, float]:
    """What rows are multiplied by, √days ÷ the size of their errors, and the power chosen.

    Errors may grow with expected use (its 0th, ½th or 1st power): the likelihood says which.
    Left at one size, the noise of winter bills would look like changes.
    """
    root = np.sqrt(history.days / history.days.mean())
    y, place = history.y, history.place
    coef, *_ = np.linalg.lstsq(x * root[:, None], y * root, rcond=None)
    mean = float(y.mean())
    best: tuple[float, Array, float] | None = None
    for power in (0.0,) if flat or mean <= 0.0 else POWERS:
        size = np.maximum(x @ coef / (mean if mean > 0.0 else 1.0), LEAST_SHARE) ** power
        size /= float(np.exp(np.log(size).mean()))
        scale = root / size
        value, _ = null_likelihood(x * scale[:, None], y * scale, place)
        if best is None or value > best[0] + 1e-9:
            best = (value, scale, power)
    assert best is not None  # noqa: S101  there is always the power 0
    return best[1], best[2]


def normal_year(model: Model, form: str, history: History, year: LongTermYear | None) -> Array:
    """(q,) what each changing column sums to in a normal year.

    Without a long-term year the history's own weather, scaled to 365 days, stands in.
    """
    if year is None:
        own: Array = 365.0 * (model.base * history.days[:, None]).sum(axis=0) / history.days.sum()
        return own
    out = [365.0]
    if form == "line":
        out.append(365.0 * (year.mean_f - SHIFT_F))
    if form in ("heating", "two slopes", "heating and cooling"):
        out.append(year.heating(model.heating_f))
    if form in ("cooling", "two slopes", "heating and cooling"):
        out.append(year.cooling(model.cooling_f))
    return np.array(out)
