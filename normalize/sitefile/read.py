"""site.toml, read and checked: strict, so that a slip of the pen cannot change an answer."""

from __future__ import annotations

import hashlib
import os
import re
import tomllib
from collections.abc import Callable, Mapping
from dataclasses import replace
from pathlib import Path
from typing import Final

from normalize.days import iso
from normalize.errors import MissingFile, SiteError, UnknownKey
from normalize.fitting.forms import FORMS
from normalize.savings.components import Component
from normalize.sitefile.components import (
    EFFICIENCY_UNIT,
    HIGHEST_EFFICIENCY,
    LOWEST_EFFICIENCY,
    MOST_COMPONENTS,
    read_component,
)
from normalize.sitefile.drivers import read_day_types, read_drivers
from normalize.sitefile.table import Table, line_numbers, must_exist, nearest, shown
from normalize.sitefile.values import AccountPlan, Change, SiteFile, Upgrade, WeatherPlan
from normalize.units import canonical_fuel, canonical_unit

SITE_FILE: Final = "site.toml"
MAX_BYTES: Final = 1_000_000  # a site file is a page of text; more is something else
MAX_YEARS: Final = 100
HIGHEST_PRICE: Final = 100_000.0  # of one unit, in any currency: above it a comma has slipped
HIGHEST_CO2: Final = 100_000.0  # kg a unit
LARGEST_FLOOR_FT2: Final = 1e8  # the largest buildings are near 2e7 ft²
HIGHEST_COST: Final = 1e12

TABLES: Final = ("site", "weather", "account", "upgrade", "change", "driver", "day_types")
SITE_KEYS: Final = ("name", "floor_area_ft2", "currency", "heating_setpoint_f")
ACCOUNT_KEYS: Final = (
    "name",
    "fuel",
    "bills",
    "unit",
    "price",
    "co2_kg_per_unit",
    "occupied_since",
    "space_heating",
    "net_metered",
    "forms",
    "efficiency",
    "heating_share",
)
UPGRADE_KEYS: Final = ("name", "start", "end", "cost", "accounts", "component")
CHANGE_KEYS: Final = ("what", "since", "until")
WEATHER_KEYS: Final = (
    "observed",
    "neighbour",
    "long_term",
    "from_bills",
    "also",
    "long_term_also",
)
MOST_ALSO: Final = 20  # stations or years that an answer is repeated with
LONG_TERM_KEYS: Final = ("years", "file")


def _hours(table: Table, key: str) -> object:
    return table.number(key, low=-14.0, high=14.0, unit="hours")


def _read_day(table: Table, key: str) -> object:
    """A day of the month, or "calendar"."""
    if isinstance(table.values.get(key), str):
        return table.text(key)
    return table.whole(key, low=1, high=31, unit="day of the month")


def _above_zero(table: Table, key: str) -> object:
    return table.number(key, low=1e-9, high=1e9, unit="above zero")


def _first_day(table: Table, key: str) -> object:
    """The first day of a date, or of a month."""
    days = table.days(key)
    return days[0] if days else None


# Answers to the readers' questions: passed on as their keywords, under the same names.
BILL_READER_KEYS: Final[dict[str, Callable[[Table, str], object]]] = {
    "dates": Table.text,
    "end_dates": Table.text,
    "start_column": Table.text,
    "end_column": Table.text,
    "days_column": Table.text,
    "usage_column": Table.text,
    "cost_column": Table.text,
    "estimated_column": Table.text,
    "temperature_column": Table.text,
    "register_column": Table.text,
    "generation_column": Table.text,
    "temperature_unit": Table.text,
    "sheet": Table.text,
    "kind": Table.text,
    "rows": Table.text,
    "decimal": Table.text,
    "read_day": _read_day,
    "time_zone": Table.text,
    "sum_to": Table.text,
    "interval_times": Table.text,
    "multiplier": _above_zero,
    "tank_size": _above_zero,
    "tank_percent": Table.text,
    "solar_since": _first_day,
}
BILL_FILE_KEYS: Final = ("periods_from", "generation")  # further files of an account
WEATHER_READER_KEYS: Final[dict[str, Callable[[Table, str], object]]] = {
    "unit": Table.text,
    "date_column": Table.text,
    "temperature_column": Table.text,
    "max_column": Table.text,
    "min_column": Table.text,
    "dates": Table.text,
    "time_zone_offset": _hours,
    "station": Table.text,
}


def read_site_file(folder: str | os.PathLike[str]) -> SiteFile:
    """Read ``site.toml`` of a site's folder.

    Raises MissingFile, UnknownKey or SiteError; each says where and what to do.
    """
    folder = Path(folder)
    data = _bytes(folder)
    text = _text(data)
    values = _parse(text)
    for key in values:
        if key not in TABLES:
            guess = nearest(key, TABLES)
            hint = f"Did you mean [{guess}]? " if guess else ""
            raise UnknownKey(
                f"the table or key {shown(key)} is not known",
                where=SITE_FILE,
                next_step=f"{hint}site.toml may have [site], [weather], [[account]], [[upgrade]], "
                "[[change]], [[driver]], [day_types].",
            )
    lines = line_numbers(text)
    site = _single(values, "site", lines)
    site.check_keys(SITE_KEYS)
    accounts = tuple(_account(t, folder) for t in _several(values, "account", lines))
    _check_accounts(accounts)
    upgrades = _upgrades(_several(values, "upgrade", lines), accounts)
    day_types = None
    if "day_types" in values:
        day_types = read_day_types(_single(values, "day_types", lines), folder, accounts)
    return SiteFile(
        name=site.text("name") or folder.resolve().name or "site",
        folder=folder,
        floor_area_ft2=site.number("floor_area_ft2", low=1.0, high=LARGEST_FLOOR_FT2, unit="ft²"),
        currency=_currency(site),
        weather=_weather(_single(values, "weather", lines), folder),
        accounts=accounts,
        upgrades=upgrades,
        changes=tuple(_change(t) for t in _several(values, "change", lines)),
        sha256=hashlib.sha256(data).hexdigest(),
        heating_setpoint_f=site.number("heating_setpoint_f", low=40.0, high=90.0, unit="°F"),
        drivers=read_drivers(_several(values, "driver", lines), folder, accounts, day_types),
        day_types=day_types,
    )


def _bytes(folder: Path) -> bytes:
    start = f"Start one with: normalize new {folder}"
    if not folder.exists():
        raise MissingFile("there is no such folder", where=str(folder), next_step=start)
    if not folder.is_dir():
        raise SiteError(
            "this is a file, not a folder",
            where=str(folder),
            wanted="the folder that holds site.toml",
        )
    path = folder / SITE_FILE
    if not path.exists():
        raise MissingFile(
            "there is no site.toml in this folder", where=str(folder), next_step=start
        )
    if not path.resolve().is_relative_to(folder.resolve()):
        raise SiteError(
            "site.toml is a link to a file outside the folder",
            where=str(folder),
            next_step="Copy the file into the folder.",
        )
    try:
        with path.open("rb") as file:
            data = file.read(MAX_BYTES + 1)
    except OSError as error:
        raise SiteError(f"site.toml cannot be read ({error.strerror})", where=str(folder)) from None
    if len(data) > MAX_BYTES:
        raise SiteError(
            f"site.toml is larger than {MAX_BYTES // 1000} kB",
            where=str(folder),
            wanted="a page or two of text",
        )
    return data


def _text(data: bytes) -> str:
    try:
        return data.decode("utf-8-sig")  # editors on Windows put a mark in front
    except UnicodeDecodeError as error:
        line = data[: error.start].count(b"\n") + 1
        raise SiteError(
            "a character is not written in UTF-8",
            where=f"{SITE_FILE}:{line}",
            next_step="Save the file again with the encoding UTF-8.",
        ) from None


def _parse(text: str) -> dict[str, object]:
    try:
        return tomllib.loads(text)
    except RecursionError:
        raise SiteError("lists or tables are nested too deeply", where=SITE_FILE) from None
    except ValueError as error:  # TOMLDecodeError, and numbers of thousands of digits
        message, line = str(error), ""
        if found := re.search(r"^(.*) \(at (?:line (\d+), column \d+|end of document)\)$", message):
            message = found.group(1)
            line = f":{found.group(2)}" if found.group(2) else ""
        raise SiteError(
            f"this is not TOML ({message[:100]})",
            where=f"{SITE_FILE}{line}",
            next_step='Each line is key = value; text stands in quotation marks: name = "gas".',
        ) from None


def _single(
    values: Mapping[str, object], name: str, lines: Mapping[tuple[str, int, str], int]
) -> Table:
    value = values.get(name, {})
    if not isinstance(value, dict):
        raise SiteError(f"{name} must be one table, written [{name}]", where=SITE_FILE)
    return Table(SITE_FILE, f"[{name}]", value, lines)


def _several(
    values: Mapping[str, object], name: str, lines: Mapping[tuple[str, int, str], int]
) -> list[Table]:
    value = values.get(name, [])
    if not isinstance(value, list) or not all(isinstance(item, dict) for item in value):
        raise SiteError(
            f"{name} is not a list of tables",
            where=SITE_FILE,
            wanted=f"[[{name}]] with two brackets, once for each",
        )
    return [Table(SITE_FILE, f"[[{name}]]", item, lines, i) for i, item in enumerate(value)]


def _currency(site: Table) -> str:
    text = site.text("currency") or "USD"
    if not re.fullmatch(r"[A-Z]{3}", text):
        raise site.bad("currency", shown(text), 'three capital letters, such as "USD"')
    return text


def _weather(table: Table, folder: Path) -> WeatherPlan:
    table.check_keys((*WEATHER_KEYS, *WEATHER_READER_KEYS))
    observed = table.path("observed", folder)
    from_bills = table.flag("from_bills", default=False)
    if observed is None and not from_bills:
        raise SiteError(
            "no weather is named",
            where=table.where(),
            next_step='Under [weather] write observed = "station.csv", or from_bills = true when '
            "each bill carries its mean temperature.",
        )
    if observed is not None:
        must_exist(observed, table.where("observed"))
    file, years = _long_term(table, folder)
    reader = _reader(table, WEATHER_READER_KEYS)
    neighbour = table.path("neighbour", folder)
    if neighbour is not None:
        must_exist(neighbour, table.where("neighbour"))
        reader["neighbour"] = neighbour
    return WeatherPlan(
        observed=observed,
        long_term_file=file,
        long_term_years=years,
        from_bills=from_bills,
        reader=reader,
        also=_files(table, "also", folder),
        long_term_also=_files(table, "long_term_also", folder),
    )


def _files(table: Table, key: str, folder: Path) -> tuple[Path, ...]:
    """A list of files in the folder, all of them there."""
    names = table.texts(key) or ()
    if len(names) > MOST_ALSO:
        raise table.bad(key, f"a list of {len(names)}", f"at most {MOST_ALSO} files")
    one = Table(table.file, table.label, {}, table.lines, table.index)
    files = []
    for name in names:
        path = replace(one, values={key: name}).required_path(key, folder)
        must_exist(path, table.where(key))
        files.append(path)
    return tuple(files)


def _long_term(weather: Table, folder: Path) -> tuple[Path | None, int]:
    value = weather.values.get("long_term")
    if value is None:
        return None, 10
    if not isinstance(value, dict):
        raise weather.bad(
            "long_term", shown(value), '{ years = 10 } or { file = "typical_year.epw" }'
        )
    line = weather.lines.get(("weather", 0, "long_term"))
    where = {("long_term", 0, key): line for key in ("", *value) if line is not None}
    table = Table(SITE_FILE, "long_term", value, {**weather.lines, **where})
    table.check_keys(LONG_TERM_KEYS)
    file = table.path("file", folder)
    years = table.whole("years", low=1, high=MAX_YEARS, unit="years")
    if file is not None and years is not None:
        raise SiteError(
            "long_term names both a file and a number of years",
            where=weather.where("long_term"),
            wanted="one of the two",
        )
    if file is not None:
        must_exist(file, weather.where("long_term"))
    return file, years or 10


def _account(table: Table, folder: Path) -> AccountPlan:
    table.check_keys((*ACCOUNT_KEYS, *BILL_READER_KEYS, *BILL_FILE_KEYS))
    fuel = canonical_fuel(table.required_text("fuel"), where=table.where("fuel"))
    unit = table.text("unit")
    since = table.days("occupied_since")
    return AccountPlan(
        name=table.text("name") or fuel,
        fuel=fuel,
        bills=table.required_path("bills", folder),
        unit=canonical_unit(unit, fuel, where=table.where("unit")) if unit else None,
        price=table.number("price", low=0.0, high=HIGHEST_PRICE, unit="money for one unit"),
        co2_kg_per_unit=table.number("co2_kg_per_unit", low=0.0, high=HIGHEST_CO2, unit="kg"),
        occupied_since=since[0] if since else None,
        space_heating=table.flag("space_heating", default=True),
        net_metered=table.flag("net_metered", default=False),
        forms=_forms(table),
        efficiency=table.number(
            "efficiency", low=LOWEST_EFFICIENCY, high=HIGHEST_EFFICIENCY, unit=EFFICIENCY_UNIT
        ),
        heating_share=table.number(
            "heating_share", low=0.01, high=1.0, unit="share of the house's heat"
        ),
        reader={**_reader(table, BILL_READER_KEYS), **_further_files(table, folder)},
    )


def _forms(table: Table) -> tuple[str, ...] | None:
    forms = table.texts("forms")
    for form in forms or ():
        if form not in FORMS:
            guess = nearest(form, list(FORMS))
            raise table.bad(
                "forms",
                shown(form),
                "any of " + ", ".join(FORMS),
                f"Did you mean {guess!r}?" if guess else "",
            )
    return forms


def _further_files(table: Table, folder: Path) -> dict[str, object]:
    """Files that an account's bills are read with, all of them there."""
    files: dict[str, object] = {}
    for key in BILL_FILE_KEYS:
        path = table.path(key, folder)
        if path is not None:
            must_exist(path, table.where(key))
            files[key] = path
    return files


def _reader(table: Table, keys: Mapping[str, Callable[[Table, str], object]]) -> dict[str, object]:
    answers = {key: get(table, key) for key, get in keys.items()}
    return {key: value for key, value in answers.items() if value is not None}


def _check_accounts(accounts: tuple[AccountPlan, ...]) -> None:
    if not accounts:
        raise SiteError(
            "there is no account",
            where=SITE_FILE,
            next_step='Add [[account]] with fuel = "natural gas" and bills = "gas.csv".',
        )
    seen: set[str] = set()
    for account in accounts:
        if account.name in seen:
            raise SiteError(
                f"two accounts are called {shown(account.name)}",
                where=SITE_FILE,
                next_step="Give each [[account]] a name of its own.",
            )
        seen.add(account.name)


def _upgrades(tables: list[Table], accounts: tuple[AccountPlan, ...]) -> tuple[Upgrade, ...]:
    upgrades: list[Upgrade] = []
    components = 0  # so far in the file: lines are counted through all upgrades
    for table in tables:
        upgrades.append(_upgrade(table, accounts, components))
        components += len(upgrades[-1].components)
    return tuple(upgrades)


def _components(upgrade: Table, before: int) -> tuple[Component, ...]:
    if isinstance(upgrade.values.get("component"), dict):
        raise upgrade.bad("component", "one table", "[[upgrade.component]] with two brackets")
    tables = _several(upgrade.values, "component", upgrade.lines)
    if len(tables) > MOST_COMPONENTS:
        raise upgrade.bad("component", f"a list of {len(tables)}", f"at most {MOST_COMPONENTS}")
    return tuple(
        read_component(replace(t, label="[[upgrade.component]]", index=before + i))
        for i, t in enumerate(tables)
    )


def _upgrade(table: Table, accounts: tuple[AccountPlan, ...], components: int) -> Upgrade:
    table.check_keys(UPGRADE_KEYS)
    start = table.days("start")
    if start is None:
        raise SiteError(
            "there is no start",
            where=table.where(),
            wanted='the first day of the work, start = 2023-09-11, or its month, start = "2023-09"',
        )
    end = table.days("end") or start
    if end[1] <= start[0]:
        raise table.bad("end", f"{iso(end[1] - 1)}, before start, {iso(start[0])}", "a later day")
    names = [account.name for account in accounts]
    touched = table.texts("accounts") or ()
    for name in touched:
        if name not in names:
            guess = nearest(name, names)
            raise table.bad(
                "accounts",
                f"{shown(name)}, which is no account of this site",
                "the names of accounts",
                f"Did you mean {guess!r}?" if guess else "",
            )
    return Upgrade(
        name=table.text("name") or "the upgrade",
        start=start[0],
        end=end[1],
        cost=table.number("cost", low=0.0, high=HIGHEST_COST, unit="the site's currency"),
        accounts=touched,
        components=_components(table, components),
    )


def _change(table: Table) -> Change:
    table.check_keys(CHANGE_KEYS)
    what = table.required_text("what")
    since, until = table.days("since"), table.days("until")
    if since and until and until[1] <= since[0]:
        raise table.bad(
            "until", f"{iso(until[1] - 1)}, before since, {iso(since[0])}", "a later day"
        )
    return Change(what=what, since=since[0] if since else None, until=until[1] if until else None)
