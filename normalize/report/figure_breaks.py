"""Use through time with the weather taken out, and the dates at which it changed."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from normalize.report import axes as axes_by_hand
from normalize.report import look, marks, svg
from normalize.report import numbers as n
from normalize.savings.break_words import month, months

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from normalize.savings.break_results import Breaks, Step
    from normalize.site import AccountResult

HEIGHT: Final = 292.0
LEFT: Final = 46.0
BOTTOM: Final = 30.0
TOP: Final = 62.0
RANGE_AT: Final = 0.035  # height of a range of dates above the axis, share of the panel
COLOURS: Final = {"before": look.BEFORE, "after": look.AFTER, "work": look.QUIET, "odd": look.CARE}
SHAPES: Final = {"before": "o", "after": "D", "work": "x", "odd": "x"}


def breaks_figure(account: AccountResult, key: str) -> svg.Picture | None:
    """Every bill against what its weather leads one to expect; None where there is no scan."""
    found = account.breaks
    if found is None or found.claimed is None:
        return None
    steps = [s for s in found.steps if marks.drawable(s.departure)]
    if not steps:
        return None
    title = _title(found)
    with svg.surface(HEIGHT) as figure:
        svg.title(figure, title, height=HEIGHT)
        axes = svg.panel(
            figure, LEFT, BOTTOM, look.WIDTH - LEFT - 4.0, HEIGHT - BOTTOM - TOP, of=HEIGHT
        )
        _limits(axes, steps)
        axes.axhline(0.0, color=look.QUIET, linewidth=0.8)
        marks.draw_work(axes, account)
        _draw_steps(axes, steps)
        _draw_levels(axes, found, account.work_start or 0)
        _draw_dates(axes, found)
        axes_by_hand.time_axis(axes, steps[0].start, steps[-1].end)
        axes_by_hand.number_axis(axes, "y")
        figure.text(
            0.0, 1.0 - (TOP - 14.0) / HEIGHT,
            "percent of average use, above or below what the bills before the work promise",
            fontsize=look.SMALL_SIZE, color=look.QUIET,
        )  # fmt: skip
        return svg.picture(
            figure, key, title=title, alt=_alt(found, title), caption=_caption(found),
            height=HEIGHT,
        )  # fmt: skip


def _title(found: Breaks) -> str:
    claimed = found.claimed
    if found.changes:
        told = [
            f"{'rose' if c.change > 0 else 'fell'} around {month(c.day)}" for c in found.changes
        ]
        return f"Beside the work, use {' and '.join(told[:2])}"
    if claimed is not None and claimed.announced:
        which = "the change" if claimed.meets else "the largest change"
        return f"The bills place {which} {months(claimed.low, claimed.high)}"
    return "With the weather taken out, the bills single out no date of change"


def _limits(axes: Axes, steps: list[Step]) -> None:
    values = [0.0, *(100.0 * s.departure for s in steps)]
    room = 0.10 * (max(values) - min(values)) or 1.0
    axes.set_ylim(min(values) - 1.6 * room, max(values) + room)
    first, last = steps[0].start, steps[-1].end
    edge = 0.01 * (last - first)
    axes.set_xlim(first - edge, last + edge)


def _draw_steps(axes: Axes, steps: list[Step]) -> None:
    for part, colour in COLOURS.items():
        mine = [s for s in steps if s.part == part]
        if not mine:
            continue
        xs, ys = marks.steps((s.start, s.end, 100.0 * s.departure) for s in mine)
        axes.plot(xs, ys, color=colour, linewidth=0.9, alpha=0.55)
        axes.plot(
            [0.5 * (s.start + s.end) for s in mine], [100.0 * s.departure for s in mine],
            linestyle="none", marker=SHAPES[part], markersize=3.6 if part != "odd" else 6.5,
            color=colour, markerfacecolor=look.PAPER if part == "before" else colour,
            markeredgewidth=1.0 if part != "odd" else 1.8, zorder=4,
        )  # fmt: skip


def _draw_levels(axes: Axes, found: Breaks, work_start: int) -> None:
    """Mean of every stretch as a thick line; levels away from the baseline's are named."""
    for start, end, level in found.levels:
        after = start >= work_start
        axes.plot(
            [start, end], [100.0 * level] * 2, color=look.AFTER if after else look.BEFORE,
            linewidth=2.4, linestyle="-" if after else look.DASHES, zorder=5,
        )  # fmt: skip
        if abs(level) < 0.005:
            continue
        sign = n.MINUS if level < 0 else "+"
        axes.annotate(
            f"{sign}{abs(100.0 * level):.0f}{n.NBSP}%", (end, 100.0 * level),
            xytext=(-3, -5 if level < 0 else 4), textcoords="offset points", ha="right",
            va="top" if level < 0 else "bottom", zorder=6, color=look.INK,
            fontsize=look.TEXT_SIZE, bbox={"facecolor": look.PAPER, "alpha": 0.8, "pad": 1.0,
                                           "linewidth": 0.0},
        )  # fmt: skip


def _draw_dates(axes: Axes, found: Breaks) -> None:
    """Ranges of dates as thick strokes along the axis, the most likely date as a tick."""
    claimed = found.claimed
    dates = [(c.day, c.low, c.high, look.CARE) for c in found.changes]
    if claimed is not None and claimed.announced:
        dates.insert(0, (claimed.day, claimed.low, claimed.high, look.INK))
    where = axes.get_xaxis_transform()
    for i, (day, low, high, colour) in enumerate(dates):
        y = RANGE_AT * (1.0 + 1.4 * i)
        axes.plot([low, high], [y, y], transform=where, color=colour, linewidth=4.5, zorder=5,
                  solid_capstyle="butt")  # fmt: skip
        axes.plot([day, day], [y - 0.02, y + 0.05], transform=where, color=colour, linewidth=1.6,
                  zorder=5)  # fmt: skip
        if colour == look.CARE:
            axes.plot([day, day], [0.0, 0.94], transform=where, color=colour, linewidth=1.0,
                      linestyle=look.DASHES, zorder=2)  # fmt: skip


def _alt(found: Breaks, title: str) -> str:
    others = "; ".join(f"another change {months(c.low, c.high)}" for c in found.changes)
    return (
        f"{title}. {found.n} bills through time with the weather taken out, as percent of average "
        f"use above or below what the bills before the work lead one to expect"
        f"{'; ' + others if others else ''}."
    )


def _caption(found: Breaks) -> str:
    parts = ["Open circles are bills before the work, filled diamonds after it; thick lines are "
             "means"]  # fmt: skip
    if found.claimed is not None and found.claimed.announced:
        parts.append(
            "the thick stroke on the axis spans the dates that cannot be told from the most likely "
            "one (90\u00a0%), found without being told of the work"
        )
    if found.changes:
        parts.append("a dashed upright line with its stroke is a change beside the work")
    if found.odd:
        parts.append("large crosses are bills that stand out")
    return f"{'; '.join(parts)}."
