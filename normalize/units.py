"""Fuels, the units they are billed in, and their factors (all higher heating value).

**One heat content per fuel, for heat and for carbon alike.**  Published tables disagree by
about one per cent: a cubic foot of natural gas holds 1,026 Btu in EPA's carbon table and
1,036 Btu as EIA measured what US consumers were delivered.  Taking one for heat and the other
for carbon would give a house billed in ccf another carbon figure than the same house billed
in therms.  So carbon always goes through heat: kg CO2 per unit = kg CO2 per MMBtu (EPA) ×
MMBtu per unit (below).

- natural gas by volume: EIA's 1,036 Btu/cf.  Carbon per cf is therefore 1 % above EPA's
  0.05444 kg/scf, because the gas is that much richer.  A bill's own therms, or its own therm
  factor, are better than any average.
- oil, kerosene, propane: EPA's heat contents, so that carbon per gallon is EPA's published
  figure.  (EIA's heating oil is 138,500 Btu/gal: 0.4 % more heat.)
- electricity: the national average of generation, without the losses of the grid.  A
  region's factor, or that of the plants that follow the load, may be twice or half of it: the
  site file can give its own.

The therm is 100,000 international-table Btu (the legal US therm is 0.024 % smaller).
"""

from __future__ import annotations

from dataclasses import dataclass
from types import MappingProxyType
from typing import TYPE_CHECKING

from normalize.errors import BillError, UnknownUnit

if TYPE_CHECKING:
    from collections.abc import Mapping

BTU_J = 1055.05585262  # joules per international-table Btu, exact by definition
LB_KG = 0.45359237  # kilograms per pound, exact by definition
CF_M3 = 0.3048**3  # cubic metres per cubic foot, exact by definition
GAL_L = 3.785411784  # litres per US gallon, exact by definition
IMP_GAL_L = 4.54609  # litres per imperial gallon, exact by definition


@dataclass(frozen=True, slots=True)
class Factor:
    """A number with its source. memory : true when not checked against its document."""

    value: float
    unit: str
    source: str
    year: str
    memory: bool = False


@dataclass(frozen=True, slots=True)
class Fuel:
    """A fuel and what is known of it.

    units : canonical unit → MMBtu per unit, higher heating value.
    default_unit : what a report uses when nothing else is said.
    kg_co2_per_mmbtu : None for electricity, which has ``kg_co2_per_kwh`` instead.
    delivered : comes by truck, so use is known only between fills.
    heating_only : not offered cooling unless asked.
    plain : the word for sentences ("18 % less gas").
    content : kind of measure → heat content of that kind's base unit, with its source.
    biogenic : its CO2 comes from regrowing wood and is reported apart from fossil CO2.
    """

    name: str
    units: Mapping[str, float]
    default_unit: str
    kg_co2_per_mmbtu: Factor | None
    delivered: bool
    heating_only: bool
    plain: str
    content: Mapping[str, Factor]
    kg_co2_per_kwh: Factor | None = None
    biogenic: bool = False


# Canonical unit → (kind of measure, size in that kind's base unit).
_SIZE: Mapping[str, tuple[str, float]] = MappingProxyType(
    {
        "Btu": ("heat", 1.0),
        "kBtu": ("heat", 1e3),
        "MMBtu": ("heat", 1e6),
        "therm": ("heat", 1e5),
        "Dth": ("heat", 1e6),
        "J": ("heat", 1.0 / BTU_J),
        "MJ": ("heat", 1e6 / BTU_J),
        "GJ": ("heat", 1e9 / BTU_J),
        "Wh": ("heat", 3.6e3 / BTU_J),
        "kWh": ("heat", 3.6e6 / BTU_J),
        "MWh": ("heat", 3.6e9 / BTU_J),
        "GWh": ("heat", 3.6e12 / BTU_J),
        "cf": ("gas volume", 1.0),
        "ccf": ("gas volume", 1e2),
        "Mcf": ("gas volume", 1e3),
        "MMcf": ("gas volume", 1e6),
        "m3": ("gas volume", 1.0 / CF_M3),
        "gal": ("liquid volume", 1.0),
        "L": ("liquid volume", 1.0 / GAL_L),
        "imp gal": ("liquid volume", IMP_GAL_L / GAL_L),
        "lb": ("mass", 1.0),
        "Mlb": ("mass", 1e3),
        "short ton": ("mass", 2e3),
        "kg": ("mass", 1.0 / LB_KG),
        "tonne": ("mass", 1e3 / LB_KG),
        "cord": ("stacked volume", 1.0),
    }
)

_DEFINITION = "definition: 1 kWh = 3.6 MJ, 1 Btu = 1055.05585262 J, 1 therm = 100,000 Btu"
_EPA = "US EPA greenhouse gas emission factors (40 CFR 98 Table C-1)"
_HEAT = Factor(1e-6, "MMBtu/Btu", _DEFINITION, "")


def _epa(value: float, unit: str, note: str = "") -> Factor:
    return Factor(value, unit, f"{_EPA}{note}", "2024")


def _fuel(
    name: str,
    plain: str,
    default_unit: str,
    content: dict[str, Factor],
    co2: Factor | None,
    *,
    leave_out: tuple[str, ...] = (),
    delivered: bool = False,
    heating_only: bool = True,
    kg_co2_per_kwh: Factor | None = None,
    biogenic: bool = False,
) -> Fuel:
    """A fuel with all units of the kinds whose heat content is known."""
    kinds = {"heat": _HEAT, **content}
    units = {
        unit: size * kinds[kind].value
        for unit, (kind, size) in _SIZE.items()
        if kind in kinds and unit not in leave_out
    }
    return Fuel(
        name=name,
        units=MappingProxyType(units),
        default_unit=default_unit,
        kg_co2_per_mmbtu=co2,
        delivered=delivered,
        heating_only=heating_only,
        plain=plain,
        kg_co2_per_kwh=kg_co2_per_kwh,
        biogenic=biogenic,
        content=MappingProxyType(kinds),
    )


_GAS_CF = Factor(
    1036e-6, "MMBtu/cf", "US EIA, heat content of natural gas delivered to consumers, US", "2025"
)
_PELLETS = Factor(16.5 / 2e3, "MMBtu/lb", "US EIA, heating fuel comparison, wood pellets", "", True)
_STEAM = Factor(1194e-6, "MMBtu/lb", "customary billing value of district steam", "", True)
_CORD = Factor(20.0, "MMBtu/cord", "US EIA, units and calculators: an estimate, woods differ", "")
_GRID = Factor(
    823.1 * LB_KG / 1e3,
    "kg CO2/kWh",
    "US EPA eGRID, US average total output rate, 823.1 lb CO2/MWh, grid losses not included",
    "2022",
)
_STEAM_CO2 = Factor(66.33, "kg CO2/MMBtu", f"{_EPA}, steam and heat", "2024", True)
_WOOD_CO2 = _epa(93.80, "kg CO2/MMBtu", "; biogenic, reported apart from fossil CO2")
_NOT_FOR_LIQUIDS = ("therm", "Dth")
_NOT_FOR_GAS = ("m3",)  # of propane: as a gas or as a liquid?

FUELS: Mapping[str, Fuel] = MappingProxyType(
    {
        fuel.name: fuel
        for fuel in (
            _fuel(
                "natural gas",
                "gas",
                "therm",
                {"gas volume": _GAS_CF},
                _epa(53.06, "kg CO2/MMBtu"),
            ),
            _fuel(
                "electricity",
                "electricity",
                "kWh",
                {},
                None,
                leave_out=("therm", "Dth"),
                heating_only=False,
                kg_co2_per_kwh=_GRID,
            ),
            _fuel(
                "heating oil",
                "oil",
                "gal",
                {"liquid volume": _epa(0.138, "MMBtu/gal", ", distillate fuel oil No. 2")},
                _epa(73.96, "kg CO2/MMBtu", ", distillate fuel oil No. 2"),
                leave_out=_NOT_FOR_LIQUIDS,
                delivered=True,
            ),
            _fuel(
                "propane",
                "propane",
                "gal",
                {
                    "liquid volume": _epa(0.091, "MMBtu/gal", ", propane"),
                    "gas volume": _epa(0.002516, "MMBtu/cf", ", propane gas"),
                },
                _epa(62.87, "kg CO2/MMBtu", ", propane"),
                leave_out=_NOT_FOR_GAS,
                delivered=True,
            ),
            _fuel(
                "kerosene",
                "kerosene",
                "gal",
                {"liquid volume": _epa(0.135, "MMBtu/gal", ", kerosene")},
                _epa(75.20, "kg CO2/MMBtu", ", kerosene"),
                leave_out=_NOT_FOR_LIQUIDS,
                delivered=True,
            ),
            _fuel(
                "wood",
                "wood",
                "cord",
                {
                    "stacked volume": _CORD,
                    "mass": _epa(17.48 / 2e3, "MMBtu/lb", ", wood and wood residuals"),
                },
                _WOOD_CO2,
                leave_out=("therm", "Dth", "Mlb"),
                delivered=True,
                biogenic=True,
            ),
            _fuel(
                "pellets",
                "wood pellets",
                "short ton",
                {"mass": _PELLETS},
                _WOOD_CO2,
                leave_out=("therm", "Dth", "Mlb"),
                delivered=True,
                biogenic=True,
            ),
            _fuel(
                "district steam",
                "steam",
                "Mlb",
                {"mass": _STEAM},
                _STEAM_CO2,
                leave_out=("short ton",),
            ),
        )
    }
)

_FUEL_SPELLINGS: Mapping[str, tuple[str, ...]] = MappingProxyType(
    {
        "natural gas": ("gas", "nat gas", "ng", "piped gas", "mains gas"),
        "electricity": ("electric", "elec", "power", "electric power"),
        "heating oil": (
            "oil",
            "fuel oil",
            "no 2 oil",
            "no 2 fuel oil",
            "2 oil",
            "home heating oil",
        ),
        "propane": ("lp", "lpg", "lp gas", "propane gas", "bottled gas"),
        "kerosene": ("k 1", "k1"),
        "wood": ("firewood", "cordwood"),
        "pellets": ("pellet", "wood pellets", "wood pellet"),
        "district steam": ("steam",),
    }
)

# Spellings are compared without case, spaces, dots, hyphens and underscores.  "m" before "cf"
# is the trade's thousand; capitals don't tell a mega- from a milliwatt-hour on any bill.
_UNIT_SPELLINGS: Mapping[str, tuple[str, ...]] = MappingProxyType(
    {
        "Btu": ("btu", "btus"),
        "kBtu": ("kbtu", "kbtus", "thousandbtu"),
        "MMBtu": ("mmbtu", "mmbtus", "millionbtu"),
        "therm": ("therm", "therms", "thm", "thms"),
        "Dth": ("dth", "dths", "dekatherm", "dekatherms", "decatherm", "decatherms"),
        "J": ("j", "joule", "joules"),
        "MJ": ("mj", "megajoule", "megajoules"),
        "GJ": ("gj", "gigajoule", "gigajoules"),
        "Wh": ("wh", "watthour", "watthours"),
        "kWh": ("kwh", "kwhs", "kwhr", "kwhrs", "kilowatthour", "kilowatthours"),
        "MWh": ("mwh", "mwhr", "megawatthour", "megawatthours"),
        "GWh": ("gwh", "gigawatthour", "gigawatthours"),
        "cf": ("cf", "scf", "cuft", "ft3", "cubicfoot", "cubicfeet"),
        "ccf": ("ccf", "hcf", "100cf", "100cuft", "100ft3", "hundredcubicfeet"),
        "Mcf": ("mcf", "1000cf", "1000cuft", "1000ft3", "thousandcubicfeet"),
        "MMcf": ("mmcf", "millioncubicfeet"),
        "m3": ("m3", "cum", "cubicmeter", "cubicmeters", "cubicmetre", "cubicmetres"),
        "gal": ("gal", "gals", "gallon", "gallons", "usgal", "usgallon", "usgallons"),
        "L": ("l", "ltr", "ltrs", "liter", "liters", "litre", "litres"),
        "imp gal": (
            "impgal",
            "impgals",
            "impgallon",
            "impgallons",
            "imperialgallon",
            "imperialgallons",
            "ukgal",
            "ukgallons",
        ),
        "lb": ("lb", "lbs", "pound", "pounds"),
        "Mlb": ("mlb", "mlbs", "klb", "klbs", "1000lb", "1000lbs", "thousandpounds"),
        "short ton": ("shortton", "shorttons", "uston", "ustons"),
        "kg": ("kg", "kgs", "kilogram", "kilograms"),
        "tonne": ("tonne", "tonnes", "metricton", "metrictons"),
        "cord": ("cord", "cords", "fullcord", "fullcords"),
    }
)

# Spellings that mean two things: (spellings, the two meanings, what settles it).
_QUESTIONS: tuple[tuple[tuple[str, ...], str, str], ...] = (
    (
        ("mbtu", "mbtus", "mbtuh"),
        "a thousand Btu in the US gas trade, a million Btu elsewhere",
        "Write kBtu for a thousand or MMBtu for a million.",
    ),
    (
        ("ton", "tons", "t"),
        "a short ton of 2,000 lb, a tonne of 1,000 kg, or a ton of cooling",
        "Write 'short ton' or 'tonne'.",
    ),
    (
        ("tonhr", "tonhrs", "tonhour", "tonhours"),
        "12,000 Btu of cooling taken from chilled water, which is no fuel here",
        "Convert to kBtu (12 per ton-hour).",
    ),
    (
        ("unit", "units", "meterunits"),
        "steps of the meter, in cubic feet, cubic metres or with a multiplier of its own",
        "Look for the unit beside the meter reading on the bill (ccf, m3, kWh …) and write that.",
    ),
    (
        ("th", "dt"),
        "a therm, a dekatherm, a thermie or a decitonne",
        "Write therm (100,000 Btu) or Dth (ten therms).",
    ),
    (
        ("kw", "w", "mw", "kva"),
        "the highest rate of use (demand), not an amount of energy",
        "Use the column in kWh.",
    ),
    (
        ("kvah", "kvarh", "kvar", "vah", "varh"),
        "apparent or reactive use, which is not the energy used",
        "Use the column in kWh.",
    ),
    (
        ("facecord", "facecords", "rick", "ricks"),
        "a stack as deep as its sticks are long, a third to a half of a cord",
        "Give full cords (4 × 4 × 8 ft).",
    ),
    (
        ("bag", "bags", "sack", "sacks"),
        "40 lb in one country, 15 kg in another",
        "Give lb, kg or 'short ton'.",
    ),
    (
        ("kcal", "mcal", "gcal", "cal"),
        "an international or a thermochemical calorie",
        "Give kWh, MJ or kBtu.",
    ),
    (
        ("m", "c", "mm"),
        "a prefix without a unit: M is a thousand in the gas trade, a million elsewhere",
        "Write the whole unit, such as Mcf (1,000 cubic feet) or ccf (100 cubic feet).",
    ),
)


def _squeeze(text: str) -> str:
    """Compatibility form, lower case, letters and digits only: "ft³" and "cu. ft." compare."""
    import unicodedata

    return "".join(c for c in unicodedata.normalize("NFKC", text).lower() if c.isalnum())


_UNIT_OF = {s: unit for unit, spellings in _UNIT_SPELLINGS.items() for s in spellings}
_FUEL_OF = {_squeeze(s): n for n, more in _FUEL_SPELLINGS.items() for s in (n, *more)}
_QUESTION_OF = {s: (what, cure) for spellings, what, cure in _QUESTIONS for s in spellings}


def _quoted(text: str) -> str:
    """The text for a message, on one line and never long."""
    return repr(text if len(text) <= 40 else text[:37] + "…")


def _nearest(word: str, known: list[str]) -> str:
    from difflib import get_close_matches

    found = get_close_matches(word[:40], known, n=1, cutoff=0.6)
    return found[0] if found else ""


def canonical_fuel(text: str, *, where: str = "") -> str:
    """The one spelling of a fuel's name.

    Raises BillError, with the known fuels and the nearest, if there is no such fuel.

    >>> canonical_fuel("Nat. Gas"), canonical_fuel("#2 oil")
    ('natural gas', 'heating oil')
    """
    word = _squeeze(text)
    if word in _FUEL_OF:
        return _FUEL_OF[word]
    near = _nearest(word, list(_FUEL_OF))
    raise BillError(
        f"no fuel is called {_quoted(text)}",
        where=where,
        wanted="one of " + ", ".join(FUELS),
        next_step=f"Did you mean {_FUEL_OF[near]!r}?" if near else "",
    )


def canonical_unit(text: str, fuel: str | None, *, where: str = "") -> str:
    """The one spelling of a unit that fits the fuel (any fuel if None).

    Raises UnknownUnit if it is unknown, does not fit, or means two things in the trade; the
    message then asks which.

    >>> canonical_unit("THERMS", "natural gas"), canonical_unit("m³", None)
    ('therm', 'm3')
    """
    word = _squeeze(text)
    known = FUELS[canonical_fuel(fuel, where=where)] if fuel is not None else None
    if word in _QUESTION_OF:
        meaning, cure = _QUESTION_OF[word]
        raise UnknownUnit(f"{_quoted(text)} is used for {meaning}", where=where, next_step=cure)
    if word not in _UNIT_OF:
        raise _unknown_unit(text, word, known, where)
    unit = _UNIT_OF[word]
    if known is None and unit == "lb":
        raise UnknownUnit(
            f"{_quoted(text)} can be pounds of steam, of wood or of pellets",
            where=where,
            next_step="Say which fuel it is.",
        )
    if known is not None and unit not in known.units:
        raise _unfit_unit(text, known, where)
    return unit


def is_unit(text: str) -> bool:
    """Whether the text is a unit, or a word that the trade uses for two units.

    >>> is_unit("Therms"), is_unit("MBtu"), is_unit("bananas")
    (True, True, False)
    """
    word = _squeeze(text)
    return word in _UNIT_OF or word in _QUESTION_OF


def _usual_units(fuel: Fuel | None) -> str:
    """The units that bills of the fuel use, its default first, for a message."""
    rare = {"Btu", "J", "Wh", "GWh", "MMcf"}
    units = dict.fromkeys((fuel.default_unit, *fuel.units) if fuel else _SIZE)
    return "one of " + ", ".join(u for u in units if u not in rare)


def _unknown_unit(text: str, word: str, fuel: Fuel | None, where: str) -> UnknownUnit:
    candidates = [s for s, u in _UNIT_OF.items() if fuel is None or u in fuel.units]
    near = _nearest(word, candidates)
    return UnknownUnit(
        f"no unit is called {_quoted(text)}",
        where=where,
        wanted=_usual_units(fuel),
        next_step=f"Did you mean {_UNIT_OF[near]!r}?" if near else "",
    )


def _unfit_unit(text: str, fuel: Fuel, where: str) -> UnknownUnit:
    return UnknownUnit(
        f"{fuel.name} is not billed in {_quoted(text)}",
        where=where,
        wanted=_usual_units(fuel),
        next_step="Check the fuel, or the unit on the bill.",
    )


def mmbtu_per_unit(fuel: str, unit: str) -> Factor:
    """Heat in one unit, higher heating value. [MMBtu]

    Raises BillError for an unknown fuel, UnknownUnit for a unit that does not fit.

    >>> mmbtu_per_unit("heating oil", "gal").value
    0.138
    """
    name, unit = canonical_fuel(fuel), canonical_unit(unit, fuel)
    content = FUELS[name].content[_SIZE[unit][0]]
    return Factor(
        FUELS[name].units[unit], f"MMBtu/{unit}", content.source, content.year, content.memory
    )


def co2_kg_per_unit(fuel: str, unit: str) -> Factor:
    """CO2 released for one unit. [kg]

    Fuels: what burning releases on site.  Electricity: the US grid's average (2022).  Raises
    as ``mmbtu_per_unit``.

    >>> round(co2_kg_per_unit("natural gas", "therm").value, 3)
    5.306
    >>> round(co2_kg_per_unit("electricity", "kWh").value, 4)
    0.3734
    """
    known, heat = FUELS[canonical_fuel(fuel)], mmbtu_per_unit(fuel, unit)
    unit = canonical_unit(unit, fuel)
    label = f"kg CO2/{unit}"
    if known.kg_co2_per_kwh is not None:
        grid = known.kg_co2_per_kwh
        value = grid.value * (_SIZE[unit][1] / _SIZE["kWh"][1])
        return Factor(value, label, grid.source, grid.year, grid.memory)
    carbon = known.kg_co2_per_mmbtu
    if carbon is None:
        raise BillError(
            f"no carbon factor is known for {known.name}", wanted="one in the site file"
        )
    source = carbon.source
    if _SIZE[unit][0] != "heat" and not heat.source.startswith(_EPA):
        source = f"{source}; heat content: {heat.source}, {heat.year}".rstrip(", ")
    return Factor(
        carbon.value * heat.value, label, source, carbon.year, carbon.memory or heat.memory
    )


def convert(value: float, from_unit: str, to_unit: str, fuel: str) -> float:
    """The same amount of the same fuel in another unit, through its heat content if need be.

    Raises as ``mmbtu_per_unit``.

    >>> convert(10.0, "therm", "Dth", "natural gas")
    1.0
    >>> round(convert(1.0, "ccf", "therm", "natural gas"), 3)
    1.036
    """
    source, target = canonical_unit(from_unit, fuel), canonical_unit(to_unit, fuel)
    (kind_in, size_in), (kind_out, size_out) = _SIZE[source], _SIZE[target]
    if kind_in == kind_out:
        return value * size_in / size_out
    units = FUELS[canonical_fuel(fuel)].units
    return value * units[source] / units[target]


def heat_content_btu(fuel: str, unit: str) -> float:
    """Heat in one unit, higher heating value. [Btu]

    >>> heat_content_btu("propane", "gal")
    91000.0
    """
    return mmbtu_per_unit(fuel, unit).value * 1e6
