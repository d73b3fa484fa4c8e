"""Every default that decides a number, in one place; reports print those that mattered.

Sources: "method §n" and "design" are this project's docs/method.md; others are named.
"""

from __future__ import annotations

from typing import Final

CONFIDENCE: Final = 0.90  # two-sided; the trade's customary level (common practice)

# Which bills count.
WINDOW_DAYS: Final = 731  # the 24 months next to the work window on either side
FEW_INTERVALS: Final = 12  # fewer deliveries than this in 24 months: years are pooled
POOLED_WINDOW_DAYS: Final = 1461  # to four years on either side
MIN_DAYS_A_SIDE: Final = 270  # of bills, for a normalized result
SPARE_PERIODS: Final = 3  # n >= parameters + 3 (method §3)
MIN_COLD_PERIODS: Final = 3  # with more than half their days on the slope's side of τ
MIN_MILD_PERIODS: Final = 2  # with fewer than half
MAX_FILLED_SHARE: Final = 0.10  # of a period's days of weather, else it is set aside
SHORT_YEAR_DAYS: Final = 360  # fewer reporting days than this: avoided use "so far"

# Where balance temperatures are looked for. °F
HEATING_RANGE_F: Final = (40.0, 80.0)
COOLING_RANGE_F: Final = (50.0, 85.0)

# What an engineering expectation takes where the site file does not say.
HEATING_SETPOINT_F: Final = 68.0  # °F indoors in the heating season (common practice)

# When a form is set aside.
MIN_ABS_T: Final = 2.0  # IPMVP asks |t| > 2 (memory)
BASE_LOAD_T: Final = -2.0  # a base load is called negative only when two standard errors below 0

# When a driver of use beside the weather is refused (method §3.1).
MAX_SHARED_VARIATION: Final = 0.90  # of its variation with weather and other drivers: a variance
#                        inflation of 10 (Marquardt 1970, Technometrics 12:591-612, memory)
MIN_DAY_TYPE_SPREAD: Final = 0.05  # of a bill's days: months all have nearly the same weekends
