"""The grid of serial correlations that a range integrates over (docs/method.md §5)."""

from __future__ import annotations

from typing import Final

import numpy as np

RHO_LOW: Final = -0.4
RHO_HIGH: Final = 0.9
RHO_POINTS: Final = 27

RHO = np.round(np.linspace(RHO_LOW, RHO_HIGH, RHO_POINTS), 10)
RHO_ZERO = int(np.argmin(np.abs(RHO)))  # index of ρ = 0
