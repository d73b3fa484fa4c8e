"""How firm the answer is, as a picture: one row a change, the chosen answer as a line through."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final, NamedTuple

from normalize.report import axes as axes_by_hand
from normalize.report import look, marks, spread, svg, words
from normalize.report import numbers as n

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from normalize.savings.results import Estimate
    from normalize.sensitivity import Moved
    from normalize.site import AccountResult, SiteResult

MOST_ROWS: Final = 25  # more are in the table
ROW: Final = 21.0  # px
LEFT: Final = 268.0
RIGHT: Final = 12.0
BOTTOM: Final = 42.0
TOP: Final = 62.0
LONGEST: Final = 48  # letters of a label
NAMES_BELOW: Final = 0.75  # of a row, for the names of a band's ends
BEYOND: Final = 4.0  # ranges longer than this many times the chosen one's are cut at the edge


class _Row(NamedTuple):
    """A row ready to be drawn; all numbers in the picture's unit.  last : a band's other end."""

    line: spread.Line
    value: float
    low: float
    high: float
    last: float


def spread_figure(account: AccountResult, result: SiteResult, key: str) -> svg.Picture | None:
    """Ranges under every change; None where there is nothing to compare."""
    rows = spread.rows_of(account, result)
    lines = spread.lines(account, result)[:MOST_ROWS]
    if len(lines) < 2:
        return None
    own = spread.answer_of(rows[0], rows[0])
    share = own is not None and n.known(own.fraction)
    drawn = [r for line in lines if (r := _row(line, share=share)) is not None]
    if len(drawn) < 2 or not drawn[0].line.chosen:
        return None
    places = _places(drawn)
    room = places[-1] + 1.0
    height = TOP + BOTTOM + ROW * room
    title = _title(account, drawn)
    with svg.surface(height) as figure:
        svg.title(figure, title, _under(account, result), height=height)
        axes = svg.panel(figure, LEFT, BOTTOM, look.WIDTH - LEFT - RIGHT, ROW * room, of=height)
        axes.spines["left"].set_visible(False)
        _limits(axes, drawn, room)
        _guides(axes, drawn[0].value, room, share=share, unit=account.unit)
        for place, row in zip(places, drawn, strict=True):
            _draw(axes, row, room - 1.0 - place)
        unit = "% of use before the work" if share else words.unit_word(account.unit)
        axes_by_hand.name_below(axes, f"← more used · {svg.drawn(unit)} · less used →")
        alt = f"{title}. " + " ".join(spread.sentences(account, result))
        return svg.picture(
            figure, key, title=title, alt=alt, caption=_caption(drawn), height=height
        )


def _row(line: spread.Line, *, share: bool) -> _Row | None:
    """The numbers of a line, in per cent or units; None where they cannot be drawn."""
    if line.band is not None and line.reach is not None:
        first, last = (_value(told.estimate, share=share) for told in line.band)
        k = _factor(line.band[0].estimate, share=share)
        row = _Row(line, first, line.reach[0] * k, line.reach[1] * k, last)
    else:
        e = line.estimate
        if e is None or e.low is None or e.high is None:
            return None
        k = _factor(e, share=share)
        row = _Row(line, _value(e, share=share), e.low * k, e.high * k, _value(e, share=share))
    return row if all(marks.drawable(x) for x in row[1:]) else None


def _value(e: Estimate, *, share: bool) -> float:
    return float(e.value or 0.0) * _factor(e, share=share)


def _factor(e: Estimate, *, share: bool) -> float:
    """From the account's unit to per cent of use before the work."""
    if not share:
        return 1.0
    if e.fraction is None or not e.value:
        return float("nan")
    return 100.0 * e.fraction / e.value


def _title(account: AccountResult, rows: list[_Row]) -> str:
    fuel = words.upper(words.fuel_word(account.fuel))
    turned = sum("turns the answer" in r.line.note for r in rows)
    own = rows[0].line.estimate
    if own is not None and own.verdict == "cannot tell" and not turned:
        return f"{fuel}: no choice below makes the change one that can be told"
    if turned:
        return f"{fuel}: some choices below would turn the answer"
    return f"{fuel}: no choice below turns the answer"


def _under(account: AccountResult, result: SiteResult) -> str:
    own = spread.rows_of(account, result)[0]
    normal = own.normalized is not None and own.normalized.available
    kind = "in a normal year" if normal else "since the work"
    return f"The change {kind}, one thing changed at a time"


def _places(rows: list[_Row]) -> list[float]:
    """Rows from the top; beneath a band there is room for the names of its ends."""
    out = [0.0]
    for row in rows[:-1]:
        out.append(out[-1] + (1.0 if row.line.band is None else 1.0 + NAMES_BELOW))
    return out


def _limits(axes: Axes, rows: list[_Row], room: float) -> None:
    """Room for the answer and its rivals; far rows may run over the edge."""
    own = rows[0]
    ends = [0.0]
    for row in rows:
        if not row.line.far:
            ends += [row.low, row.high, row.value]
    wide = BEYOND * max(own.high - own.low, 1e-9)
    low = max(min(ends), own.low - wide)
    high = min(max(ends), own.high + wide)
    low, high = min(low, 0.0), max(high, 0.0)
    pad = 0.04 * (high - low if high > low else 1.0)
    axes.set_xlim(low - pad, high + pad)
    axes.set_ylim(-0.6, room - 0.4)
    axes_by_hand.number_axis(axes, "x", most=7)


def _guides(axes: Axes, chosen: float, room: float, *, share: bool, unit: str) -> None:
    """Zero and the chosen answer, each with its name above."""
    axes.axvline(0.0, color=look.QUIET, linewidth=0.9)
    axes.axvline(chosen, color=look.AFTER, linewidth=1.0, linestyle=look.DOTS)
    left, right = axes.get_xlim()
    top = room - 0.4
    near = abs(chosen) < 0.16 * (right - left)
    told = n.significant(abs(chosen), 2)
    ending = "%" if share else words.unit_word(unit)
    word = "less" if chosen > 0 else "more"
    own = f"as chosen: {told}{n.NBSP}{ending} {word}"
    places = (
        (0.0, "no change", look.QUIET, "right" if chosen >= 0 else "left"),
        (chosen, own, look.AFTER, "left" if chosen >= 0 else "right"),
    )
    for x, text, colour, side in places:
        at = side if near else "center"
        if not near:
            at = "right" if x > right - 0.2 * (right - left) else at
            at = "left" if x < left + 0.2 * (right - left) else at
        axes.text(
            x, top, svg.drawn(text), ha=at, va="bottom", color=colour, fontsize=look.SMALL_SIZE
        )


def _draw(axes: Axes, row: _Row, y: float) -> None:
    line = row.line
    colour = look.QUIET if line.far else look.INK
    left, right = axes.get_xlim()
    label = line.label if len(line.label) <= LONGEST else line.label[: LONGEST - 1] + "…"
    axes.annotate(
        svg.drawn(label), (0.0, y), xycoords=("axes fraction", "data"), xytext=(-10, 0),
        textcoords="offset points", ha="right", va="center", color=colour,
        fontsize=look.SMALL_SIZE, fontweight=700 if line.chosen else 400,
    )  # fmt: skip
    low, high = max(row.low, left), min(row.high, right)
    if line.band is not None:
        _draw_band(axes, row, y)
        return
    if low < high:
        axes.plot(
            [low, high], [y, y], color=colour, linewidth=2.2 if line.chosen else 1.2,
            linestyle=look.DOTS if line.far else "-", solid_capstyle="butt",
        )  # fmt: skip
    for end, cut in ((row.low, left), (row.high, right)):
        if left <= end <= right:
            axes.plot([end, end], [y - 0.16, y + 0.16], color=colour, linewidth=1.2)
        else:  # goes on beyond the edge
            axes.plot([cut], [y], marker="<" if end < cut else ">", markersize=4.5,
                      color=colour, clip_on=False)  # fmt: skip
    if left <= row.value <= right:
        if line.far:
            axes.plot([row.value], [y], marker="x", markersize=4.5, color=colour)
        else:
            axes.plot(
                [row.value], [y], marker="D" if line.chosen else "o", markersize=6.0,
                markerfacecolor=look.AFTER if line.chosen else look.PAPER,
                color=look.AFTER if line.chosen else look.INK, markeredgewidth=1.2,
            )  # fmt: skip


def _draw_band(axes: Axes, row: _Row, y: float) -> None:
    """All bills left out in turn: the values as a bar, their ranges as a thin line."""
    left, right = axes.get_xlim()
    axes.plot([max(row.low, left), min(row.high, right)], [y, y], color=look.INK, linewidth=1.2)
    for end in (row.low, row.high):
        if left <= end <= right:
            axes.plot([end, end], [y - 0.16, y + 0.16], color=look.INK, linewidth=1.2)
    axes.barh(
        y, row.last - row.value, left=row.value, height=0.44, facecolor=look.AFTER, alpha=0.45,
        edgecolor=look.INK, linewidth=0.8,
    )  # fmt: skip
    if row.line.band is None:
        return
    low, high = (_month(told.row) for told in row.line.band)
    middle = 0.5 * (row.value + row.last)
    right_side = middle > left + 0.5 * (right - left)
    axes.annotate(
        svg.drawn(f"lowest without {low}, highest without {high}"), (1.0 if right_side else 0.0, y),
        xycoords=("axes fraction", "data"), xytext=(0, -NAMES_BELOW * ROW), va="center",
        textcoords="offset points", ha="right" if right_side else "left", color=look.QUIET,
        fontsize=look.SMALL_SIZE,
        bbox={"facecolor": look.PAPER, "edgecolor": "none", "pad": 1.0},
    )  # fmt: skip


def _month(row: Moved) -> str:
    return spread.month_of(row.start, row.end) if row.start is not None and row.end else ""


def _caption(rows: list[_Row]) -> str:
    text = (
        "The diamond is the answer as chosen, the dotted line carries it down; open circles are "
        "other choices, each with its own range. "
    )
    band = next((r.line.band for r in rows if r.line.band is not None), None)
    if band is not None:
        text += "The bar spans all answers with one bill left out, its line all their ranges. "
    if any(r.line.far for r in rows):
        text += "Crosses on dotted lines fit these bills far worse, and count for nothing. "
    return text.strip()
