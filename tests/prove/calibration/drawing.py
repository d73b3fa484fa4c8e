"""What the study's figures share: marks of the methods, the target's band, panels, dots."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from normalize.report import axes as by_hand
from normalize.report import look

if TYPE_CHECKING:
    from matplotlib.axes import Axes

#: Colour, mark, line and name of each method; shape and line speak where colour cannot.
STYLES: dict[str, dict[str, Any]] = {
    "default": {"color": look.BEFORE, "marker": "o", "linestyle": "-"},
    "plain": {"color": look.AFTER, "marker": "D", "linestyle": look.DASHES},
    "guideline": {"color": look.WEATHER, "marker": "s", "linestyle": (0, (8, 2, 1.5, 2))},
    "guideline, no correlation": {"color": look.CARE, "marker": "x", "linestyle": look.DOTS},
}
WORDS = {
    "default": "default",
    "plain": "plain delta method",
    "guideline": "Guideline 14",
    "guideline, no correlation": "Guideline 14, ρ = 0",
}
SIZES = {"o": 5.5, "D": 4.6, "s": 4.8, "x": 5.5}


def pct(share: float) -> str:
    """A share in whole percent.

    >>> pct(0.654)
    '65 %'
    """
    return f"{100 * share:.0f} %"


def line(axes: Axes, method: str, xs: Sequence[float], ys: Sequence[float]) -> None:
    """One method's line with its marks."""
    style = STYLES[method]
    axes.plot(xs, ys, markersize=SIZES[style["marker"]], linewidth=1.4, zorder=3, **style)


def dots(axes: Axes, method: str, xs: Sequence[float], ys: Sequence[float]) -> None:
    """One method's marks without a line; open, so that several can be seen."""
    style = {**STYLES[method], "linestyle": "none"}
    axes.plot(
        xs, ys, markersize=SIZES[style["marker"]] - 0.6, markerfacecolor="none",
        markeredgewidth=1.1, zorder=3, clip_on=False, **style,
    )  # fmt: skip


def band(axes: Axes, low: float, high: float, at: float, *, along: str = "y") -> None:
    """The target's band, shaded, and a hairline where the promise lies."""
    span = axes.axhspan if along == "y" else axes.axvspan
    hair = axes.axhline if along == "y" else axes.axvline
    span(low, high, color=look.RULE, alpha=0.45, linewidth=0, zorder=0)
    hair(at, color=look.QUIET, linewidth=0.8, zorder=1)


def key(axes: Axes, places: dict[str, tuple[float, float]]) -> None:
    """The methods' names beside their marks, at (x, y) of the axes."""
    for method, (x, y) in places.items():
        style = STYLES[method]
        axes.plot(
            [x], [y], transform=axes.transAxes, clip_on=False, markersize=SIZES[style["marker"]],
            **style,
        )  # fmt: skip
        axes.text(
            x + 9.0 / axes.bbox.width, y, WORDS[method], transform=axes.transAxes, va="center",
            color=style["color"], fontsize=look.SMALL_SIZE,
        )  # fmt: skip


def heading(axes: Axes, text: str) -> None:
    """A panel's own name, above it."""
    axes.text(
        0.0, 1.0 + 7.0 / axes.bbox.height, text, transform=axes.transAxes, color=look.INK,
        fontsize=look.TEXT_SIZE,
    )  # fmt: skip


def limits(
    axes: Axes, x: tuple[float, float], y: tuple[float, float], ticks: Sequence[float]
) -> None:
    """Limits, ticks below at the given places, shares at the left as percent."""
    axes.set_xlim(*x)
    axes.set_ylim(*y)
    by_hand.ticks_below(axes, [(t, by_hand.tick(t)) for t in ticks])


def percent_left(axes: Axes, places: Sequence[float], *, labels: bool = True) -> None:
    """Hairlines at shares, and their labels in percent."""
    for share in places:
        axes.axhline(share, color=look.RULE, linewidth=0.6, zorder=0)
        if labels:
            axes.text(
                -6.0 / axes.bbox.width, share, pct(share), ha="right", va="center",
                transform=axes.get_yaxis_transform(), color=look.QUIET, fontsize=look.SMALL_SIZE,
            )  # fmt: skip
