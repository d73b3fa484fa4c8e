"""Where each number of a form's fit stands in its row of the kernel's table."""

from __future__ import annotations

from typing import Final

STATUS: Final = 0  # forms.FITTED or the reason why not
TAU_H: Final = 1  # °F
TAU_C: Final = 2
BASE: Final = 3  # use per day
SLOPE_H: Final = 4  # use per °F·day
SLOPE_C: Final = 5
SLOPE_LINE: Final = 6  # use per day and °F
RSS: Final = 7  # Σ w·r² of use per day
TSS: Final = 8
N: Final = 9
DAYS: Final = 10
LOW_H: Final = 11  # the range of τ that the bills and the settings allow
HIGH_H: Final = 12
LOW_C: Final = 13
HIGH_C: Final = 14
SE_BASE: Final = 15  # standard errors with τ held
SE_H: Final = 16
SE_C: Final = 17
SE_LINE: Final = 18
AICC: Final = 19
BIC: Final = 20
ON_BOUND: Final = 21
MEAN: Final = 22  # weighted mean use per day
WORST_T: Final = 23  # smallest |t| of the slopes
WIDTH: Final = 24

# Index of a period's side, given to the batch kernels.
BEFORE: Final = 0
AFTER: Final = 1
UNUSED: Final = 2
