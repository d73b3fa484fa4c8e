"""Twelve monthly mean temperatures, as climate tables print them: month,mean_f."""

from __future__ import annotations

import csv
from typing import TYPE_CHECKING, Final

import numpy as np

from normalize.errors import AmbiguousWeather, UnreadableWeather
from normalize.weather.columns import role_of, unit_in
from normalize.weather.degrees import drop_absurd, read_numbers, to_fahrenheit
from normalize.weather.estimate import estimated_year
from normalize.weather.formats import Format
from normalize.weather.source import decode

if TYPE_CHECKING:
    from normalize.weather.source import SourceFile
    from normalize.weather.year import LongTermYear

_NAMES: Final = ("jan", "feb", "mar", "apr", "may", "jun", "jul", "aug", "sep", "oct", "nov", "dec")
_LONGEST: Final = 4000  # bytes; it is a table of thirteen lines


def _table(text: str) -> list[list[str]]:
    return [[c.strip() for c in row] for row in csv.reader(text.splitlines()) if any(row)]


def _month(text: str) -> int:
    """1 to 12, or 0 where it is none."""
    if text.isdecimal():
        return int(text) if len(text) <= 2 and 1 <= int(text) <= 12 else 0
    return _NAMES.index(text[:3].lower()) + 1 if text[:3].lower() in _NAMES else 0


def _recognises(head: bytes) -> bool:
    if len(head) > _LONGEST:
        return False
    rows = _table(head.decode("utf-8-sig", "replace"))
    if len(rows) != 13 or rows[0][0].lower() != "month":
        return False
    return [_month(row[0]) for row in rows[1:]] == list(range(1, 13))


def _read_year(source: SourceFile) -> LongTermYear:
    rows = _table(decode(source))
    header = rows[0]
    at = [i for i, name in enumerate(header) if role_of(name) in ("mean", "temperature")]
    if len(at) != 1:
        raise UnreadableWeather(
            f"has {len(at)} columns of mean temperatures",
            where=source.name,
            wanted="one, such as mean_f or mean_c",
        )
    unit = unit_in(header[at[0]])
    if unit is None:
        raise AmbiguousWeather(
            f"the column {header[at[0]]!r} does not say whether it is °F or °C",
            where=source.name,
            next_step="Call it mean_f or mean_c.",
        )
    cells = [row[at[0]] if at[0] < len(row) else "" for row in rows[1:]]
    mean_f = to_fahrenheit(read_numbers(cells).value, unit)
    drop_absurd(mean_f, source.name, unit)
    if not np.isfinite(mean_f).all():
        raise UnreadableWeather(
            "lacks the mean of a month", where=source.name, wanted="twelve temperatures"
        )
    return estimated_year(mean_f, source=source.fingerprint)


FORMAT = Format(name="table of monthly means", recognises=_recognises, read_year=_read_year)
