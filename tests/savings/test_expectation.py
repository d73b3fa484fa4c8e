"""The engineering expectation against handbook examples and arithmetic with units.

Sources stand beside each check.  "By hand" is arithmetic written out here with its units, from
the formulas of docs/method.md §7, independent of the code.
"""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise

import numpy as np
import pytest

from normalize.fitting.results import Fit
from normalize.savings.components import (
    AirSealing,
    Component,
    Equipment,
    Insulation,
    Setback,
    Windows,
)
from normalize.savings.expectation import (
    EFFICIENCY,
    Expectation,
    House,
    balance_after,
    expectation_of,
    heat_loss_rate,
)
from normalize.savings.heat_loss import HYPOTHESIS, heat_loss_of, reading_of
from normalize.savings.results import Estimate
from normalize.savings.taken_apart import Part, Parts
from normalize.units import FUELS
from normalize.weather.year import LongTermYear, year_from_sample
from tests.fitting.accounts import weather

THERM = 100_000.0  # Btu, by definition
KELVIN_F = 1.8  # °F per kelvin
WATT = 3.412142  # Btu/h, from 1 Btu = 1055.056 J
SAVED = Estimate(value=90.0, low=60.0, high=120.0)


def year_of(mean_f: float = 50.0) -> LongTermYear:
    temp = weather(np.random.default_rng(7), 3650, mean=mean_f)
    return year_from_sample("ten years", temp, np.full(3650, 0.1))


def fit_of(slope: float | None = 0.12, tau: float | None = 61.0) -> Fit:
    return Fit(
        form="heating" if slope is not None else "flat", balance_heating_f=tau,
        balance_cooling_f=None, base_load=0.6, heating_slope=slope, cooling_slope=None,
        line_slope=None, n_periods=24, n_days=730, rss=1.0, r2=0.98, cv_rmse=0.05, bias=0.0,
        terms=("base load", "heating slope"), se=(0.1, 0.003), se_full=None, t=(6.0, 40.0),
        aicc=0.0, bic=0.0, mean_use=2.0,
    )  # fmt: skip


HOUSE = House("natural gas", THERM, setpoint_f=70.0, efficiency=0.80)


def expected(
    *components: Component,
    fit: Fit | None = None,
    house: House = HOUSE,
    year: LongTermYear | None = None,
) -> Expectation:
    found = expectation_of(
        fit or fit_of(), year or year_of(), components, house, SAVED, nac_before=800.0
    )
    assert found is not None
    return found


def test_a_house_of_the_handbook_of_fundamentals() -> None:
    """ASHRAE Handbook of Fundamentals, energy estimating, degree-day example (memory): New York,
    K = 205 W/K, gains 569 W, indoors 21.1 °C, η 0.75: balance 18.3 °C, 2800 K·day, 66 GJ a year.

    The formulas here give the same from the slope that such a house would show in gas.
    """
    ua = 205.0 * WATT / KELVIN_F  # W/K → Btu/h·°F
    gains = 569.0 * WATT  # Btu/h
    balance_c = ((21.1 * 1.8 + 32.0) - gains / ua - 32.0) / 1.8
    assert balance_c == pytest.approx(18.3, abs=0.05)
    slope = 24.0 * ua / (0.75 * THERM)  # therms per °F·day
    assert heat_loss_rate(slope, THERM, 0.75) == pytest.approx(ua, rel=1e-12)
    therms = slope * 2800.0 * KELVIN_F
    assert therms * THERM * 1055.056 / 1e9 == pytest.approx(66.0, abs=0.5)  # GJ


def test_sensible_heat_of_air() -> None:
    """1.08 Btu/h·°F·cfm = 0.24 Btu/lb·°F × 0.075 lb/ft³ × 60 min/h (common practice, no source)."""
    assert AirSealing("", 100.0, 0.0).ua_cut == pytest.approx(100.0 * 0.24 * 0.075 * 60.0, rel=1e-9)


def test_doubling_the_r_value_halves_the_loss() -> None:
    """Fourier's law, common practice."""
    assert Insulation("", 500.0, 10.0, 20.0).ua_cut == pytest.approx(0.5 * 500.0 / 10.0)


def test_a_furnace_from_80_to_95_per_cent() -> None:
    """15.8 % of heating (common practice: 1 − 0.80/0.95); base load untouched."""
    year = year_of()
    found = expected(Equipment("furnace", 0.80, 0.95))
    heating = 0.12 * year.heating(61.0)
    assert found.saved == pytest.approx(0.158 * heating, rel=0.01)
    assert found.saved == pytest.approx((1 - 0.80 / 0.95) * heating, rel=1e-12)
    assert found.balance_after_f == 61.0
    assert found.ua_after == found.ua_before


def test_insulation_and_air_sealing_by_hand() -> None:
    """0.12 therm/°F·day × 100,000 Btu/therm × 0.80 ÷ 24 h/day = 400 Btu/h·°F.

    Attic: 1000 ft² × (1/11 − 1/38) = 64.59; air: 1.08 × 35 = 37.8; UA₂ = 297.61 Btu/h·°F.
    Gains: 400 × (70 − 61) = 3600 Btu/h, so τ₂ = 70 − 3600/297.61 = 57.90 °F.
    """
    year = year_of()
    found = expected(Insulation("attic", 1000.0, 11.0, 38.0), AirSealing("", 130.0, 95.0))
    assert found.ua_before == pytest.approx(400.0)
    assert found.ua_after == pytest.approx(297.61, abs=0.005)
    assert found.balance_after_f == pytest.approx(57.90, abs=0.005)
    ua2 = 400.0 - 1000.0 * (1 / 11 - 1 / 38) - 1.08 * 35.0
    btu = 24.0 * (400.0 * year.heating(61.0) - ua2 * year.heating(70.0 - 3600.0 / ua2))
    assert found.saved == pytest.approx(btu / 0.80 / THERM, rel=1e-12)
    held = 24.0 * (400.0 - ua2) * year.heating(61.0) / 0.80 / THERM
    assert found.balance_held == pytest.approx(held, rel=1e-12)
    assert [s.kind for s in found.steps] == ["insulation", "air sealing"]
    assert sum(s.saved for s in found.steps) == pytest.approx(found.saved, rel=1e-12)
    assert found.fraction == pytest.approx((found.saved or 0.0) / 800.0)
    assert found.ratio == pytest.approx(90.0 / (found.saved or 1.0))
    assert found.ratio_low == pytest.approx(60.0 / (found.saved or 1.0))


@pytest.mark.parametrize("mean_f", [38.0, 46.0, 52.0, 58.0])
@pytest.mark.parametrize(("ua", "cut"), [(350.0, 0.1), (500.0, 0.2), (700.0, 0.3)])
def test_holding_the_balance_temperature_gives_too_little(
    mean_f: float, ua: float, cut: float
) -> None:
    """0.6–0.85 of the full answer for typical houses (docs/method.md §7): τ 60–62 °F under 70."""
    slope = ua * 24.0 / (0.80 * THERM)
    for tau in (60.0, 62.0):
        # A layer that takes the given share of the loss away.
        layer = Insulation("", cut * ua * 20.0, 10.0, 20.0)
        found = expected(layer, fit=fit_of(slope, tau), year=year_of(mean_f))
        assert found.ua_after == pytest.approx((1 - cut) * ua)
        share = (found.balance_held or 0.0) / (found.saved or 1.0)
        assert 0.6 <= share <= 0.85


def test_a_setback_lowers_the_balance_temperature_alone() -> None:
    """6 °F for 8 of 24 hours is 2 °F in the mean: heating is 24·UA·H0(59)/η instead of H0(61)."""
    year = year_of()
    found = expected(Setback("nights", 6.0, 8.0))
    assert found.balance_after_f == pytest.approx(59.0)
    assert found.saved == pytest.approx(0.12 * (year.heating(61.0) - year.heating(59.0)))
    assert found.ua_after == found.ua_before


def test_windows_and_a_setback_and_a_furnace_in_order() -> None:
    """By hand, each on what the one before left."""
    year = year_of()
    found = expected(
        Windows("", 150.0, 1.0, 0.3), Setback("", 6.0, 8.0), Equipment("", 0.8, 0.96, share=0.5)
    )
    ua = 400.0 - 105.0
    tau = 70.0 - 9.0 * 400.0 / ua
    heat = [400.0 * year.heating(61.0), ua * year.heating(tau), ua * year.heating(tau - 2.0)]
    heat.append(heat[-1] * (1.0 - 0.5 * (1.0 - 0.8 / 0.96)))
    steps = [24.0 * (a - b) / 0.80 / THERM for a, b in pairwise(heat)]
    assert [s.saved for s in found.steps] == pytest.approx(steps, rel=1e-12)


def test_two_furnaces_that_share_the_load_add_up() -> None:
    half = expected(Equipment("one", 0.8, 0.95, 0.5), Equipment("two", 0.8, 0.95, 0.5))
    assert half.saved == pytest.approx(expected(Equipment("", 0.8, 0.95)).saved, rel=1e-12)
    twice = expected(Equipment("one", 0.8, 0.9), Equipment("two", 0.9, 0.95))
    assert "cannot be more than 1" in (twice.unavailable or "")


def test_a_house_heated_by_two_accounts_asks_for_the_share() -> None:
    """UA of the whole house from an account that carries 60 % of it; the account saves 60 %."""
    two = replace(HOUSE, other_heaters=("wood",))
    layer = Insulation("attic", 1000.0, 11.0, 38.0)
    assert "heating_share" in (expected(layer, house=two).unavailable or "")
    found = expected(layer, house=replace(two, heating_share=0.6))
    assert found.ua_before == pytest.approx(400.0 / 0.6)
    whole = expected(layer, fit=fit_of(0.12 / 0.6))
    assert found.saved == pytest.approx(0.6 * (whole.saved or 0.0), rel=1e-12)


def test_the_heat_loss_must_stay_positive() -> None:
    too_much = expected(AirSealing("", 2600.0, 2050.0))
    assert too_much.saved is None
    assert "594 Btu/h·°F" in (too_much.unavailable or "")
    assert "blower_door_cfm50_before" in (too_much.unavailable or "")
    door = expected(AirSealing("", 130.0, 102.5, 20.0))
    assert door.available
    assert any("divided by 20" in word for word in door.assumed)


def test_what_is_assumed_is_said() -> None:
    bare = House("natural gas", THERM)
    found = expected(Insulation("", 100.0, 10.0, 20.0), house=bare)
    assert found.efficiency == 0.80
    assert found.setpoint_f == 68.0
    assert len(found.assumed) == 2
    furnace = expected(Equipment("", 0.72, 0.95), house=bare)
    assert furnace.efficiency == 0.72
    assert len(furnace.assumed) == 1
    assert set(EFFICIENCY) == set(FUELS)


def test_a_balance_temperature_above_the_setpoint_is_left_and_questioned() -> None:
    found = expected(Insulation("", 500.0, 10.0, 20.0), fit=fit_of(0.12, 69.0),
                     house=replace(HOUSE, setpoint_f=66.0))  # fmt: skip
    assert found.balance_after_f == 69.0
    assert found.saved == pytest.approx(found.balance_held)
    assert any("is the indoor temperature right" in c for c in found.cautions)
    assert balance_after(70.0, 70.0, 400.0, 300.0) == 70.0


def test_reasons_and_nothing_at_all() -> None:
    layer = Insulation("", 100.0, 10.0, 20.0)
    assert expectation_of(fit_of(), year_of(), [], HOUSE, SAVED) is None
    for fit, year, house, word in (
        (None, year_of(), HOUSE, "no fit"),
        (fit_of(None, None), year_of(), HOUSE, "no heating slope"),
        (fit_of(), None, HOUSE, "long-term year"),
        (fit_of(), year_of(), replace(HOUSE, btu_per_unit=None), "heat content"),
    ):
        found = expectation_of(fit, year, [layer], house, SAVED)
        assert found is not None
        assert word in (found.unavailable or "")
        assert found.saved is None


def test_without_a_measured_saving_there_is_no_ratio() -> None:
    layer = Insulation("", 100.0, 10.0, 20.0)
    found = expectation_of(fit_of(), year_of(), [layer], HOUSE, Estimate.none("too soon"))
    assert found is not None
    assert found.saved is not None
    assert found.ratio is None


def test_cautions_that_the_components_call_for() -> None:
    told = " ".join(expected(AirSealing("", 130.0, 95.0)).cautions)
    for word in ("combustion safety", "ventilation", "local code", "Heavy walls", "humid cooling"):
        assert word in told
    two = expected(Insulation("", 100.0, 10.0, 20.0), Equipment("", 0.70, 0.95))
    assert any("differ" in c for c in two.cautions)
    found = expectation_of(
        fit_of(), year_of(), [Insulation("", 100.0, 10.0, 20.0)], HOUSE, SAVED,
        undescribed=["new windows"],
    )  # fmt: skip
    assert found is not None
    assert any("new windows" in c for c in found.cautions)


def parts_with(slope: tuple[float, float], balance: tuple[float, float]) -> Parts:
    def part(name: str, ends: tuple[float, float]) -> Part:
        return Part(name, Estimate(value=0.5 * sum(ends), low=ends[0], high=ends[1]))

    slope_of = Estimate(value=0.12, low=0.11, high=0.13, plain_low=0.115, plain_high=0.125)
    return Parts(
        (part("heating slope", slope), part("heating balance temperature", balance)),
        None, slope_of, replace(slope_of, value=0.10), replace(slope_of, value=0.02),
    )  # fmt: skip


def test_heat_loss_in_its_units() -> None:
    """0.12 therm/°F·day: 500 Btu/h·°F of fuel, 400 with η 0.80; ÷ 2000 ft²: 6 Btu/ft²·°F·day."""
    found = heat_loss_of(
        parts_with((1.0, 9.0), (1.0, 5.0)), btu_per_unit=THERM, efficiency=0.80,
        floor_area_ft2=2000.0,
    )  # fmt: skip
    assert found is not None
    assert found.before is not None
    assert found.before.value == pytest.approx(500.0)
    assert found.before.low == pytest.approx(0.11 * THERM / 24.0)
    assert found.ua_before is not None
    assert found.ua_before.value == pytest.approx(400.0)
    assert found.intensity_before is not None
    assert found.intensity_before.value == pytest.approx(6.0)
    new = heat_loss_of(
        parts_with((1.0, 9.0), (1.0, 5.0)), btu_per_unit=THERM, efficiency=0.80,
        efficiency_after=0.95,
    )  # fmt: skip
    assert new is not None
    assert new.ua_after is not None
    assert new.ua_after.value == pytest.approx(0.10 * THERM * 0.95 / 24.0)
    assert new.ua_change is None
    assert heat_loss_of(Parts(), btu_per_unit=THERM) is None


def test_readings_are_hypotheses() -> None:
    both = reading_of(parts_with((1.0, 9.0), (1.0, 5.0)))
    assert "insulation and air sealing usually do" in both
    assert both.endswith(HYPOTHESIS)
    alone = reading_of(parts_with((1.0, 9.0), (-1.0, 5.0)))
    assert "more efficient equipment" in alone
    assert "the bills do not choose" in alone
    neither = reading_of(parts_with((-1.0, 9.0), (-1.0, 5.0)))
    assert neither.endswith("the bills do not say which of the two changed.")
    assert reading_of(Parts()) == ""
    signs = {"r": (1.0, 2.0), "i": (-2.0, -1.0), "c": (-1.0, 1.0)}
    texts = {reading_of(parts_with(signs[a], signs[b])) for a in signs for b in signs}
    assert "" not in texts
