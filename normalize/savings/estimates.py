"""From the columns of a kernel's answer to an Estimate."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from normalize.savings.kernel import NAC_BEFORE, NORMALIZED
from normalize.savings.results import Estimate


def estimate_at(
    answer: NDArray[np.float64],
    at: int,
    over: float | None,
    confidence: float,
    method: str,
    net: bool = False,
) -> Estimate:
    """The estimate whose five columns begin at ``at``; fractions are of ``over``.

    net : generation may outweigh use, so that more than all of it can be saved.
    """
    value, low, high, plain_low, plain_high = (float(x) for x in answer[at : at + 5])
    share = over if over is not None and over > 0.0 else None
    return Estimate(
        value=value,
        low=low,
        high=high,
        fraction=value / share if share else None,
        fraction_low=low / share if share else None,
        # Nobody can use less than nothing: no more than all of it can be saved.
        fraction_high=(high if net else min(high, share)) / share if share else None,
        plain_low=plain_low,
        plain_high=plain_high,
        confidence=confidence,
        method=method,
    )


def normalized_of(
    answer: NDArray[np.float64], confidence: float, method: str, net: bool
) -> Estimate:
    """Normalized savings, as a fraction of NAC before."""
    return estimate_at(answer, NORMALIZED, float(answer[NAC_BEFORE]), confidence, method, net)
