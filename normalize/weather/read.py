"""Read a weather file of any known format into daily temperature."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

from normalize.errors import UnreadableWeather
from normalize.weather.formats import format_of
from normalize.weather.gaps import fill_gaps
from normalize.weather.options import WeatherOptions
from normalize.weather.source import clean_name, read_source

if TYPE_CHECKING:
    from pathlib import Path

    from normalize.weather.temperature import DailyTemperature


def read_weather(
    path: str | Path,
    *,
    unit: str | None = None,
    date_column: str | None = None,
    temperature_column: str | None = None,
    max_column: str | None = None,
    min_column: str | None = None,
    dates: str | None = None,
    time_zone_offset: float | None = None,
    station: str | None = None,
    neighbour: str | Path | None = None,
) -> DailyTemperature:
    """A station's daily mean temperature from its file, short gaps filled. [°F]

    unit : "F" or "C", where the file does not say.
    date_column, temperature_column, max_column, min_column : headers, where they are not
        to be found by themselves.  max_column and min_column go together.
    dates : "month first", "day first" or "year first", where the file does not settle it.
    time_zone_offset : hours from UTC to local standard time (−5 for US Eastern), for files
        whose hours are UTC.
    station : its name; or which of several stations in the file.
    neighbour : the file of a station near by, from which gaps of up to 30 days are filled by
        regression; it must be readable without options.

    Raises UnreadableWeather for a file that cannot be read, AmbiguousWeather (which names
    the option to give) for one that can be read in two ways.
    """
    weather = _read(
        path,
        WeatherOptions(
            unit=unit,
            date_column=date_column,
            temperature_column=temperature_column,
            max_column=max_column,
            min_column=min_column,
            dates=dates,
            time_zone_offset=time_zone_offset,
            station=station,
        ),
    )
    if neighbour is not None:
        from normalize.weather.neighbour import fill_from_neighbour

        weather = fill_from_neighbour(weather, _read(neighbour, WeatherOptions()))
    return fill_gaps(weather)


def _read(path: str | Path, options: WeatherOptions) -> DailyTemperature:
    """A file's days as they are, gaps and all."""
    source = read_source(path)
    found = format_of(source.head)
    if found is None:
        raise UnreadableWeather(
            "is in no weather format that normalize knows",
            where=source.name,
            wanted="a table of daily or hourly temperatures (CSV)",
            next_step="Give a table with a header such as 'date,mean_f'.",
        )
    if found.read_days is None:
        raise UnreadableWeather(
            f"is a {found.name}: a typical year, not the weather that was",
            where=source.name,
            wanted="the station's observed days",
            next_step='Give it as long_term = { file = "…" } under [weather] in site.toml.',
        )
    weather = found.read_days(source, options)
    name = clean_name(options.station or weather.station or source.path.stem)
    return replace(weather, station=name, source=source.fingerprint)
