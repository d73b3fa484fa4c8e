"""The regression of a scan: either side of the work with its own columns, and odd bills."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np
from numpy.typing import NDArray

from normalize.fitting.forms import FORMS
from normalize.savings.break_history import (
    NO_BALANCES,
    History,
    Model,
    balances,
    model_of,
    row_weights,
)
from normalize.savings.break_results import LEVEL
from normalize.savings.break_scan import Array, changing, odd_ones

if TYPE_CHECKING:
    from normalize.savings.sides import Work
    from normalize.weather.year import LongTermYear

ODD_SHARE: Final = 0.10  # of the periods, at most, are set aside as odd

Declared = tuple[str, int | None, int | None]  # what, since, until


@dataclass(frozen=True, slots=True)
class Asked:
    """What stays the same through a scan. hold_f : a balance temperature that was stated."""

    form: str
    net: bool
    hold_f: float | None
    work: Work
    year: LongTermYear | None
    declared: tuple[Declared, ...]
    confidence: float

    @property
    def parameters(self) -> int:
        """Coefficients and balance temperatures that are found."""
        return FORMS[self.form].parameters - (1 if self.hold_f is not None else 0)

    def model(self, h: History, tau: tuple[float, float]) -> Model:
        """Regressors of these periods at these balance temperatures."""
        hold = self.hold_f is not None
        return model_of(h, self.form, heating_f=tau[0], cooling_f=tau[1], hold=hold)


@dataclass(frozen=True, slots=True)
class Stretch:
    """One side of the work: its periods [first, last) and its regressors, over all rows."""

    first: int
    last: int
    model: Model

    def columns(self) -> Array:
        """(n, p) zero outside the stretch."""
        x = np.hstack([self.model.base, self.model.tau])
        out = np.zeros_like(x)
        out[self.first : self.last] = x[self.first : self.last]
        return out


def tau_of(
    h: History, asked: Asked, otherwise: tuple[float, float] | None
) -> tuple[float, float] | None:
    """Balance temperatures of these periods, or the given ones where they place none."""
    if asked.hold_f is not None:
        return asked.hold_f, asked.hold_f
    if asked.form in ("flat", "line"):
        return NO_BALANCES
    return balances(h, asked.form, asked.net) or otherwise


def stretches_of(h: History, asked: Asked, whole: tuple[float, float]) -> list[Stretch]:
    """Either side of the work with its own regression, where it has periods enough for one."""
    out = []
    for side in (-1, 1):
        at = np.flatnonzero(h.side == side)
        if at.shape[0] < asked.parameters + 2:
            continue
        tau = tau_of(h.only(h.side == side), asked, whole) or whole
        out.append(Stretch(int(at[0]), int(at[-1]) + 1, asked.model(h, tau)))
    return out


@dataclass(slots=True)
class Design:
    """Regressors side by side. spans : (offset, first, last), the rows in which the base
    columns at that offset hold.  q : how many base columns there are.
    """

    x: Array
    q: int
    spans: list[tuple[int, int, int]]

    def add(self, block: Array, first: int, last: int) -> None:
        """Columns that hold in the rows [first, last), the base columns in front."""
        self.spans.append((self.x.shape[1], first, last))
        self.x = np.hstack([self.x, block])

    def at(self, row: int, year: Array) -> Array:
        """(columns,) what the regression that holds in a row sums to in a normal year."""
        out = np.zeros(self.x.shape[1])
        for offset, first, last in self.spans:
            if first <= row < last:
                out[offset : offset + self.q] = year
        return out


def regressors(
    h: History, asked: Asked, whole: tuple[float, float], days: Sequence[int]
) -> tuple[list[Stretch], Design]:
    """Both sides' columns, and those of changes at the given days within them."""
    stretches = stretches_of(h, asked, whole)
    if not stretches:
        model = asked.model(h, whole)
        return [], Design(np.hstack([model.base, model.tau]), model.base.shape[1], [(0, 0, h.n)])
    design = Design(np.empty((h.n, 0)), stretches[0].model.base.shape[1], [])
    for s in stretches:
        design.add(s.columns(), s.first, s.last)
    for day in days:
        for s in stretches:
            k = int(np.searchsorted(h.start, day - 0.5))
            if s.first < k < s.last:
                design.add(changing(s.model.base, [k], s.last)[0], k, s.last)
    return stretches, design


@dataclass(frozen=True, slots=True)
class Odd:
    """Which periods stand out. mask, t, p, expected (use per day) : (n,) each."""

    mask: NDArray[np.bool_]
    t: Array
    p: Array
    expected: Array


def odd_of(h: History, asked: Asked, whole: tuple[float, float], days: Sequence[int]) -> Odd:
    """Periods that stand out, with changes at the given days allowed for.

    The worst is set aside, the rest fitted again, until none stands out.  Periods that
    touch the work belong to neither side and are not judged.
    """
    odd = np.zeros(h.n, dtype=np.bool_)
    t, p, expected = np.zeros(h.n), np.ones(h.n), np.full(h.n, np.nan)
    stretches, design = regressors(h, asked, whole, days)
    x, inside = design.x, np.zeros(h.n, dtype=np.bool_)
    for s in stretches:
        inside[s.first : s.last] = True
    inside &= h.side != 0
    most = int(ODD_SHARE * inside.sum())
    while inside.any():
        kept = np.flatnonzero(inside & ~odd)
        scale, _ = row_weights(h.at(kept), x[kept], flat=asked.net)
        rows, y = x[kept] * scale[:, None], h.y[kept] * scale
        coef, *_ = np.linalg.lstsq(rows, y, rcond=None)
        expected = np.where(inside, x @ coef, np.nan)
        now_t, now_p = odd_ones(rows, y)
        worst = int(np.argmin(now_p))
        if not now_p[worst] <= LEVEL or int(odd.sum()) >= most:
            break
        odd[kept[worst]] = True
        t[kept[worst]], p[kept[worst]] = now_t[worst], now_p[worst]
    return Odd(odd, t, p, expected)
