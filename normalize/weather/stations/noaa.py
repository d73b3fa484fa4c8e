"""The public archive's files: what there is for a station, and its path on the server.

Paths as published by the archive; those of the lists and of .dly files are *(memory)*.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import Final

from normalize.errors import WeatherError

STATIONS: Final = "pub/data/ghcn/daily/ghcnd-stations.txt"
INVENTORY: Final = "pub/data/ghcn/daily/ghcnd-inventory.txt"
FIRST_YEAR, LAST_YEAR = 1850, 2099


@dataclass(frozen=True, slots=True)
class Product:
    """One kind of file. station : pattern of its ids; by_year : one file for each year."""

    name: str
    path: str
    station: str
    example: str
    by_year: bool = False


_GHCN: Final = r"[A-Z]{2}[A-Z0-9]{9}"
PRODUCTS: Final = {
    p.name: p
    for p in (
        Product("daily", "pub/data/ghcn/daily/all/{id}.dly", _GHCN, "USW00094728"),
        Product(
            "normals",
            "data/normals-annualseasonal/1991-2020/access/{id}.csv",
            _GHCN,
            "USW00094728",
        ),
        Product(
            "normals-monthly", "data/normals-monthly/1991-2020/access/{id}.csv", _GHCN,
            "USW00094728",
        ),
        Product(
            "normals-daily", "data/normals-daily/1991-2020/access/{id}.csv", _GHCN, "USW00094728"
        ),
        Product(
            "gsod",
            "data/global-summary-of-the-day/access/{year}/{id}.csv",
            r"[0-9A]\d{10}",
            "72530094846",
            by_year=True,
        ),
        Product(
            "lcd",
            "data/local-climatological-data/access/{year}/{id}.csv",
            r"[0-9A]\d{10}",
            "72530094846",
            by_year=True,
        ),
        Product(
            "isd-lite",
            "pub/data/noaa/isd-lite/{year}/{id}-{year}.gz",
            r"[0-9A]\d{5}-\d{5}",
            "725300-94846",
            by_year=True,
        ),
    )
}  # fmt: skip


def path_of(product: str, station: str, year: int | None = None) -> str:
    """A file's path on the server.

    >>> path_of("daily", "USW00094728")
    'pub/data/ghcn/daily/all/USW00094728.dly'

    Raises WeatherError for an id or a year that cannot be.
    """
    kind = PRODUCTS[product]
    if not re.fullmatch(kind.station, station):
        raise WeatherError(
            f"{station[:40]!r} is no station of this kind of file",
            where=product,
            wanted=f"an id such as {kind.example}",
            next_step="Find it with: normalize weather near LAT,LON",
        )
    if kind.by_year and (year is None or not FIRST_YEAR <= year <= LAST_YEAR):
        raise WeatherError(
            "these files are by year" if year is None else f"{year} is no year of the archive",
            where=product,
            wanted="--year 2023",
        )
    return kind.path.format(id=station, year=year)
