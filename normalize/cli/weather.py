"""``normalize weather``: find a station, get its files, check a file."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

import click

from normalize.cli.console import say, show
from normalize.cli.options import FILE, STDOUT, json_option, write_json
from normalize.cli.tables import paragraph, table

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

    from normalize.weather.stations.cache import Cache
    from normalize.weather.stations.fetch import Fetcher
    from normalize.weather.stations.near import Candidate
    from normalize.weather.temperature import DailyTemperature
    from normalize.weather.year import LongTermYear

PRODUCTS: Final = (
    "daily", "normals", "normals-monthly", "normals-daily", "gsod", "lcd", "isd-lite",
)  # fmt: skip
DEFAULT_YEARS: Final = 5  # of the span that near asks for, where nothing says which bills
LOOKED_AT: Final = 6  # stations whose normals near gets to know their climate zone
NO_CONNECTION: Final = "Nothing is downloaded unless you ask: add --download."


@click.group(
    "weather",
    short_help="Find a weather station, get its files, check a file.",
    epilog="Example: normalize weather near 43.64,-72.30 --download",
)
def command() -> None:
    """Find a weather station, get its files, check a file.

    Only `get` and `near --download` use the network, and only NOAA's public archive; all else
    works from files and from what was downloaded before.
    """


def _cache_option(function: Callable[..., Any]) -> Callable[..., Any]:
    return click.option(
        "--cache",
        "cache_folder",
        type=click.Path(path_type=Path),
        metavar="FOLDER",
        help="Where downloaded files are kept; by default a folder of the user's own.",
    )(function)


@command.command(
    "near",
    context_settings={"ignore_unknown_options": True},  # a latitude may begin with a minus
    epilog="Example: normalize weather near 03766 --elevation 580ft --bills gas.csv --download",
)
@click.argument("place")
@click.option("--elevation", metavar="HEIGHT", help="Of the building, such as 580ft or 177m.")
@click.option("--bills", type=FILE, metavar="FILE", help="Bills whose days should be covered.")
@click.option("--from", "first", metavar="DATE", help="First day to cover, if there are no bills.")
@click.option("--to", "last", metavar="DATE", help="Last day to cover, if there are no bills.")
@click.option("--count", type=click.IntRange(1, 50), default=8, show_default=True, help="How many.")
@click.option("--download", is_flag=True, help="Get the lists of stations from NOAA if needed.")
@_cache_option
@json_option
def near(
    place: str,
    elevation: str | None,
    bills: Path | None,
    first: str | None,
    last: str | None,
    count: int,
    download: bool,
    cache_folder: Path | None,
    json_to: str | None,
) -> None:
    """Rank weather stations for a PLACE: LAT,LON in degrees, or a ZIP code.

    By distance, difference in height, completeness over the bills' days, and climate zone.
    """
    from normalize.weather.stations.near import rank
    from normalize.weather.stations.place import height_of, place_of

    where = place_of(place)
    height = height_of(elevation) if elevation is not None else None
    span = _span(bills, first, last)
    fetcher = _fetcher(cache_folder)
    stations = _stations(fetcher, download=download)
    found = rank(stations, where, span, elevation_m=height, count=max(count, LOOKED_AT))
    # Once more, now that files at hand or just fetched tell completeness and climate.
    zones = _zones(fetcher, found, download=download)
    measured = _measured(fetcher.cache, found, span)
    found = rank(
        stations, where, span, elevation_m=height, measured=measured, zones=zones, count=count
    )
    if json_to is not None:
        write_json(_near_json(where.name, span, found), json_to)
    if json_to != STDOUT:
        show(_near_text(where.name, span, found, height_given=height is not None))


@command.command("get", epilog="Example: normalize weather get USW00094765 --into my-house")
@click.argument("station")
@click.option(
    "--what",
    type=click.Choice(PRODUCTS),
    default="daily",
    show_default=True,
    help="Which of the station's files.",
)
@click.option("--year", type=int, metavar="YEAR", help="For gsod, lcd and isd-lite.")
@click.option(
    "--into",
    type=click.Path(path_type=Path),
    metavar="FOLDER",
    help="Copy the file there, such as into a site's folder.",
)
@click.option("--offline", is_flag=True, help="Only from what was downloaded before.")
@_cache_option
def get(
    station: str,
    what: str,
    year: int | None,
    into: Path | None,
    offline: bool,
    cache_folder: Path | None,
) -> None:
    """Download a STATION's file from NOAA's public archive, or take it from the cache.

    A download that was cut goes on where it stopped; a file that has not changed is not sent
    again.
    """
    from normalize.weather.stations.noaa import path_of

    path = path_of(what, station.strip().upper(), year)
    fetched = _fetcher(cache_folder).fetch(path, offline=offline)
    if fetched.remark:
        say(fetched.remark)
    how = {
        "new": "downloaded",
        "unchanged": "unchanged since the last download",
        "cached": "taken from the cache",
    }[fetched.how]
    file = _copy(fetched.file, into) if into is not None else fetched.file
    show(f"{file}\n{how}, {fetched.note.size:,} bytes, as of {fetched.note.fetched}")


@command.command("check", epilog="Example: normalize weather check station.csv --years 10")
@click.argument("file", type=FILE)
@click.option("--neighbour", type=FILE, metavar="FILE", help="A station near by, to fill gaps.")
@click.option("--years", type=click.IntRange(1, 100), default=10, show_default=True,
              help="Whole years that a long-term year is made of.")  # fmt: skip
@click.option("--unit", type=click.Choice(["F", "C"]), help="Where the file does not say.")
@click.option("--time-zone-offset", type=float, metavar="HOURS",
              help="From UTC to local standard time, for files whose hours are UTC.")  # fmt: skip
@click.option("--station", metavar="NAME", help="Its name, or which of several in the file.")
def check(
    file: Path,
    neighbour: Path | None,
    years: int,
    unit: str | None,
    time_zone_offset: float | None,
    station: str | None,
) -> None:
    """Say what a weather FILE holds: its days, gaps, traps and the year that it makes."""
    from normalize.weather.formats import format_of
    from normalize.weather.read import read_weather
    from normalize.weather.source import read_source
    from normalize.weather.year import read_long_term_year

    kind = format_of(read_source(file).head)
    if kind is not None and kind.read_days is None:
        show(_year_text(kind.name, read_long_term_year(file)))
        return
    weather = read_weather(
        file, unit=unit, time_zone_offset=time_zone_offset, station=station, neighbour=neighbour
    )
    name = kind.name if kind is not None else "file"
    show(_check_text(name, weather, years))


def _span(bills: Path | None, first: str | None, last: str | None) -> tuple[int, int]:
    from datetime import UTC, datetime

    from normalize.days import day_of, day_of_iso

    if bills is not None:
        from normalize.cli.degree_days import bill_periods

        periods = bill_periods(bills)
        return int(periods.start.min()), int(periods.end.max())
    try:
        end = day_of_iso(last) + 1 if last else day_of(datetime.now(UTC).date())
        start = day_of_iso(first) if first else end - DEFAULT_YEARS * 365
    except ValueError:
        raise click.BadParameter("write days as 2023-01-31", param_hint="--from or --to") from None
    if end <= start:
        raise click.BadParameter("the last day is before the first", param_hint="--to")
    return start, end


def _fetcher(folder: Path | None) -> Fetcher:
    from normalize.weather.stations.cache import Cache
    from normalize.weather.stations.fetch import Fetcher

    if folder is None:
        try:
            from platformdirs import user_cache_path
        except ImportError:
            folder = Path.home() / ".cache" / "normalize" / "weather"
        else:
            folder = user_cache_path("normalize", appauthor=False) / "weather"
    return Fetcher(Cache(folder))


def _stations(fetcher: Fetcher, *, download: bool) -> Sequence[Any]:
    from normalize.errors import MissingWeather
    from normalize.weather.source import read_source
    from normalize.weather.stations.lists import read_stations
    from normalize.weather.stations.noaa import INVENTORY, STATIONS

    files = []
    for path in (STATIONS, INVENTORY):
        try:
            held = fetcher.fetch(path, offline=True)
        except MissingWeather:
            if not download:
                raise MissingWeather(
                    "the archive's list of stations is not on this computer yet",
                    where="weather near",
                    next_step=NO_CONNECTION,
                ) from None
            held = fetcher.fetch(path)
        files.append(read_source(held.file))
    return read_stations(files[0], files[1])


def _zones(fetcher: Fetcher, found: Sequence[Candidate], *, download: bool) -> dict[str, int]:
    """Climate zones of the stations whose normals are at hand, or can be had."""
    from normalize.errors import NormalizeError
    from normalize.weather.stations.noaa import path_of
    from normalize.weather.stations.zone import zone_of
    from normalize.weather.year import read_long_term_year

    zones = {}
    for candidate in found[:LOOKED_AT]:
        number = candidate.station.id
        try:
            path = path_of("normals", number)
            held = fetcher.cache.note(path)
            file = fetcher.fetch(path, offline=held is not None or not download).file
            zones[number] = zone_of(read_long_term_year(file))
        except NormalizeError:
            continue  # many stations have no normals; the list then says "?"
    return zones


def _measured(cache: Cache, found: Sequence[Candidate], span: tuple[int, int]) -> dict[str, float]:
    """Completeness of the stations whose daily file is in the cache."""
    from normalize.errors import NormalizeError
    from normalize.weather.read import read_weather
    from normalize.weather.stations.near import present
    from normalize.weather.stations.noaa import path_of

    shares = {}
    for candidate in found:
        try:
            path = path_of("daily", candidate.station.id)
            if cache.note(path) is not None:
                shares[candidate.station.id] = present(read_weather(cache.place(path)), span)
        except NormalizeError:
            continue
    return shares


def _near_text(
    place: str, span: tuple[int, int], found: Sequence[Candidate], *, height_given: bool
) -> str:
    from normalize.days import iso

    when = f"{iso(span[0])} to {iso(span[1] - 1)}"
    if not found:
        return f"No station with temperatures within 250 km of {place}."
    rows = []
    for c in found:
        rise = "?" if c.rise_m is None else f"{c.rise_m:+.0f} m"
        share = "?" if c.complete is None else f"{100 * c.complete:.0f} %"
        zone = "?" if c.zone is None else f"{c.zone}{'' if c.same_zone else ' (other)'}"
        days = "midnight" if c.station.midnight_days else "may be shifted"
        rows.append(
            [c.station.id, c.station.name, f"{c.distance_km:.0f} km", rise,
             share + ("" if c.measured else " *"), zone, days]
        )  # fmt: skip
    head = ["station", "name", "distance", "height", "complete", "zone", "days begin"]
    words = [
        "Best first: distance plus what height, missing days and another climate zone are worth "
        "in distance (docs/weather.md).",
        "* by the years that the archive's inventory lists; get the station to count its days.",
        "Height: above the building."
        if height_given
        else "Height: above the median of the nearest five stations, as no --elevation was given.",
        "Zone: thermal climate zone from normals, after ASHRAE 169 (bounds from memory).",
        f"Next: normalize weather get {found[0].station.id} --into YOUR-SITE-FOLDER",
    ]
    return "\n\n".join(
        [
            f"Stations near {place}, for {when}",
            table(head, rows, left=2),
            "\n".join(paragraph(w) for w in words),
        ]
    )


def _near_json(place: str, span: tuple[int, int], found: Sequence[Candidate]) -> str:
    import json

    from normalize.days import iso

    whole = {
        "schema": 1,
        "place": place,
        "first_day": iso(span[0]),
        "last_day": iso(span[1] - 1),
        "stations": [
            {
                "station": c.station.id,
                "name": c.station.name,
                "latitude": c.station.latitude,
                "longitude": c.station.longitude,
                "elevation_m": c.station.elevation_m,
                "distance_km": round(c.distance_km, 3),
                "rise_m": c.rise_m,
                "complete": c.complete,
                "complete_is_measured": c.measured,
                "zone": c.zone,
                "same_zone": c.same_zone,
                "cost_km": round(c.cost_km, 3),
            }
            for c in found
        ],
    }
    return json.dumps(whole, indent=2, ensure_ascii=False, allow_nan=False)


def _copy(file: Path, folder: Path) -> Path:
    """A copy in a folder; a different file of that name is never written over."""
    from normalize.errors import UnwritableReport

    target = folder / file.name
    data = file.read_bytes()
    if target.is_symlink() or (target.exists() and target.read_bytes() != data):
        raise UnwritableReport(
            "another file of that name is there already",
            where=str(target),
            next_step="Move it away, or choose another folder.",
        )
    if not folder.is_dir():
        raise UnwritableReport("there is no such folder", where=str(folder))
    target.write_bytes(data)
    return target


def _check_text(kind: str, weather: DailyTemperature, years: int) -> str:
    import numpy as np

    from normalize.days import iso
    from normalize.errors import NormalizeError
    from normalize.weather.year import long_term_year

    missing = int(np.isnan(weather.temp_f).sum())
    lines = [
        f"{weather.station}: {kind}",
        f"{iso(weather.first_day)} to {iso(weather.last_day - 1)}, {weather.n_days:,} days; "
        f"{weather.days_filled} filled, {missing} missing",
        f"each day: {weather.method}",
    ]
    blocks = ["\n".join(lines), *(paragraph(note) for note in weather.notes)]
    try:
        blocks.append(_year_text("long-term year", long_term_year(weather, years=years)))
    except NormalizeError as error:
        blocks.append(paragraph(f"No long-term year: {error}"))
    return "\n\n".join(blocks)


def _year_text(kind: str, year: LongTermYear) -> str:
    head = ["base", "heating °F·day", "cooling °F·day", "days below"]
    rows = [
        [f"{b:g} °F", f"{year.heating(b):,.0f}", f"{year.cooling(b):,.0f}",
         f"{year.days_below(b):.0f}"]
        for b in (50.0, 55.0, 60.0, 65.0, 70.0)
    ]  # fmt: skip
    blocks = [f"{kind}: {year.name}", *(paragraph(note) for note in year.notes), table(head, rows)]
    return "\n\n".join(blocks)
