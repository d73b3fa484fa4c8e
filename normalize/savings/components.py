"""What an upgrade consists of, as site.toml describes it: areas, R-values, airflow, efficiency.

Light on purpose: site files are read without loading any science.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

# Btu per hour, °F and cfm of air: 0.24 Btu/lb·°F × 0.075 lb/ft³ × 60 min/h (common practice).
SENSIBLE: Final = 1.08
# From the blower door's 50 Pa figure to the natural airflow of a year: about twenty in a
# cold, sheltered, two-storey house, 10 to 30 elsewhere (common practice, no source).
BLOWER_DOOR_DIVISOR: Final = 20.0


@dataclass(frozen=True, slots=True)
class Insulation:
    """A part of the envelope insulated.

    area_ft2; r_before, r_after : of the whole assembly, ft²·°F·h/Btu.
    """

    name: str
    area_ft2: float
    r_before: float
    r_after: float

    @property
    def ua_cut(self) -> float:
        """Heat-loss rate that it takes away, A·(1/R₁ − 1/R₂). [Btu/h·°F]

        >>> round(Insulation("attic", 1000.0, 11.0, 38.0).ua_cut, 2)
        64.59
        """
        return self.area_ft2 * (1.0 / self.r_before - 1.0 / self.r_after)


@dataclass(frozen=True, slots=True)
class Windows:
    """Windows or doors replaced. area_ft2; u_before, u_after : Btu/h·ft²·°F, frame included."""

    name: str
    area_ft2: float
    u_before: float
    u_after: float

    @property
    def ua_cut(self) -> float:
        """Heat-loss rate that they take away, A·(U₁ − U₂). [Btu/h·°F]

        >>> Windows("windows", 150.0, 1.0, 0.3).ua_cut
        105.0
        """
        return self.area_ft2 * (self.u_before - self.u_after)


@dataclass(frozen=True, slots=True)
class AirSealing:
    """Air sealing. cfm_before, cfm_after : natural airflow, ft³/min, averaged over the season.

    divisor : by which a blower door's 50 Pa figures were divided; None when the natural
    airflow was given itself.
    """

    name: str
    cfm_before: float
    cfm_after: float
    divisor: float | None = None

    @property
    def ua_cut(self) -> float:
        """Heat-loss rate that it takes away, 1.08·Δcfm at sea level. [Btu/h·°F]

        >>> round(AirSealing("air sealing", 130.0, 95.0).ua_cut, 1)
        37.8
        """
        return SENSIBLE * (self.cfm_before - self.cfm_after)


@dataclass(frozen=True, slots=True)
class Equipment:
    """Heating equipment replaced by one of the same fuel.

    efficiency_before, efficiency_after : heat out per heat in, over a season (0.80; a heat
    pump's 2.5).  share : of the account's heating fuel that this equipment took.
    """

    name: str
    efficiency_before: float
    efficiency_after: float
    share: float = 1.0

    @property
    def fuel_cut(self) -> float:
        """Share of the heating fuel that it takes away, share·(1 − η₁/η₂).

        >>> round(Equipment("furnace", 0.80, 0.95).fuel_cut, 3)
        0.158
        """
        return self.share * (1.0 - self.efficiency_before / self.efficiency_after)


@dataclass(frozen=True, slots=True)
class Setback:
    """A lower thermostat setting. degrees_f lower, for hours_a_day."""

    name: str
    degrees_f: float
    hours_a_day: float

    @property
    def mean_f(self) -> float:
        """By how much the mean setting is lower, if the house cools and warms at once. [°F]

        >>> Setback("nights", 6.0, 8.0).mean_f
        2.0
        """
        return self.degrees_f * self.hours_a_day / 24.0


Envelope = Insulation | Windows | AirSealing
Component = Envelope | Equipment | Setback

KINDS: Final[dict[str, type[Component]]] = {
    "insulation": Insulation,
    "windows": Windows,
    "air sealing": AirSealing,
    "equipment": Equipment,
    "setback": Setback,
}


def kind_of(component: Component) -> str:
    """The name of a component's kind.

    >>> kind_of(Setback("nights", 6.0, 8.0))
    'setback'
    """
    return next(kind for kind, made in KINDS.items() if isinstance(component, made))
