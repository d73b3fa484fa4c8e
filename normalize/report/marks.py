"""Marks of one bill and of a run of bills, shared by the figures, and what is drawable."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, Any, Final

from normalize.report import look

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence

    from matplotlib.axes import Axes

    from normalize.site import AccountResult, PeriodRow

USED: Final = ("before", "after")
ELSEWHERE: Final = ("older", "later", "between", "earlier occupant")  # sound, but of other times
COLOURS: Final = {"before": look.BEFORE, "after": look.AFTER, "elsewhere": look.QUIET}
TOO_LARGE: Final = 1e12  # no bill is; beyond it axes cannot be labelled

MARKS_BEFORE: Final = "Open circles are bills before the work"
MARKS_AFTER: Final = "filled diamonds are bills after it"
MARKS_LEFT_OUT: Final = "small crosses are bills that took no part"
MARKS_ESTIMATED: Final = "a bar through an open mark is an estimated reading"


def drawable(value: float | None) -> bool:
    """Whether a number can be placed on an axis.

    >>> drawable(3.0), drawable(float("nan")), drawable(1e300)
    (True, False, False)
    """
    return value is not None and math.isfinite(value) and abs(value) < TOO_LARGE


def marks_sentence(rows: Sequence[PeriodRow]) -> str:
    """What the marks mean, for those marks that are there."""
    sides = {r.side for r in rows}
    parts = [MARKS_BEFORE] if "before" in sides else []
    if "after" in sides:
        parts.append(MARKS_AFTER)
    if sides - set(USED):
        parts.append(MARKS_LEFT_OUT)
    if any(r.estimated for r in rows):
        parts.append(MARKS_ESTIMATED)
    if not parts:
        return ""
    text = "; ".join(parts)
    return f"{text[:1].upper()}{text[1:]}."


def draw_marks(axes: Axes, points: Iterable[tuple[float, float, PeriodRow]]) -> None:
    """One mark a bill, by side and kind of reading."""
    groups: dict[tuple[str, bool], list[tuple[float, float]]] = {}
    for x, y, row in points:
        side = row.side if row.side in (*USED, *ELSEWHERE) else "left out"
        side = "elsewhere" if side in ELSEWHERE else side
        groups.setdefault((side, row.estimated and side in USED), []).append((x, y))
    for (side, estimated), places in sorted(groups.items()):
        xs, ys = zip(*places, strict=True)
        colour = COLOURS.get(side, look.CARE)
        shape = {"before": "o", "after": "D"}.get(side, "x")
        size = {"before": 6.0, "after": 5.4}.get(side, 4.5)
        face = look.PAPER if side == "before" or estimated else colour
        style: dict[str, Any] = {"linestyle": "none", "color": colour, "zorder": 4}
        style["markeredgewidth"] = 1.2
        axes.plot(xs, ys, marker=shape, markersize=size, markerfacecolor=face, **style)
        if estimated:
            axes.plot(xs, ys, marker="_", markersize=13.0, **style)


def steps(spans: Iterable[tuple[float, float, float]]) -> tuple[list[float], list[float]]:
    """Line through half-open spans ``(start, end, value)``; broken where bills are missing.

    >>> steps([(0, 30, 2.0), (30, 60, 3.0)])
    ([0, 30, 30, 60], [2.0, 2.0, 3.0, 3.0])
    """
    xs: list[float] = []
    ys: list[float] = []
    for start, end, value in spans:
        if xs and xs[-1] != start:
            xs.append(start)
            ys.append(math.nan)
        xs += [start, end]
        ys += [value, value]
    return xs, ys


def draw_work(axes: Axes, account: AccountResult) -> None:
    """The work window as a band, named at its top."""
    start, end = account.work_start, account.work_end
    left, right = axes.get_xlim()
    if start is None or end is None or end < left or start > right:
        return
    axes.axvspan(max(start, left), min(end, right), color=look.RULE, alpha=0.75, linewidth=0)
    axes.axvline(max(start, left), color=look.QUIET, linewidth=0.8)
    late = start > left + 0.85 * (right - left)
    axes.annotate(
        "work", (start if late else end, 1.0), xycoords=("data", "axes fraction"),
        xytext=(-4 if late else 4, -1), textcoords="offset points", ha="right" if late else "left",
        va="top", color=look.QUIET, fontsize=look.SMALL_SIZE,
    )  # fmt: skip
