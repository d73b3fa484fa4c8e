"""Stations ranked for a place: distance, height, completeness, climate.

The ranking adds up what each short-coming is worth in kilometres.  The worths are our own
choice (a house 100 m higher is 0.65 °C colder by the standard atmosphere, ISO 2533, which is
what 20 km of distance may be); the list shows every part, so that a person can choose otherwise.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from statistics import median
from typing import TYPE_CHECKING, Final

from normalize.days import date_of

if TYPE_CHECKING:
    from normalize.weather.stations.lists import Station
    from normalize.weather.stations.place import Place
    from normalize.weather.temperature import DailyTemperature

EARTH_KM: Final = 6371.0088  # mean radius (IUGG)
KM_PER_100_M: Final = 20.0
KM_FOR_ALL_MISSING: Final = 400.0
KM_FOR_ANOTHER_ZONE: Final = 50.0
KM_FOR_MORNING_DAYS: Final = 10.0  # a volunteer observer's days may be shifted
MOST_KM: Final = 250.0
NEAREST_HEIGHTS: Final = 5  # stations whose median height stands for a building's


@dataclass(frozen=True, slots=True)
class Candidate:
    """A station as seen from a place.

    rise_m : station above place (or above the median of the nearest stations, where the
    place's height is not given), None where a height is unknown.  complete : share of
    the span's days (or years, by the inventory) that it covers, None where unknown; measured
    says that its own file was looked at.  zone : None where unknown.  cost_km : sum of all.
    """

    station: Station
    distance_km: float
    rise_m: float | None
    complete: float | None
    measured: bool
    zone: int | None
    same_zone: bool | None
    cost_km: float


def distance_km(lat1: float, lon1: float, lat2: float, lon2: float) -> float:
    """Great-circle distance. [km]

    >>> round(distance_km(0.0, 0.0, 1.0, 0.0), 2)
    111.2
    """
    a, b = math.radians(lat1), math.radians(lat2)
    across = math.sin((b - a) / 2) ** 2
    along = math.cos(a) * math.cos(b) * math.sin(math.radians(lon2 - lon1) / 2) ** 2
    return 2 * EARTH_KM * math.asin(min(1.0, math.sqrt(across + along)))


def covered(station: Station, span: tuple[int, int]) -> float | None:
    """Share of the span's years that the inventory lists. span : day numbers, half-open."""
    if station.years is None:
        return None
    first, last = date_of(span[0]).year, date_of(span[1] - 1).year
    inside = min(last, station.years[1]) - max(first, station.years[0]) + 1
    return max(inside, 0) / (last - first + 1)


def present(weather: DailyTemperature, span: tuple[int, int]) -> float:
    """Share of the span's days that a record measured. span : day numbers, half-open."""
    import numpy as np

    a, b = (min(max(d - weather.first_day, 0), weather.n_days) for d in span)
    known = np.isfinite(weather.temp_f[a:b]) & ~weather.filled[a:b]
    return float(known.sum()) / (span[1] - span[0])


def rank(
    stations: Iterable[Station],
    place: Place,
    span: tuple[int, int],
    *,
    elevation_m: float | None = None,
    measured: Mapping[str, float] | None = None,
    zones: Mapping[str, int] | None = None,
    most_km: float = MOST_KM,
    count: int = 8,
) -> tuple[Candidate, ...]:
    """The best stations for a place, best first.

    span : day numbers of the bills, half-open.  measured : id → share of the span's days, of
    stations whose file is at hand.  zones : id → climate zone.  The place's own zone is taken
    to be that of the nearest station whose zone is known.
    """
    near = []
    for station in stations:
        away = distance_km(place.latitude, place.longitude, station.latitude, station.longitude)
        if away <= most_km:
            near.append((away, station))
    near.sort(key=lambda pair: (pair[0], pair[1].id))
    zones = zones or {}
    if elevation_m is None:
        elevation_m = usual_height([station for _, station in near])
    home = next((zones[s.id] for _, s in near if s.id in zones), None)
    found = [
        _candidate(station, away, span, elevation_m, measured or {}, zones.get(station.id), home)
        for away, station in near
    ]
    found.sort(key=lambda c: (c.cost_km, c.station.id))
    return tuple(found[:count])


def usual_height(stations: Sequence[Station]) -> float | None:
    """The median height of the nearest stations, where the building's own is not given. [m]

    stations : nearest first.  None where none of them has a height.
    """
    heights = [s.elevation_m for s in stations if s.elevation_m is not None][:NEAREST_HEIGHTS]
    return median(heights) if heights else None


def _candidate(
    station: Station,
    away: float,
    span: tuple[int, int],
    elevation_m: float | None,
    measured: Mapping[str, float],
    zone: int | None,
    home: int | None,
) -> Candidate:
    rise = None
    if elevation_m is not None and station.elevation_m is not None:
        rise = station.elevation_m - elevation_m
    complete = measured.get(station.id, covered(station, span))
    same = None if zone is None or home is None else zone == home
    cost = away
    cost += abs(rise or 0.0) / 100 * KM_PER_100_M
    cost += (1.0 - complete if complete is not None else 0.5) * KM_FOR_ALL_MISSING
    cost += KM_FOR_ANOTHER_ZONE if same is False else 0.0
    cost += 0.0 if station.midnight_days else KM_FOR_MORNING_DAYS
    return Candidate(station, away, rise, complete, station.id in measured, zone, same, cost)
