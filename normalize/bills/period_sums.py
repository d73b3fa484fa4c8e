"""Days summed to the periods of bills: those of months, of another file, of the file's own bills.

What belongs here: spans of days, and what the days within each come to.  A span with a day
missing, or one from which readings are missing, is left out with a count of both.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from normalize.bills import rules
from normalize.bills.answers import Understood
from normalize.bills.day_rows import DayRows, estimates_note
from normalize.bills.local_days import DAY, spoken
from normalize.bills.periods import BillRow, Periods, Spans
from normalize.bills.sum_rows import month_edge, several
from normalize.days import date_of, iso
from normalize.errors import UnreadableBills

if TYPE_CHECKING:
    from numpy.typing import NDArray

    Long = NDArray[np.int64]
    Float = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class _Days:
    """Days in order. whole : nothing is missing and nothing twice.  gone : seconds missing.
    step : seconds of a reading, 0 where the days were given as days.
    """

    day: Long
    use: Float
    cost: Float
    line: Long
    whole: NDArray[np.bool_]
    gone: Long
    count: Long
    estimated: Long
    step: int


def month_spans(rows: Sequence[BillRow], read_day: int) -> Spans:
    """Months that begin on ``read_day``, from the first day with a reading to the last."""
    days = _days(rows).day
    first, last = date_of(int(days[0])), int(days[-1])
    year, month = first.year, first.month
    if int(days[0]) < month_edge(year, month, read_day):
        month -= 1
    edges = [month_edge(year, month, read_day)]
    while edges[-1] <= last:
        month += 1
        edges.append(month_edge(year, month, read_day))
    edge = np.array(edges, np.int64)
    nothing = np.full(edge.size - 1, np.nan)
    return Spans(edge[:-1], edge[1:], nothing, nothing, f"months that begin on day {read_day}")


def spans_of_bills(periods: Periods, source: str, *, known: bool = True) -> Spans:
    """The periods of bills. known : their use is in the unit of the days."""
    use = periods.use if known else np.full(periods.n, np.nan)
    start, end = periods.start.astype(np.int64), periods.end.astype(np.int64)
    return Spans(start, end, use, periods.cost, source)


def summed(found: Understood, spans: Spans) -> Understood:
    """The same account with a row for each span.  Raises UnreadableBills where it has no days."""
    days = _days(found.rows)
    inside = (spans.end > days.day[0]) & (spans.start <= days.day[-1])
    if not np.any(inside):
        raise UnreadableBills(
            f"the readings ({_span(days.day[0], days.day[-1] + 1)}) and {spans.source} "
            f"({_span(spans.start[0], spans.end[-1])}) have no day in common",
            wanted="bills of the same time",
        )
    file = found.rows[0].file
    order = np.flatnonzero(inside)
    rows = tuple(_row(file, days, spans, int(k)) for k in order)
    notes = [f"days summed to {spans.source}"]
    if (outside := int(np.count_nonzero(~inside))) > 0:
        notes.append(f"{several(outside, 'bill')} outside the readings")
    at = np.searchsorted(spans.start, days.day, side="right") - 1
    stray = int(np.count_nonzero((at < 0) | (days.day >= spans.end[np.maximum(at, 0)])))
    if stray:
        notes.append(f"{several(stray, 'day')} with readings in none of these periods")
    if (left := sum(1 for r in rows if r.problem)) > 0:
        notes.append(f"left out: {several(left, 'period')} in which readings are missing")
    cautions = [c for c in (_against_bills(rows, spans, order),) if c]
    return replace(
        found, rows=rows, reading=(*found.reading, *notes), cautions=(*found.cautions, *cautions)
    )


def _span(start: int, end: int) -> str:
    return f"{iso(int(start))} to {iso(int(end) - 1)}"


def _days(rows: Sequence[BillRow]) -> _Days:
    if isinstance(rows, DayRows):
        s = rows.sums
        return _Days(s.day, s.use, s.cost, s.line, rows.usable, s.missing, s.count, s.estimated,
                     rows.step)  # fmt: skip
    lengths = [r.end - r.start for r in rows if r.start is not None and r.end is not None]
    if not lengths or sorted(lengths)[len(lengths) // 2] != 1:
        raise UnreadableBills(
            "sum_to or periods_from was given, but the file holds no days to add up",
            next_step="Leave it out.",
        )
    some = sorted((r for r in rows if r.start is not None), key=lambda r: r.start or 0)
    day = np.array([r.start for r in some], np.int64)
    use = np.array([np.nan if r.use is None else r.use for r in some])
    bad = np.array([bool(r.problem) or (r.end or 0) - (r.start or 0) != 1 for r in some])
    day, first, count = np.unique(day, return_index=True, return_counts=True)
    guessed = np.array([r.estimated for r in some])[first].astype(np.int64)
    return _Days(
        day, use[first],
        np.array([np.nan if r.cost is None else r.cost for r in some])[first],
        np.array([r.line for r in some], np.int64)[first],
        ~bad[first] & np.isfinite(use[first]) & (count == 1),
        np.zeros(day.size, np.int64), np.ones(day.size, np.int64), guessed, 0,
    )  # fmt: skip


def _row(file: str, days: _Days, spans: Spans, k: int) -> BillRow:
    """What the days of one span come to."""
    start, end = int(spans.start[k]), int(spans.end[k])
    a, b = np.searchsorted(days.day, (start, end))
    good = days.whole[a:b]
    use, cost = days.use[a:b][good], days.cost[a:b][good]
    lacking = end - start - int(good.sum())
    problem = ""
    if lacking > 0:
        problem = f"{lacking} of {end - start} days are missing or not whole"
        gone = int(days.gone[a:b].sum()) + (end - start - int(b - a)) * DAY
        if days.step and gone:
            problem += f": {several(round(gone / days.step), 'reading')} of {spoken(days.step)}"
    money = float(cost.sum()) if cost.size and np.all(np.isfinite(cost)) else float(spans.cost[k])
    return BillRow(
        file, int(days.line[min(int(a), days.line.size - 1)]), start, end, float(use.sum()),
        None if np.isnan(money) else money, problem=problem,
        note=estimates_note(int(days.estimated[a:b].sum()), int(days.count[a:b].sum())),
    )  # fmt: skip


def _against_bills(rows: Sequence[BillRow], spans: Spans, order: NDArray[np.intp]) -> str:
    """A caution where the readings do not come to what was billed; "" where they do."""
    pairs = [
        (r, float(spans.use[k]))
        for r, k in zip(rows, order.tolist(), strict=True)
        if not r.problem and np.isfinite(spans.use[k])
    ]
    off = [
        r for r, billed in pairs
        if abs((r.use or 0.0) - billed) > rules.SUM_MISMATCH * max(abs(billed), 1.0)
    ]  # fmt: skip
    if not off:
        return ""
    total = sum(r.use or 0.0 for r, _ in pairs) / max(abs(sum(b for _, b in pairs)), 1e-9)
    return (
        f"In {len(off)} of {several(len(pairs), 'period')} the readings differ by more than "
        f"{rules.SUM_MISMATCH:.0%} from what was billed (first from {iso(off[0].start or 0)}); all "
        f"in all they come to {total:.0%} of it."
    )
