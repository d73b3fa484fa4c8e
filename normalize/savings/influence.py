"""What each single bill weighs: in its side's fit, and in the answer, which is made without it.

A bill of great weight is named, never dropped: it may be the one that knows the cold.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from normalize.fitting.columns import UNUSED
from normalize.savings.again import Asked, ask_again
from normalize.savings.results import Estimate
from normalize.savings.sides import codes

MOST_SINGLE = 120  # more readings than this (days, not bills): none is left out singly


@dataclass(frozen=True, slots=True)
class BillWeight:
    """What one bill weighs in its side's fit, balance temperature included.

    leverage : its hat value, 0 to 1.  cook : Cook's distance.  dffits : the change of its
    own fitted value without it, in standard errors.  NaN where they are not defined.
    """

    number: int
    side: str
    leverage: float
    cook: float
    dffits: float


def weigh(
    jac: NDArray[np.float64],
    resid: NDArray[np.float64],
    w: NDArray[np.float64],
    *,
    side: str = "",
    numbers: Sequence[int] | None = None,
) -> tuple[BillWeight, ...]:
    """Leverage, Cook's distance and DFFITS of every bill (docs/method.md §6).

    jac (n, k) derivatives of use per day by every parameter, resid (n,), w (n,) weights.
    Source: Cook 1977, Technometrics 19:15-18 (memory); Belsley, Kuh & Welsch 1980 (memory).

    >>> x = np.column_stack([np.ones(4), [-1.5, -0.5, 0.5, 1.5]])
    >>> found = weigh(x, np.array([0.1, -0.3, 0.3, -0.1]), np.ones(4))
    >>> [round(b.cook, 4) for b in found]  # by hand: e²h / (k·s²·(1−h)²), h = ¼ + x²/5
    [0.3889, 0.2755, 0.2755, 0.3889]
    """
    n, k = jac.shape
    names = numbers if numbers is not None else range(1, n + 1)
    root = np.sqrt(w)
    q, _ = np.linalg.qr(jac * root[:, None])
    leverage = (q * q).sum(axis=1)
    e = resid * root
    total = float((e * e).sum())
    with np.errstate(divide="ignore", invalid="ignore"):
        s2 = np.float64(total) / (n - k)
        cook = e * e * leverage / (k * s2 * (1.0 - leverage) ** 2)
        s2_without = (total - e * e / (1.0 - leverage)) / (n - k - 1)
        student = e / np.sqrt(s2_without * (1.0 - leverage))
        dffits = student * np.sqrt(leverage / (1.0 - leverage))
    return tuple(
        BillWeight(number, side, float(a), float(b), float(c))
        for number, a, b, c in zip(names, leverage, cook, dffits, strict=True)
    )


@dataclass(frozen=True, slots=True)
class Without:
    """The answer without one bill.

    number : of its period, from 1; start, end : day numbers, half-open; side : "before" or
    "after".  form_before, form_after : chosen then, "" where none fits.
    """

    number: int
    side: str
    start: int
    end: int
    form_before: str
    form_after: str
    normalized: Estimate
    avoided: Estimate


def without_each(asked: Asked, labels: Sequence[str]) -> tuple[Without, ...]:
    """The whole comparison, choice of form included, once without each bill in use.

    labels : (periods,) as ``Comparison.labels``.  One batch; nothing is approximated.  Empty
    where more than ``MOST_SINGLE`` readings are in use: of so many no one weighs much.
    """
    aligned = asked.aligned
    own = codes(tuple(labels))
    used = np.flatnonzero((own != UNUSED) & aligned.usable)
    if not 0 < used.shape[0] <= MOST_SINGLE:
        return ()
    sides = np.tile(own, (used.shape[0], 1))
    sides[np.arange(used.shape[0]), used] = UNUSED
    found = ask_again(asked, sides)
    return tuple(
        Without(
            number=int(p) + 1,
            side=labels[p],
            start=int(aligned.start[p]),
            end=int(aligned.end[p]),
            form_before=found.form(i, 0),
            form_after=found.form(i, 1),
            normalized=found.normalized(i),
            avoided=found.avoided(i),
        )
        for i, p in enumerate(used.tolist())
    )
