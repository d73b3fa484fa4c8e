"""Invented work dates and what each would have announced, with the real work beside them."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final, NamedTuple

from normalize.report import axes as axes_by_hand
from normalize.report import look, marks, placebo_words, svg, words

if TYPE_CHECKING:
    from collections.abc import Sequence

    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

    from normalize.savings.results import Estimate
    from normalize.site import AccountResult

HEIGHT: Final = 240.0
LEFT: Final = 46.0
BOTTOM: Final = 30.0
TOP: Final = 62.0


class _Point(NamedTuple):
    """A date with its change and range, in percent or the account's unit."""

    day: int
    value: float
    low: float
    high: float
    told: bool


def placebo_figure(account: AccountResult, key: str) -> svg.Picture | None:
    """Every invented date as a point with its range through time; None where there is none."""
    placebo = account.placebo
    if placebo is None or not placebo.dates:
        return None
    share = all(d.normalized.fraction is not None for d in placebo.dates)
    invented = [p for d in placebo.dates if (p := _point(d.day, d.normalized, share)) is not None]
    real = None
    if account.work_start is not None:
        real = _point(account.work_start, account.savings.normalized, share)
    if not invented:
        return None
    title = placebo_words.finding(placebo)
    with svg.surface(HEIGHT) as figure:
        svg.title(figure, title, height=HEIGHT)
        axes = svg.panel(
            figure, LEFT, BOTTOM, look.WIDTH - LEFT - 4.0, HEIGHT - BOTTOM - TOP, of=HEIGHT
        )
        every = [*invented, real] if real is not None else invented
        _limits(axes, every)
        axes.axhline(0.0, color=look.QUIET, linewidth=0.8)
        _draw(axes, [p for p in invented if not p.told], look.BEFORE, "o", look.PAPER)
        _draw(axes, [p for p in invented if p.told], look.BEFORE, "o", look.BEFORE)
        if real is not None:
            _draw(axes, [real], look.AFTER, "D", look.AFTER)
            _name(axes, real)
        axes_by_hand.time_axis(axes, every[0].day, every[-1].day)
        axes_by_hand.number_axis(axes, "y")
        _unit(figure, "percent" if share else words.unit_word(account.unit))
        return svg.picture(
            figure,
            key,
            title=title,
            alt=f"{title}. {len(invented)} points through time, each with its range; the range of "
            f"{sum(p.told for p in invented)} excludes no change.",
            caption=_caption(invented, real),
            height=HEIGHT,
        )


def _unit(figure: Figure, unit: str) -> None:
    figure.text(
        0.0, 1.0 - (TOP - 14.0) / HEIGHT,
        svg.drawn(f"{unit} less in a normal year; below the line: more"),
        fontsize=look.SMALL_SIZE, color=look.QUIET,
    )  # fmt: skip


def _point(day: int, e: Estimate, share: bool) -> _Point | None:
    ends = (e.fraction, e.fraction_low, e.fraction_high) if share else (e.value, e.low, e.high)
    value, low, high = ends
    if value is None or low is None or high is None:
        return None
    scale = 100.0 if share else 1.0
    if not all(marks.drawable(scale * x) for x in (value, low, high)):
        return None
    told = e.verdict in ("reduction", "increase")
    return _Point(day, scale * value, scale * low, scale * high, told)


def _limits(axes: Axes, points: Sequence[_Point]) -> None:
    bottom = min(0.0, *(p.low for p in points))
    top = max(0.0, *(p.high for p in points))
    room = 0.08 * (top - bottom) or 1.0
    axes.set_ylim(bottom - room, top + room)
    first, last = points[0].day, points[-1].day
    edge = 0.03 * (last - first) or 30.0
    axes.set_xlim(first - edge, last + edge)


def _draw(axes: Axes, points: Sequence[_Point], colour: str, shape: str, face: str) -> None:
    if not points:
        return
    nothing = float("nan")
    xs = [float(x) for p in points for x in (p.day, p.day, nothing)]
    ys = [y for p in points for y in (p.low, p.high, nothing)]
    axes.plot(xs, ys, color=colour, linewidth=1.1, zorder=3)
    axes.plot(
        [p.day for p in points], [p.value for p in points], linestyle="none", marker=shape,
        markersize=5.6, color=colour, markerfacecolor=face, markeredgewidth=1.2, zorder=4,
    )  # fmt: skip


def _name(axes: Axes, real: _Point) -> None:
    axes.annotate(
        "the work", (real.day, real.value), xytext=(-8, 0), textcoords="offset points", ha="right",
        va="center", color=look.AFTER, fontsize=look.SMALL_SIZE,
    )  # fmt: skip


def _caption(invented: Sequence[_Point], real: _Point | None) -> str:
    parts = ["Circles are invented work dates with their ranges, filled where a change would have "
             "been announced"]  # fmt: skip
    if real is not None:
        parts.append("the diamond is the real work")
    if len(invented) > 1:
        parts.append("neighbouring dates share nearly all their bills, so they lie near each other")
    return f"{'; '.join(parts)}."
