"""The heating slope as a physicist reads it: a rate of heat loss, and what its change suggests.

Readings are hypotheses.  Other causes have the same signs, and bills do not choose between them
(docs/method.md §7).
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Final

from normalize.savings.expectation import heat_loss_rate

if TYPE_CHECKING:
    from normalize.savings.results import Estimate
    from normalize.savings.taken_apart import Parts


@dataclass(frozen=True, slots=True)
class HeatLoss:
    """Heat-loss rates of one account, each with its range; change : before − after.

    before, after, change : effective, UA/η = b·HC/24.  [Btu/h·°F]
    efficiency : of the heating before the work, as stated; ua_before… : UA itself, with it.
        After equipment was replaced ua_after uses the new one's, and ua_change is None.
    intensity_before… : b·HC/area.  [Btu/ft²·°F·day]
    reading : what the signs of the changes usually go with, in words; a hypothesis.
    """

    before: Estimate | None
    after: Estimate | None
    change: Estimate | None
    efficiency: float | None = None
    efficiency_after: float | None = None
    ua_before: Estimate | None = None
    ua_after: Estimate | None = None
    ua_change: Estimate | None = None
    intensity_before: Estimate | None = None
    intensity_after: Estimate | None = None
    intensity_change: Estimate | None = None
    reading: str = ""


def heat_loss_of(
    parts: Parts,
    *,
    btu_per_unit: float | None,
    efficiency: float | None = None,
    efficiency_after: float | None = None,
    floor_area_ft2: float | None = None,
) -> HeatLoss | None:
    """Heat-loss rates from the heating slopes; None where no side shows a heating slope.

    btu_per_unit : heat content of the account's unit.  efficiency : of the heating before the
    work, where it is stated; efficiency_after : of the equipment put in, where it is described.
    """
    slopes = (parts.slope_before, parts.slope_after, parts.slope_change)
    if btu_per_unit is None or slopes == (None, None, None):
        return None
    before, after, change = (_times(s, heat_loss_rate(1.0, btu_per_unit)) for s in slopes)
    found = HeatLoss(before, after, change, reading=reading_of(parts))
    if efficiency is not None:
        later = efficiency if efficiency_after is None else efficiency_after
        found = replace(
            found,
            efficiency=efficiency,
            efficiency_after=later,
            ua_before=_times(before, efficiency),
            ua_after=_times(after, later),
            ua_change=_times(change, efficiency) if later == efficiency else None,
        )
    if floor_area_ft2 is not None:
        per_area = (_times(s, btu_per_unit / floor_area_ft2) for s in slopes)
        a, b, c = per_area
        found = replace(found, intensity_before=a, intensity_after=b, intensity_change=c)
    return found


def _times(estimate: Estimate | None, factor: float) -> Estimate | None:
    """The same estimate in another unit; factor above zero."""
    if estimate is None:
        return None

    def scaled(value: float | None) -> float | None:
        return None if value is None else value * factor

    return replace(
        estimate,
        value=scaled(estimate.value),
        low=scaled(estimate.low),
        high=scaled(estimate.high),
        plain_low=scaled(estimate.plain_low),
        plain_high=scaled(estimate.plain_high),
    )


HYPOTHESIS: Final = "That is a hypothesis, not a finding: other causes leave the same signs."
# (slope, balance temperature) → what usually leaves such signs (common practice, no source).
_USUAL: Final[dict[tuple[str, str], str]] = {
    ("reduction", "reduction"): "A lower heating slope and a lower balance temperature is what "
    "insulation and air sealing usually do, and what another heater that took over can leave.",
    ("reduction", "cannot tell"): "A lower heating slope is what insulation and air sealing, "
    "more efficient equipment, or another heater that took over usually leaves. The first two "
    "lower the balance temperature too; here it could not be told from no change, so the bills do "
    "not choose.",
    ("cannot tell", "reduction"): "A lower balance temperature is what a lower thermostat setting, "
    "more heat from people, sun and appliances, or insulation usually leaves. Insulation lowers "
    "the heating slope too; here it could not be told from no change, so the bills do not choose.",
    ("reduction", "increase"): "A lower heating slope with a higher balance temperature is an "
    "unusual pair: the two err against each other, so read neither alone.",
    ("increase", "reduction"): "A higher heating slope with a lower balance temperature is an "
    "unusual pair: the two err against each other, so read neither alone.",
    ("increase", "increase"): "A higher heating slope and a higher balance temperature is what "
    "lost insulation, more outdoor air, or heating that moved to this account usually leaves.",
    ("increase", "cannot tell"): "A higher heating slope, with a balance temperature that could "
    "not be told from no change, is what less efficient equipment, more outdoor air, or heating "
    "that moved to this account usually leaves.",
    ("cannot tell", "increase"): "A higher balance temperature, with a heating slope that could "
    "not be told from no change, is what a higher thermostat setting or less heat from people, sun "
    "and appliances usually does.",
    ("cannot tell", "cannot tell"): "Neither the heating slope nor the balance temperature could "
    "be told from no change on its own, so the bills do not say which of the two changed.",
}


def reading_of(parts: Parts) -> str:
    """What the signs of the two heating parts usually go with; empty where there are no parts."""
    by_name = {p.name: p.estimate.verdict for p in parts.parts}
    slope = by_name.get("heating slope")
    balance = by_name.get("heating balance temperature")
    told = _USUAL.get((slope or "", balance or ""), "")
    if not told or "unusual pair" in told or slope == balance == "cannot tell":
        return told
    return f"{told} {HYPOTHESIS}"
