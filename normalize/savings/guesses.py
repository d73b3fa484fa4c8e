"""Readings that were guessed and not marked: told from the fit's residuals, bill after bill.

A guess that is too high is taken back by the next real reading, so the bills around it lie on
either side of their fit.  What belongs here: the measure of that, and its words.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray

    Float = NDArray[np.float64]

# How the scatter of bills grows with their use: not at all, with its root, in proportion.  Each
# account's own is the likeliest of these.
POWERS = (0.0, 0.25, 0.5, 0.75, 1.0)
LEAST_SHARE = 0.1  # of the mean fitted use: below it a bill's scatter shrinks no more
MIN_PAIRS = 17  # bills next to each other: fewer say nothing (our own, no source)
# Residuals of a fit of k parameters to n bills have a lag-1 correlation of about −0.7·k/n where
# the bills err independently, and a spread of 1/√n (Bartlett 1946).  0.7 is measured on the
# homes of tests/prove/bills_guesses.py, which also gives the rate of false alarms.
PULL = 0.7
LIMIT = -2.0  # spreads below that


@dataclass(frozen=True, slots=True)
class SideOfWork:
    """Bills of one side in order of time.

    start, end : (n,) days.  use, fitted : (n,) per day.  parameters : of the fit.
    """

    start: NDArray[np.int64]
    end: NDArray[np.int64]
    use: Float
    fitted: Float
    parameters: int


@dataclass(frozen=True, slots=True)
class Sway:
    """How bills sway about their fit.

    correlation : from bill to bill, of residuals on the account's own scale.  pairs : of
    neighbouring bills.  spreads : how far below what independent bills show, in spreads.
    """

    correlation: float
    pairs: int
    spreads: float

    @property
    def suspicious(self) -> bool:
        """Whether chance alone is a poor explanation."""
        return self.spreads < LIMIT


def sway_of(sides: Sequence[SideOfWork]) -> Sway | None:
    """The sway of an account's bills about its fits; None for too few neighbouring bills.

    >>> day = np.arange(24) * 30
    >>> swaying = 10 + np.tile([1.0, -1.0], 12)
    >>> sway = sway_of([SideOfWork(day, day + 30, swaying, np.full(24, 10.0), 1)])
    >>> sway.suspicious, round(sway.correlation, 2)
    (True, -0.96)
    """
    sides = [side for side in sides if side.use.shape[0] > 1]
    pairs = sum(int(_neighbours(side).sum()) for side in sides)
    n = sum(side.use.shape[0] for side in sides)
    if pairs < MIN_PAIRS:
        return None
    power = max(POWERS, key=lambda p: sum(_likelihood(side, p) for side in sides))
    product, square = 0.0, 0.0
    for side in sides:
        z = _scaled(side, power)
        product += float((z[1:] * z[:-1])[_neighbours(side)].sum())
        square += float((z * z).sum())
    if square <= 0.0:
        return None
    rho = product / square
    k = sum(side.parameters for side in sides)
    return Sway(rho, pairs, float(np.sqrt(n) * (rho + PULL * k / n)))


def _neighbours(side: SideOfWork) -> NDArray[np.bool_]:
    """Which bills are followed by the next one without a gap."""
    follows: NDArray[np.bool_] = side.start[1:] == side.end[:-1]
    return follows


def _size(side: SideOfWork) -> Float:
    return np.maximum(side.fitted, LEAST_SHARE * max(float(side.fitted.mean()), 1e-300))


def _scaled(side: SideOfWork, power: float) -> Float:
    days = (side.end - side.start).astype(np.float64)
    z: Float = (side.use - side.fitted) * np.sqrt(days) / _size(side) ** power
    return z


def _likelihood(side: SideOfWork, power: float) -> float:
    """Logarithm of the normal likelihood of scatter in proportion to use to that power."""
    z = _scaled(side, power)
    square = max(float((z * z).mean()), 1e-300)
    scatter: float = z.shape[0] * np.log(square)
    sizes: float = power * np.log(_size(side)).sum()
    return -0.5 * scatter - sizes


def guess_caution(sway: Sway | None) -> tuple[str, ...]:
    """What a suspicious sway means and what to do; nothing otherwise."""
    if sway is None or not sway.suspicious:
        return ()
    rho = f"{sway.correlation:.2f}".replace("-", "\u2212")
    return (
        f"Bills sway about the fit, high and low in turn (correlation {rho} over {sway.pairs} "
        "pairs of neighbouring bills), as they do where readings are guessed and the next real "
        "one puts it right; none of these is marked so. A year's use is little touched, single "
        "months are. Ask the supplier which readings were estimated and mark those bills "
        "estimated: each is then joined to the next real reading.",
    )
