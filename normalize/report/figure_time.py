"""Bills through time as steps, with the fit and what would have been used."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any, Final

from normalize.report import axes as axes_by_hand
from normalize.report import look, marks, svg, words
from normalize.report import numbers as n

if TYPE_CHECKING:
    from collections.abc import Callable

    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

    from normalize.site import AccountResult, PeriodRow

HEIGHT: Final = 330.0
LEFT: Final = 46.0
BOTTOM: Final = 30.0
TOP: Final = 84.0


def time_figure(account: AccountResult, key: str) -> svg.Picture | None:
    """Every bill as a step over its own days; None without bills."""
    rows = [r for r in account.periods if marks.drawable(r.use_per_day)]
    if not rows:
        return None
    title = _title(account)
    with svg.surface(HEIGHT) as figure:
        svg.title(figure, title, height=HEIGHT)
        axes = svg.panel(
            figure, LEFT, BOTTOM, look.WIDTH - LEFT - 4.0, HEIGHT - BOTTOM - TOP, of=HEIGHT
        )
        _draw_steps(axes, rows)
        middles = ((0.5 * (r.start + r.end), r.use_per_day, r) for r in rows)
        marks.draw_marks(axes, middles)
        _limits(axes, rows)
        marks.draw_work(axes, account)
        axes_by_hand.time_axis(axes, rows[0].start, rows[-1].end)
        axes_by_hand.number_axis(axes, "y")
        _unit(figure, account.unit)
        _key(figure, rows)
        return svg.picture(
            figure,
            key,
            title=title,
            alt=_alt(account, title, rows),
            caption=_caption(account, rows),
            height=HEIGHT,
        )


def _title(account: AccountResult) -> str:
    save = account.savings
    spread = words.in_units(save.avoided)
    verdict = words.verdict_of(spread)
    fuel = words.fuel_word(account.fuel)
    if verdict == "unknown":
        return f"{fuel[:1].upper()}{fuel[1:]} bills through time"
    so_far = ", so far" if save.avoided.so_far else ""
    if verdict == "cannot tell":
        return f"Since the work: {fuel} use could not be told from what was expected{so_far}"
    told = words.finding(save.avoided, account.fuel, account.unit)
    return f"Since the work: {told} than expected in the same weather{so_far}"


def _draw_steps(axes: Axes, rows: list[PeriodRow]) -> None:
    def line(
        of: Callable[[PeriodRow], float], keep: Callable[[PeriodRow], bool], **style: object
    ) -> None:
        spans = [(r.start, r.end, of(r)) for r in rows if keep(r) and marks.drawable(of(r))]
        if spans:
            axes.plot(*marks.steps(spans), **style)  # type: ignore[arg-type]

    line(
        lambda r: r.use_per_day, lambda r: r.side not in marks.USED, color=look.QUIET, linewidth=1.0
    )
    for side, colour in (("before", look.BEFORE), ("after", look.AFTER)):
        line(
            lambda r: r.use_per_day,
            lambda r, side=side: r.side == side,  # type: ignore[misc]
            color=colour, linewidth=1.8, zorder=3,
        )  # fmt: skip
        line(
            lambda r: r.fitted_per_day,
            lambda r, side=side: r.side == side,  # type: ignore[misc]
            color=look.INK, linewidth=0.9, zorder=3.5,
            linestyle=look.DASHES if side == "before" else "-",
        )  # fmt: skip
    line(
        lambda r: r.without_work_per_day, lambda r: r.side == "after",
        color=look.BEFORE, linewidth=1.8, linestyle=look.DOTS, zorder=3.2,
    )  # fmt: skip
    _draw_gap(axes, rows)


def _draw_gap(axes: Axes, rows: list[PeriodRow]) -> None:
    after = [r for r in rows if r.side == "after" and marks.drawable(r.without_work_per_day)]
    if not after:
        return
    xs, used = marks.steps((r.start, r.end, r.use_per_day) for r in after)
    _, without = marks.steps((r.start, r.end, r.without_work_per_day) for r in after)
    axes.fill_between(xs, used, without, color=look.AFTER, alpha=0.14, linewidth=0)


def _limits(axes: Axes, rows: list[PeriodRow]) -> None:
    values = [
        v
        for r in rows
        for v in (r.use_per_day, r.fitted_per_day, r.without_work_per_day)
        if marks.drawable(v)
    ]
    bottom, top = min(0.0, *values), max(values)
    top = top if top > bottom else bottom + 1.0
    axes.set_ylim(bottom * 1.08, top + 0.08 * (top - bottom))
    edge = 0.01 * (rows[-1].end - rows[0].start)
    axes.set_xlim(rows[0].start - edge, rows[-1].end + edge)


def _unit(figure: Figure, unit: str) -> None:
    figure.text(
        0.0, 1.0 - (TOP - 12.0) / HEIGHT, svg.drawn(f"{words.unit_word(unit)} a day"),
        fontsize=look.SMALL_SIZE, color=look.QUIET,
    )  # fmt: skip


def _key(figure: Figure, rows: list[PeriodRow]) -> None:
    """One line of samples under the title: what each kind of line is."""
    from matplotlib.lines import Line2D

    sides = {r.side for r in rows}
    samples: tuple[tuple[str, str, Any, float, str], ...] = (
        ("billed before", look.BEFORE, "-", 1.8, "before"),
        ("billed after", look.AFTER, "-", 1.8, "after"),
        ("expected without a change", look.BEFORE, look.DOTS, 1.8, "after"),
        ("fit", look.INK, look.DASHES, 0.9, "before"),
    )
    x = 0.0
    y = 1.0 - 36.0 / HEIGHT
    for text, colour, dashes, width, side in samples:
        if side not in sides:
            continue
        ends = [x / look.WIDTH, (x + 26.0) / look.WIDTH]
        figure.add_artist(
            Line2D(ends, [y + 4.0 / HEIGHT] * 2, color=colour, linestyle=dashes, linewidth=width)
        )
        figure.text((x + 32.0) / look.WIDTH, y, text, fontsize=look.SMALL_SIZE, color=look.QUIET)
        x += 32.0 + 5.6 * len(text) + 20.0


def _alt(account: AccountResult, title: str, rows: list[PeriodRow]) -> str:
    return (
        f"{title}. {len(rows)} bills from {n.short_date(rows[0].start)} to "
        f"{n.short_date(rows[-1].end)} as steps: use per day in {words.unit_word(account.unit)}, "
        "with the fit and, after the work, what the earlier bills lead one to expect."
    )


def _caption(account: AccountResult, rows: list[PeriodRow]) -> str:
    parts = ["A bill is a step as long as its days.", marks.marks_sentence(rows)]
    if any(r.side == "after" and marks.drawable(r.without_work_per_day) for r in rows):
        parts.append("The shaded gap is the change in use since the work.")
    return " ".join(p for p in parts if p)
