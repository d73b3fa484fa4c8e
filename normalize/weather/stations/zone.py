"""The thermal climate zone of a year of weather, 0 (hottest) to 8 (coldest).

Bounds of ASHRAE Standard 169 (memory: not checked against the standard), in heating
degree-days at 65 °F and cooling degree-days at 50 °F.  Humidity (the letters A, B, C) needs
more than temperature and is not told.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

if TYPE_CHECKING:
    from normalize.weather.year import LongTermYear

HEATING_BASE_F: Final = 65.0
COOLING_BASE_F: Final = 50.0
BY_COOLING: Final = ((10800.0, 0), (9000.0, 1), (6300.0, 2))  # above which, in °F·day (memory)
BY_HEATING: Final = ((3600.0, 3), (5400.0, 4), (7200.0, 5), (9000.0, 6), (12600.0, 7))  # up to


def zone_of_degree_days(heating_65: float, cooling_50: float) -> int:
    """The zone of a year's degree-days. [°F·day]

    >>> zone_of_degree_days(7333.4, 2363.7)  # Lebanon, NH, normals 1991-2020: zone 6 (memory)
    6
    """
    for bound, zone in BY_COOLING:
        if cooling_50 > bound:
            return zone
    for bound, zone in BY_HEATING:
        if heating_65 <= bound:
            return zone
    return 8


def zone_of(year: LongTermYear) -> int:
    """The zone of a long-term year."""
    return zone_of_degree_days(year.heating(HEATING_BASE_F), year.cooling(COOLING_BASE_F))
