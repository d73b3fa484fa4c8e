"""The figures of the study: SVG files beside the page, the same bytes for the same results."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np

from normalize.report import axes as by_hand
from normalize.report import look, svg
from tests.prove.calibration.drawing import (
    band,
    dots,
    heading,
    key,
    limits,
    line,
    pct,
    percent_left,
)
from tests.prove.calibration.judge import HIGH, LOW, MOST_ALARMS, PROMISED
from tests.prove.calibration.measures import METHODS, Result
from tests.prove.calibration.plan import BILLS, RHOS, SPOKE_FORMS

LEFT, RIGHT, TOP, BOTTOM = 48.0, 8.0, 78.0, 46.0
GAP = 18.0
Rows = Sequence[tuple[str, Sequence[Result]]]


def mean(results: Sequence[Result], value: Callable[[Result], float]) -> float:
    """Mean over cells; NaN where there is none."""
    return float(np.mean([value(r) for r in results])) if results else float("nan")


def methods_figure(core: Sequence[Result]) -> svg.Picture:
    """Coverage of avoided use by method, bills and correlation: means over the forms."""
    height = 300.0
    strong = [r for r in core if r.cell.rho == 0.5 and r.cell.bills >= 12]
    ours = mean(strong, lambda r: r.of("avoided").coverage)
    plain = mean(strong, lambda r: r.of("avoided", "plain").coverage)
    title = (
        f"Where bills err together, a plain 90 % range covers {pct(plain)}, the default {pct(ours)}"
    )
    with svg.surface(height) as figure:
        svg.title(figure, title, "Coverage of avoided use, nominal 90 %; mean over the forms",
                  height=height)  # fmt: skip
        wide = (look.WIDTH - LEFT - RIGHT - 3 * GAP) / 4
        for i, rho in enumerate(RHOS):
            axes = svg.panel(
                figure, LEFT + i * (wide + GAP), BOTTOM, wide, height - TOP - BOTTOM, of=height
            )
            limits(axes, (7, 38), (0.38, 1.0), BILLS)
            percent_left(axes, (0.4, 0.5, 0.6, 0.7, 0.8, 0.9, 1.0), labels=i == 0)
            band(axes, LOW, HIGH, PROMISED)
            heading(axes, f"ρ = {rho:g}")
            by_hand.name_below(axes, "bills a side")
            for method in METHODS:
                ys = [
                    mean([r for r in core if r.cell.rho == rho and r.cell.bills == b],
                         lambda r, m=method: r.of("avoided", m).coverage)  # type: ignore[misc]
                    for b in BILLS
                ]  # fmt: skip
                line(axes, method, BILLS, ys)
            if i == 0:
                key(axes, {m: (0.10, 0.38 - 0.11 * j) for j, m in enumerate(METHODS)})
        return svg.picture(
            figure, "methods", title=title, height=height, caption="",
            alt=f"{title}. Four panels by lag-1 correlation, coverage against bills a side.",
        )  # fmt: skip


def alarms_figure(core: Sequence[Result]) -> svg.Picture:
    """How often each method announces a saving or an increase where nothing was done."""
    height = 290.0
    at = [r for r in core if r.cell.bills == 24 and r.cell.rho == 0.5]
    ours = mean(at, lambda r: r.of("avoided").alarms)
    theirs = mean(at, lambda r: r.of("avoided", "plain").alarms)
    title = (
        f"Nothing was done: at ρ = 0.5 the default announces a change in {pct(ours)} of homes, "
        f"plain in {pct(theirs)}"
    )
    with svg.surface(height) as figure:
        svg.title(figure, title, "Share of homes whose avoided use excludes zero; mean over forms",
                  height=height)  # fmt: skip
        wide = (look.WIDTH - LEFT - RIGHT - 2 * GAP) / 3
        for i, bills in enumerate((12, 24, 36)):
            axes = svg.panel(
                figure, LEFT + i * (wide + GAP), BOTTOM, wide, height - TOP - BOTTOM, of=height
            )
            limits(axes, (-0.04, 0.74), (0.0, 0.62), RHOS)
            percent_left(axes, (0.0, 0.1, 0.2, 0.3, 0.4, 0.5, 0.6), labels=i == 0)
            band(axes, 0.0, MOST_ALARMS, 1.0 - PROMISED)
            heading(axes, f"{bills} bills a side")
            by_hand.name_below(axes, "lag-1 correlation ρ")
            for method in METHODS:
                ys = [
                    mean([r for r in core if r.cell.rho == rho and r.cell.bills == bills],
                         lambda r, m=method: r.of("avoided", m).alarms)  # type: ignore[misc]
                    for rho in RHOS
                ]  # fmt: skip
                line(axes, method, RHOS, ys)
            if i == 0:
                key(axes, {m: (0.08, 0.94 - 0.095 * j) for j, m in enumerate(METHODS)})
        return svg.picture(
            figure, "alarms", title=title, height=height, caption="",
            alt=f"{title}. Three panels by bills a side, alarms against correlation.",
        )  # fmt: skip


def cells_figure(name: str, rows: Rows, quantity: str, title: str, under: str) -> svg.Picture:
    """Coverage of every cell of each row as marks: the default's and the plain one's."""
    step = 17.0
    height = 96.0 + BOTTOM + step * len(rows)
    left = 238.0
    with svg.surface(height) as figure:
        svg.title(figure, title, under, height=height)
        axes = svg.panel(
            figure, left, BOTTOM, look.WIDTH - left - 18.0, step * len(rows), of=height
        )
        limits(axes, (0.4, 1.0), (len(rows) - 0.5, -0.5), (0.4, 0.5, 0.6, 0.7, 0.8, 0.9, 1.0))
        band(axes, LOW, HIGH, PROMISED, along="x")
        axes.spines["left"].set_visible(False)
        by_hand.name_below(axes, "coverage of a nominal 90 % range")
        for y, (label, results) in enumerate(rows):
            axes.axhline(y, color=look.RULE, linewidth=0.5, zorder=0)
            axes.text(
                -10.0 / axes.bbox.width, y, label, transform=axes.get_yaxis_transform(),
                ha="right", va="center", fontsize=look.SMALL_SIZE, color=look.INK,
            )  # fmt: skip
            for method in ("plain", "default"):
                known = [r.of(quantity, method).coverage for r in results]
                known = [c for c in known if c == c]
                dots(axes, method, [max(c, 0.4) for c in known], [y] * len(known))
        key(axes, {"default": (0.02, 1.0 + 14.0 / axes.bbox.height),
                   "plain": (0.22, 1.0 + 14.0 / axes.bbox.height)})  # fmt: skip
        return svg.picture(
            figure, name, title=title, height=height, caption="",
            alt=f"{title}. Marks of coverage, one a cell, in rows.",
        )  # fmt: skip


def width_figure(core: Sequence[Result]) -> svg.Picture:
    """What it costs: width of the range of normalized savings."""
    height = 290.0
    form = "heating"
    mine = {(r.cell.bills, r.cell.rho): r for r in core if r.cell.form == form}
    a, b = mine[12, 0.3].of("normalized"), mine[24, 0.3].of("normalized")
    title = (
        f"Twice the bills, {pct(1 - b.width / a.width)} narrower: "
        f"±{50 * a.width:.0f} % of NAC at 12 bills, ±{50 * b.width:.0f} % at 24"
    )
    with svg.surface(height) as figure:
        svg.title(
            figure, title,
            "Half the mean width of the range of normalized savings; heating form, ρ as written",
            height=height,
        )  # fmt: skip
        axes = svg.panel(
            figure, LEFT, BOTTOM, look.WIDTH - LEFT - 150.0, height - TOP - BOTTOM, of=height
        )
        limits(axes, (7, 38), (0.0, 0.22), BILLS)
        percent_left(axes, (0.0, 0.05, 0.10, 0.15, 0.20))
        by_hand.name_below(axes, "bills a side")
        for rho in RHOS:
            for method in ("plain", "default"):
                ys = [0.5 * mine[n, rho].of("normalized", method).width for n in BILLS]
                line(axes, method, BILLS, ys)
                if method == "default":
                    axes.text(37.2, ys[-1], f"ρ = {rho:g}", color=look.BEFORE, va="center",
                              fontsize=look.SMALL_SIZE, clip_on=False)  # fmt: skip
        key(axes, {"default": (0.55, 0.95), "plain": (0.55, 0.86)})
        return svg.picture(
            figure, "width", title=title, height=height, caption="",
            alt=f"{title}. Half-width against bills a side, by correlation.",
        )  # fmt: skip


def forms_figure(core: Sequence[Result]) -> svg.Picture:
    """How often the true form is chosen."""
    height = 290.0
    few = [r for r in core if r.cell.bills == 12 and r.cell.form in SPOKE_FORMS]
    many = [r for r in core if r.cell.bills == 24 and r.cell.form in SPOKE_FORMS]
    a, b = mean(few, lambda r: r.right_form), mean(many, lambda r: r.right_form)
    title = f"The right form is named in {pct(a)} of homes with 12 bills and {pct(b)} with 24"
    marks = ("o", "D", "s", "x")
    with svg.surface(height) as figure:
        svg.title(figure, title, "Share of homes; four forms offered", height=height)
        wide = (look.WIDTH - LEFT - RIGHT - 3 * GAP) / 4
        for i, form in enumerate(SPOKE_FORMS):
            axes = svg.panel(
                figure, LEFT + i * (wide + GAP), BOTTOM, wide, height - TOP - BOTTOM, of=height
            )
            limits(axes, (7, 38), (0.5, 1.005), BILLS)
            percent_left(axes, (0.5, 0.6, 0.7, 0.8, 0.9, 1.0), labels=i == 0)
            heading(axes, form)
            by_hand.name_below(axes, "bills a side")
            for rho, mark in zip(RHOS, marks, strict=True):
                ys = [
                    mean([r for r in core if (r.cell.form, r.cell.bills, r.cell.rho)
                          == (form, n, rho)], lambda r: r.right_form)
                    for n in BILLS
                ]  # fmt: skip
                colour = (look.BEFORE, look.WEATHER, look.AFTER, look.CARE)[marks.index(mark)]
                axes.plot(BILLS, ys, marker=mark, markersize=4.8, color=colour, linewidth=1.2)
                if i == 0:
                    y = 0.36 - 0.095 * marks.index(mark)
                    axes.plot([0.5], [y], marker=mark, markersize=4.8, color=colour,
                              transform=axes.transAxes)  # fmt: skip
                    axes.text(0.57, y, f"ρ = {rho:g}", color=colour, va="center",
                              transform=axes.transAxes, fontsize=look.SMALL_SIZE)  # fmt: skip
        return svg.picture(
            figure, "forms", title=title, height=height, caption="",
            alt=f"{title}. Four panels by true form, share against bills a side.",
        )  # fmt: skip
