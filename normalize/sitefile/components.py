"""What an upgrade consists of, read from [[upgrade.component]].

Strict, and it asks where two things may be meant.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Final

from normalize.errors import SiteError
from normalize.savings.components import (
    BLOWER_DOOR_DIVISOR,
    KINDS,
    AirSealing,
    Component,
    Equipment,
    Insulation,
    Setback,
    Windows,
)
from normalize.sitefile.table import Table, nearest, shown

COMMON_KEYS: Final = ("kind", "name")
NATURAL: Final = ("natural_cfm_before", "natural_cfm_after")
BLOWER_DOOR: Final = ("blower_door_cfm50_before", "blower_door_cfm50_after")
KEYS: Final[dict[str, tuple[str, ...]]] = {
    "insulation": ("area_ft2", "r_before", "r_after"),
    "windows": ("area_ft2", "u_before", "u_after"),
    "air sealing": (*NATURAL, *BLOWER_DOOR, "blower_door_divisor"),
    "equipment": ("efficiency_before", "efficiency_after", "share"),
    "setback": ("degrees_f", "hours_a_day"),
}
MOST_COMPONENTS: Final = 50
LOWEST_EFFICIENCY, HIGHEST_EFFICIENCY = 0.1, 8.0  # an open fire; a ground-source heat pump
EFFICIENCY_UNIT: Final = "heat out per heat in (80 % is 0.80; a heat pump's may be 2.5)"


def read_component(table: Table) -> Component:
    """One component.  Raises SiteError or UnknownKey, with what would have been right."""
    kind = table.required_text("kind")
    if kind not in KINDS:
        guess = nearest(kind, list(KINDS))
        raise table.bad(
            "kind", shown(kind), "one of " + ", ".join(KINDS),
            f"Did you mean {guess!r}?" if guess else "",
        )  # fmt: skip
    if kind == "air sealing":
        _ask_which_airflow(table)
    table.check_keys((*COMMON_KEYS, *KEYS[kind]))
    return _READERS[kind](table, table.text("name") or kind)


def _needed(table: Table, key: str, low: float, high: float, unit: str) -> float:
    value = table.number(key, low=low, high=high, unit=unit)
    if value is None:
        raise SiteError(
            f"there is no {key}", where=table.where(), next_step=f"Add {key} = …, in {unit}."
        )
    return value


def _improved(table: Table, low_key: str, low: float, high_key: str, high: float) -> None:
    """The work must be an improvement; the other way round is a slip more often than not."""
    if not high > low:
        raise SiteError(
            f"{high_key} ({high:g}) is not larger than {low_key} ({low:g})",
            where=table.where(high_key),
            next_step="Were they swapped? Components describe what the work made better.",
        )


def _insulation(table: Table, name: str) -> Component:
    area = _needed(table, "area_ft2", 1.0, 1e7, "ft²")
    before = _needed(table, "r_before", 0.1, 200.0, "ft²·°F·h/Btu")
    after = _needed(table, "r_after", 0.1, 200.0, "ft²·°F·h/Btu")
    _improved(table, "r_before", before, "r_after", after)
    return Insulation(name, area, before, after)


def _windows(table: Table, name: str) -> Component:
    area = _needed(table, "area_ft2", 1.0, 1e7, "ft²")
    before = _needed(table, "u_before", 0.02, 3.0, "Btu/h·ft²·°F")
    after = _needed(table, "u_after", 0.02, 3.0, "Btu/h·ft²·°F")
    _improved(table, "u_after", after, "u_before", before)
    return Windows(name, area, before, after)


def _ask_which_airflow(table: Table) -> None:
    """A bare airflow has two meanings in the trade, twenty times apart: ask."""
    known = (*COMMON_KEYS, *KEYS["air sealing"])
    for key in table.values:
        word = key.lower()
        if key in known:
            continue
        if "ach" in word:
            raise SiteError(
                f"{shown(key)} is in air changes an hour, and the house's volume is not known",
                where=table.where(key),
                next_step="Give airflow: air changes an hour × volume in ft³ ÷ 60 is cfm. "
                + _WHICH_AIRFLOW,
            )
        if any(part in word for part in ("cfm", "flow", "leak", "infiltration", "blower")):
            raise SiteError(
                f"{shown(key)} leaves open which airflow is meant",
                where=table.where(key),
                next_step=_WHICH_AIRFLOW,
            )


_WHICH_AIRFLOW: Final = (
    "A blower door's figure at 50 Pa is about twenty times the airflow that the weather drives. "
    "Write blower_door_cfm50_before and blower_door_cfm50_after for a blower-door test, or "
    "natural_cfm_before and natural_cfm_after for the natural airflow."
)


def _air_sealing(table: Table, name: str) -> Component:
    given = [key for key in (*NATURAL, *BLOWER_DOOR) if key in table.values]
    natural = any(key in NATURAL for key in given)
    door = any(key in BLOWER_DOOR for key in given)
    if natural == door:
        found = "natural and blower-door airflows are both given" if door else "no airflow is given"
        raise SiteError(found, where=table.where(), next_step=_WHICH_AIRFLOW)
    first, second = BLOWER_DOOR if door else NATURAL
    before = _needed(table, first, 0.0, 1e6, "ft³/min")
    after = _needed(table, second, 0.0, 1e6, "ft³/min")
    _improved(table, second, after, first, before)
    divisor = table.number("blower_door_divisor", low=5.0, high=50.0, unit="times")
    if not door:
        if divisor is not None:
            raise table.bad(
                "blower_door_divisor", f"{divisor:g}", "natural airflow without a divisor"
            )
        return AirSealing(name, before, after)
    divisor = divisor if divisor is not None else BLOWER_DOOR_DIVISOR
    return AirSealing(name, before / divisor, after / divisor, divisor)


def _equipment(table: Table, name: str) -> Component:
    low, high = LOWEST_EFFICIENCY, HIGHEST_EFFICIENCY
    before = _needed(table, "efficiency_before", low, high, EFFICIENCY_UNIT)
    after = _needed(table, "efficiency_after", low, high, EFFICIENCY_UNIT)
    _improved(table, "efficiency_before", before, "efficiency_after", after)
    share = table.number("share", low=0.01, high=1.0, unit="share of the account's heating")
    return Equipment(name, before, after, 1.0 if share is None else share)


def _setback(table: Table, name: str) -> Component:
    degrees = _needed(table, "degrees_f", 0.1, 30.0, "°F lower")
    return Setback(name, degrees, _needed(table, "hours_a_day", 0.1, 24.0, "hours"))


_READERS: Final[dict[str, Callable[[Table, str], Component]]] = {
    "insulation": _insulation,
    "windows": _windows,
    "air sealing": _air_sealing,
    "equipment": _equipment,
    "setback": _setback,
}
