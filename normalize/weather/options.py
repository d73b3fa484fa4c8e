"""The answers a user may give to the weather reader's questions; keys of [weather] in site.toml."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

from normalize.errors import AmbiguousWeather, WeatherError

UNITS: Final = ("F", "C")
DATE_ORDERS: Final = ("month first", "day first", "year first")
OFFSET_RANGE: Final = (-12.0, 14.0)  # hours from UTC that exist on Earth


@dataclass(frozen=True, slots=True)
class WeatherOptions:
    """How to read a file where it does not say so itself.

    unit : "F" or "C".  dates : "month first", "day first" or "year first".
    time_zone_offset : hours from UTC to local standard time (−5 for US Eastern), for files
        whose hours are UTC.
    """

    unit: str | None = None
    date_column: str | None = None
    temperature_column: str | None = None
    max_column: str | None = None
    min_column: str | None = None
    dates: str | None = None
    time_zone_offset: float | None = None
    station: str | None = None

    def __post_init__(self) -> None:
        if self.unit is not None and self.unit not in UNITS:
            raise _bad_option("unit", self.unit, '"F" or "C"')
        if self.dates is not None and self.dates not in DATE_ORDERS:
            raise _bad_option("dates", self.dates, " or ".join(f'"{d}"' for d in DATE_ORDERS))
        if self.time_zone_offset is not None and not _is_offset(self.time_zone_offset):
            raise _bad_option("time_zone_offset", self.time_zone_offset, "hours, -12 to 14")
        if (self.max_column is None) != (self.min_column is None):
            raise WeatherError(
                "max_column and min_column go together",
                where="[weather]",
                next_step="Give both, or temperature_column alone.",
            )


def _is_offset(value: object) -> bool:
    is_number = isinstance(value, int | float) and not isinstance(value, bool)
    return is_number and OFFSET_RANGE[0] <= float(value) <= OFFSET_RANGE[1]  # type: ignore[arg-type]


def _bad_option(key: str, value: object, wanted: str) -> WeatherError:
    return WeatherError(f"{key} = {value!r} is not a choice", where="[weather]", wanted=wanted)


def ask(found: str, *, where: str, key: str, choices: str, why: str = "") -> AmbiguousWeather:
    """An AmbiguousWeather that ends with the exact line to write.

    >>> ask("°F or °C?", where="a.csv", key="unit", choices='"F" or "C"').next_step
    'Write unit = "F" or "C" under [weather] in site.toml (on the command line: --unit).'
    """
    option = "--" + key.replace("_", "-")
    step = f"Write {key} = {choices} under [weather] in site.toml (on the command line: {option})."
    return AmbiguousWeather(found, where=where, wanted=why, next_step=step)
