"""Will it show?  The smallest saving against the number of bills, the hoped-for one as a line."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from normalize.report import axes as axes_by_hand
from normalize.report import look, outlook, svg, words
from normalize.report import numbers as n
from normalize.savings.planning import EVEN, LIKELY, needed

if TYPE_CHECKING:
    from collections.abc import Sequence

    from matplotlib.axes import Axes

    from normalize.plan import Outlook

HEIGHT: Final = 330.0
LEFT: Final = 46.0
RIGHT: Final = 168.0  # room for the lines' names
BOTTOM: Final = 46.0
TOP: Final = 74.0
HIGHEST: Final = 60.0  # per cent; more than this nobody hopes for
LEAST_APART: Final = 15.0  # px between the names of two lines


def outlook_figure(found: Outlook, hoped: float | None, key: str) -> svg.Picture | None:
    """Four lines, two kinds of saving at two odds; None where nothing is known."""
    lines = _lines(found)
    if not lines:
        return None
    title = _title(found, hoped)
    with svg.surface(HEIGHT) as figure:
        svg.title(figure, title, _under(found), height=HEIGHT)
        figure.text(
            0.0, 1.0 - (TOP - 14.0) / HEIGHT, "% of use", fontsize=look.SMALL_SIZE,
            color=look.QUIET,
        )  # fmt: skip
        wide, tall = look.WIDTH - LEFT - RIGHT, HEIGHT - BOTTOM - TOP
        axes = svg.panel(figure, LEFT, BOTTOM, wide, tall, of=HEIGHT)
        _limits(axes, lines, hoped)
        for line in lines:
            axes.plot(line.xs, line.ys, color=line.colour, linewidth=line.width,
                      linestyle=line.style)  # fmt: skip
        _names(axes, lines, hoped, tall)
        kind = outlook.kind_of(found.length, delivered=found.delivered)
        axes_by_hand.name_below(axes, f"{kind}s after the work")
        alt = f"{title}. " + " ".join(outlook.sentences(found, 0.9, hoped)[:2])
        return svg.picture(
            figure, key, title=title, alt=alt, caption=_caption(found), height=HEIGHT
        )


class _Line:
    """One line to draw. name : in words at its end."""

    def __init__(self, found: Outlook, odds: float, *, normalized: bool) -> None:
        points = []
        for p in found.prospects:
            s = p.normalized if normalized else p.avoided
            if s is not None:
                share = s.likely_fraction if odds == LIKELY else s.even_fraction
                if n.known(share):
                    points.append((float(p.bills), 100.0 * share))
        self.xs = [x for x, _ in points]
        self.ys = [y for _, y in points]
        self.colour = look.AFTER if normalized else look.BEFORE
        self.width = 1.8 if odds == LIKELY else 1.1
        self.style = ("-" if normalized else look.DASHES) if odds == LIKELY else look.DOTS
        kind = "normal year" if normalized else "avoided use"
        self.name = f"{kind}, {'4 times in 5' if odds == LIKELY else 'even odds'}"


def _lines(found: Outlook) -> list[_Line]:
    every = [
        _Line(found, odds, normalized=normalized)
        for normalized in (False, True)
        for odds in (LIKELY, EVEN)
    ]
    return [line for line in every if line.xs]


def _title(found: Outlook, hoped: float | None) -> str:
    fuel = words.upper(words.fuel_word(found.fuel))
    if hoped is None:
        least = min(
            (p.normalized.likely_fraction for p in found.prospects if p.normalized), default=None
        )
        if least is None:
            return f"{fuel}: no normal year within 36 bills"
        return f"{fuel}: {n.percent(least)} is the smallest saving that would show within 36 bills"
    year = needed(found.prospects, hoped, odds=LIKELY, normalized=True)
    soon = needed(found.prospects, hoped, odds=LIKELY, normalized=False)
    counts = [p.bills for p in (soon, year) if p is not None]
    if not counts:
        return f"{fuel}: {outlook.share_word(hoped)} would hardly show within 36 bills"
    return f"{fuel}: {outlook.share_word(hoped)} would show after {min(counts)} bills"


def _under(found: Outlook) -> str:
    fit = found.fit
    bills = "" if fit is None else f", from {fit.n_periods} bills before the work"
    return f"The smallest saving that would show{bills}"


def _limits(axes: Axes, lines: Sequence[_Line], hoped: float | None) -> None:
    top = max(y for line in lines for y in line.ys)
    shown = max([min(top, HIGHEST), 0.0 if hoped is None else min(130.0 * hoped, 100.0)])
    axes.set_xlim(3.0, 36.0)
    axes.set_ylim(0.0, 1.06 * shown)
    axes_by_hand.number_axis(axes, "y")
    axes_by_hand.ticks_below(axes, [(float(b), f"{b}") for b in (3, 6, 9, 12, 18, 24, 30, 36)])


def _names(axes: Axes, lines: Sequence[_Line], hoped: float | None, tall: float) -> None:
    """The lines' names at their right ends, moved apart; the hope drawn through."""
    low, high = axes.get_ylim()
    ends = [(line.ys[-1], line.name, line.colour) for line in lines]
    if hoped is not None:
        axes.axhline(100.0 * hoped, color=look.INK, linewidth=1.2)
        ends.append((100.0 * hoped, f"hoped for: {outlook.share_word(hoped)}", look.INK))
    ends.sort()
    least = LEAST_APART * (high - low) / tall
    at: list[float] = []
    for y, _, _ in ends:
        at.append(max(y, at[-1] + least) if at else max(y, low + 0.3 * least))
    over = at[-1] - high
    if over > 0.0:
        at = [y - over for y in at]
    for y, (_, name, colour) in zip(at, ends, strict=True):
        axes.annotate(
            svg.drawn(name), (1.0, y), xycoords=("axes fraction", "data"), xytext=(8, 0),
            textcoords="offset points", va="center", ha="left", color=colour,
            fontsize=look.SMALL_SIZE,
        )  # fmt: skip


def _caption(found: Outlook) -> str:
    years = found.years
    listed = f"{years[0]}{n.NDASH}{years[-1]}" if len(years) > 1 else f"{years[0]}"
    return (
        "Blue, dashed: as use avoided since the work; ochre, solid: in a normal year. Dotted: "
        "at even odds. Waves are seasons: bills of mild months add noise and little use to save "
        f"from. Weather to come: the mean of {listed}."
    )
