"""The two normal years side by side, and the difference spelled out."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from normalize.report import axes as axes_by_hand
from normalize.report import look, marks, svg, words
from normalize.report import numbers as n

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from normalize.savings.results import Estimate
    from normalize.site import AccountResult

HEIGHT: Final = 226.0
LEFT: Final = 62.0
BOTTOM: Final = 42.0
TOP: Final = 54.0
ROWS: Final = {"before": 2.0, "after": 1.0, "change": 0.0}
THICK: Final = 0.52
ROOM_FOR_WORDS: Final = 0.52  # of the longest bar, right of it


def years_figure(account: AccountResult, key: str) -> svg.Picture | None:
    """Bars of both normal years and of the change, with ranges; None if neither is known."""
    save = account.savings
    bars = {"before": save.nac_before, "after": save.nac_after, "change": save.normalized}
    shown = {row: e for row, e in bars.items() if marks.drawable(e.value)}
    if "before" not in shown and "after" not in shown:
        return None
    title = _title(account)
    unit = words.unit_word(account.unit)
    with svg.surface(HEIGHT) as figure:
        svg.title(figure, title, "Use in the same normal year", height=HEIGHT)
        axes = svg.panel(
            figure, LEFT, BOTTOM, look.WIDTH - LEFT - 4.0, HEIGHT - BOTTOM - TOP, of=HEIGHT
        )
        _limits(axes, list(shown.values()))
        for row, y in ROWS.items():
            _draw_row(axes, row, y, shown.get(row), unit)
        axes.axvline(0.0, color=look.QUIET, linewidth=0.8)
        axes_by_hand.name_below(axes, svg.drawn(f"{unit} a normal year"))
        alt = f"{title}. Bars with their ranges: " + "; ".join(
            f"{row} {_words(row, e, unit)}" for row, e in shown.items()
        )
        return svg.picture(
            figure, key, title=title, alt=f"{alt}.", caption=_caption(account), height=HEIGHT
        )


def _title(account: AccountResult) -> str:
    save = account.savings
    unit = words.unit_word(account.unit)
    before, after = save.nac_before.value, save.nac_after.value
    if marks.drawable(before) and marks.drawable(after):
        told = words.verdict_of(words.in_units(save.normalized))
        tail = ", which could not be told from no change" if told == "cannot tell" else ""
        return f"{n.significant(before, 3)} {unit} before, {n.significant(after, 3)} after{tail}"
    if marks.drawable(before):
        return f"{n.significant(before, 3)} {unit} before; after is not known yet"
    return f"{n.significant(after, 3)} {unit} after; before is not known"


def _limits(axes: Axes, estimates: list[Estimate]) -> None:
    ends = [0.0]
    for e in estimates:
        ends += [x for x in (e.value, e.low, e.high) if x is not None and marks.drawable(x)]
    low, high = min(ends), max(ends)
    wide = high - low if high > low else 1.0
    axes.set_xlim(low - (0.03 * wide if low < 0 else 0.0), high + ROOM_FOR_WORDS * wide)
    axes.set_ylim(-0.6, 2.6)
    axes.spines["left"].set_visible(False)
    axes_by_hand.number_axis(axes, "x", most=7)


def _draw_row(axes: Axes, row: str, y: float, estimate: Estimate | None, unit: str) -> None:
    colour = {"before": look.BEFORE, "after": look.AFTER}.get(row, look.INK)
    left, right = axes.get_xlim()
    axes.annotate(
        row, (0.0, y), xycoords=("axes fraction", "data"), xytext=(-8, 0),
        textcoords="offset points", ha="right", va="center", color=colour, fontsize=look.TEXT_SIZE,
    )  # fmt: skip
    nudge = 0.012 * (right - left)
    if estimate is None or estimate.value is None:
        axes.text(
            max(left, 0.0) + nudge, y, "not known", va="center", color=look.QUIET,
            fontsize=look.TEXT_SIZE,
        )  # fmt: skip
        return
    value = estimate.value
    style: dict[str, object] = {
        "before": {"facecolor": "none", "edgecolor": colour, "linestyle": "--", "linewidth": 1.4},
        "after": {"facecolor": colour, "alpha": 0.55},
    }.get(row, {"facecolor": look.AFTER, "alpha": 0.14})
    axes.barh(y, value, height=THICK, **style)  # type: ignore[arg-type]
    ends = [x for x in (estimate.low, estimate.high) if x is not None and marks.drawable(x)]
    if len(ends) == 2:
        low, high = ends
        cap = 0.13
        axes.plot(
            [low, low, low, high, high, high],
            [y - cap, y + cap, y, y, y + cap, y - cap],
            color=look.INK, linewidth=1.4, solid_joinstyle="miter",
        )  # fmt: skip
    x = max([value, 0.0, *ends]) + nudge
    axes.text(x, y, svg.drawn(_words(row, estimate, unit)), va="center", color=look.INK,
              fontsize=look.TEXT_SIZE)  # fmt: skip


def _words(row: str, estimate: Estimate, unit: str) -> str:
    spread = words.in_units(estimate)
    verdict = words.verdict_of(spread)
    if row == "change" and verdict == "cannot tell":
        return f"{_signed_short(spread.low)} to {_signed_short(spread.high)}"
    if row == "change":
        head = words.signed(spread.value, words.unit_form(unit), 3)
        if verdict == "no range":
            return head
        near, far = sorted((abs(spread.low or 0.0), abs(spread.high or 0.0)))
        return f"{head} ({n.significant(near, 3)} to {n.significant(far, 3)})"
    text = n.significant(spread.value, 3)
    if verdict == "no range":
        return text
    return f"{text} ({n.significant(spread.low, 3)} to {n.significant(spread.high, 3)})"


def _signed_short(value: float | None) -> str:
    if value is None:
        return n.UNKNOWN
    return f"{n.significant(abs(value), 3)} {'less' if value > 0 else 'more'}"


def _caption(account: AccountResult) -> str:
    sure = words.confidence_word(account.savings.normalized.confidence)
    return (
        "Both years have the weather of the same normal year, so they differ in use only. "
        f"Whiskers are {sure} ranges."
    )
