"""Chance that falls the same way on every machine and every version of Python."""

from __future__ import annotations

import random
from statistics import NormalDist

_NORMAL = NormalDist()


class Chance:
    """Seeded draws.

    ``random.Random.random`` is promised never to change its stream; bell-shaped draws go
    through the inverse of the normal distribution, so that they do not either.
    """

    def __init__(self, seed: str) -> None:
        self._random = random.Random(seed)

    def normal(self) -> float:
        """A draw from the standard normal distribution."""
        return _NORMAL.inv_cdf(min(max(self._random.random(), 1e-12), 1.0 - 1e-12))

    def between(self, low: int, high: int) -> int:
        """A whole number from low to high, both included."""
        return low + int(self._random.random() * (high - low + 1))


def persistent(chance: Chance, n: int, rho: float) -> list[float]:
    """n draws of unit variance, each correlated with the one before by rho (AR(1))."""
    now, out = chance.normal(), []
    for _ in range(n):
        out.append(now)
        now = rho * now + (1.0 - rho * rho) ** 0.5 * chance.normal()
    return out
