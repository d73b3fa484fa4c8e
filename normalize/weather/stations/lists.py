"""The archive's lists: where each station is, and the years it measured temperature.

ghcnd-stations.txt: ID 1-11, latitude 13-20, longitude 22-30, elevation 32-37 (m, -999.9
missing), state 39-40, name 42-71.  ghcnd-inventory.txt: ID 1-11, element 32-35, first year
37-40, last year 42-45 (memory).
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

from normalize.errors import UnreadableWeather
from normalize.weather.source import clean_name, decode

if TYPE_CHECKING:
    from normalize.weather.source import SourceFile

_NO_ELEVATION: Final = -999.0


@dataclass(frozen=True, slots=True)
class Station:
    """A station. elevation_m : None where unknown.  years : first and last with both maximum
    and minimum temperature; None where the inventory has none.
    """

    id: str
    name: str
    latitude: float
    longitude: float
    elevation_m: float | None
    years: tuple[int, int] | None = None

    @property
    def midnight_days(self) -> bool:
        """Whether its days run from midnight to midnight, as an airport's (USW…) do."""
        return self.id.startswith("USW")


def read_stations(stations: SourceFile, inventory: SourceFile | None = None) -> tuple[Station, ...]:
    """Every station that measured maximum and minimum (all, where there is no inventory)."""
    years = _years(decode(inventory).splitlines()) if inventory is not None else None
    found, bad = [], 0
    for line in decode(stations).splitlines():
        if not line.strip():
            continue
        station = _station(line, years)
        if station is None:
            bad += 1
        elif years is None or station.years is not None:
            found.append(station)
    if not found or bad > len(found):
        raise UnreadableWeather(
            "is no list of stations",
            where=stations.name,
            wanted="ghcnd-stations.txt",
            next_step="Get it with: normalize weather near LAT,LON --download",
        )
    return tuple(found)


def _station(line: str, years: Mapping[str, tuple[int, int]] | None) -> Station | None:
    try:
        latitude, longitude = float(line[12:20]), float(line[21:30])
        elevation = float(line[31:37])
    except ValueError:
        return None
    if not (-90 <= latitude <= 90 and -180 <= longitude <= 180):
        return None
    number = line[:11]
    name = clean_name(f"{line[41:71].strip()}, {line[38:40]}".strip(", "))
    height = elevation if elevation > _NO_ELEVATION else None
    return Station(number, name, latitude, longitude, height, (years or {}).get(number))


def _years(lines: Iterable[str]) -> dict[str, tuple[int, int]]:
    """First and last year in which a station has both maximum and minimum."""
    spans: dict[str, dict[str, tuple[int, int]]] = {}
    for line in lines:
        element = line[31:35]
        if element in ("TMAX", "TMIN"):
            try:
                spans.setdefault(line[:11], {})[element] = (int(line[36:40]), int(line[41:45]))
            except ValueError:
                continue
    both = {}
    for number, of in spans.items():
        if len(of) == 2:
            first = max(span[0] for span in of.values())
            last = min(span[1] for span in of.values())
            if first <= last:
                both[number] = (first, last)
    return both
