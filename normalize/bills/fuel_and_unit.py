"""The fuel of a bill file and the unit of its usage, from whatever the file says.

What belongs here: headings, unit columns, units behind the numbers; and the question to ask
when none of them says it.  Units themselves are known in normalize/units.py.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from normalize.bills.amounts import split_amount
from normalize.bills.columns import Columns, answer, fuel_of_unit, fuel_suggested
from normalize.bills.groups import cell, fuel_named
from normalize.bills.headings import known_unit
from normalize.bills.table import RawRow
from normalize.errors import AmbiguousBills, UnknownUnit
from normalize.units import FUELS, canonical_unit


def fuel_of(columns: Columns, body: Sequence[RawRow], unit: str | None, where: str) -> str:
    """The fuel that the file names, or its unit is usual for.  Raises AmbiguousBills."""
    if (k := columns.get("fuel")) is not None:
        for row in body:
            if cell(row, k) is not None and str(cell(row, k)).strip():
                return fuel_named(str(cell(row, k)), where=where)
    suggested = fuel_suggested(columns.heading("usage"))
    if not suggested and (k := columns.get("unit")) is not None:
        texts = [str(cell(row, k) or "").strip() for row in body]
        first = next((t for t in texts if t), "")
        if first:
            suggested = fuel_of_unit(canonical_unit(first, None, where=where))
    suggested = suggested or fuel_of_unit(unit or "") or _fuel_behind_numbers(columns, body)
    if not suggested:
        raise AmbiguousBills(
            "the file does not say which fuel it is about",
            where=where,
            next_step=answer("fuel", *_fuels_of_unit(columns.heading("usage").unit or unit or "")),
        )
    return suggested


def _fuels_of_unit(unit: str) -> tuple[str, ...]:
    """Fuels that are billed in a unit, the commonest first; the common ones if none is."""
    fits = []
    for fuel in FUELS:
        try:
            canonical_unit(unit, fuel)
        except UnknownUnit:
            continue
        fits.append(fuel)
    return tuple(fits[:4]) or ("natural gas", "electricity", "heating oil", "propane")


def _fuel_behind_numbers(columns: Columns, body: Sequence[RawRow]) -> str:
    """The fuel of "81 therms", where units stand behind the numbers."""
    for row in body:
        amount = split_amount(cell(row, columns.get("usage")))
        if amount is not None and known_unit(amount.suffix):
            return fuel_of_unit(canonical_unit(amount.suffix, None))
    return ""


def unit_of(
    columns: Columns,
    body: Sequence[RawRow],
    suffixes: Iterable[str],
    *,
    said: str | None,
    fuel: str,
    where: str,
) -> tuple[str, str]:
    """The unit, and a sentence on where it was found.  Raises AmbiguousBills, UnknownUnit.

    suffixes : what stands behind the numbers.  said : the user's unit, canonical.
    """
    heading = columns.heading("usage")
    if heading.unit:
        unit = canonical_unit(heading.unit, fuel, where=where)
        if said is not None and said != unit:
            raise UnknownUnit(
                f"column {heading.text!r} is in {unit}, but unit says {said}", where=where,
                next_step="Leave out unit, or name another column with usage_column.",
            )  # fmt: skip
        per_day = ", per day, times the days of the bill" if heading.per_day else ""
        return unit, f"unit: {unit}, from heading {heading.text!r}{per_day}"
    k = columns.get("unit")
    texts = {str(cell(row, k) or "").strip() for row in body} if k is not None else set()
    texts |= set(suffixes)
    units = {canonical_unit(t, fuel, where=where) for t in sorted(texts) if t}
    if len(units) > 1 or (said is not None and units and units != {said}):
        every = sorted(units | ({said} if said else set()))
        raise AmbiguousBills(
            f"usage is given in several units ({', '.join(every)})", where=where,
            next_step=answer("rows", *every[:2]) if k is not None else "Give all in one unit.",
        )  # fmt: skip
    if units:
        return units.pop(), "unit: from the lines themselves"
    if said is not None:
        return said, f"unit: {said}, as you said"
    raise AmbiguousBills(
        f"the unit of column {heading.text!r} is not given", where=where,
        next_step=answer("unit", *_usual_units(fuel)),
    )  # fmt: skip


def _usual_units(fuel: str) -> tuple[str, ...]:
    usual = {
        "natural gas": ("therm", "ccf"), "electricity": ("kWh",), "wood": ("cord",),
        "pellets": ("short ton", "lb"), "district steam": ("Mlb",),
    }  # fmt: skip
    return usual.get(fuel, ("gal", "L"))
