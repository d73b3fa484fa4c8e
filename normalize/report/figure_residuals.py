"""What the fits leave over, bill by bill."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from normalize.report import axes as axes_by_hand
from normalize.report import look, marks, svg, words
from normalize.report import numbers as n

if TYPE_CHECKING:
    from normalize.site import AccountResult

HEIGHT: Final = 220.0
LEFT: Final = 46.0
BOTTOM: Final = 30.0
TOP: Final = 62.0


def residuals_figure(account: AccountResult, key: str) -> svg.Picture | None:
    """Billed less fitted use per day through time; None without a fit."""
    points = [
        (0.5 * (r.start + r.end), r.use_per_day - r.fitted_per_day, r)
        for r in account.periods
        if r.side in marks.USED and marks.drawable(r.use_per_day - r.fitted_per_day)
    ]
    if not points:
        return None
    title = _title(account)
    unit = words.unit_word(account.unit)
    with svg.surface(HEIGHT) as figure:
        svg.title(figure, title, height=HEIGHT)
        axes = svg.panel(
            figure, LEFT, BOTTOM, look.WIDTH - LEFT - 4.0, HEIGHT - BOTTOM - TOP, of=HEIGHT
        )
        reach = max(abs(y) for _, y, _ in points) or 1.0
        axes.set_ylim(-1.15 * reach, 1.15 * reach)
        first, last = points[0][2].start, points[-1][2].end
        edge = 0.01 * (last - first)
        axes.set_xlim(first - edge, last + edge)
        axes.axhline(0.0, color=look.QUIET, linewidth=0.8)
        xs = [v for x, _, _ in points for v in (x, x, float("nan"))]
        ys = [v for _, y, _ in points for v in (0.0, y, float("nan"))]
        axes.plot(xs, ys, color=look.RULE, linewidth=1.6)
        marks.draw_marks(axes, points)
        axes_by_hand.time_axis(axes, first, last)
        axes_by_hand.number_axis(axes, "y")
        figure.text(
            0.0, 1.0 - (TOP - 14.0) / HEIGHT, svg.drawn(f"{unit} a day above or below its own fit"),
            fontsize=look.SMALL_SIZE, color=look.QUIET,
        )  # fmt: skip
        return svg.picture(
            figure,
            key,
            title=title,
            alt=f"{title}. {len(points)} bills through time: billed less fitted use, {unit} a day.",
            caption="Long runs on one side of the line mean that bills err together; the ranges "
            "allow for that.",
            height=HEIGHT,
        )


def _title(account: AccountResult) -> str:
    sides = (("before", account.savings.before), ("after", account.savings.after))
    parts = [
        f"{n.percent(fit.cv_rmse)} {side}"
        for side, fit in sides
        if fit is not None and n.known(fit.cv_rmse)
    ]
    if not parts:
        return "What the fit leaves over"
    return f"Bills scatter about their fit by {' and '.join(parts)} the work"
