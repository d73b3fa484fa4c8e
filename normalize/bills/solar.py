"""Solar panels behind the meter: gross use where generation is known, else how they show.

What belongs here: the signature of generation in net use.  With panels, what the meter counts
is use less sunshine, and no balance temperature explains sunshine.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from normalize.bills import rules

if TYPE_CHECKING:
    from normalize.bills.answers import Understood
    from normalize.bills.periods import Periods

CURE = (
    "Add a column of what the panels generated (generation_column), so that use can be made "
    "whole: gross = net + generation."
)
SENT = (
    "energy was sent to the grid, as from solar panels, and what they generated is not known: "
    "net use follows the sun, not the temperature. " + CURE
)
SUMMER = (
    "use all but vanishes in the sunny months, as it does with solar panels (or in a house that "
    "is empty in summer): such use follows the sun, not the temperature. " + CURE
)


def solar_signature(found: Understood, periods: Periods, *, net_metered: bool) -> str:
    """Why net use is unfit for this method; "" where generation is known or nothing shows.

    net_metered : the user said so.
    """
    if found.fuel != "electricity" or found.generation:
        return ""
    if found.sent or net_metered or bool(np.any(periods.use < 0)):
        return SENT
    return SUMMER if vanishes_in_summer(periods) else ""


def vanishes_in_summer(periods: Periods) -> bool:
    """Whether use a day in sunny months falls to a small part of that in the dark ones."""
    per_day = periods.use / np.maximum(periods.days, 1)
    middle = ((periods.start + periods.end) // 2).astype("datetime64[D]")
    months = middle.astype("datetime64[M]").astype(np.int64) % 12 + 1
    dark = per_day[np.isin(months, rules.DARK_MONTHS)]
    sunny = per_day[np.isin(months, rules.SUNNY_MONTHS)]
    days = periods.days[np.isin(months, rules.SUNNY_MONTHS)]
    if dark.size == 0 or periods.n < rules.SOLAR_MIN_PERIODS:
        return False
    low = sunny <= rules.SOLAR_SHARE * float(np.median(dark))
    return bool(days[low].sum() >= rules.SOLAR_MIN_DAYS)
