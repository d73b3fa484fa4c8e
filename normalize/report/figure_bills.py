"""Bills of one account on a time line, as read and as repaired."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from normalize.errors import UnwritableReport
from normalize.report import axes as axes_by_hand
from normalize.report import look, marks, svg, words
from normalize.report import numbers as n

if TYPE_CHECKING:
    from pathlib import Path

    from matplotlib.axes import Axes

    from normalize.bills.periods import BillRow, Bills

HEIGHT: Final = 360.0
LEFT: Final = 46.0
BOTTOM: Final = 30.0
STRIP: Final = 64.0  # readings, beneath the axis
TOP: Final = 84.0
MOST_MARKS: Final = 400  # more, as in interval data, would be a smear

UNDER: Final = "Beneath: | a reading, a barred circle an estimate, a cross a bill left out."
KEY: Final = (
    "Steps are periods; a shaded one joins several bills; a question mark is odd and was kept. "
    "Beneath the steps: | a reading, a barred circle an estimated one, a cross a bill left out."
)


def bills_figure(bills: Bills, key: str = "bills", label: str = "") -> svg.Picture | None:
    """Periods as steps of use a day; readings and repairs beneath; None without periods."""
    p = bills.periods
    per_day = p.use / p.days
    if p.n == 0 or not all(marks.drawable(float(y)) for y in per_day):
        return None
    title = f"{label}: {_title(bills)}" if label else _title(bills)
    with svg.surface(HEIGHT) as figure:
        svg.title(figure, title, UNDER, height=HEIGHT)
        tall = HEIGHT - BOTTOM - STRIP - TOP
        axes = svg.panel(figure, LEFT, BOTTOM + STRIP, look.WIDTH - LEFT - 4.0, tall, of=HEIGHT)
        strip = svg.panel(figure, LEFT, BOTTOM, look.WIDTH - LEFT - 4.0, STRIP, of=HEIGHT)
        _draw_steps(axes, bills)
        first, last = int(p.start[0]), int(p.end[-1])
        edge = max(1.0, 0.01 * (last - first))
        for panel in (axes, strip):
            panel.set_xlim(first - edge, last + edge)
        low, high = min(0.0, float(per_day.min())), max(0.0, float(per_day.max()))
        reach = (high - low) or 1.0
        axes.set_ylim(low - 0.02 * reach, high + 0.08 * reach)
        _draw_readings(strip, bills)
        axes_by_hand.time_axis(strip, first, last)
        axes_by_hand.number_axis(axes, "y")
        figure.text(
            0.0, 1.0 - (TOP - 18.0) / HEIGHT, svg.drawn(f"{words.unit_word(bills.unit)} a day"),
            fontsize=look.SMALL_SIZE, color=look.QUIET,
        )  # fmt: skip
        return svg.picture(
            figure, key, title=title,
            alt=f"{title}. {p.n} periods through time, with the readings beneath.",
            caption=KEY, height=HEIGHT,
        )  # fmt: skip


def _title(bills: Bills) -> str:
    left_out = sum(1 for e in bills.ledger if e.fate == "left out")
    n_rows, n_periods = len(bills.rows), bills.periods.n
    became = f"{n_rows} bills became {n_periods} {'period' if n_periods == 1 else 'periods'}"
    return f"{became}; {left_out} left out" if left_out else f"{became}; none left out"


def _draw_steps(axes: Axes, bills: Bills) -> None:
    p = bills.periods
    xs: list[float] = []
    ys: list[float] = []
    for k in range(p.n):
        if k and p.start[k] != p.end[k - 1]:
            xs.append(float("nan"))
            ys.append(float("nan"))
        y = float(p.use[k] / p.days[k])
        xs += [float(p.start[k]), float(p.end[k])]
        ys += [y, y]
        if p.joined[k] > 1 and p.n <= MOST_MARKS:
            axes.fill_between([p.start[k], p.end[k]], [0.0, 0.0], [y, y], color=look.RULE,
                              linewidth=0.0)  # fmt: skip
    axes.plot(xs, ys, color=look.BEFORE, linewidth=1.4, zorder=3)
    odd = [f.period - 1 for f in bills.flags if f.what != "alternating"]
    for k in dict.fromkeys(odd[:MOST_MARKS]):
        x, y = 0.5 * float(p.start[k] + p.end[k]), float(p.use[k] / p.days[k])
        axes.text(x, y, "?", color=look.CARE, fontsize=look.TEXT_SIZE, ha="center", va="bottom")


def _draw_readings(strip: Axes, bills: Bills) -> None:
    """One mark for each bill's reading, by what became of it."""
    strip.set_ylim(0.0, 1.0)
    strip.spines["left"].set_visible(False)
    left_out = {e.line for e in bills.ledger if e.fate == "left out"}
    shown = [r for r in bills.rows if r.end is not None][:MOST_MARKS]
    groups: dict[str, list[float]] = {"read": [], "estimated": [], "left out": []}
    for row in shown:
        groups[_group(row, left_out)].append(float(row.end or 0))
    at = {"read": 0.75, "estimated": 0.75, "left out": 0.32}
    shape = {"read": "|", "estimated": "o", "left out": "x"}
    colour = {"read": look.INK, "estimated": look.BEFORE, "left out": look.CARE}
    for name, xs in groups.items():
        ys = [at[name]] * len(xs)
        strip.plot(xs, ys, linestyle="none", marker=shape[name], color=colour[name],
                   markersize=6.0, markerfacecolor=look.PAPER, markeredgewidth=1.2)  # fmt: skip
        if name == "estimated":
            strip.plot(xs, ys, linestyle="none", marker="_", color=colour[name], markersize=12.0)


def _group(row: BillRow, left_out: set[int]) -> str:
    if row.line in left_out:
        return "left out"
    return "estimated" if row.estimated else "read"


def write_bills_figure(bills: Bills, path: Path, label: str = "") -> None:
    """Write the picture as SVG to a new file.  label : whose bills.  Raises UnwritableReport."""
    picture = bills_figure(bills, label=n.mask(label))
    if picture is None:
        raise UnwritableReport("there is nothing that could be drawn", where=n.mask(path.name))
    try:
        with path.open("x", encoding="utf-8", newline="\n") as stream:
            stream.write(picture.standalone())
    except FileExistsError:
        raise UnwritableReport(
            "there is a file of that name", where=path.name, next_step="Choose another name."
        ) from None
    except (OSError, ValueError) as error:
        reason = error.strerror if isinstance(error, OSError) else "no name for a file"
        raise UnwritableReport(f"cannot be written ({reason})", where=path.name) from None
