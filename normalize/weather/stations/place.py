"""A place: coordinates as people type them, or a ZIP code by an offline table."""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import Final

from normalize.errors import MissingWeather, WeatherError

_COORDINATES: Final = re.compile(
    r"\s*([-+]?\d{1,2}(?:\.\d+)?)\s*[,; ]\s*([-+]?\d{1,3}(?:\.\d+)?)\s*$"
)
_ZIP: Final = re.compile(r"\s*(\d{5})(?:-\d{4})?\s*$")
_HEIGHT: Final = re.compile(r"\s*(-?\d+(?:\.\d+)?)\s*(ft|feet|m)\s*$", re.IGNORECASE)
METRES_A_FOOT: Final = 0.3048
HIGHEST_M: Final = 6000.0
LOWEST_M: Final = -450.0


@dataclass(frozen=True, slots=True)
class Place:
    """Where it is, in degrees. name : as a message says it."""

    latitude: float
    longitude: float
    name: str


def place_of(text: str) -> Place:
    """A place from "43.64,-72.25" or from a ZIP code.

    >>> place_of("43.64,-72.25").longitude
    -72.25
    """
    if match := _COORDINATES.match(text):
        latitude, longitude = float(match[1]), float(match[2])
        if abs(latitude) <= 90 and abs(longitude) <= 180:
            return Place(latitude, longitude, f"{latitude:g}, {longitude:g}")
    if match := _ZIP.match(text):
        return _of_zip(match[1])
    raise WeatherError(
        f"{text[:40]!r} is no place",
        where="place",
        wanted="latitude and longitude in degrees, such as 43.64,-72.25, or a ZIP code",
    )


def _of_zip(code: str) -> Place:
    try:
        import zipcodes
    except ImportError:
        raise MissingWeather(
            "the table of ZIP codes is not installed",
            where=code,
            next_step="Give latitude and longitude instead, or install normalize[download].",
        ) from None
    found = zipcodes.matching(code)  # type: ignore[no-untyped-call]
    for entry in found:
        try:
            return Place(float(entry["lat"]), float(entry["long"]), f"ZIP code {code}")
        except (KeyError, TypeError, ValueError):
            continue
    raise MissingWeather(
        "the table has no such ZIP code",
        where=code,
        next_step="Give latitude and longitude instead, such as 43.64,-72.25.",
    )


def height_of(text: str) -> float:
    """Metres of "580ft" or "177m".

    >>> height_of("1000ft")
    304.8
    """
    match = _HEIGHT.match(text)
    if match:
        metres = float(match[1]) * (1.0 if match[2].lower() == "m" else METRES_A_FOOT)
        if LOWEST_M <= metres <= HIGHEST_M:
            return round(metres, 3)
    raise WeatherError(
        f"{text[:20]!r} is no height",
        where="elevation",
        wanted="metres or feet with the unit, such as 580ft",
    )
