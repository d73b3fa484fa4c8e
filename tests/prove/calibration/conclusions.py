"""What the numbers say about picking a form or averaging, in sentences made from them."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from tests.prove.calibration.choice import ALONE, AVERAGED, PICK_AICC, PICK_BIC, Choice
from tests.prove.calibration.judge import HIGH, LOW

WORTHWHILE = 0.03  # a gain in error smaller than this share is no reason to change
RIVALS = {PICK_AICC: PICK_BIC, AVERAGED: ALONE}  # each against the same ranges by BIC


def conclusion(results: Sequence[Choice]) -> str:
    """One paragraph a number of bills, then the choice that follows."""
    groups: dict[tuple[int, float], list[Choice]] = {}
    for r in sorted(results, key=lambda r: (r.cell.bills, r.cell.noise)):
        groups.setdefault((r.cell.bills, r.cell.noise), []).append(r)
    paragraphs = [_at(rows, *key) for key, rows in groups.items()]
    return "\n\n".join([*paragraphs, _choice(results)])


def mean_of(results: Sequence[Choice], way: str, what: str) -> float:
    """Mean over cells of one score of one way."""
    return float(np.mean([getattr(r.scores[way], what) for r in results]))


def gain(results: Sequence[Choice], way: str, against: str) -> float:
    """Relative fall of the mean rms error of savings; positive is better than ``against``."""
    base = mean_of(results, against, "rms_savings")
    return 1.0 - mean_of(results, way, "rms_savings") / base


def _at(results: Sequence[Choice], bills: int, noise: float) -> str:
    told = [f"**{bills} bills a side, {noise:.0%} noise** ({len(results)} cells)."]
    errors = ", ".join(
        f"{way} {100 * mean_of(results, way, 'rms_savings'):.2f} %"
        for way in (PICK_BIC, PICK_AICC, AVERAGED)
    )
    told.append(f"Rms error of savings, of NAC: {errors}.")
    for way, against in RIVALS.items():
        better = gain(results, way, against)
        wins = sum(r.scores[way].rms_savings < r.scores[against].rms_savings for r in results)
        word = "smaller" if better > 0 else "larger"
        said = (
            f"{abs(better):.1%} {word} than BIC's" if abs(better) >= 5e-4 else "as large as BIC's"
        )
        told.append(
            f"{way.capitalize() if way == AVERAGED else way}: {said}, the smaller one in {wins} "
            f"of {len(results)} cells."
        )
    covers = ", ".join(
        f"{way} {mean_of(results, way, 'coverage_savings'):.3f}"
        for way in (PICK_BIC, PICK_AICC, ALONE, AVERAGED)
    )
    told.append(f"Coverage of savings: {covers}.")
    worst = max(results, key=lambda r: abs(gain([r], PICK_AICC, PICK_BIC)))
    told.append(
        f"The two criteria differ most where {worst.cell.form} is true (ρ {worst.cell.rho:g}): "
        f"BIC names it in {worst.scores[PICK_BIC].right_form:.0%}, AICc in "
        f"{worst.scores[PICK_AICC].right_form:.0%}; rms error of savings "
        f"{100 * worst.scores[PICK_BIC].rms_savings:.2f} % and "
        f"{100 * worst.scores[PICK_AICC].rms_savings:.2f} %."
    )
    return " ".join(told)


def _choice(results: Sequence[Choice]) -> str:
    gains = {way: gain(results, way, against) for way, against in RIVALS.items()}
    best = max(gains, key=lambda w: gains[w])
    inside = {
        way: sum(LOW <= r.scores[way].coverage_savings <= HIGH for r in results)
        for way in (PICK_BIC, PICK_AICC, ALONE, AVERAGED)
    }
    covers = "; ".join(f"{way} in {inside[way]} of {len(results)} cells" for way in inside)
    facts = (
        f"Over all {len(results)} cells AICc changes the rms error of savings by "
        f"{-gains[PICK_AICC]:+.1%} and averaging by {-gains[AVERAGED]:+.1%}. Coverage of savings "
        f"lies within {LOW:.2f}–{HIGH:.2f}: {covers}."
    )
    if gains[best] < WORTHWHILE or inside[best] < inside[RIVALS[best]]:
        told = (
            f"Neither lowers the error by as much as {WORTHWHILE:.0%} with coverage at least as "
            "good, and one form that can be drawn and checked is worth more to a reader than a "
            "mean of several. **So the program picks one form by BIC, at 12 bills as elsewhere**, "
            "and shows the answer averaged over forms beside it."
        )
    else:
        told = (
            f"**{best.capitalize() if best == AVERAGED else best} lowers the error by "
            f"{gains[best]:.1%} without losing coverage: by this study it should be preferred.**"
        )
    return f"**Reasoned choice.** {facts} {told}"
