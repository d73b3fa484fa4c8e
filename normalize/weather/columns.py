"""Which column of a table is which: the vocabulary of weather files' headers."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

from normalize.errors import UnreadableWeather
from normalize.weather.options import WeatherOptions, ask
from normalize.weather.words import listed


def _words(text: str) -> frozenset[str]:
    return frozenset(text.split())


_MAX: Final = _words(
    """
    max maximum tmax maxt tx high maxtemp hightemp hi
    """
)
_MIN: Final = _words(
    """
    min minimum tmin mint tn low mintemp lowtemp lo
    """
)
_MEAN: Final = _words(
    """
    mean avg average tavg tmean tm meantemp avgtemp ave
    """
)
_TEMP: Final = _words(
    """
    temp temps temperature temperatures tmp t tempf tempc drybulb dry bulb tair airtemp
    """
)
# Words that may stand beside a temperature without changing what it is.
_FILLER: Final = _words(
    """
    daily day hourly air outdoor outside ambient observed station of the in at m deg degree
    degrees degf degc f c fahrenheit celsius centigrade value screen a
    """
)
_DATE_RANK: Final = {
    "date": 0,
    "datetime": 0,
    "timestamp": 0,
    "dates": 0,
    "valid": 1,
    "day": 2,
    "time": 3,
}
_DATE_FILLER: Final = _words(
    """
    time local lst obs observation of the utc gmt mm dd yyyy hh ymd standard est cst mst
    pst end ending hour
    """
)
_STATION_RANK: Final = {
    ("station", "name"): 0,
    ("name",): 1,
    ("station",): 2,
    ("site",): 3,
    ("station", "id"): 4,
    ("location",): 5,
    ("place",): 5,
    ("city",): 5,
    ("origin",): 5,
}
_DEGREE: Final = "[°º˚\u00c2\ufffd]+"
_UNIT: Final = {
    "F": re.compile(
        rf"{_DEGREE}\s*f\b|\bdeg(rees?)?[\s_.]*f\b|fahrenheit|[(\[]\s*f\s*[)\]]|[_\s.\-/]f$|tempf$",
        re.IGNORECASE,
    ),
    "C": re.compile(
        rf"{_DEGREE}\s*c\b|\bdeg(rees?)?[\s_.]*c\b|celsius|centigrade|[(\[]\s*c\s*[)\]]|[_\s.\-/]c$|tempc$",
        re.IGNORECASE,
    ),
}
_OTHER_UNIT: Final = re.compile(r"kelvin|[(\[]\s*K\s*[)\]]|_K$")
_TENTHS: Final = re.compile(r"tenth|\b0[.,]1\s*(°|deg|º|c\b|f\b)", re.IGNORECASE)


@dataclass(frozen=True, slots=True)
class Columns:
    """Positions of the columns that are used; None where the table has none.

    parts : positions of year, month, day (and hour) when the date is spread over columns.
    time : position of a time of day beside a date.
    """

    date: int | None
    parts: tuple[int, ...]
    time: int | None
    mean: int | None
    high: int | None
    low: int | None
    station: int | None
    utc: bool


def words_of(header: str) -> tuple[str, ...]:
    """A header's words, lower case, camel case taken apart.

    >>> words_of("Max Temp (°C)"), words_of("HourlyDryBulbTemperature")
    (('max', 'temp', 'c'), ('hourly', 'dry', 'bulb', 'temperature'))
    """
    spaced = re.sub(r"(?<=[a-z])(?=[A-Z])", " ", header)
    return tuple(re.findall(r"[a-z]+", spaced.lower()))


def unit_in(header: str) -> str | None:
    """The unit a header states: "F", "C" or None.

    >>> unit_in("TAVG (°F)"), unit_in("temp_c"), unit_in("Mean"), unit_in("AvgTempF")
    ('F', 'C', None, 'F')
    """
    if re.search(r"[a-z](F|C)$", header):
        return header[-1]
    found = [unit for unit, pattern in _UNIT.items() if pattern.search(header)]
    return found[0] if len(found) == 1 else None


def role_of(header: str) -> str | None:
    """What a header names: "mean", "temperature", "max", "min" or None.

    >>> role_of("Mean Temp (°C)"), role_of("Dew Point Temp (°C)"), role_of("TMAX"), role_of("t2m")
    ('mean', None, 'max', 'temperature')
    """
    words = set(words_of(header))
    rest = words - _FILLER
    if not rest or rest - (_MAX | _MIN | _MEAN | _TEMP):
        return None
    kinds = [
        name
        for name, vocabulary in (("max", _MAX), ("min", _MIN), ("mean", _MEAN))
        if rest & vocabulary
    ]
    if len(kinds) > 1:
        return None
    if kinds:
        return kinds[0]
    # "dry" or "bulb" alone name no temperature
    return "temperature" if rest - {"dry", "bulb"} or rest == {"dry", "bulb"} else None


def date_rank(header: str) -> int | None:
    """How surely a header names the date; 0 is surest, None not at all.

    >>> date_rank("Date/Time (LST)"), date_rank("time"), date_rank("temp")
    (0, 3, None)
    """
    words = words_of(header)
    ranks = [_DATE_RANK[w] for w in words if w in _DATE_RANK]
    if not ranks or any(w not in _DATE_RANK and w not in _DATE_FILLER for w in words):
        return None
    return min(ranks)


def has_date_and_temperature(header: Sequence[str], options: WeatherOptions) -> bool:
    """Whether a row can be the header: it names a date and a temperature."""
    named = {c.strip().casefold() for c in header}
    dates = _asked(options.date_column, named) or any(date_rank(c) is not None for c in header)
    dates = dates or bool(_date_parts(header))
    asked = _asked(options.temperature_column, named) or _asked(options.max_column, named)
    return dates and (asked or any(role_of(c) is not None for c in header))


def _asked(column: str | None, named: set[str]) -> bool:
    return column is not None and column.strip().casefold() in named


def find_columns(header: Sequence[str], where: str, options: WeatherOptions) -> Columns:
    """Positions of date, temperatures and station; asks where two columns would do."""
    parts = _date_parts(header)
    date = _find_date(header, where, options) if options.date_column or not parts else None
    mean = high = low = None
    if options.max_column is not None and options.min_column is not None:
        high = _named(header, options.max_column, "max_column", where)
        low = _named(header, options.min_column, "min_column", where)
    else:
        high = (
            _only(header, ("max",), "max_column", where) if not options.temperature_column else None
        )
        low = (
            _only(header, ("min",), "min_column", where) if not options.temperature_column else None
        )
    if options.temperature_column is not None:
        mean = _named(header, options.temperature_column, "temperature_column", where)
    elif options.max_column is None:
        mean = _only(header, ("mean",), "temperature_column", where)
        if mean is None:
            mean = _only(header, ("temperature",), "temperature_column", where)
    if mean is None and (high is None or low is None):
        raise _no_temperature(header, where)
    stamp = header[date] if date is not None else ""
    time = _time_beside(header, date, options)
    clock = " ".join(filter(None, [stamp, header[time] if time is not None else ""]))
    return Columns(
        date=date,
        parts=parts if date is None else (),
        time=time,
        mean=mean,
        high=high if low is not None else None,
        low=low if high is not None else None,
        station=_station_column(header),
        utc=bool({"utc", "gmt"} & set(words_of(clock))),
    )


def stated_unit(header: Sequence[str], used: Sequence[int], where: str) -> str | None:
    """The unit that the headers of the used columns state, if they agree."""
    names = [header[i] for i in used]
    for name in names:
        if _TENTHS.search(name) or _OTHER_UNIT.search(name):
            raise UnreadableWeather(
                f"column {name!r} is in another unit",
                where=where,
                wanted="whole °F or °C, not tenths and not kelvin",
                next_step="Convert the column first.",
            )
    units = {u for u in map(unit_in, names) if u is not None}
    if len(units) > 1:
        raise UnreadableWeather(
            f"columns {listed(map(repr, names))} are in different units",
            where=where,
            wanted="one unit for all temperatures",
            next_step="Name the right column with temperature_column.",
        )
    return units.pop() if units else None


def _named(header: Sequence[str], column: str, key: str, where: str) -> int:
    wanted = column.strip().casefold()
    hits = [i for i, name in enumerate(header) if name.strip().casefold() == wanted]
    if len(hits) == 1:
        return hits[0]
    count = "no column is" if not hits else f"{len(hits)} columns are"
    raise UnreadableWeather(
        f"{count} called {column!r}",
        where=where,
        wanted=f"one of {listed(repr(h) for h in header if h.strip())}",
        next_step=f"Correct {key} under [weather] in site.toml.",
    )


def _only(header: Sequence[str], roles: tuple[str, ...], key: str, where: str) -> int | None:
    hits = [i for i, name in enumerate(header) if role_of(name) in roles]
    if len(hits) > 1 and len({unit_in(header[i]) for i in hits} - {None}) == len(hits) == 2:
        # The same quantity printed in both units: °F needs no conversion.
        hits = [i for i in hits if unit_in(header[i]) == "F"]
    if len(hits) > 1:
        names = [header[i].strip() for i in hits]
        raise ask(
            f"{len(hits)} columns could be the {roles[0]} temperature: {listed(map(repr, names))}",
            where=where,
            key=key,
            choices=" or ".join(f'"{n}"' for n in names[:3]),
        )
    return hits[0] if hits else None


def _find_date(header: Sequence[str], where: str, options: WeatherOptions) -> int:
    if options.date_column is not None:
        return _named(header, options.date_column, "date_column", where)
    ranked = [(rank, i) for i, name in enumerate(header) if (rank := date_rank(name)) is not None]
    if not ranked:
        raise UnreadableWeather(
            f"no column looks like a date among {listed(repr(h) for h in header if h.strip())}",
            where=where,
            wanted="a header such as 'date'",
            next_step='Write date_column = "…" under [weather] in site.toml.',
        )
    best = [i for rank, i in ranked if rank == min(ranked)[0]]
    if len(best) > 1:
        # Local time is what bills are dated in.
        best = [i for i in best if not {"utc", "gmt"} & set(words_of(header[i]))] or best
    if len(best) > 1:
        names = [header[i].strip() for i in best]
        raise ask(
            f"{len(best)} columns could be the date: {listed(map(repr, names))}",
            where=where,
            key="date_column",
            choices=" or ".join(f'"{n}"' for n in names[:3]),
        )
    return best[0]


def _date_parts(header: Sequence[str]) -> tuple[int, ...]:
    """Positions of year, month, day and, where there is one, hour; empty if not so spread."""
    names = [name.strip().casefold() for name in header]
    hits = [names.index(part) for part in ("year", "month", "day") if names.count(part) == 1]
    if len(hits) < 3:
        return ()
    return (*hits, names.index("hour")) if names.count("hour") == 1 else tuple(hits)


def _time_beside(header: Sequence[str], date: int | None, options: WeatherOptions) -> int | None:
    if date is None:
        return None
    names = ("time", "hour", "hr", "time of day", "local time", "hour ending")
    hits = [
        i
        for i, name in enumerate(header)
        if i != date and " ".join(words_of(name)).removesuffix(" hh mm") in names
    ]
    return hits[0] if len(hits) == 1 else None


def _station_column(header: Sequence[str]) -> int | None:
    ranked = [
        (_STATION_RANK[words], i)
        for i, name in enumerate(header)
        if (words := words_of(name)) in _STATION_RANK
    ]
    return min(ranked)[1] if ranked else None


def _no_temperature(header: Sequence[str], where: str) -> UnreadableWeather:
    return UnreadableWeather(
        f"no column looks like a temperature among {listed(repr(h) for h in header if h.strip())}",
        where=where,
        wanted="a daily mean such as 'mean_f', or both of 'tmax_f' and 'tmin_f'",
        next_step='Write temperature_column = "…" under [weather] in site.toml.',
    )
