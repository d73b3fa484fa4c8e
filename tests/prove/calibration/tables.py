"""Tables of the study in Markdown."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence

from tests.prove.calibration.cells import Cell
from tests.prove.calibration.choice import WAYS, Choice
from tests.prove.calibration.judge import Verdict, outside, short
from tests.prove.calibration.measures import QUANTITIES, Result

COLUMNS = (
    "NAC", "plain", "savings", "plain", "avoided", "plain", "G14", "G14, ρ=0",
    "alarms", "plain", "width", "plain", "bias", "rms", "right form", "no answer",
)  # fmt: skip
KEY = (
    "Coverage of nominal 90 % ranges of **NAC** before the work, normalized **savings** and "
    "**avoided** use by the default and by the plain delta method; **G14** is the Guideline 14 "
    "formula for avoided use with each home's own lag-1 correlation and taking it for zero. "
    "**Alarms**: share of homes where nothing was done whose range of normalized savings "
    "excludes zero. **Width** (high − low, mean), **bias** and **rms** error of normalized "
    "savings are in percent of true NAC. **Right form** is of the homes with an answer; "
    "**no answer** of all homes. Bold coverages lie outside the target's band."
)


def markdown(head: Sequence[str], rows: Iterable[Sequence[str]], left: int = 1) -> str:
    """A table; the first ``left`` columns are words, the others numbers.

    >>> print(markdown(["a", "b"], [["x", "1"]]))
    | a | b |
    | :-- | --: |
    | x | 1 |
    """
    rule = [":--"] * left + ["--:"] * (len(head) - left)
    lines = [head, rule, *rows]
    return "\n".join("| " + " | ".join(line) + " |" for line in lines)


def of_cells(
    results: Sequence[Result], names: Sequence[str], name: Callable[[Cell], Sequence[str]]
) -> str:
    """One row a cell. names : headings of what ``name`` gives."""
    rows = [[*name(r.cell), *_numbers(r)] for r in results]
    return markdown([*names, *COLUMNS], rows, len(names))


def _numbers(r: Result) -> list[str]:
    def share(quantity: str, method: str = "default") -> str:
        text = _three(r.of(quantity, method).coverage)
        return f"**{text}**" if method == "default" and outside(r, quantity) else text

    normal, plain = r.of("normalized"), r.of("normalized", "plain")
    return [
        *(share(q, m) for q in QUANTITIES for m in ("default", "plain")),
        share("avoided", "guideline"), share("avoided", "guideline, no correlation"),
        _three(normal.alarms), _three(plain.alarms),
        f"{100 * normal.width:.1f}", f"{100 * plain.width:.1f}",
        f"{100 * r.bias['normalized']:+.1f}", f"{100 * r.rms['normalized']:.1f}",
        f"{r.right_form:.0%}", f"{r.unavailable:.0%}",
    ]  # fmt: skip


def _three(share: float) -> str:
    return f"{share:.3f}" if share == share else "–"  # NaN: nobody had an answer


def of_verdicts(verdicts: Iterable[Verdict]) -> str:
    """Targets, what was found, met or missed."""
    rows = [[v.target, v.found, "met" if v.met else "**missed**"] for v in verdicts]
    return markdown(["target", "found", ""], rows, 3)


def of_outside(results: Iterable[Result], why: Callable[[Result], str]) -> str:
    """Cells outside the band, with the likely reason."""
    rows = [
        [short(r.cell), *(_three(r.of(q).coverage) for q in QUANTITIES), why(r)] for r in results
    ]
    head = ["cell", "NAC", "savings", "avoided", "likely reason"]
    return markdown(head, rows, 1).replace("| :-- | --: | --: | --: | --: |",
                                           "| :-- | --: | --: | --: | :-- |")  # fmt: skip


def of_choices(results: Sequence[Choice]) -> str:
    """Ways of choosing a form, side by side."""
    rows = []
    for r in results:
        for way in WAYS:
            s = r.scores[way]
            right = f"{s.right_form:.0%}" if way in WAYS[:2] else ""
            rows.append([
                r.cell.form, str(r.cell.bills), f"{r.cell.rho:g}", f"{r.cell.noise:.0%}", way,
                right,
                f"{100 * s.rms_nac:.2f}", f"{100 * s.rms_savings:.2f}",
                _three(s.coverage_nac), _three(s.coverage_savings), f"{100 * s.width_savings:.1f}",
            ])  # fmt: skip
    head = [
        "true form", "bills", "ρ", "noise", "way", "right form", "rms NAC", "rms savings",
        "covers NAC", "covers savings", "width",
    ]  # fmt: skip
    return markdown(head, rows, 5)
