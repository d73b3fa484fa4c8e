"""What the parts of a saving are, and the caution that goes with them.

Light on purpose: reports read it without loading what computes it (``parts.py``).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

if TYPE_CHECKING:
    from normalize.savings.results import Estimate

ERR_TOGETHER: Final = (
    "Slope and balance temperature err together, strongly: where the bills put one too high they "
    "put the other too low. So each part is less sure than the whole, its range is its own and "
    "wider, and the ranges do not add up as the parts do."
)


@dataclass(frozen=True, slots=True)
class Part:
    """One parameter's part of the normalized savings, in the account's unit a year.

    estimate : positive is a reduction; fractions are of NAC before.
    """

    name: str
    estimate: Estimate


@dataclass(frozen=True, slots=True)
class Parts:
    """The parts of the normalized savings, or the reason why there are none.

    rough : where a balance temperature is poorly placed, in words, so that parts are rough.
    slope_before, slope_after, slope_change : the heating slope with its range, and before −
    after (positive is a fall), per °F·day; None where a side has none.
    """

    parts: tuple[Part, ...] = ()
    unavailable: str | None = None
    slope_before: Estimate | None = None
    slope_after: Estimate | None = None
    slope_change: Estimate | None = None
    rough: str = ""

    @property
    def caution(self) -> str:
        """That slope and balance temperature err together, where there is a balance temperature."""
        return ERR_TOGETHER if any("balance" in p.name for p in self.parts) else ""

    @property
    def total(self) -> float | None:
        """What the parts add up to: the normalized savings, but for rounding."""
        if not self.parts:
            return None
        return sum(p.estimate.value or 0.0 for p in self.parts)
