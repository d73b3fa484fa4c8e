"""Units and factors against published tables and exact definitions."""

from __future__ import annotations

import doctest
import pickle
import subprocess
import sys

import pytest
import scipy.constants as nist

from normalize import units
from normalize.errors import BillError, UnknownUnit
from normalize.units import (
    FUELS,
    canonical_fuel,
    canonical_unit,
    co2_kg_per_unit,
    convert,
    heat_content_btu,
    mmbtu_per_unit,
)

# Exact constants as scipy.constants gives them (CODATA and NIST SP 811).
EXACT = [
    ("Btu", "J", nist.Btu),
    ("kWh", "J", 3.6e6),
    ("MMBtu", "kWh", 1e6 * nist.Btu / 3.6e6),
    ("GJ", "MMBtu", 1e9 / nist.Btu / 1e6),
    ("MWh", "kWh", 1e3),
    ("Dth", "therm", 10.0),
    ("therm", "MJ", 1e5 * nist.Btu / 1e6),
    ("Mcf", "ccf", 10.0),
    ("m3", "cf", 1.0 / nist.foot**3),
]
EXACT_LIQUID = [
    ("gal", "L", nist.gallon_US * 1e3),
    ("imp gal", "L", nist.gallon_imp * 1e3),
]

# fuel, unit, MMBtu per unit, kg CO2 per unit: US EPA Emission Factors Hub, 2024, table 1,
# which publishes both per unit (rounded as there); EIA's 1,036 Btu/cf for natural gas.
PUBLISHED = [
    ("natural gas", "MMBtu", 1.0, 53.06),
    ("natural gas", "therm", 0.1, 5.306),
    ("heating oil", "gal", 0.138, 10.21),
    ("kerosene", "gal", 0.135, 10.15),
    ("propane", "gal", 0.091, 5.72),
]


@pytest.mark.parametrize(("source", "target", "factor"), EXACT)
def test_exact_conversions_of_gas(source: str, target: str, factor: float) -> None:
    assert convert(1.0, source, target, "natural gas") == pytest.approx(factor, rel=1e-14)


@pytest.mark.parametrize(("source", "target", "factor"), EXACT_LIQUID)
@pytest.mark.parametrize("fuel", ["heating oil", "propane", "kerosene"])
def test_exact_conversions_of_liquids(source: str, target: str, factor: float, fuel: str) -> None:
    assert convert(1.0, source, target, fuel) == pytest.approx(factor, rel=1e-14)


def test_exact_conversions_of_weight() -> None:
    """Pound and short ton (2,000 lb), NIST SP 811."""
    assert convert(1.0, "lb", "kg", "pellets") == pytest.approx(nist.pound, rel=1e-14)
    assert convert(1.0, "short ton", "tonne", "pellets") == pytest.approx(
        2000 * nist.pound / 1000, rel=1e-14
    )


def test_kwh_holds_3412_btu() -> None:
    """1 kWh = 3412.14163 Btu (international table), NIST SP 811."""
    assert heat_content_btu("electricity", "kWh") == pytest.approx(3412.14163, abs=5e-6)


@pytest.mark.parametrize(("fuel", "unit", "heat", "carbon"), PUBLISHED)
def test_published_factors(fuel: str, unit: str, heat: float, carbon: float) -> None:
    """US EPA Emission Factors Hub 2024, table 1; the hub rounds per-gallon carbon to 0.01."""
    assert mmbtu_per_unit(fuel, unit).value == pytest.approx(heat, rel=1e-12)
    assert co2_kg_per_unit(fuel, unit).value == pytest.approx(carbon, abs=0.005)
    assert not co2_kg_per_unit(fuel, unit).memory


def test_gas_by_volume_holds_what_eia_measured() -> None:
    """EIA, natural gas delivered to US consumers, 2022, 2023 and 2025: 1,036 Btu/cf."""
    assert heat_content_btu("natural gas", "cf") == pytest.approx(1036.0, rel=1e-12)
    assert convert(1.0, "ccf", "therm", "natural gas") == pytest.approx(1.036, rel=1e-12)


def test_gas_volume_in_metric() -> None:
    """1 m³ ≈ 38.6 MJ ≈ 10.72 kWh at 1,036 Btu/cf (common practice)."""
    assert convert(1.0, "m3", "MJ", "natural gas") == pytest.approx(38.6, abs=0.05)
    assert convert(1.0, "m3", "kWh", "natural gas") == pytest.approx(10.72, abs=0.005)


def test_gas_carbon_is_the_same_by_volume_and_by_heat() -> None:
    """One heat content for both: EPA's 0.05444 kg/scf (at 1,026 Btu) rises as 1036 : 1026."""
    per_ccf = co2_kg_per_unit("natural gas", "ccf").value
    therms = convert(1.0, "ccf", "therm", "natural gas")
    assert per_ccf == pytest.approx(
        therms * co2_kg_per_unit("natural gas", "therm").value, rel=1e-12
    )
    assert per_ccf / 100 * 1026 / 1036 == pytest.approx(0.05444, abs=5e-6)


def test_oil_and_propane_by_the_litre() -> None:
    """No. 2 oil 38.6 MJ/L, propane 25.5 MJ/L: a metric handbook's figures (common practice).

    EPA's US heat contents come within 1 %.
    """
    assert convert(1.0, "L", "MJ", "heating oil") == pytest.approx(38.6, rel=0.01)
    assert convert(1.0, "L", "MJ", "propane") == pytest.approx(25.5, rel=0.01)


def test_oil_agrees_with_eia_within_half_a_percent() -> None:
    """EIA, units and calculators: heating oil 138,500 Btu/gal; propane 91,452."""
    assert heat_content_btu("heating oil", "gal") == pytest.approx(138_500, rel=0.005)
    assert heat_content_btu("propane", "gal") == pytest.approx(91_452, rel=0.006)


def test_electricity_carbon() -> None:
    """EPA eGRID2022, US total output: 823.1 lb CO2/MWh."""
    per_mwh = co2_kg_per_unit("electricity", "MWh")
    assert per_mwh.value / nist.pound == pytest.approx(823.1, rel=1e-12)
    assert per_mwh.year == "2022"
    per_mmbtu = co2_kg_per_unit("electricity", "MMBtu").value
    assert per_mmbtu == pytest.approx(per_mwh.value / 3.41214163, rel=1e-8)


def test_wood_is_biogenic_and_says_so() -> None:
    """EPA hub 2024: 93.80 kg/MMBtu, 17.48 MMBtu per short ton; EIA: 20 MMBtu a cord."""
    assert FUELS["wood"].biogenic
    assert FUELS["pellets"].biogenic
    assert "biogenic" in co2_kg_per_unit("wood", "cord").source
    assert co2_kg_per_unit("wood", "cord").value == pytest.approx(20 * 93.80, rel=1e-12)
    assert mmbtu_per_unit("wood", "short ton").value == pytest.approx(17.48, rel=1e-12)


def test_values_from_memory_are_marked() -> None:
    """District steam 1,194 Btu/lb (memory); pellets 16–16.5 MMBtu a short ton (memory)."""
    steam, pellets = mmbtu_per_unit("district steam", "Mlb"), mmbtu_per_unit("pellets", "short ton")
    assert steam.memory
    assert pellets.memory
    assert co2_kg_per_unit("district steam", "Mlb").memory
    assert co2_kg_per_unit("pellets", "short ton").memory
    assert steam.value == pytest.approx(1.194, rel=1e-12)
    assert 16.0 <= pellets.value <= 16.5


@pytest.mark.parametrize("fuel", sorted(FUELS))
def test_every_factor_has_its_source_and_agrees_with_the_table(fuel: str) -> None:
    for unit, heat in FUELS[fuel].units.items():
        assert canonical_unit(unit, fuel) == unit
        for factor in (mmbtu_per_unit(fuel, unit), co2_kg_per_unit(fuel, unit)):
            assert factor.source
            assert factor.unit.endswith(f"/{unit}")
            assert factor.value > 0
        assert mmbtu_per_unit(fuel, unit).value == heat
        there = convert(7.0, unit, FUELS[fuel].default_unit, fuel)
        assert convert(there, FUELS[fuel].default_unit, unit, fuel) == pytest.approx(7.0, rel=1e-14)


@pytest.mark.parametrize(
    ("text", "fuel", "unit"),
    [
        ("therms", "natural gas", "therm"),
        ("THM", "natural gas", "therm"),
        ("CCF", "natural gas", "ccf"),
        ("HCF", "gas", "ccf"),
        ("MCF", "natural gas", "Mcf"),
        ("MMcf", "natural gas", "MMcf"),
        ("cu. ft.", "natural gas", "cf"),
        ("ft³", "natural gas", "cf"),
        ("m³", "natural gas", "m3"),
        ("M3", "natural gas", "m3"),
        ("dekatherms", "natural gas", "Dth"),
        ("mmbtu", "natural gas", "MMBtu"),
        ("KWH", "electricity", "kWh"),
        ("kW-h", "electricity", "kWh"),
        ("Mwh", "electricity", "MWh"),
        ("mwh", "electricity", "MWh"),
        ("Gallons", "heating oil", "gal"),
        ("U.S. gal", "heating oil", "gal"),
        ("imp. gal.", "heating oil", "imp gal"),
        ("litres", "propane", "L"),
        ("lbs", "district steam", "lb"),
        ("full cord", "wood", "cord"),
        ("kBtu", None, "kBtu"),
    ],
)
def test_spellings(text: str, fuel: str | None, unit: str) -> None:
    assert canonical_unit(text, fuel) == unit


# Each of these means two things in the trade: (text, fuel, a word that must be in the answer).
ASK = [
    ("MBtu", "natural gas", "MMBtu"),
    ("mBtu", "natural gas", "kBtu"),
    ("MBTU", None, "kBtu"),
    ("M", "natural gas", "Mcf"),
    ("ton", "pellets", "short ton"),
    ("T", "pellets", "tonne"),
    ("ton-hr", None, "12"),
    ("DT", "natural gas", "Dth"),
    ("units", "natural gas", "ccf"),
    ("kW", "electricity", "kWh"),
    ("kVAh", "electricity", "kWh"),
    ("lb", None, "fuel"),
    ("face cord", "wood", "full cords"),
    ("bags", "pellets", "lb"),
    ("kcal", "natural gas", "kBtu"),
]


@pytest.mark.parametrize(("text", "fuel", "word"), ASK)
def test_two_meanings_are_asked_about(text: str, fuel: str | None, word: str) -> None:
    with pytest.raises(UnknownUnit) as caught:
        canonical_unit(text, fuel, where="bills.csv:4")
    assert str(caught.value).startswith("bills.csv:4: ")
    assert word in str(caught.value)


@pytest.mark.parametrize(
    ("text", "fuel"),
    [
        ("therm", "electricity"),
        ("ccf", "electricity"),
        ("gal", "natural gas"),
        ("kWh hour", "electricity"),
        ("m3", "propane"),  # as a gas or as a liquid?
        ("lb", "propane"),
        ("", "natural gas"),
        ("=1+1", "natural gas"),
        ("\0", "natural gas"),
        ("x" * 100_000, "natural gas"),
    ],
)
def test_what_does_not_fit_is_refused_briefly(text: str, fuel: str) -> None:
    with pytest.raises(UnknownUnit) as caught:
        canonical_unit(text, fuel)
    assert FUELS[fuel].default_unit in str(caught.value)
    assert len(str(caught.value)) < 400
    assert "\0" not in str(caught.value)


@pytest.mark.parametrize(
    ("text", "fuel"),
    [
        ("Gas", "natural gas"),
        ("NATURAL_GAS", "natural gas"),
        ("Electric", "electricity"),
        ("No. 2 fuel oil", "heating oil"),
        ("#2 oil", "heating oil"),
        ("LP gas", "propane"),
        ("Steam", "district steam"),
    ],
)
def test_fuel_spellings(text: str, fuel: str) -> None:
    assert canonical_fuel(text) == fuel


def test_an_unknown_fuel_names_the_nearest() -> None:
    with pytest.raises(BillError) as caught:
        canonical_fuel("natrual gas", where="site.toml")
    assert "site.toml" in str(caught.value)
    assert "Did you mean 'natural gas'?" in str(caught.value)
    assert all(name in str(caught.value) for name in FUELS)


def test_errors_survive_a_process_border() -> None:
    with pytest.raises(UnknownUnit) as caught:
        canonical_unit("MBtu", None, where="a.csv")
    back = pickle.loads(pickle.dumps(caught.value))  # noqa: S301 - our own bytes
    assert str(back) == str(caught.value)


def test_only_heating_fuels_are_kept_from_cooling() -> None:
    assert {n for n, f in FUELS.items() if not f.heating_only} == {"electricity"}
    delivered = {"heating oil", "propane", "kerosene", "wood", "pellets"}
    assert {n for n, f in FUELS.items() if f.delivered} == delivered


def test_loads_no_science() -> None:
    code = (
        "import sys, normalize.units; print([m for m in ('numpy', 'pandas') if m in sys.modules])"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"


def test_printed_examples() -> None:
    failed, tried = doctest.testmod(units)
    assert tried > 0
    assert failed == 0
