"""The targets of the study, each met or missed and by how much, and why a cell is outside."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

from tests.prove.calibration.cells import Cell
from tests.prove.calibration.measures import QUANTITIES, Result

LOW, HIGH = 0.87, 0.97
LEAST_SHARE = 0.95
LEAST_BILLS = 12
MOST_RHO = 0.5
MOST_ALARMS = 0.12
RIGHT_FORM = {"flat": 0.93, "heating": 0.93, "cooling": 0.93, "heating and cooling": 0.80}
RIGHT_BILLS, RIGHT_NOISE = 24, 0.10
PROMISED = 0.90
MANY = 0.25  # of homes: enough to colour a cell
NEAR = "within two Monte Carlo errors of the target"
ALARM_QUANTITIES = ("normalized", "avoided")


@dataclass(frozen=True, slots=True)
class Verdict:
    """One target. found : what was measured, in words; met."""

    target: str
    found: str
    met: bool


def in_scope(cell: Cell) -> bool:
    """Whether the coverage target speaks of a cell: enough bills, correlation not extreme."""
    return cell.bills >= LEAST_BILLS and cell.rho <= MOST_RHO


def outside(result: Result, quantity: str) -> bool:
    """Whether a quantity's coverage lies outside the target's band."""
    return not LOW <= result.of(quantity).coverage <= HIGH


def coverage_verdict(results: Iterable[Result], quantity: str, where: str) -> Verdict:
    """Share of the cells in scope whose coverage lies in the band."""
    judged = [r for r in results if in_scope(r.cell)]
    inside = sum(not outside(r, quantity) for r in judged)
    share = inside / len(judged)
    worst = min(judged, key=lambda r: r.of(quantity).coverage).of(quantity)
    return Verdict(
        f"coverage of {NAMES[quantity]} within {LOW:.2f}–{HIGH:.2f} in at least {LEAST_SHARE:.0%} "
        f"of cells with {LEAST_BILLS} bills or more and correlation up to {MOST_RHO:g}, {where}",
        f"{inside} of {len(judged)} cells ({share:.1%}); lowest {worst.coverage:.3f} "
        f"± {worst.error:.3f}",
        share >= LEAST_SHARE,
    )


def alarm_verdict(results: Iterable[Result], quantity: str, where: str) -> Verdict:
    """Whether no cell in scope announces a change too often where nothing was done."""
    judged = [r for r in results if in_scope(r.cell)]
    over = [r for r in judged if r.of(quantity).alarms > MOST_ALARMS]
    worst = max(judged, key=lambda r: r.of(quantity).alarms)
    return Verdict(
        f"placebo alarms of {NAMES[quantity]} at most {MOST_ALARMS:.0%}, same cells, {where}",
        f"{len(judged) - len(over)} of {len(judged)} cells; highest "
        f"{worst.of(quantity).alarms:.1%} ({short(worst.cell)})",
        not over,
    )


def form_verdicts(core: Iterable[Result]) -> list[Verdict]:
    """The right form at 24 bills and 10 % noise, by form, at every correlation of the core."""
    out = []
    for form, least in RIGHT_FORM.items():
        judged = [
            r for r in core
            if r.cell.form == form and r.cell.bills == RIGHT_BILLS and r.cell.noise == RIGHT_NOISE
        ]  # fmt: skip
        judged.sort(key=lambda r: r.cell.rho)
        if not judged:
            continue
        told = ", ".join(f"{r.right_form:.1%} at {r.cell.rho:g}" for r in judged)
        missed = [r for r in judged if r.right_form < least and r.cell.rho <= MOST_RHO]
        out.append(
            Verdict(
                f"right form chosen in at least {least:.0%}: {form}, {RIGHT_BILLS} bills, "
                f"{RIGHT_NOISE:.0%} noise, correlation up to {MOST_RHO:g}",
                f"by correlation: {told}",
                not missed,
            )
        )
    return out


NAMES = {
    "nac before": "NAC before the work",
    "normalized": "normalized savings",
    "avoided": "avoided use",
}


def short(cell: Cell) -> str:
    """A cell in a few words, naming what differs from the hub of the design.

    >>> short(Cell("heating", 12, 0.3))
    'heating, 12 bills, correlation 0.3'
    """
    parts = [cell.form]
    if cell.schedule == "delivered":
        parts.append(f"{cell.bills} deliveries at {cell.a_year} a year")
    elif cell.schedule == "daily":
        parts.append(f"{cell.bills} days")
    else:
        two = "two-monthly " if cell.schedule == "two-monthly" else ""
        parts.append(f"{cell.bills} {two}bills")
    parts.append(f"correlation {cell.rho:g}")
    if cell.noise != RIGHT_NOISE and cell.schedule != "daily":
        parts.append(f"noise {cell.noise:.0%}")
    if cell.climate != "temperate":
        parts.append(f"{cell.climate} climate")
    parts += [
        words
        for words, there in (
            ("t errors", cell.tails == "t3"), ("outliers", cell.tails == "outliers"),
            ("errors by use", cell.spread == "use"), ("errors alike", cell.spread == "equal"),
            ("estimates joined", cell.folded), ("weekly pattern", cell.pattern == "weekly"),
            ("slow component", cell.pattern == "slow"),
            ("heating fuel", cell.offer == "heat"),
            ("form not offered", cell.form not in cell.offered),
        )
        if there
    ]  # fmt: skip
    return ", ".join(parts)


def reasons(result: Result) -> str:
    """The likeliest reason for a coverage outside the band, from what was counted beside it."""
    cell = result.cell
    worst = min(QUANTITIES, key=lambda q: result.of(q).coverage)
    coverage = result.of(worst).coverage
    found: list[str] = []
    if max(result.of(q).coverage for q in QUANTITIES) > HIGH and coverage >= LOW:
        return _cautious(result)
    if cell.form not in cell.offered:
        found.append("the true form was not offered, so the fit is another's")
    found += _parts(result)
    if cell.schedule != "daily" and cell.rho - result.rho > 0.08:
        found.append(
            f"correlation is judged too low (mean {result.rho:.2f} where {cell.rho:g} is true): "
            "the fit takes up part of it and few bills tell the rest"
        )
    half = 0.5 * result.of(worst).median_width
    if abs(result.bias[worst]) > 0.25 * half:
        found.append(f"the value is off by {result.bias[worst]:+.1%} of NAC on average")
    if cell.pattern:
        found.append("the errors are no autoregression of one day's memory")
    if cell.spread == "use":
        found.append("the bills that carry the slope err most, and weights by days do not know it")
    if cell.spread == "equal":
        found.append("the errors do not shrink with the days as the weights assume")
    if cell.tails != "normal":
        found.append("t ranges are made for normal errors")
    margin = min(abs(coverage - LOW), abs(coverage - HIGH))
    if margin <= 2.0 * result.of(worst).error:
        found.append(NEAR)
    return "; ".join(found) or "no single reason stands out"


def _cautious(result: Result) -> str:
    """Why a coverage is above the band."""
    found = [
        "cautious: so few bills cannot rule out strong correlation, and the range allows for it"
    ]
    coverage, count = result.parts.get("τ integrated over", (float("nan"), 0))
    share = count / result.homes
    if share >= MANY and coverage > PROMISED:
        found.append(
            f"in {share:.0%} of homes the bills place the balance temperature badly and the range "
            f"integrates over it (coverage {coverage:.2f})"
        )
    top = max(QUANTITIES, key=lambda q: result.of(q).coverage)
    if result.of(top).coverage - HIGH <= 2.0 * result.of(top).error:
        found.append(NEAR)
    return "; ".join(found)


def _parts(result: Result) -> list[str]:
    """Homes of a kind that hold half of what is missing to 90 %."""
    missing = PROMISED - result.of("normalized").coverage
    n = result.of("normalized").n
    out = []
    for name, words in (
        ("other form before", "homes whose baseline was given another form"),
        ("τ on its bound", "homes whose balance temperature ended on its bound"),
        ("τ held", "homes whose balance temperature was held"),
        ("τ integrated over", "homes whose balance temperature was integrated over"),
        ("τ stated", "homes answered at a stated balance temperature"),
    ):
        coverage, count = result.parts.get(name, (float("nan"), 0))
        if count and missing > 0.0 and count / n * (PROMISED - coverage) >= 0.5 * missing:
            out.append(f"{words} ({count / n:.0%}) cover {coverage:.2f}")
    return out


def outside_cells(results: Sequence[Result]) -> list[Result]:
    """Cells in scope with any of the three coverages outside the band."""
    return [
        r for r in results if in_scope(r.cell) and any(outside(r, q) for q in QUANTITIES)
    ]  # fmt: skip
