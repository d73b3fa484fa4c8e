"""What drives use beside the weather: known amounts for each period, about a normal level.

Occupied units, production, school days, weekends: anything whose amount is known on every
day that was billed.  A driver enters a fit as one more regressor, the mean of its days in
each period less its level in a normal year,

    use a day = a + b·h(τ) + Σ γ (x̄ − x₀),

so that the base load *a* and with it NAC belong to a normal amount of the driver, and every
formula for a normal year stays as it is.  The exact sweep projects the regressor out
(docs/method.md §2), so τ is still the global optimum.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True, slots=True)
class Drivers:
    """Drivers of one account's periods, ready for a fit.

    names : (k,) as reports call them.
    values : (n, k) float64, C-contiguous: the period's mean of the driver's daily amount, less
        its normal level; one row for each period of the account, usable or not.  Finite
        everywhere: the rows of periods that no fit may use hold 0.
    normals : (k,) the level taken off, an amount a day.
    sources : (k,) the file or list each came from.
    """

    names: tuple[str, ...]
    values: NDArray[np.float64]
    normals: tuple[float, ...]
    sources: tuple[str, ...]

    @property
    def k(self) -> int:
        """How many drivers."""
        return len(self.names)

    def only(self, keep: Sequence[int]) -> Drivers:
        """Some of them, by position.

        >>> both = Drivers(("a", "b"), np.array([[1.0, 2.0]]), (0.0, 5.0), ("", "x.csv"))
        >>> both.only([1]).names, both.only([1]).values.tolist(), both.only([]).k
        (('b',), [[2.0]], 0)
        """
        at = list(keep)
        return Drivers(
            names=tuple(self.names[i] for i in at),
            values=np.ascontiguousarray(self.values[:, at], dtype=np.float64),
            normals=tuple(self.normals[i] for i in at),
            sources=tuple(self.sources[i] for i in at),
        )


def no_drivers(n: int) -> NDArray[np.float64]:
    """(n, 0): the matrix of an account without drivers."""
    return np.empty((n, 0), dtype=np.float64)
