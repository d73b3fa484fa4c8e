"""The answer with one thing changed: how much of it hangs on choices that could be others.

Forms, their average, weights, criterion, each bill, the stretch of bills: each asked of the
same compiled comparison, a batch a kind (docs/method.md §7).
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from statistics import NormalDist
from typing import Final

import numpy as np
from numpy.typing import NDArray

from normalize.defaults import MIN_DAYS_A_SIDE, POOLED_WINDOW_DAYS, WINDOW_DAYS
from normalize.fitting import forms as f
from normalize.fitting.align import Aligned
from normalize.fitting.batch import CRITERIA
from normalize.fitting.columns import BASE, BIC, STATUS
from normalize.fitting.fit import also_tried, batch_of_one
from normalize.savings.again import Answers, Asked, ask_again
from normalize.savings.compare import run_batch
from normalize.savings.influence import Without, without_each
from normalize.savings.kernel import NAC_BEFORE, PREDICTED
from normalize.savings.results import Estimate, Savings
from normalize.savings.sides import Work, codes, label_periods

FAR_BIC: Final = 10.0  # worse by more: "very strong" evidence against, Kass & Raftery 1995 (memory)
BASELINE_MONTHS: Final = (12, 24, 36)  # other lengths of the baseline that are tried
DAYS_A_MONTH: Final = 30.4375
MORE_MONTHS: Final = 3  # a baseline must differ by this much to be worth a row
NO_LIMIT: Final = 100_000  # days: every bill before the work
WIDENED: Final = (1, 2)  # bills more left out on each side of the work

# What is changed, in the order of the table.
SAME_FORM: Final = "same form"
OTHER_FORMS: Final = "other forms"
AVERAGED: Final = "averaged over forms"
WEIGHTS: Final = "weights"
CRITERION: Final = "criterion"
ONE_BILL: Final = "one bill left out"
WINDOW: Final = "window"


@dataclass(frozen=True, slots=True)
class Variation:
    """The answer with one thing changed.

    changes : which kind of thing, one of the words above.  name : what exactly.
    form_before, form_after : of the fits then; "" where there is none or it is an average.
    far : why this row is shown but is no rival of the answer; "" where it is one.
    number : of the period left out, from 1; side, start, end : its own.
    """

    changes: str
    name: str
    normalized: Estimate
    avoided: Estimate
    form_before: str = ""
    form_after: str = ""
    far: str = ""
    number: int | None = None
    side: str = ""
    start: int | None = None
    end: int | None = None


def variations(
    asked: Asked,
    labels: Sequence[str],
    work: Work,
    chosen: Savings,
    *,
    occupied_since: int | None = None,
    without: Sequence[Without] | None = None,
) -> tuple[Variation, ...]:
    """Every variation of one account's comparison that its bills allow, one change at a time.

    labels : (periods,) as ``Comparison.labels``.  chosen : the answer itself; a part of it
    that is unavailable stays so.  Where the balance temperature was stated there is only one
    form, and forms, weights and criterion are not varied.  without : the answers without each
    bill, where they are there already.
    """
    side = codes(tuple(labels))
    out: list[Variation] = []
    if not asked.stated:
        out += _forms(asked, side)
        out += _weights_and_criterion(asked, side)
    out += _one_bill(without or without_each(asked, labels))
    out += _windows(asked, tuple(labels), work, occupied_since)
    return tuple(_kept(v, chosen) for v in out)


def _kept(variation: Variation, chosen: Savings) -> Variation:
    """What the answer itself does not know, no variation claims to know."""
    kept = variation
    if not chosen.normalized.available:
        kept = replace(kept, normalized=chosen.normalized)
    if not chosen.avoided.available:
        kept = replace(kept, avoided=chosen.avoided)
    return kept


def _forms(asked: Asked, side: NDArray[np.uint8]) -> list[Variation]:
    """Same form on both sides, other pairs of forms, and the average over forms."""
    batch, table = batch_of_one(asked.aligned, side, asked.forms, asked.net)
    fits, chosen, _ = run_batch(
        batch, table, [asked.year], confidence=asked.confidence, tried=also_tried()
    )
    before, after = fits[0]
    own = (int(chosen[0, 0]), int(chosen[0, 1]))
    if min(own) < 0:
        return []
    can = [~np.isnan(rows[:, BASE]) & (rows[:, STATUS] >= 0.0) for rows in (before, after)]
    weight = [form_weights(rows, batch.wanted[0]) for rows in (before, after)]
    rivals = [np.flatnonzero(w > 0.0).tolist() for w in weight]
    same = [(i, i) for i in range(f.N_FORMS) if can[0][i] and can[1][i]]
    mixed = [(i, j) for i in rivals[0] for j in rivals[1]]
    pairs = list(dict.fromkeys([*same, *mixed]))
    wanted = np.zeros((len(pairs), f.N_FORMS), dtype=np.bool_)
    for row, pair in enumerate(pairs):
        wanted[row, list(pair)] = True
    many = replace(
        batch,
        start=np.tile(batch.start, len(pairs)),
        end=np.tile(batch.end, len(pairs)),
        use=np.tile(batch.use, len(pairs)),
        side=np.tile(batch.side, len(pairs)),
        offsets=batch.offsets[1] * np.arange(len(pairs) + 1, dtype=np.int64),
        station=np.zeros(len(pairs), dtype=np.int32),
        wanted=wanted,
        net=np.full(len(pairs), asked.net),
        drivers=None if batch.drivers is None else np.tile(batch.drivers, (len(pairs), 1)),
    )
    found = Answers(
        asked,
        *run_batch(
            many, table, [asked.year], confidence=asked.confidence,
            forced=np.array(pairs, dtype=np.int8),
        ),
    )  # fmt: skip
    names = [form.name for form in f.BY_CODE]
    out = []
    for row, (i, j) in enumerate(pairs):
        if (i, j) == own:
            continue
        far = _far(i, j, weight, fits[0], batch.wanted[0])
        name = f"{names[i]} on both sides" if i == j else f"{names[i]} before, {names[j]} after"
        kind = SAME_FORM if i == j else OTHER_FORMS
        out.append(
            Variation(
                kind, name, found.normalized(row), found.avoided(row), names[i], names[j], far
            )
        )
    out.sort(key=lambda v: (v.changes != SAME_FORM, bool(v.far)))
    if len(mixed) > 1:
        share = [float(weight[0][i] * weight[1][j]) for i, j in mixed]
        out.append(_averaged(found, [pairs.index(p) for p in mixed], share))
    return out


def form_weights(rows: NDArray[np.float64], offered: NDArray[np.bool_]) -> NDArray[np.float64]:
    """(N_FORMS,) weights ∝ exp(−½ΔBIC) of the forms offered that no screen set aside.

    Forms worse by more than ``FAR_BIC`` have none.  Source: Buckland, Burnham & Augustin
    1997, Biometrics 53:603-618 (with BIC in place of AIC).

    >>> rows = np.full((6, 24), np.nan)
    >>> rows[[0, 2], STATUS] = f.FITTED
    >>> rows[[0, 2], BIC] = [12.0, 10.0]
    >>> [round(float(w), 4) for w in form_weights(rows, np.ones(6, bool))]
    [0.2689, 0.0, 0.7311, 0.0, 0.0, 0.0]
    """
    stands = offered & (rows[:, STATUS] == f.FITTED) & np.isfinite(rows[:, BIC])
    out = np.zeros(rows.shape[0])
    if not stands.any():
        return out
    worse = rows[:, BIC] - rows[stands, BIC].min()
    keep = stands & (worse <= FAR_BIC)
    out[keep] = np.exp(-0.5 * worse[keep])
    total = float(out.sum())
    out /= total
    return out


def _far(
    i: int,
    j: int,
    weight: Sequence[NDArray[np.float64]],
    rows: NDArray[np.float64],
    offered: NDArray[np.bool_],
) -> str:
    """Why a pair of forms is no rival of the answer."""
    reasons = []
    for code, which in ((i, 0), (j, 1)):
        if weight[which][code] > 0.0:
            reasons.append("")
            continue
        status = int(rows[which, code, STATUS])
        best = np.nanmin(np.where(weight[which] > 0.0, rows[which, :, BIC], np.nan))
        worse = float(rows[which, code, BIC] - best)
        if worse > FAR_BIC:
            reasons.append(f"fits far worse (BIC {worse:.0f} higher)")
        elif status != f.FITTED:
            reasons.append("set aside")
        elif not offered[code]:
            reasons.append("offered only when asked for")
        else:
            reasons.append("")
    if reasons[0] == reasons[1]:
        return reasons[0]
    told = [f"{r} {when}" for r, when in zip(reasons, ("before", "after"), strict=True) if r]
    return "; ".join(told)


def _averaged(found: Answers, rows: Sequence[int], share: Sequence[float]) -> Variation:
    asked = found.asked
    net = asked.net

    def mean(estimates: list[Estimate], at: int) -> Estimate:
        over = float(np.dot(share, found.answers[list(rows), at]))
        return average(estimates, share, over=over, net=net)

    return Variation(
        AVERAGED,
        f"average of {len(rows)} pairs of forms, by their weight",
        mean([found.normalized(r) for r in rows], NAC_BEFORE),
        mean([found.avoided(r) for r in rows], PREDICTED),
    )


def average(
    estimates: Sequence[Estimate], share: Sequence[float], *, over: float, net: bool = False
) -> Estimate:
    """The mean of estimates, with a range that has their disagreement in it.

    share : weights that sum to 1.  se = Σ w·√(se² + (θ − θ̄)²), se being half a range's width
    in units of a normal's; the range lies about the mean of the ranges' middles, so that one
    estimate alone is its own average.  over : what fractions are of.
    Source: Buckland, Burnham & Augustin 1997, Biometrics 53:603-618, eq. 9.

    >>> one = Estimate(value=10.0, low=8.0, high=12.5, plain_low=9.0, plain_high=11.0)
    >>> average([one], [1.0], over=100.0).high
    12.5
    >>> two = Estimate(value=14.0, low=12.0, high=16.5, plain_low=13.0, plain_high=15.0)
    >>> wide = average([one, two], [0.5, 0.5], over=100.0)
    >>> wide.value, round(wide.high - wide.low, 2)
    (12.0, 7.97)
    """
    lacking = next((e for e in estimates if not e.available), None)
    if lacking is not None:
        return lacking
    confidence = estimates[0].confidence
    z = NormalDist().inv_cdf(0.5 + 0.5 * confidence)
    value = math.fsum(w * (e.value or 0.0) for w, e in zip(share, estimates, strict=True))

    def ends(low: str, high: str) -> tuple[float, float]:
        se = middle = 0.0
        for w, e in zip(share, estimates, strict=True):
            a, b = getattr(e, low), getattr(e, high)
            middle += w * 0.5 * (a + b)
            se += w * math.hypot((b - a) / (2.0 * z), (e.value or 0.0) - value)
        return middle - z * se, middle + z * se

    low, high = ends("low", "high")
    plain_low, plain_high = ends("plain_low", "plain_high")
    part = over if over > 0.0 else None
    return Estimate(
        value=value,
        low=low,
        high=high,
        fraction=value / part if part else None,
        fraction_low=low / part if part else None,
        fraction_high=(high if net else min(high, part)) / part if part else None,
        plain_low=plain_low,
        plain_high=plain_high,
        confidence=confidence,
        method="average over forms, their disagreement included (Buckland, Burnham & Augustin "
        "1997); each form's own range integrates balance temperature and correlation",
        so_far=estimates[0].so_far,
    )


def _weights_and_criterion(asked: Asked, side: NDArray[np.uint8]) -> list[Variation]:
    batch, table = batch_of_one(asked.aligned, side, asked.forms, asked.net)
    out = []
    for kind, name, weights, criterion in (
        (WEIGHTS, "every bill counts alike, whatever its days", "equal", BIC),
        (CRITERION, "form chosen by AICc instead of BIC", "days", CRITERIA["aicc"]),
    ):
        found = Answers(
            asked,
            *run_batch(
                batch, table, [asked.year], confidence=asked.confidence, weights=weights,
                criterion=criterion,
            ),
        )  # fmt: skip
        out.append(_of(found, 0, kind, name))
    return out


def _of(found: Answers, row: int, kind: str, name: str) -> Variation:
    return Variation(
        kind, name, found.normalized(row), found.avoided(row),
        found.form(row, 0), found.form(row, 1),
    )  # fmt: skip


def _one_bill(without: Sequence[Without]) -> list[Variation]:
    return [
        Variation(
            ONE_BILL, f"without bill {w.number}", w.normalized, w.avoided,
            w.form_before, w.form_after, "", w.number, w.side, w.start, w.end,
        )
        for w in without
    ]  # fmt: skip


def _windows(
    asked: Asked, labels: tuple[str, ...], work: Work, occupied_since: int | None
) -> list[Variation]:
    """Other stretches of bills: further from the work, and other lengths of the baseline."""
    aligned = asked.aligned
    plain = label_periods(aligned, work, occupied_since=occupied_since)
    days = WINDOW_DAYS if plain == labels else POOLED_WINDOW_DAYS
    tried: list[tuple[str, tuple[str, ...]]] = []
    for more in WIDENED:
        wider = _wider(aligned, labels, work, more)
        if wider is not None:
            number = ("one more bill", "two more bills")[more - 1]
            tried.append(
                (
                    f"{number} left out on each side of the work",
                    label_periods(aligned, wider, occupied_since=occupied_since, window_days=days),
                )
            )
    tried += _other_baselines(aligned, labels, work, occupied_since)
    if _enough(aligned, labels):
        tried = [(name, own) for name, own in tried if _enough(aligned, own)]
    if not tried:
        return []
    found = ask_again(asked, np.stack([codes(own) for _, own in tried]))
    return [_of(found, row, WINDOW, name) for row, (name, _) in enumerate(tried)]


def _wider(aligned: Aligned, labels: tuple[str, ...], work: Work, more: int) -> Work | None:
    """The work window widened to swallow so many bills on each side."""
    before = [i for i, label in enumerate(labels) if label == "before"]
    after = [i for i, label in enumerate(labels) if label == "after"]
    if len(before) <= more or len(after) <= more:
        return None
    first = sorted(int(aligned.start[i]) for i in before)[-more]
    last = sorted(int(aligned.end[i]) for i in after)[more - 1]
    return Work(min(first, work.start), max(last, work.end))


def _other_baselines(
    aligned: Aligned, labels: tuple[str, ...], work: Work, occupied_since: int | None
) -> list[tuple[str, tuple[str, ...]]]:
    """Baselines of other lengths, counted back from the last bill before the work."""
    own = _days(aligned, labels, "before")
    ends = [int(aligned.end[i]) for i, label in enumerate(labels) if label == "before"]
    every = label_periods(aligned, work, occupied_since=occupied_since, window_days=NO_LIMIT)
    middle = 0.5 * (aligned.start + aligned.end)
    out: dict[tuple[str, ...], str] = {}
    for months in BASELINE_MONTHS if ends else ():
        earliest = max(ends) - months * DAYS_A_MONTH
        other = tuple(
            label if there != "before" else ("before" if middle[i] >= earliest else "older")
            for i, (label, there) in enumerate(zip(labels, every, strict=True))
        )
        now = _days(aligned, other, "before")
        if abs(now - own) >= MORE_MONTHS * DAYS_A_MONTH:
            out.setdefault(other, f"a baseline of {round(now / DAYS_A_MONTH)} months")
    return [(name, other) for other, name in out.items()]


def _days(aligned: Aligned, labels: Sequence[str], side: str) -> int:
    return int(sum(int(d) for d, label in zip(aligned.days, labels, strict=True) if label == side))


def _enough(aligned: Aligned, labels: Sequence[str]) -> bool:
    return min(_days(aligned, labels, s) for s in ("before", "after")) >= MIN_DAYS_A_SIDE
