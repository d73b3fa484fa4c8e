"""One account's answer looked at closely: evidence of both fits, without each bill, placebo."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from normalize.savings.evidence import SideEvidence, evidence_of
from normalize.savings.influence import Without, without_each
from normalize.savings.placebo import Placebo, placebo_of

if TYPE_CHECKING:
    from normalize.savings.again import Asked
    from normalize.savings.compare import Comparison


@dataclass(frozen=True, slots=True)
class Scrutiny:
    """evidence : of the sides that have a fit.  without : the answer without each bill, where
    there is an answer.  placebo : invented work dates in the baseline, or why there are none.
    """

    evidence: tuple[SideEvidence, ...] = ()
    without: tuple[Without, ...] = ()
    placebo: Placebo | None = None


def scrutinise(
    asked: Asked, found: Comparison, *, work_start: int, delivered: bool = False
) -> Scrutiny:
    """Everything that checks of one account need beyond the answer itself."""
    savings = found.savings
    answered = savings.normalized.available or savings.avoided.available
    return Scrutiny(
        evidence=evidence_of(asked.aligned, found, asked.year),
        without=without_each(asked, found.labels) if answered else (),
        placebo=placebo_of(asked, found.labels, work_start=work_start, delivered=delivered),
    )
