"""NOAA's 1991-2020 normals, by station: annual, monthly or daily files.

Their degree-days at several bases are what is used (65 is called NORMAL, the others BASEnn);
degree-days of normal mean temperatures would lose a third of cooling.  °F and °F·day; special
values: -7777 is more than nothing that rounds to 0, others below -5000 are missing (memory).
"""

from __future__ import annotations

import re
from typing import TYPE_CHECKING, Final

import numpy as np

from normalize.errors import UnreadableWeather
from normalize.weather.estimate import estimated_year
from normalize.weather.formats import Format
from normalize.weather.formats.archive import table_of_archive
from normalize.weather.published import MIN_BASES, Published, year_of_published
from normalize.weather.source import clean_name

if TYPE_CHECKING:
    from collections.abc import Sequence

    from normalize.weather.source import SourceFile
    from normalize.weather.year import LongTermYear

_COLUMN: Final = re.compile(r"(ANN|MLY|DLY)-(HTDD|CLDD)-(?:NORMAL|BASE(\d\d))$")
_ROWS: Final = {"ANN": (1,), "MLY": (12,), "DLY": (365, 366)}
_KIND: Final = {"ANN": "annual", "MLY": "monthly", "DLY": "daily"}
CUSTOMARY_BASE: Final = 65.0
WEAK: Final = {  # flags of completeness below C (complete) and S (standard) (memory)
    "R": "representative",
    "P": "provisional",
    "Q": "quasi-normal",
    "E": "estimated",
}
ROUNDS_TO_NOTHING: Final = -7777.0
LOWEST_VALUE: Final = -5000.0
METHOD: Final = "1991-2020 normals of daily maximum and minimum"


def _recognises(head: bytes) -> bool:
    line = head.split(b"\n", 1)[0]
    return any(f"{k}-TAVG-NORMAL".encode() in head or f"{k}-HTDD-NORMAL".encode() in head
               for k in _ROWS) and b"STATION" in line  # fmt: skip


def _read_year(source: SourceFile) -> LongTermYear:
    rows = _rows(source)
    kind = next((k for k in _ROWS if any(c.startswith(f"{k}-") for c in rows[0])), "ANN")
    if kind == "DLY":
        rows = [row for row in rows if row.get("DATE", "").strip() != "02-29"]
    if len(rows) not in _ROWS[kind]:
        raise UnreadableWeather(
            f"has {len(rows)} rows of {_KIND[kind]} normals",
            where=source.name,
            wanted=f"one station, {_ROWS[kind][0]} rows",
            next_step="Download the station's own file.",
        )
    name = clean_name(rows[0].get("NAME") or "")
    station = f"{name} ({rows[0]['STATION'].strip()})" if name else rows[0]["STATION"].strip()
    published = _published(rows, kind)
    if len(set(published.heating) | set(published.cooling)) < MIN_BASES:
        return _estimated(source, rows, kind, station)
    return year_of_published(
        f"normals 1991-2020 of {station}",
        published,
        where=source.name,
        station=station,
        method=METHOD,
        source=source.fingerprint,
        notes=_notes(rows, kind, published),
    )


def _rows(source: SourceFile) -> list[dict[str, str]]:
    rows = table_of_archive(source, ("STATION",))
    if len({row["STATION"] for row in rows}) != 1:
        raise UnreadableWeather(
            "holds no station, or several",
            where=source.name,
            wanted="the normals of one station",
            next_step="Keep the rows of one station.",
        )
    return rows


def _number(text: str | None) -> float:
    try:
        value = float(text or "")
    except ValueError:
        return float("nan")
    if value == ROUNDS_TO_NOTHING:
        return 0.0
    return value if value > LOWEST_VALUE else float("nan")


def _published(rows: Sequence[dict[str, str]], kind: str) -> Published:
    """Yearly degree-days by base; a base with a month or day missing is passed over."""
    totals: dict[str, dict[float, float]] = {"HTDD": {}, "CLDD": {}}
    for column in rows[0]:
        match = _COLUMN.match(column or "")
        if match and match[1] == kind:
            total = sum(_number(row[column]) for row in rows)
            if np.isfinite(total):
                totals[match[2]][float(match[3]) if match[3] else CUSTOMARY_BASE] = total
    mean = float(np.mean([_number(row.get(f"{kind}-TAVG-NORMAL")) for row in rows]))
    return Published(totals["HTDD"], totals["CLDD"], mean if np.isfinite(mean) else None)


def _notes(rows: Sequence[dict[str, str]], kind: str, published: Published) -> tuple[str, ...]:
    bases = sorted(set(published.heating) | set(published.cooling))
    notes = [
        f"Published degree-days at {len(bases)} bases ({bases[0]:g} to {bases[-1]:g} °F) are kept "
        "exactly; between them they are interpolated, rising ever faster with the base."
    ]
    used = {_number(row.get(f"years_{kind}-HTDD-NORMAL")) for row in rows} - {float("nan")}
    years = [y for y in used if np.isfinite(y)]
    if years and min(years) < 30:
        notes.append(f"The normals rest on {min(years):.0f} of the 30 years 1991-2020.")
    flags = {(row.get(f"comp_flag_{kind}-HTDD-NORMAL") or "").strip() for row in rows}
    weak = sorted(flags & set(WEAK))
    if weak:
        notes.append(
            "Their completeness is less than standard: "
            + ", ".join(f"flag {flag} ({WEAK[flag]})" for flag in weak)
            + "."
        )
    if kind == "DLY":
        notes.append("February 29 was left out: a long-term year has 365 days.")
    return tuple(notes)


def _estimated(
    source: SourceFile, rows: Sequence[dict[str, str]], kind: str, station: str
) -> LongTermYear:
    """Where the station publishes too few degree-days: the monthly means alone."""
    if kind != "MLY":
        raise UnreadableWeather(
            "gives degree-days at fewer than three bases",
            where=source.name,
            wanted="normals of degree-days, or the monthly normals file",
            next_step="Download the station's monthly normals.",
        )
    means = [_number(row.get("MLY-TAVG-NORMAL")) for row in rows]
    return estimated_year(means, station=station, source=source.fingerprint)


FORMAT = Format(name="normals file", recognises=_recognises, read_year=_read_year)
