"""The weather file formats that normalize reads, each recognised by its content.

A format is one module here with a ``FORMAT`` object; to add one, write the module and put
its name in ``MODULES``, before the generic table, which takes whatever is left.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from importlib import import_module
from typing import TYPE_CHECKING, Final

if TYPE_CHECKING:
    from normalize.weather.options import WeatherOptions
    from normalize.weather.source import SourceFile
    from normalize.weather.temperature import DailyTemperature
    from normalize.weather.year import LongTermYear

MODULES: Final = (  # asked in this order
    "tmy3",
    "epw",
    "tmy2",
    "normals",
    "ghcn_dly",
    "ghcn_rows",
    "ghcn_access",
    "gsod",
    "lcd",
    "isd_lite",
    "environment_canada",
    "monthly_means",
    "generic_csv",
)


@dataclass(frozen=True, slots=True)
class Format:
    """One kind of weather file.

    name : what messages call it.
    recognises : whether the first bytes of a file (up to 64 KB) are of this kind.
    read_days : the days of an observed file; None where the kind holds no observed days.
        Gaps are left as they are: ``read_weather`` fills them.
    read_year : the long-term year of the file; None where the kind holds none.
    """

    name: str
    recognises: Callable[[bytes], bool]
    read_days: Callable[[SourceFile, WeatherOptions], DailyTemperature] | None = None
    read_year: Callable[[SourceFile], LongTermYear] | None = None


def format_of(head: bytes) -> Format | None:
    """The first format that recognises a file's beginning."""
    for module in MODULES:
        found: Format = import_module(f"normalize.weather.formats.{module}").FORMAT
        if found.recognises(head):
            return found
    return None
