"""Use per day against outdoor temperature: the picture that carries the report."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from normalize.report import axes as axes_by_hand
from normalize.report import look, marks, svg, words
from normalize.report import numbers as n

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

    from normalize.fitting.results import Fit
    from normalize.site import AccountResult, Curve, PeriodRow
    from normalize.weather.year import LongTermYear

HEIGHT: Final = 452.0
LEFT: Final = 46.0
BOTTOM: Final = 46.0  # tick labels and the name of the axis
STRIP: Final = 70.0  # balance temperatures and the rug, beneath the axis
TOP: Final = 78.0  # title, line under it, unit of the axis
ROOM_FOR_LABEL: Final = 0.115  # share of the axis beyond the lines' ends
LABEL_SHARE: Final = 0.26  # of the axis, about what the longest label takes
STROKES: Final = 73  # each stands for five days of the normal year
ROWS: Final = {"before": 0.80, "after": 0.50}
COLOURS: Final = {"before": look.BEFORE, "after": look.AFTER}


def temperature_figure(
    account: AccountResult, year: LongTermYear | None, key: str
) -> svg.Picture | None:
    """Bills, both fits, balance temperatures, the normal year's days; None without bills."""
    rows = [r for r in account.periods if marks.drawable(r.mean_temp_f) and marks.drawable(_use(r))]
    if not rows:
        return None
    low, high = _span(account, [r.mean_temp_f for r in rows], year)
    title, under = _title(account)
    with svg.surface(HEIGHT) as figure:
        svg.title(figure, title, under, height=HEIGHT)
        axes, strip = _panels(figure, account.unit)
        lines = _draw_lines(axes, account, low, high)
        marks.draw_marks(axes, ((r.mean_temp_f, _use(r), r) for r in rows))
        ends = _limits(axes, strip, low, high, [_use(r) for r in rows], lines)
        _label_lines(axes, lines, ends, low, high)
        _draw_balances(strip, account)
        if year is not None:
            _draw_rug(strip, year, low, high)
        return svg.picture(
            figure,
            key,
            title=title,
            alt=_alt(account, title, len(rows)),
            caption=_caption(account, rows, year),
            height=HEIGHT,
        )


def _title(account: AccountResult) -> tuple[str, str]:
    save = account.savings
    finding = words.finding(save.normalized, account.fuel, account.unit)
    spread = words.in_units(save.normalized)
    verdict = words.verdict_of(spread)
    if verdict in ("reduction", "increase"):
        form = words.unit_form(words.unit_word(account.unit))
        digits = words.digits_for(spread, form)
        gap = words.signed(spread.value, form, digits)
        ranged = words.span_words(spread, form, digits)
        return f"{finding} {words.NORMAL_YEAR}", f"Shaded: the gap, {gap} a year ({ranged})"
    if verdict != "unknown":
        return f"{finding} {words.NORMAL_YEAR}", "Shaded: the gap between the two fits"
    return _title_of_one_fit(account), "Use per day of each bill against outdoor temperature"


def _title_of_one_fit(account: AccountResult) -> str:
    fuel = words.fuel_word(account.fuel)
    fuel = f"{fuel[:1].upper()}{fuel[1:]}"
    fit = account.savings.before or account.savings.after
    if fit is None:
        return f"{fuel}: no fit of use to weather yet"
    side = "before" if account.savings.before is not None else "after"
    if fit.balance_heating_f is not None:
        return f"{fuel} use {side} the work rises below {_degrees(fit.balance_heating_f)}"
    if fit.balance_cooling_f is not None:
        return f"{fuel} use {side} the work rises above {_degrees(fit.balance_cooling_f)}"
    return f"{fuel} use {side} the work, against outdoor temperature"


def _span(
    account: AccountResult, temps: list[float], year: LongTermYear | None
) -> tuple[float, float]:
    """The stretch of temperatures to draw: bills, and nearly all days of the normal year."""
    ends = [min(temps), max(temps)]
    if year is not None and year.temp_f.shape[0] > 0:
        m = year.temp_f.shape[0]
        ends += [float(year.temp_f[int(0.01 * m)]), float(year.temp_f[int(0.99 * (m - 1))])]
    ends = [e for e in ends if marks.drawable(e)]
    low, high = min(ends), max(ends)
    return (low - 5.0, high + 5.0) if high - low < 10.0 else (low, high)


def _panels(figure: Figure, unit: str) -> tuple[Axes, Axes]:
    wide = look.WIDTH - LEFT - 4.0
    axes = svg.panel(figure, LEFT, BOTTOM + STRIP, wide, HEIGHT - BOTTOM - STRIP - TOP, of=HEIGHT)
    strip = svg.panel(figure, LEFT, BOTTOM, wide, STRIP, of=HEIGHT)
    strip.spines["left"].set_visible(False)
    strip.set_ylim(0.0, 1.0)
    figure.text(
        0.0,
        1.0 - (TOP - 12.0) / HEIGHT,
        svg.drawn(f"{words.unit_word(unit)} a day"),
        fontsize=look.SMALL_SIZE,
        color=look.QUIET,
    )
    axes_by_hand.name_below(strip, "mean outdoor temperature of the bill’s days, °F")
    return axes, strip


def _draw_lines(
    axes: Axes, account: AccountResult, low: float, high: float
) -> dict[str, tuple[list[float], list[float]]]:
    lines = {}
    for side, curve in (("before", account.curve_before), ("after", account.curve_after)):
        if curve is None:
            continue
        xs, ys = _cut(curve, low, high)
        if len(xs) < 2:
            continue
        lines[side] = (xs, ys)
        dashes = look.DASHES if side == "before" else "-"
        axes.plot(xs, ys, color=COLOURS[side], linestyle=dashes, linewidth=2.0, zorder=3)
    if len(lines) == 2:
        _shade_gap(axes, *lines["before"], *lines["after"])
    return lines


def _shade_gap(
    axes: Axes, xs: list[float], ys: list[float], other_xs: list[float], other_ys: list[float]
) -> None:
    """Between both lines, where both are drawn; each keeps its own corners."""
    import numpy as np

    low, high = max(xs[0], other_xs[0]), min(xs[-1], other_xs[-1])
    at = np.unique(np.array([x for x in (*xs, *other_xs) if low <= x <= high]))
    first, second = np.interp(at, xs, ys), np.interp(at, other_xs, other_ys)
    axes.fill_between(at, first, second, color=look.AFTER, alpha=0.14, linewidth=0)


def _cut(curve: Curve, low: float, high: float) -> tuple[list[float], list[float]]:
    """The part of a curve inside the stretch, with its ends on the stretch's ends."""
    xs = [float(x) for x in curve.temp_f]
    ys = [float(y) for y in curve.use_per_day]
    points = [(x, y) for x, y in zip(xs, ys, strict=True) if marks.drawable(x + y)]
    kept: list[tuple[float, float]] = []
    for i, (x, y) in enumerate(points):
        if i and (points[i - 1][0] < low < x):
            kept.append((low, _between(points[i - 1], (x, y), low)))
        if low <= x <= high:
            kept.append((x, y))
        if i and (points[i - 1][0] < high < x):
            kept.append((high, _between(points[i - 1], (x, y), high)))
    return [x for x, _ in kept], [y for _, y in kept]


def _between(first: tuple[float, float], second: tuple[float, float], at: float) -> float:
    return first[1] + (second[1] - first[1]) * (at - first[0]) / (second[0] - first[0])


def _limits(
    axes: Axes,
    strip: Axes,
    low: float,
    high: float,
    uses: list[float],
    lines: dict[str, tuple[list[float], list[float]]],
) -> str:
    """Set both axes; returns the end, "left" or "right", at which the lines are labelled."""
    values = uses + [y for _, ys in lines.values() for y in ys]
    bottom, top = min(0.0, *values), max(values)
    top = top if top > bottom else bottom + 1.0
    axes.set_ylim(bottom * 1.08, top + 0.06 * (top - bottom))
    end = "right"
    if lines:
        heights = {
            at: [ys[i] for _, ys in lines.values()] for at, i in (("left", 0), ("right", -1))
        }
        spread = {at: (max(ys) - min(ys), max(ys)) for at, ys in heights.items()}
        end = "left" if spread["left"] > spread["right"] else "right"
    room = ROOM_FOR_LABEL * (high - low)
    margin = 0.02 * (high - low)
    left = low - (room if end == "left" else margin)
    right = high + (room if end == "right" else margin)
    axes.set_xlim(left, right)
    strip.set_xlim(left, right)
    axes_by_hand.number_axis(axes, "y")
    axes_by_hand.number_axis(strip, "x", most=10)
    return end


def _label_lines(
    axes: Axes,
    lines: dict[str, tuple[list[float], list[float]]],
    end: str,
    low: float,
    high: float,
) -> None:
    """Name both lines beside their ends, kept apart."""
    bottom, top = axes.get_ylim()
    apart = 17.0 / (HEIGHT - BOTTOM - STRIP - TOP) * (top - bottom)
    places = sorted((ys[0 if end == "left" else -1], side) for side, (_, ys) in lines.items())
    if len(places) == 2 and places[1][0] - places[0][0] < apart:
        middle = 0.5 * (places[0][0] + places[1][0])
        middle = min(max(middle, bottom + apart), top - 0.5 * apart)
        places = [(middle - 0.5 * apart, places[0][1]), (middle + 0.5 * apart, places[1][1])]
    nudge = 0.01 * (high - low)
    for y, side in places:
        axes.text(
            low - nudge if end == "left" else high + nudge,
            y,
            side,
            ha="right" if end == "left" else "left",
            va="center",
            color=COLOURS[side],
            fontsize=look.TEXT_SIZE,
        )


def _draw_balances(strip: Axes, account: AccountResult) -> None:
    save = account.savings
    crossing = [] if save.after is None else _balances_of(save.after)
    for side, fit, ticks in (("before", save.before, crossing), ("after", save.after, [])):
        if fit is None:
            continue
        heat, cool = fit.balance_heating_f, fit.balance_cooling_f
        if fit.form == "two slopes":
            turn = f"{side}: turns at {_degrees(heat)}"
            _balance(strip, side, heat, fit.balance_heating_range_f, turn, "right", ticks)
            continue
        told = f"{side}: heating below {_degrees(heat)}"
        _balance(strip, side, heat, fit.balance_heating_range_f, told, "right", ticks)
        both = heat is not None and cool is not None
        told = f"{'' if both else f'{side}: '}cooling above {_degrees(cool)}"
        align = "left" if both else "right"
        _balance(strip, side, cool, fit.balance_cooling_range_f, told, align, ticks)


def _balances_of(fit: Fit) -> list[float]:
    both = (fit.balance_heating_f, fit.balance_cooling_f)
    return [at for at in both if at is not None and marks.drawable(at)]


def _balance(
    strip: Axes,
    side: str,
    at: float | None,
    spread: tuple[float, float] | None,
    text: str,
    align: str,
    crossing: list[float],
) -> None:
    """A tick from the axis down to its row, its range as a thick stretch, its words beside.

    crossing : ticks of the row beneath, which pass through this row; words keep off them.
    """
    if at is None or not marks.drawable(at):
        return
    y, colour = ROWS[side], COLOURS[side]
    ends = [e for e in (*(spread or ()), at) if marks.drawable(e)]
    low, high = min(ends), max(ends)
    strip.plot([at, at], [1.0, y - 0.09], color=colour, linewidth=1.6, clip_on=False)
    if high > low:
        strip.plot([low, high], [y, y], color=colour, linewidth=5.0, alpha=0.45)
    left, right = strip.get_xlim()
    nudge = 0.012 * (right - left)
    wide = LABEL_SHARE * (right - left)
    if align == "right":
        low = min([low, *(c for c in crossing if low - wide < c < low + nudge)])
    else:
        high = max([high, *(c for c in crossing if high - nudge < c < high + wide)])
    x = low - nudge if align == "right" else high + nudge
    strip.text(x, y, text, ha=align, va="center", color=colour, fontsize=look.SMALL_SIZE)


def _draw_rug(strip: Axes, year: LongTermYear, low: float, high: float) -> None:
    """Strokes at equal steps of the normal year's days, coldest to warmest."""
    import numpy as np

    if year.temp_f.shape[0] == 0:
        return
    middles = (np.arange(STROKES) + 0.5) / STROKES * float(year.cum_days[-1])
    index = np.clip(np.searchsorted(year.cum_days, middles, side="right") - 1, 0, None)
    temps = year.temp_f[np.minimum(index, year.temp_f.shape[0] - 1)]
    temps = temps[(temps >= low) & (temps <= high)]
    xs = np.repeat(temps, 3)
    xs[2::3] = np.nan
    ys = np.tile([0.02, 0.2, np.nan], temps.shape[0])
    strip.plot(xs, ys, color=look.WEATHER, linewidth=0.9)
    strip.text(
        strip.get_xlim()[1],
        0.29,
        "days of the normal year",
        ha="right",
        va="center",
        color=look.WEATHER,
        fontsize=look.SMALL_SIZE,
    )


def _degrees(value: float | None) -> str:
    return f"{n.plain(value, 0)}{n.NBSP}°F"


def _alt(account: AccountResult, title: str, bills: int) -> str:
    parts = [
        f"{title}. Scatter of {bills} bills: use per day in {words.unit_word(account.unit)} "
        "against mean outdoor temperature."
    ]
    for side, fit in (("Before", account.savings.before), ("After", account.savings.after)):
        if fit is not None:
            parts.append(f"{side} the work: {fit_in_words(fit, account.unit)}.")
    return " ".join(parts)


def fit_in_words(fit: Fit, unit: str) -> str:
    """A fit as a clause, for listeners."""
    unit = words.unit_word(unit)
    if fit.line_slope is not None:
        return f"a straight line with slope {n.significant(fit.line_slope)} {unit} a day per °F"
    parts = [f"{n.significant(fit.base_load)} {unit} a day whatever the weather"]
    if fit.heating_slope is not None:
        parts.append(
            f"{n.significant(fit.heating_slope)} more for each degree below "
            f"{_degrees(fit.balance_heating_f)}"
        )
    if fit.cooling_slope is not None:
        parts.append(
            f"{n.significant(fit.cooling_slope)} more for each degree above "
            f"{_degrees(fit.balance_cooling_f)}"
        )
    return ", ".join(parts)


def _use(row: PeriodRow) -> float:
    """Use a day at a normal amount of every driver, as the lines are."""
    return row.use_per_day - row.drivers_per_day


def _caption(account: AccountResult, rows: list, year: LongTermYear | None) -> str:  # type: ignore[type-arg]
    parts = [marks.marks_sentence(rows)]
    save = account.savings
    if account.drivers is not None and account.drivers.kept:
        names = " and ".join(n.name(name) for name in account.drivers.kept)
        parts.append(f"Bills and lines are shown at a normal amount of {names}.")
    if save.before is not None or save.after is not None:
        parts.append(
            "Beneath the axis, a tick is a balance temperature and the thick stretch its range."
        )
    if year is not None:
        parts.append(f"Each stroke below stands for five days of the normal year ({year.name}).")
    return " ".join(p for p in parts if p)
