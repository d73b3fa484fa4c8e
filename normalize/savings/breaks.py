"""When did use change?  The claimed date, changes nobody mentioned, and single odd bills.

Three questions are asked of an account's whole history, with the weather taken out by the
same degree-day regression as everywhere: do the bills themselves place a change at the work;
is there another change on either side of it; does a single bill stand out
(docs/method.md §6.4).  An answer is a date and a size, never a cause.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from itertools import pairwise
from typing import TYPE_CHECKING, Final

import numpy as np
from numpy.typing import NDArray

from normalize.fitting.forms import FORMS
from normalize.savings.break_design import (
    Asked,
    Declared,
    Design,
    Odd,
    Stretch,
    odd_of,
    regressors,
    tau_of,
)
from normalize.savings.break_history import (
    History,
    chosen_form,
    fuller,
    history_of,
    normal_year,
    row_weights,
)
from normalize.savings.break_results import (
    LEVEL,
    Breaks,
    ClaimedDate,
    FoundChange,
    OddPeriod,
    Step,
)
from normalize.savings.break_scan import (
    Array,
    Scan,
    candidates,
    changing,
    independent,
    null_likelihood,
    scan,
    trimmed,
    whitened,
)

if TYPE_CHECKING:
    from normalize.fitting.align import Aligned
    from normalize.savings.sides import Work
    from normalize.weather.year import LongTermYear

MOST_CHANGES: Final = 3  # beyond the work: more, and the history is not one building's
NEAR_DAYS: Final = 31  # a declared change this near a found one explains it


def breaks_of(
    aligned: Aligned,
    labels: Sequence[str],
    work: Work,
    year: LongTermYear | None,
    *,
    forms: Sequence[str],
    chosen: Sequence[str] = (),
    net: bool = False,
    stated_f: float | None = None,
    declared: Sequence[Declared] = (),
    confidence: float = 0.90,
) -> Breaks:
    """The scan of one account.

    labels : as ``Comparison.labels``.  forms : offered; chosen : those that the answer rests
    on, of which the fullest is used throughout.  stated_f : a balance temperature that was
    stated, not found.  declared : other changes that the site file names.
    """
    history = history_of(aligned, labels, work)
    form = fuller(chosen) or chosen_form(history, forms, net)
    stated = 0 if stated_f is None else 1  # a balance temperature that need not be found
    least = 2 * trimmed(0, FORMS[form or "flat"].parameters - stated)
    if not form or history.n < least:
        return Breaks(n=history.n, unavailable=_too_short(history, form, least))
    asked = Asked(form, net, stated_f, work, year, tuple(declared), confidence)
    whole = tau_of(history, asked, None)
    if whole is None:
        return Breaks(n=history.n, form=form, unavailable="no balance temperature can be placed")
    sure = history.only(~odd_of(history, asked, whole, ()).mask)
    claimed, dates, f = _claimed(sure, asked, whole)
    found, rest, rho, power = _changes(sure.only(sure.side != 0), asked, whole)
    marked = tuple(_settled(c, asked, aligned, labels) for c in found)
    odd = odd_of(history, asked, whole, [c.day for c in marked])
    steps, levels = _picture(history, asked, whole, marked, odd.mask)
    return Breaks(
        n=history.n,
        joined=history.joined,
        form=form,
        power=power,
        rho=rho,
        claimed=claimed,
        dates=dates,
        f=f,
        changes=marked,
        p_rest=rest,
        not_searched=_not_searched(sure, asked),
        odd=_odd_periods(history, asked, odd),
        steps=steps,
        levels=levels,
    )


def _too_short(history: History, form: str, least: int) -> str:
    if history.n < least:
        missing = least - history.n
        return (
            f"there are {history.n} usable bills and {least} are needed to look for a date of "
            f"change, {least // 2} on either side: {missing} more"
        )
    return "no form fits the whole history" if not form else ""


def _not_searched(h: History, asked: Asked) -> tuple[str, ...]:
    least = 2 * trimmed(0, asked.parameters)
    out = []
    for side, name in ((-1, "before"), (1, "after")):
        n = int((h.side == side).sum())
        if n < least:
            out.append(
                f"the bills {name} the work were not searched for another change: there are "
                f"{n} and {least} are needed"
            )
    return tuple(out)


def _between(h: History, k: int) -> int:
    """Day of the boundary before period k."""
    return round(0.5 * (float(h.end[k - 1]) + float(h.start[k])))


def _hull(h: History, at: list[int], near: NDArray[np.bool_], best: int) -> tuple[int, int, int]:
    """(day, low, high): a change may also lie inside the bill next to the boundary."""
    kept = [k for k, told in zip(at, near.tolist(), strict=True) if told]
    first, last = min(kept), max(kept)
    low = 0.5 * (h.start[first - 1] + h.end[first - 1])
    high = 0.5 * (h.start[last] + h.end[last])
    return _between(h, at[best]), int(low), int(np.ceil(high))


def _claimed(
    h: History, asked: Asked, whole: tuple[float, float]
) -> tuple[ClaimedDate | None, tuple[int, ...], tuple[float, ...]]:
    """The whole history without a change against one at any date, and at the work."""
    model = asked.model(h, whole)
    x = np.hstack([model.base, model.tau])
    scale, _ = row_weights(h, x, flat=asked.net)
    at = candidates(0, h.n, asked.parameters)
    found = scan(
        x * scale[:, None], h.y * scale, changing(model.base * scale[:, None], at, h.n), h.place
    )
    if found is None:
        return None, (), ()
    day, low, high = _hull(h, at, found.not_told_apart(asked.confidence), found.best)
    known = _known_date(h, asked, whole)
    work = asked.work
    claimed = ClaimedDate(
        f=None if known is None else float(known.f[0]),
        p=None if known is None else known.p,
        day=day,
        low=low,
        high=high,
        f_any=float(found.f[found.best]),
        p_any=found.p,
        threshold=found.threshold,
        meets=low < work.end and high >= work.start,
    )
    return claimed, tuple(_between(h, k) for k in at), tuple(found.f.tolist())


def _known_date(h: History, asked: Asked, whole: tuple[float, float]) -> Scan | None:
    """F of a change at the work itself (Chow), bills that touch it left out."""
    h = h.only(h.side != 0)
    k = int((h.side < 0).sum())
    model = asked.model(h, whole)
    if min(k, h.n - k) < model.base.shape[1] + 1:
        return None
    x = np.hstack([model.base, model.tau])
    scale, _ = row_weights(h, x, flat=asked.net)
    block = changing(model.base * scale[:, None], [k], h.n)
    return scan(x * scale[:, None], h.y * scale, block, h.place)


def _changes(
    h: History, asked: Asked, whole: tuple[float, float]
) -> tuple[list[FoundChange], float | None, float, float]:
    """Changes beside the work, one after another (Bai & Perron's sequential test).

    Returns them, p of any further one, and ρ and the errors' power with the work allowed for.
    """
    stretches, design = regressors(h, asked, whole, ())
    keep = np.zeros(h.n, dtype=np.bool_)
    for s in stretches:
        keep[s.first : s.last] = True
    if stretches and not keep.all():
        h = h.only(keep)
        stretches, design = regressors(h, asked, whole, ())
    if not stretches:
        return [], None, 0.0, 0.0
    cuts: list[_Cut] = []
    rest, rho = None, 0.0
    while True:
        x = design.x
        scale, power = row_weights(h, x, flat=asked.net)
        at, ends, pieces = _inner(stretches, [c.k for c in cuts], asked.parameters)
        blocks = _blocks(h, at, ends, pieces)
        found = scan(x * scale[:, None], h.y * scale, blocks * scale[None, :, None], h.place)
        if found is None:
            break
        rho = rho if cuts else found.rho
        rest = found.p
        if found.p > LEVEL or len(cuts) == MOST_CHANGES:
            break
        k, end, s = at[found.best], ends[found.best], pieces[found.best]
        near = found.not_told_apart(asked.confidence)
        near &= np.array([e == end for e in ends])
        cuts.append(_Cut(k, s, found.p, _hull(h, at, near, found.best)))
        design.add(blocks[found.best], k, end)
    return _sized(h, asked, design, scale, cuts), rest, rho, power


@dataclass(frozen=True, slots=True)
class _Cut:
    """A change found: position of the first period after it, its stretch, p, its days."""

    k: int
    stretch: Stretch
    p: float
    days: tuple[int, int, int]


def _inner(
    stretches: list[Stretch], cuts: list[int], parameters: int
) -> tuple[list[int], list[int], list[Stretch]]:
    """Candidate positions within the stretches, cut where changes were found already: with
    the end of each one's piece and its stretch.
    """
    at: list[int] = []
    ends: list[int] = []
    pieces: list[Stretch] = []
    for s in stretches:
        edges = [s.first, *sorted(c for c in cuts if s.first < c < s.last), s.last]
        for first, last in pairwise(edges):
            inside = candidates(first, last, parameters)
            at += inside
            ends += [last] * len(inside)
            pieces += [s] * len(inside)
    return at, ends, pieces


def _blocks(h: History, at: list[int], ends: list[int], pieces: list[Stretch]) -> Array:
    """(dates, n, q) what each candidate adds."""
    if not at:
        return np.empty((0, h.n, 1))
    each = zip(at, ends, pieces, strict=True)
    return np.concatenate([changing(s.model.base, [k], end) for k, end, s in each])


def _sized(
    h: History, asked: Asked, design: Design, scale: Array, cuts: list[_Cut]
) -> list[FoundChange]:
    """Each found change's size in a normal year, by generalised least squares."""
    from normalize.fitting.student import t_quantile

    if not cuts:
        return []
    rows = design.x * scale[:, None]
    _, rho = null_likelihood(rows, h.y * scale, h.place)
    white = whitened(np.column_stack([rows, h.y * scale]), h.place, np.array([rho]))[0][0]
    kept = independent(white[:, :-1])
    a = white[:, kept]
    inverse = np.linalg.inv(a.T @ a)
    coef = inverse @ (a.T @ white[:, -1])
    left = white[:, -1] - a @ coef
    df = max(h.n - kept.shape[0], 1)
    variance = float(left @ left) / df
    t = float(t_quantile(0.5 + 0.5 * asked.confidence, df))
    out = []
    for cut in sorted(cuts, key=lambda c: c.k):
        year = normal_year(cut.stretch.model, asked.form, h, asked.year)
        earlier = design.at(cut.k - 1, year)[kept]
        g = design.at(cut.k, year)[kept] - earlier
        change, half = float(g @ coef), t * float(np.sqrt(g @ inverse @ g * variance))
        base = float(earlier @ coef)
        spread = (change, change - half, change + half)
        share = [v / base for v in spread] if base > 0.0 else [None, None, None]
        side = "before" if h.side[cut.k] < 0 else "after"
        out.append(FoundChange(*cut.days, side, *spread, share[0], share[1], share[2], cut.p))
    return out


def _settled(
    change: FoundChange, asked: Asked, aligned: Aligned, labels: Sequence[str]
) -> FoundChange:
    """The same with what site.toml says of it, and whether it lies amid the bills used."""
    explained = ""
    for what, since, until in asked.declared:
        for day in (since, until):
            if day is not None and change.low - NEAR_DAYS <= day <= change.high + NEAR_DAYS:
                explained = explained or what
    used = np.array([label == change.side for label in labels], dtype=np.bool_)
    middle = 0.5 * (aligned.start + aligned.end)
    mixed = (used & (middle < change.day)).any() and (used & (middle > change.day)).any()
    return replace(change, explained=explained, mixed=bool(mixed))


def _odd_periods(h: History, asked: Asked, odd: Odd) -> tuple[OddPeriod, ...]:
    """Single bills that stand out once all changes are allowed for."""
    out = []
    for i in np.flatnonzero(odd.mask):
        start, end = int(h.start[i]), int(h.end[i])
        told = ""
        for what, since, until in asked.declared:
            # One without an end began here or does not explain a single bill.
            last = until if until is not None or since is None else since + 1
            if since is not None and last is not None and since < end and last > start:
                told = told or what
        numbers = tuple(number + 1 for number in h.numbers[i])
        y, expected = float(h.y[i]), float(odd.expected[i])
        out.append(
            OddPeriod(start, end, numbers, y, expected, float(odd.t[i]), float(odd.p[i]), told)
        )
    return tuple(out)


def _picture(
    h: History,
    asked: Asked,
    whole: tuple[float, float],
    changes: Sequence[FoundChange],
    odd: NDArray[np.bool_],
) -> tuple[tuple[Step, ...], tuple[tuple[int, int, float], ...]]:
    """Every period against what the bills before the work lead one to expect, and the levels."""
    ground = (h.side < 0) & ~odd
    tau = tau_of(h.only(ground), asked, whole) if int(ground.sum()) > asked.parameters else None
    if tau is None:
        ground, tau = ~odd, whole
    # Without the columns that let τ move: they reach beyond the weather they were fitted in.
    x = asked.model(h, tau).base
    root = np.sqrt(h.days)
    coef, *_ = np.linalg.lstsq(x[ground] * root[ground, None], (h.y * root)[ground], rcond=None)
    expected = x @ coef
    over = float((expected * h.days).sum() / h.days.sum())
    over = over if over > 0.0 else float(np.abs(h.y).mean()) or 1.0
    departure = (h.y - expected) / over
    names = {-1: "before", 0: "work", 1: "after"}
    steps = tuple(
        Step(int(s), int(e), float(d), "odd" if o else names[int(side)])
        for s, e, d, o, side in zip(h.start, h.end, departure, odd, h.side, strict=True)
    )
    levels = []
    for side in (-1, 1):
        mine = h.side == side
        if not mine.any():
            continue
        inner = [c.day for c in changes if h.start[mine].min() < c.day < h.end[mine].max()]
        edges = [int(h.start[mine].min()), *inner, int(h.end[mine].max())]
        for first, last in pairwise(edges):
            part = mine & ~odd & (h.start >= first - 1) & (h.end <= last + 1)
            if part.any():
                level = float((departure * h.days)[part].sum() / h.days[part].sum())
                levels.append((first, last, level))
    return steps, tuple(levels)
