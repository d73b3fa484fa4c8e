"""What a site folder says, as values.  Days are numbers counted from 1970-01-01."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from pathlib import Path

    from normalize.savings.components import Component


@dataclass(frozen=True, slots=True)
class Upgrade:
    """One upgrade. start, end : day numbers, the work window ``[start, end)`` half-open.

    cost : what it cost, in the site's currency.
    """

    name: str
    start: int
    end: int
    cost: float | None = None
    accounts: tuple[str, ...] = ()  # the accounts it touches; empty means all
    components: tuple[Component, ...] = ()  # what it consists of, for an engineer's expectation


@dataclass(frozen=True, slots=True)
class Change:
    """Something else that changed. since, until : day numbers ``[since, until)`` or None."""

    what: str
    since: int | None = None
    until: int | None = None


@dataclass(frozen=True, slots=True)
class AccountPlan:
    """What site.toml says of one account.

    fuel, unit : canonical names of ``normalize.units``; unit None where the bills say it.
    bills : inside the site's folder; need not exist (the bill reader says so).
    price : of the last unit, in the site's currency.  co2_kg_per_unit : kg of CO₂.
    occupied_since : day number; bills before it belong to an earlier occupant.
    forms : the forms to try; None for those that suit the fuel.
    efficiency : of the heating before the work, heat out per heat in over a season.
    heating_share : share of the house's heat that this account carries.
    reader : answers to the bill reader's questions, its keywords.
    """

    name: str
    fuel: str
    bills: Path
    unit: str | None = None
    price: float | None = None
    co2_kg_per_unit: float | None = None
    occupied_since: int | None = None
    space_heating: bool = True
    net_metered: bool = False
    forms: tuple[str, ...] | None = None
    reader: dict[str, object] = field(default_factory=dict)
    efficiency: float | None = None
    heating_share: float | None = None


@dataclass(frozen=True, slots=True)
class WeatherPlan:
    """What site.toml says of the weather.

    observed : the station's file; None when the weather comes from the bills.
    long_term_file : a typical-year or normals file; None for the mean of whole years.
    long_term_years : how many whole years are averaged when there is no such file.
    from_bills : fit on the mean temperatures that the bills themselves carry; a station's
        file may still be given, for the long-term year.
    reader : answers to the weather reader's questions (unit, columns, dates …), and the
        ``neighbour`` from whose file gaps are filled.
    also, long_term_also : files of further stations, and of further typical years or normals,
        with which the answer may be repeated to see how far it moves.
    """

    observed: Path | None
    long_term_file: Path | None = None
    long_term_years: int = 10
    from_bills: bool = False
    reader: dict[str, object] = field(default_factory=dict)
    also: tuple[Path, ...] = ()
    long_term_also: tuple[Path, ...] = ()


@dataclass(frozen=True, slots=True)
class DriverPlan:
    """Something beside the weather that drives use: occupied units, production, school days.

    file : with a value a day, a month or a stretch of days; None for a column of the bill file.
    accounts : that it applies to; empty means all.  normal : its level on a day of a normal
    year.  normal_per_year : its sum over a normal year.  reader : how its values are read.
    """

    name: str
    file: Path | None = None
    accounts: tuple[str, ...] = ()
    normal: float | None = None
    normal_per_year: float | None = None
    reader: dict[str, str] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class DayTypesPlan:
    """Kinds of days that may use more or less than others.

    weekend : days of the week, Monday is 0.  holidays : day numbers, or holidays_file.
    school_terms : day numbers ``[start, end)``.  accounts : empty means all.
    """

    weekend: tuple[int, ...]
    holidays: tuple[int, ...] = ()
    holidays_file: Path | None = None
    school_terms: tuple[tuple[int, int], ...] = ()
    accounts: tuple[str, ...] = ()
    holidays_per_year: float | None = None
    school_days_per_year: float | None = None


@dataclass(frozen=True, slots=True)
class SiteFile:
    """site.toml, read and checked.

    sha256 : of the file's bytes.  heating_setpoint_f : mean indoor temperature in the heating
    season, °F.
    """

    name: str
    folder: Path
    floor_area_ft2: float | None
    currency: str
    weather: WeatherPlan
    accounts: tuple[AccountPlan, ...]
    upgrades: tuple[Upgrade, ...]
    changes: tuple[Change, ...]
    sha256: str
    heating_setpoint_f: float | None = None
    drivers: tuple[DriverPlan, ...] = ()
    day_types: DayTypesPlan | None = None
