"""What each single bill weighs in the answer: the answer without it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from normalize.fitting.columns import UNUSED
from normalize.savings.again import Asked, ask_again
from normalize.savings.results import Estimate
from normalize.savings.sides import codes


@dataclass(frozen=True, slots=True)
class Without:
    """The answer without one bill.

    number : of its period, from 1; start, end : day numbers, half-open; side : "before" or
    "after".  form_before, form_after : chosen then, "" where none fits.
    """

    number: int
    side: str
    start: int
    end: int
    form_before: str
    form_after: str
    normalized: Estimate
    avoided: Estimate


def without_each(asked: Asked, labels: Sequence[str]) -> tuple[Without, ...]:
    """The whole comparison, choice of form included, once without each bill in use.

    labels : (periods,) as ``Comparison.labels``.  One batch; nothing is approximated.
    """
    aligned = asked.aligned
    own = codes(tuple(labels))
    used = np.flatnonzero((own != UNUSED) & aligned.usable)
    if used.shape[0] == 0:
        return ()
    sides = np.tile(own, (used.shape[0], 1))
    sides[np.arange(used.shape[0]), used] = UNUSED
    found = ask_again(asked, sides)
    return tuple(
        Without(
            number=int(p) + 1,
            side=labels[p],
            start=int(aligned.start[p]),
            end=int(aligned.end[p]),
            form_before=found.form(i, 0),
            form_after=found.form(i, 1),
            normalized=found.normalized(i),
            avoided=found.avoided(i),
        )
        for i, p in enumerate(used.tolist())
    )
