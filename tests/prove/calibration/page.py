"""docs/calibration.md: every number and every sentence with a number comes from the results."""

from __future__ import annotations

import platform
import re
import textwrap
from collections.abc import Sequence
from importlib.metadata import version

from normalize.jit import kernel_hash
from tests.prove.calibration import judge, tables
from tests.prove.calibration.cells import FORMS, Cell
from tests.prove.calibration.choice import Choice
from tests.prove.calibration.conclusions import conclusion
from tests.prove.calibration.measures import Result, monte_carlo_error
from tests.prove.calibration.text import CHOICES, DESIGN, HEAD, LIMITS, TARGETS

PACKAGES = ("numpy", "numba", "scipy")


class Study:
    """All results of a run. spokes : name → results; real : a section or ""."""

    def __init__(
        self, core: Sequence[Result], spokes: dict[str, Sequence[Result]],
        choices: Sequence[Choice], daily: Sequence[Result], real: str,
    ) -> None:  # fmt: skip
        self.core, self.spokes = list(core), spokes
        self.choices, self.daily, self.real = list(choices), list(daily), real

    @property
    def bills(self) -> list[Result]:
        """Core and spokes, each cell once; forms that were not offered are left out."""
        every = [*self.core, *(r for rows in self.spokes.values() for r in rows)]
        once = {r.cell: r for r in every}
        return [r for r in once.values() if r.cell.form in r.cell.offered]


def page_of(study: Study) -> str:
    """The whole page."""
    parts = [_head(study), _targets(study), _outside(study), _core(study)]
    parts.append(_placebo(study))
    if study.spokes:
        parts.append(_spokes(study))
    if study.choices:
        parts.append(
            f"## Which form, when bills are few\n\n{CHOICES}\n\n{conclusion(study.choices)}\n\n"
            + tables.of_choices(study.choices)
        )
    if study.daily:
        parts.append(_daily(study))
    if study.real:
        parts.append(study.real)
    parts.append(LIMITS)
    return tidy("\n\n".join(parts))


def tidy(text: str) -> str:
    """Paragraphs filled to the width of a page, and a space before every percent sign.

    >>> tidy("about\\n5% of\\nit")
    'about 5 % of it\\n'
    """
    blocks = []
    for block in re.split(r"\n\s*\n", re.sub(r"(\d)%", r"\1 %", text.strip())):
        plain = not block.startswith(("|", "#", "-", "!"))
        blocks.append(textwrap.fill(" ".join(block.split()), 100) if plain else block)
    return "\n\n".join(blocks) + "\n"


def _head(study: Study) -> str:
    versions = ", ".join(f"{name} {version(name)}" for name in PACKAGES)
    parts = {
        "the core": study.core,
        "the spokes": [r for rows in study.spokes.values() for r in rows],
        "the choice of form": study.choices,
        "daily data": study.daily,
    }
    sizes = "; ".join(
        f"{name} {min(r.homes for r in rows):,} in {len({r.cell for r in rows})} cells "
        f"(± {monte_carlo_error(0.9, min(r.homes for r in rows)):.3f})"
        for name, rows in parts.items()
        if rows
    )
    missing = " and ".join(name for name, rows in parts.items() if not rows)
    return HEAD.format(
        sizes=sizes,
        missing=f"**Left out of this run: {missing}.**" if missing else "",
        versions=f"Python {platform.python_version()}, {versions}",
        kernels=kernel_hash("savings.kernel"),
    )


def verdicts(study: Study) -> list[judge.Verdict]:
    """Every target."""
    out = []
    for where, results in (("core", study.core), ("core and spokes", study.bills)):
        out += [judge.coverage_verdict(results, q, where) for q in judge.NAMES]
        out += [judge.alarm_verdict(results, q, where) for q in judge.ALARM_QUANTITIES]
    out += judge.form_verdicts(study.core)
    return out


def _targets(study: Study) -> str:
    found = verdicts(study)
    met = sum(v.met for v in found)
    return (
        f"## Targets: {met} of {len(found)} met\n\n{TARGETS}\n\n{tables.of_verdicts(found)}\n\n"
        "![Coverage by method](calibration-methods.svg)\n\n"
        f"{DESIGN}"
    )


def _outside(study: Study) -> str:
    rows = judge.outside_cells(study.bills)
    judged = [r for r in study.bills if judge.in_scope(r.cell)]
    text = (
        f"## Cells outside the band\n\nOf {len(judged)} cells with {judge.LEAST_BILLS} bills or "
        f"more and correlation up to {judge.MOST_RHO:g}, these {len(rows)} have at least one of "
        f"the three coverages outside {judge.LOW:.2f}–{judge.HIGH:.2f}. The likely reason is "
        "worked out from what was counted beside the coverage."
    )
    beyond = [r for r in study.bills if not judge.in_scope(r.cell)]
    strayed = [r for r in beyond if any(judge.outside(r, q) for q in judge.NAMES)]
    more = (
        f"Beyond the target's scope (9 bills, fewer two-monthly ones or deliveries, correlation "
        f"0.7) {len(strayed)} of {len(beyond)} cells are outside:"
    )
    return "\n\n".join([
        text, tables.of_outside(rows, judge.reasons), more,
        tables.of_outside(strayed, judge.reasons),
    ])  # fmt: skip


def _core(study: Study) -> str:
    parts = [
        f"## The core: form × bills × correlation\n\n{tables.KEY}\n\n"
        "![How often the right form is chosen](calibration-forms.svg)\n\n"
        "![Width of the range](calibration-width.svg)"
    ]
    for form in FORMS:
        rows = [r for r in study.core if r.cell.form == form]
        if rows:
            table = tables.of_cells(rows, ("bills", "ρ"), lambda c: (str(c.bills), f"{c.rho:g}"))
            parts.append(f"### {form.capitalize()}\n\n{table}")
    return "\n\n".join(parts)


def _placebo(study: Study) -> str:
    methods = (
        ("normalized", "default"), ("normalized", "plain"), ("avoided", "default"),
        ("avoided", "plain"), ("avoided", "guideline"), ("avoided", "guideline, no correlation"),
    )  # fmt: skip
    rows = []
    for bills in sorted({r.cell.bills for r in study.core}):
        for rho in sorted({r.cell.rho for r in study.core}):
            mine = [r for r in study.core if (r.cell.bills, r.cell.rho) == (bills, rho)]
            shares = [[r.of(q, m).alarms for r in mine] for q, m in methods]
            rows.append(
                [str(bills), f"{rho:g}", *(f"{sum(s) / len(s):.3f} ({max(s):.3f})" for s in shares)]
            )
    head = ["bills", "ρ", *(f"{q}, {m}" for q, m in methods)]
    return (
        "## Placebo: nothing was done\n\n"
        "As many homes again in every cell, with the same parameters on both sides. Share whose "
        "90 % range excludes zero, mean over the forms (and the highest of them); a tenth is what "
        "90 % promises.\n\n![Placebo alarms](calibration-alarms.svg)\n\n"
        + tables.markdown(head, rows, 2)
    )


def _spokes(study: Study) -> str:
    parts = [
        "## Spokes: one thing changed at a time\n\n"
        "Columns as in the core. ![Coverage of every spoke](calibration-spokes.svg)"
    ]
    for name, rows in study.spokes.items():
        parts.append(f"### {name.capitalize()}\n\n" + tables.of_cells(rows, ("cell",), _cell))
    return "\n\n".join(parts)


def _cell(cell: Cell) -> tuple[str]:
    return (judge.short(cell),)


def _daily(study: Study) -> str:
    judged = [judge.coverage_verdict(study.daily, q, "daily data") for q in judge.NAMES]
    strayed = [r for r in study.daily if any(judge.outside(r, q) for q in judge.NAMES)]
    return "\n\n".join([
        "## Daily data",
        f"{study.daily[0].homes:,} homes a cell; the same homes with a reading every day, "
        f"{study.daily[0].cell.noise:.0%} daily noise. ρ is from day to day. "
        "![Coverage of daily data](calibration-daily.svg)",
        tables.of_verdicts(judged),
        tables.of_cells(study.daily, ("cell",), _cell),
        f"Outside the band: {len(strayed)} of {len(study.daily)} cells.",
        tables.of_outside(strayed, judge.reasons) if strayed else "",
    ]).strip()  # fmt: skip
