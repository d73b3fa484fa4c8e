"""What the change is made of: its parts, one after the other, up to the whole."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final, NamedTuple

from normalize.report import axes as axes_by_hand
from normalize.report import look, marks, parts, svg, words
from normalize.report import numbers as n

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from normalize.savings.results import Estimate
    from normalize.site import AccountResult

LEFT: Final = 186.0
BOTTOM: Final = 46.0
TOP: Final = 52.0
ROW: Final = 38.0
THICK: Final = 0.50
ROOM_FOR_WORDS: Final = 0.46  # of what is drawn, right of it
MOST_IN_TITLE: Final = 2  # parts that a title can name


class _Bar(NamedTuple):
    """One row: where its bar starts, and its estimate."""

    name: str
    start: float
    estimate: Estimate
    whole: bool

    @property
    def points(self) -> tuple[float, float, float]:
        """Value, low and high, from where the bar starts."""
        e = self.estimate
        return tuple(self.start + (x or 0.0) for x in (e.value, e.low, e.high))  # type: ignore[return-value]


def parts_figure(account: AccountResult, key: str) -> svg.Picture | None:
    """Bars of the parts, each where the one above it ends, and the whole; None without parts."""
    bars = _bars(account)
    if len(bars) < 3:
        return None
    unit = words.unit_word(account.unit)
    height = TOP + ROW * len(bars) + BOTTOM
    title = _title(account)
    with svg.surface(height) as figure:
        svg.title(figure, title, "Each bar starts where the one above it ends", height=height)
        axes = svg.panel(
            figure, LEFT, BOTTOM, look.WIDTH - LEFT - 4.0, height - BOTTOM - TOP, of=height
        )
        _limits(axes, bars)
        for row, bar in enumerate(bars):
            _draw(axes, bar, float(len(bars) - 1 - row))
        _joints(axes, bars)
        axes.axvline(0.0, color=look.QUIET, linewidth=0.8)
        axes_by_hand.name_below(
            axes, svg.drawn(f"{unit} in a normal year, less to the right and more to the left")
        )
        told = "; ".join(f"{b.name} {_words(b)}" for b in bars)
        return svg.picture(
            figure, key, title=title, alt=f"{title}. {told}.", caption=_caption(account),
            height=height,
        )  # fmt: skip


def _bars(account: AccountResult) -> list[_Bar]:
    found = account.parts
    if found is None or not found.parts:
        return []
    every = [*(p.estimate for p in found.parts), account.savings.normalized]
    if not all(marks.drawable(x) for e in every for x in (e.value, e.low, e.high)):
        return []
    bars, start = [], 0.0
    for part in found.parts:
        bars.append(_Bar(part.name, start, part.estimate, whole=False))
        start += part.estimate.value or 0.0
    return [*bars, _Bar("all together", 0.0, account.savings.normalized, whole=True)]


def _title(account: AccountResult) -> str:
    unit = words.unit_word(account.unit)
    whole = words.in_units(account.savings.normalized)
    if words.verdict_of(whole) == "cannot tell":
        return "A change that could not be told from none, taken apart"
    head = words.signed(whole.value, words.unit_form(unit), 3)
    found = account.parts
    same = [
        p
        for p in (found.parts if found is not None else ())
        if p.estimate.verdict == account.savings.normalized.verdict
    ]
    same.sort(key=lambda p: -abs(p.estimate.value or 0.0))
    if not same:
        return f"{head}; no part of it alone could be told from no change"
    told = ", ".join(
        f"{n.significant(abs(p.estimate.value or 0.0), 3)} from the {p.name}"
        for p in same[:MOST_IN_TITLE]
    )
    return f"{head}, {told}"


def _limits(axes: Axes, bars: list[_Bar]) -> None:
    ends = [0.0, *(x for b in bars for x in (b.start, *b.points))]
    low, high = min(ends), max(ends)
    wide = high - low if high > low else 1.0
    axes.set_xlim(low - 0.02 * wide, high + ROOM_FOR_WORDS * wide)
    axes.set_ylim(-0.55, len(bars) - 0.45)
    axes.spines["left"].set_visible(False)
    axes_by_hand.number_axis(axes, "x", most=7)


def _draw(axes: Axes, bar: _Bar, y: float) -> None:
    left, right = axes.get_xlim()
    value, low, high = bar.points
    axes.annotate(
        bar.name, (0.0, y), xycoords=("axes fraction", "data"), xytext=(-8, 0),
        textcoords="offset points", ha="right", va="center", color=look.INK,
        fontsize=look.TEXT_SIZE, fontweight=700 if bar.whole else 400,
    )  # fmt: skip
    style: dict[str, object]
    if (bar.estimate.value or 0.0) < 0.0:  # an increase is open and dashed, whatever its colour
        style = {"facecolor": "none", "edgecolor": look.CARE, "linestyle": "--", "linewidth": 1.4}
    elif bar.whole:
        style = {"facecolor": look.AFTER, "alpha": 0.55}
    else:
        style = {"facecolor": look.AFTER, "alpha": 0.28}
    axes.barh(y, value - bar.start, left=bar.start, height=THICK, **style)  # type: ignore[arg-type]
    cap = 0.13
    axes.plot(
        [low, low, low, high, high, high], [y - cap, y + cap, y, y, y + cap, y - cap],
        color=look.INK, linewidth=1.4, solid_joinstyle="miter",
    )  # fmt: skip
    axes.text(
        max(value, high, bar.start) + 0.012 * (right - left), y, svg.drawn(_words(bar)),
        va="center", color=look.INK, fontsize=look.TEXT_SIZE,
    )  # fmt: skip


def _joints(axes: Axes, bars: list[_Bar]) -> None:
    """Thin lines from the end of each bar to the start of the next."""
    top = len(bars) - 1
    xs: list[float] = []
    ys: list[float] = []
    for row, bar in enumerate(bars[:-1]):
        at = bar.points[0]
        xs += [at, at, float("nan")]
        ys += [top - row - 0.5 * THICK, top - row - 1 + 0.5 * THICK, float("nan")]
    axes.plot(xs, ys, color=look.QUIET, linewidth=0.9, linestyle=look.DOTS)


def _words(bar: _Bar) -> str:
    from normalize.savings.taken_apart import Part

    return parts.part_words(Part(bar.name, bar.estimate), digits=3)


def _caption(account: AccountResult) -> str:
    sure = words.confidence_word(account.savings.normalized.confidence)
    return (
        f"Whiskers are {sure} ranges, each part's own. Slope and balance temperature err against "
        "each other, so a part is less sure than the whole. Filled bars are less use, open dashed "
        "ones more."
    )
