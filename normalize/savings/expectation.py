"""What the described work should have saved, by an engineer's steady-state calculation.

From the heat-loss rate that the bills before the work show, through the described areas,
R-values, airflows and efficiencies, and degree-days at the balance temperature, which moves
as the house loses less (docs/method.md §8).  Shown beside the measured change, never in it.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Final

from normalize.defaults import HEATING_SETPOINT_F
from normalize.savings.components import (
    AirSealing,
    Component,
    Equipment,
    Insulation,
    Setback,
    Windows,
    kind_of,
)

if TYPE_CHECKING:
    from normalize.fitting.results import Fit
    from normalize.savings.results import Estimate
    from normalize.weather.year import LongTermYear

# Heat delivered per heat content burnt, over a season, where the site file does not say it
# (common practice, no source).  Electricity: resistance heat; a heat pump must be stated.
EFFICIENCY: Final[dict[str, float]] = {
    "natural gas": 0.80,
    "propane": 0.80,
    "heating oil": 0.80,
    "kerosene": 0.80,
    "electricity": 1.00,
    "wood": 0.60,
    "pellets": 0.75,
    "district steam": 1.00,
}
SAME_EFFICIENCY: Final = 0.005  # two efficiencies closer than this are the same
HOURS: Final = 24.0


@dataclass(frozen=True, slots=True)
class Step:
    """One component, in its order. saved : account's units in a normal year.

    ua : heat-loss rate after it, Btu/h·°F.  balance_f : balance temperature after it, °F.
    """

    name: str
    kind: str
    saved: float
    ua: float
    balance_f: float


@dataclass(frozen=True, slots=True)
class Expectation:
    """What the described work should have saved, or the reason why it cannot be said.

    saved : account's units in a normal year; fraction : of NAC before.
    balance_held : the same if the balance temperature did not move (too small; to compare).
    ua_before : heat-loss rate from the bills before the work, Btu/h·°F; ua_after : as described.
    balance_before_f (fitted), balance_after_f (as it should have moved), setpoint_f : °F.
    ratio, ratio_low, ratio_high : measured ÷ expected, the range of the measured alone.
    assumed : inputs that are defaults, in words.  cautions : sentences.
    """

    saved: float | None = None
    fraction: float | None = None
    balance_held: float | None = None
    steps: tuple[Step, ...] = ()
    ua_before: float | None = None
    ua_after: float | None = None
    balance_before_f: float | None = None
    balance_after_f: float | None = None
    setpoint_f: float | None = None
    efficiency: float | None = None
    ratio: float | None = None
    ratio_low: float | None = None
    ratio_high: float | None = None
    assumed: tuple[str, ...] = ()
    cautions: tuple[str, ...] = ()
    unavailable: str | None = None

    @property
    def available(self) -> bool:
        """Whether there is a number."""
        return self.unavailable is None


@dataclass(frozen=True, slots=True)
class House:
    """What the calculation knows of the house before the work.

    btu_per_unit : heat content of the account's unit.  setpoint_f, efficiency : None where the
    site file does not say.  heating_share : of the house's heat that this account carries;
    None where the site file does not say.  other_heaters : other accounts that heat it.
    """

    fuel: str
    btu_per_unit: float | None
    setpoint_f: float | None = None
    efficiency: float | None = None
    heating_share: float | None = None
    other_heaters: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class _State:
    """The house between two components.

    fuel : share of the heating fuel still needed for a given heat.  moves : whether the balance
    temperature follows the heat-loss rate.
    """

    ua: float
    setpoint_f: float
    balance_f: float
    fuel: float = 1.0
    moves: bool = True

    def heat(self, year: LongTermYear) -> float:
        """Heat that the old equipment would have to be fed for. [Btu·share a year]"""
        return HOURS * self.ua * year.heating(self.balance_f) * self.fuel

    def after(self, component: Component) -> _State:
        """The house once a component is in."""
        if isinstance(component, Equipment):
            return replace(self, fuel=self.fuel - component.fuel_cut)
        if isinstance(component, Setback):
            return replace(
                self,
                setpoint_f=self.setpoint_f - component.mean_f,
                balance_f=self.balance_f - component.mean_f,
            )
        ua = self.ua - component.ua_cut
        if not self.moves or ua <= 0.0:
            return replace(self, ua=ua)
        return replace(self, ua=ua, balance_f=balance_after(self.balance_f, self.setpoint_f,
                                                            self.ua, ua))  # fmt: skip


def balance_after(balance_f: float, setpoint_f: float, ua_before: float, ua_after: float) -> float:
    """Balance temperature once the heat-loss rate has changed, setpoint and gains constant. [°F]

    Gains carry the house from τ to its setpoint: UA·(T_set − τ) stays.  Where τ is not below
    the setpoint no gains are left to speak of and τ stays.  Source: docs/method.md §8.

    >>> balance_after(60.0, 70.0, 500.0, 400.0)
    57.5
    """
    if balance_f >= setpoint_f:
        return balance_f
    return setpoint_f - (setpoint_f - balance_f) * ua_before / ua_after


def heat_loss_rate(slope: float, btu_per_unit: float, efficiency: float = 1.0) -> float:
    """UA from the heating slope, b·HC·η/24; UA/η with efficiency 1. [Btu/h·°F]

    slope : account's units per °F·day.

    >>> round(heat_loss_rate(0.12, 100_000.0, 0.80), 6)
    400.0
    """
    return slope * btu_per_unit * efficiency / HOURS


def expectation_of(
    fit: Fit | None,
    year: LongTermYear | None,
    components: Sequence[Component],
    house: House,
    measured: Estimate,
    *,
    nac_before: float | None = None,
    undescribed: Sequence[str] = (),
) -> Expectation | None:
    """What the components should have saved; None when none is described.

    fit : of the bills before the work.  measured : the normalized savings, to set beside it.
    undescribed : upgrades on this account without components, which it cannot contain.
    """
    if not components:
        return None
    reason = _why_not(fit, year, components, house)
    if reason or fit is None or year is None or house.btu_per_unit is None:
        return Expectation(unavailable=reason)
    slope, tau = fit.heating_slope, fit.balance_heating_f
    if slope is None or tau is None:
        return Expectation(unavailable=NO_SLOPE)
    efficiency, setpoint, assumed = _inputs(components, house)
    share = house.heating_share if house.heating_share is not None else 1.0
    ua = heat_loss_rate(slope, house.btu_per_unit, efficiency) / share
    to_units = share / (efficiency * house.btu_per_unit)
    states = _through(_State(ua, setpoint, tau), components)
    if states[-1].ua <= 0.0 or any(s.ua <= 0.0 for s in states):
        return Expectation(unavailable=_too_much(ua, components, assumed))
    heats = [s.heat(year) * to_units for s in states]
    held = _through(_State(ua, setpoint, tau, moves=False), components)
    saved = heats[0] - heats[-1]
    steps = tuple(
        Step(c.name, kind_of(c), heats[i] - heats[i + 1], states[i + 1].ua, states[i + 1].balance_f)
        for i, c in enumerate(components)
    )
    found = Expectation(
        saved=saved,
        fraction=saved / nac_before if nac_before is not None and nac_before > 0.0 else None,
        balance_held=heats[0] - held[-1].heat(year) * to_units,
        steps=steps,
        ua_before=ua,
        ua_after=states[-1].ua,
        balance_before_f=tau,
        balance_after_f=states[-1].balance_f,
        setpoint_f=setpoint,
        efficiency=efficiency,
        assumed=assumed,
        cautions=_cautions(components, house, tau, setpoint, efficiency, undescribed),
    )
    return _beside(found, measured)


NO_SLOPE: Final = "its bills before the work show no heating slope to compute from"


def _why_not(
    fit: Fit | None, year: LongTermYear | None, components: Sequence[Component], house: House
) -> str:
    if fit is None:
        return "there is no fit of the bills before the work to compute from"
    if fit.heating_slope is None or fit.balance_heating_f is None or fit.heating_slope <= 0.0:
        return NO_SLOPE
    if year is None:
        return "there is no long-term year"
    if house.btu_per_unit is None:
        return "the heat content of its unit is not known"
    if house.other_heaters and house.heating_share is None:
        others = " and ".join(house.other_heaters)
        return (
            f"{others} may heat the house too; write heating_share = 0.6 (this account's share of "
            "the house's heat) under its [[account]]"
        )
    taken = sum(c.share for c in components if isinstance(c, Equipment))
    if taken > 1.0 + 1e-9:
        return (
            f"the shares of the equipment replaced add up to {taken:.2f} of the heating; they "
            "cannot be more than 1"
        )
    return ""


def _inputs(components: Sequence[Component], house: House) -> tuple[float, float, tuple[str, ...]]:
    """(efficiency before, setpoint, what of it is assumed)."""
    assumed = []
    efficiency = house.efficiency
    if efficiency is None:
        # Only equipment that carried all the heat speaks for the account.
        stated = [c for c in components if isinstance(c, Equipment) and c.share == 1.0]
        if stated:
            efficiency = stated[0].efficiency_before
    if efficiency is None:
        efficiency = EFFICIENCY.get(house.fuel, 1.0)
        assumed.append(f"heating efficiency {efficiency:.2f} (site.toml: efficiency)")
    setpoint = house.setpoint_f
    if setpoint is None:
        setpoint = HEATING_SETPOINT_F
        assumed.append(f"indoor temperature {setpoint:g} °F (site.toml: heating_setpoint_f)")
    assumed += [
        f"natural airflow as the blower door's 50 Pa figure divided by {c.divisor:g} "
        "(site.toml: blower_door_divisor)"
        for c in components
        if isinstance(c, AirSealing) and c.divisor is not None
    ]
    return efficiency, setpoint, tuple(dict.fromkeys(assumed))


def _through(state: _State, components: Sequence[Component]) -> list[_State]:
    """The house before the first component and after each; ends where no loss is left."""
    states = [state]
    for component in components:
        states.append(states[-1].after(component))
        if states[-1].ua <= 0.0:
            break
    return states


def _too_much(ua: float, components: Sequence[Component], assumed: Sequence[str]) -> str:
    cut = sum(
        c.ua_cut for c in components if isinstance(c, Insulation | Windows | AirSealing)
    )  # fmt: skip
    text = (
        f"the work as described would take away {cut:,.0f} Btu/h·°F, and the bills before it show "
        f"a heat loss of only {ua:,.0f}: an area, an R-value or an airflow cannot be right"
    )
    if any(isinstance(c, AirSealing) and c.divisor is None for c in components):
        text += (
            "; an airflow that a blower door measured at 50 Pa is about twenty times the natural "
            "one and belongs in blower_door_cfm50_before and blower_door_cfm50_after"
        )
    if any(word.startswith("heating efficiency") for word in assumed):
        text += "; the efficiency is assumed, so state it"
    return text


def _beside(found: Expectation, measured: Estimate) -> Expectation:
    """With the ratio of measured to expected."""
    if (
        found.saved is None
        or not found.saved > 0.0
        or measured.value is None
        or measured.low is None
        or measured.high is None
    ):
        return found
    return replace(
        found,
        ratio=measured.value / found.saved,
        ratio_low=measured.low / found.saved,
        ratio_high=measured.high / found.saved,
    )


STEADY: Final = (
    "The expectation is a steady-state calculation, best for light construction and large "
    "temperature differences. Heavy walls store heat and humid cooling carries load that "
    "temperature does not see: both are outside it, and so is any saving in cooling."
)
TIGHTER: Final = (
    "Air sealing changes ventilation and draft: have combustion safety and ventilation checked "
    "by licensed people under local code."
)


def _cautions(
    components: Sequence[Component],
    house: House,
    tau: float,
    setpoint: float,
    efficiency: float,
    undescribed: Sequence[str],
) -> tuple[str, ...]:
    told = [STEADY]
    if any(isinstance(c, AirSealing) for c in components):
        told.append(TIGHTER)
    if any(isinstance(c, Insulation) for c in components):
        told.append(
            "R-values are of the whole assembly: framing, gaps and compressed batts make it lower "
            "than the label, and the expected saving smaller."
        )
    if any(isinstance(c, Setback) for c in components):
        told.append(
            "The setback is taken as if the house cooled and warmed at once; a house that holds "
            "its heat saves less."
        )
    if tau >= setpoint:
        told.append(
            f"The balance temperature ({tau:.1f} °F) is not below the indoor temperature "
            f"({setpoint:g} °F), so it was taken not to move with the heat loss; is the indoor "
            "temperature right?"
        )
    told += [
        f"The account's efficiency ({efficiency:.2f}) and that of the equipment before the work "
        f"({c.efficiency_before:.2f}) differ: the first was used for the heat loss, the second "
        "for the equipment."
        for c in components
        if isinstance(c, Equipment)
        and c.share == 1.0
        and abs(c.efficiency_before - efficiency) > SAME_EFFICIENCY
    ]
    if undescribed:
        names = " and ".join(undescribed)
        told.append(f"It does not contain {names}, for which no components are described.")
    return tuple(told)
