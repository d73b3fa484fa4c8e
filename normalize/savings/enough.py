"""Is there enough on a side of the work?  If not, why not, and when will there be."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from normalize.days import iso
from normalize.defaults import MIN_ABS_T, MIN_DAYS_A_SIDE, SPARE_PERIODS
from normalize.fitting.align import Aligned
from normalize.fitting.fit import chosen_of
from normalize.fitting.forms import BY_CODE, NO_BALANCE, REASONS, TOO_FEW
from normalize.fitting.results import FormTried
from normalize.savings.sides import Work
from normalize.savings.stated import FEWEST


@dataclass(frozen=True, slots=True)
class SideFacts:
    """What decides whether a side suffices.

    n, days : usable periods and their days.  last : end of its last usable period.
    typical : median days of a period.  chosen : name of the form or "".
    blind : the load answers to weather but no balance temperature can be placed.
    beyond : bills that the weather record does not reach; weather_end : its end.
    """

    name: str
    n: int
    days: int
    last: int | None
    typical: int
    chosen: str
    blind: str
    delivered: bool
    beyond: int = 0
    weather_end: int | None = None

    @classmethod
    def of(
        cls,
        aligned: Aligned,
        labels: tuple[str, ...],
        name: str,
        tried: Sequence[FormTried],
        offered: Sequence[str],
        delivered: bool = False,
    ) -> SideFacts:
        """Facts of the side called ``name``."""
        mine = np.array([label == name for label in labels], dtype=np.bool_)
        lengths = aligned.days[mine]
        best = chosen_of(tried)
        return cls(
            name=name,
            n=int(mine.sum()),
            days=int(lengths.sum()),
            last=int(aligned.end[mine].max()) if mine.any() else None,
            typical=int(np.median(lengths)) if mine.any() else 30,
            chosen=best.form if best else "",
            blind=_blind(tried, offered, best.form if best else ""),
            delivered=delivered,
            beyond=int(((aligned.end > aligned.weather.last_day) & _on(name, aligned, mine)).sum()),
            weather_end=aligned.weather.last_day,
        )


def _on(name: str, aligned: Aligned, mine: NDArray[np.bool_]) -> NDArray[np.bool_]:
    """Bills later than the side's last usable one; only the side after the work has such."""
    if name != "after":
        return np.zeros(aligned.n, dtype=np.bool_)
    last = aligned.end[mine].max() if mine.any() else aligned.start.min(initial=0)
    late: NDArray[np.bool_] = aligned.start >= last
    return late


def _blind(tried: Sequence[FormTried], offered: Sequence[str], chosen: str) -> str:
    """Why a flat load must not be believed: no slope could be tried, yet weather shows."""
    if chosen != "flat":
        return ""
    slopes = [t for t in tried if t.form in offered and t.form not in ("flat", "line")]
    if not slopes or any(t.fit is not None for t in slopes):
        return ""
    line = next((t.fit for t in tried if t.form == "line"), None)
    if line is None or abs(line.t[1]) < MIN_ABS_T:
        return ""
    starved = REASONS[NO_BALANCE]
    few = REASONS[TOO_FEW].split(":")[0]
    return next((t.reason for t in slopes if t.reason in (starved,) or few in t.reason), "")


def _lacks(facts: SideFacts) -> str:
    when = "before the work" if facts.name == "before" else "after the work"
    if facts.n == 0 and not facts.delivered:
        return f"there are no usable bills {when}"
    if facts.delivered and facts.n < FEWEST:
        return _fills(facts, when)
    if facts.days < MIN_DAYS_A_SIDE:
        return (
            f"there are {facts.days} days of bills {when}; {MIN_DAYS_A_SIDE} are needed "
            "to see a normal year"
        )
    if not facts.chosen:
        least = BY_CODE[0].parameters + SPARE_PERIODS
        return f"no form fits the {facts.n} bills {when} (at least {least} are needed)"
    if facts.blind:
        return f"{when}, use answers to weather but {facts.blind}"
    return ""


def _fills(facts: SideFacts, when: str) -> str:
    """How many more full fills a delivered fuel needs: the first one only opens the record."""
    missing = FEWEST - facts.n + (1 if facts.n == 0 else 0)
    number = ("one", "two", "three", "four", "five", "six")[missing - 1]
    return (
        f"there are {facts.n} intervals between full fills {when} and {FEWEST} are needed: "
        f"{number} more full fill{'s' if missing > 1 else ''}"
    )


def before_reason(facts: SideFacts) -> tuple[str, int | None]:
    """Why the baseline does not suffice; time does not cure that, older bills may."""
    reason = _lacks(facts)
    return (f"{reason}. Older bills would help" if reason else ""), None


def after_reason(facts: SideFacts, work: Work) -> tuple[str, int | None]:
    """Why the reporting period does not suffice, and the day from which it may."""
    reason = _lacks(facts)
    if not reason:
        return "", None
    if facts.beyond and facts.weather_end is not None:
        return (
            f"{reason}. The weather record ends on {iso(facts.weather_end - 1)}, before "
            f"{facts.beyond} of the bills do: later weather would help",
            None,
        )
    missing = max(MIN_DAYS_A_SIDE - facts.days, 0)
    start = facts.last if facts.last is not None else work.end
    if missing == 0:
        # Enough days, but too few bills or only one season: at most a full year cures it.
        missing = max(365 - facts.days, facts.typical)
    periods = -(-missing // max(facts.typical, 1))
    return reason, start + periods * facts.typical
