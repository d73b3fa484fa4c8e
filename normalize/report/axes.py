"""Axes drawn by hand: ticks, their labels and the axis's name.

matplotlib's own axis objects make and measure every label several times; for figures of a
fixed layout that was two fifths of the drawing time, so they are switched off.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from normalize.days import date_of, day_of_iso
from normalize.report import look
from normalize.report import numbers as n

if TYPE_CHECKING:
    from collections.abc import Sequence

    from matplotlib.axes import Axes

STEPS: Final = (1, 2, 5, 10)  # ticks that people count by
LENGTH: Final = 4.0  # of a tick, px
GAP: Final = 3.5  # between tick and label, px
NAME_BELOW: Final = 34.0  # from the axis to the baseline of its name, px
MOST_YEARS: Final = 12  # labelled one by one; more are thinned
SHORT_DAYS: Final = 500  # below this, quarters are labelled
EDGE: Final = 0.05  # share of the axis in which a centred label would not fit


def number_axis(axes: Axes, which: str, *, most: int = 5) -> None:
    """At most so many round values, thousands separated; after the limits are set."""
    from matplotlib.ticker import MaxNLocator

    low, high = axes.get_xlim() if which == "x" else axes.get_ylim()
    values = [float(v) for v in MaxNLocator(most, steps=STEPS).tick_values(low, high)]
    slack = 1e-9 * (high - low)
    places = [(v, tick(v)) for v in values if low - slack <= v <= high + slack]
    if which == "x":
        ticks_below(axes, places)
    else:
        _ticks_left(axes, places)


def tick(value: float) -> str:
    """A tick's label.

    >>> tick(-1500.0), tick(0.25), tick(-0.0)
    ('−1,500', '0.25', '0')
    """
    text = f"{value:,.10g}" if abs(value) >= 1e-9 else "0"
    return text.replace("-", n.MINUS)


def time_axis(axes: Axes, first: int, last: int) -> None:
    """Ticks at the starts of years, or of quarters where there are few."""
    start, end = date_of(first), date_of(last)
    places: list[tuple[float, str]] = []
    every = 1 + (end.year - start.year) // MOST_YEARS
    for year in range(start.year, end.year + 2):
        if last - first < SHORT_DAYS:
            for month in (1, 4, 7, 10):
                label = f"{n.MONTHS[month - 1][:3]} {year}"
                places.append((float(day_of_iso(f"{year:04d}-{month:02d}-01")), label))
        elif (year - start.year) % every == 0:
            places.append((float(day_of_iso(f"{year:04d}-01-01")), f"Jan {year}"))
    left, right = axes.get_xlim()
    ticks_below(axes, [p for p in places if left <= p[0] <= right])


def ticks_below(axes: Axes, places: Sequence[tuple[float, str]]) -> None:
    """Ticks and labels under the lower spine; a label at the right end stays inside."""
    one = 1.0 / axes.bbox.height
    left, right = axes.get_xlim()
    where = axes.get_xaxis_transform()
    xs = [v for x, _ in places for v in (x, x, float("nan"))]
    ys = [v for _ in places for v in (0.0, -LENGTH * one, float("nan"))]
    axes.plot(xs, ys, transform=where, color=look.QUIET, linewidth=0.8, clip_on=False)
    for x, label in places:
        axes.text(
            x, -(LENGTH + GAP) * one, label, transform=where, va="top", color=look.QUIET,
            ha="right" if x > right - EDGE * (right - left) else "center",
            fontsize=look.SMALL_SIZE,
        )  # fmt: skip
    axes.set_xlim(left, right)


def _ticks_left(axes: Axes, places: Sequence[tuple[float, str]]) -> None:
    one = 1.0 / axes.bbox.width
    bottom, top = axes.get_ylim()
    where = axes.get_yaxis_transform()
    xs = [v for _ in places for v in (0.0, -LENGTH * one, float("nan"))]
    ys = [v for y, _ in places for v in (y, y, float("nan"))]
    axes.plot(xs, ys, transform=where, color=look.QUIET, linewidth=0.8, clip_on=False)
    for y, label in places:
        axes.text(
            -(LENGTH + GAP) * one, y, label, transform=where, va="center", ha="right",
            color=look.QUIET, fontsize=look.SMALL_SIZE,
        )  # fmt: skip
    axes.set_ylim(bottom, top)


def name_below(axes: Axes, text: str) -> None:
    """The axis's name, under its labels."""
    axes.text(
        0.5, -NAME_BELOW / axes.bbox.height, text, transform=axes.transAxes, ha="center",
        va="baseline", color=look.QUIET, fontsize=look.SMALL_SIZE,
    )  # fmt: skip
