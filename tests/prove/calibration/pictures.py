"""Which figures a study can draw."""

from __future__ import annotations

from collections.abc import Sequence

from normalize.report import svg
from tests.prove.calibration import figures, judge
from tests.prove.calibration.cells import Cell
from tests.prove.calibration.drawing import pct
from tests.prove.calibration.measures import Result
from tests.prove.calibration.page import Study


def pictures_of(study: Study) -> list[svg.Picture]:
    """The figures, each a file calibration-<key>.svg beside the page."""
    out = []
    if study.core:
        core = study.core
        out += [
            figures.methods_figure(core), figures.alarms_figure(core),
            figures.width_figure(core), figures.forms_figure(core),
        ]  # fmt: skip
    if study.spokes:
        rows = [
            (label, results)
            for name, cells in study.spokes.items()
            for label, results in _rows(name, cells)
        ]
        out.append(_cells("spokes", rows, "normalized", "Normalized savings, every cell a mark"))
    if study.daily:
        rows = _rows("daily", study.daily)
        out.append(_cells("daily", rows, "normalized", "Normalized savings from daily data"))
    return out


def _cells(name: str, rows: figures.Rows, quantity: str, under: str) -> svg.Picture:
    every = [r for _, results in rows for r in results]
    inside = sum(not judge.outside(r, quantity) for r in every)
    plain = sum(judge.LOW <= r.of(quantity, "plain").coverage <= judge.HIGH for r in every)
    title = (
        f"{inside} of {len(every)} cells cover between {pct(judge.LOW)} and {pct(judge.HIGH)}; "
        f"of the plain ones {plain}"
    )
    return figures.cells_figure(name, rows, quantity, title, under)


def _rows(name: str, results: Sequence[Result]) -> list[tuple[str, list[Result]]]:
    """A spoke's cells by what the spoke changes."""
    rows: dict[str, list[Result]] = {}
    for r in results:
        rows.setdefault(_label(name, r.cell), []).append(r)
    return list(rows.items())


def _label(name: str, cell: Cell) -> str:
    by_bills = f"{cell.bills} bills"
    if name == "noise":
        return f"noise {cell.noise:.0%}"
    if name == "tails":
        return "heavy tails (t, 3)" if cell.tails == "t3" else "outliers, 1 in 20"
    if name == "climate":
        return f"{cell.climate} climate"
    if name == "two-monthly bills":
        return f"two-monthly, {by_bills}"
    if name == "delivered fuel":
        return f"{cell.bills} deliveries, {cell.a_year} a year"
    if name == "a heating fuel's choice":
        return f"heating fuel, {by_bills}"
    if name == "daily":
        kind = {"weekly": ", weekly pattern", "slow": ", slow component"}.get(cell.pattern, "")
        return f"{cell.bills} days, ρ = {cell.rho:g}{kind}"
    return name
