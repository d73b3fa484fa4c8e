"""Before against after for one account: the third of the four hops."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from normalize.bills.periods import Bills
from normalize.defaults import (
    CONFIDENCE,
    FEW_INTERVALS,
    POOLED_WINDOW_DAYS,
    SHORT_YEAR_DAYS,
)
from normalize.errors import NoUpgrade
from normalize.fitting import forms as f
from normalize.fitting.align import Aligned, align
from normalize.fitting.batch import Batch, Stations, driver_gate, gate, settings
from normalize.fitting.columns import AFTER, BASE, BEFORE, BIC, UNUSED
from normalize.fitting.describe import as_tried
from normalize.fitting.fit import CHOICE, also_tried, batch_of_one, chosen_of, side_data
from normalize.fitting.results import FormTried
from normalize.savings.enough import SideFacts, after_reason, before_reason
from normalize.savings.estimates import estimate_at, normalized_of
from normalize.savings.kernel import (
    ACTUAL,
    AVOIDED,
    HELD_AFTER,
    HELD_BEFORE,
    NAC_AFTER,
    NAC_BEFORE,
    PREDICTED,
    UNSURE_AFTER,
    UNSURE_BEFORE,
    compare_batch,
)
from normalize.savings.methods import METHOD, METHOD_UNSURE, Methods
from normalize.savings.results import Estimate, Savings
from normalize.savings.sides import Moment, Work, codes, label_periods
from normalize.savings.stated import STATED_F, at_stated, needs_stated
from normalize.weather.temperature import DailyTemperature
from normalize.weather.year import LongTermYear


@dataclass(frozen=True, slots=True)
class Comparison:
    """Savings of one account with everything that was tried on the way.

    held, unsure : on either side, the balance temperature could not be told from the rest;
    the bills do not place it, so that the range tries all it may be.
    """

    savings: Savings
    tried_before: tuple[FormTried, ...]
    tried_after: tuple[FormTried, ...]
    labels: tuple[str, ...]
    held: tuple[bool, bool]
    unsure: tuple[bool, bool] = (False, False)
    stated_f: float | None = None  # balance temperature that was stated, not found
    fits: NDArray[np.float64] | None = None  # (1, 2, forms, columns), for parts of the savings


def run_batch(
    batch: Batch,
    table: Stations,
    years: Sequence[LongTermYear | None],
    *,
    confidence: float,
    tried: NDArray[np.bool_] | None = None,
    forced: tuple[int, int] | NDArray[np.int8] = (-1, -1),
    weights: str = "days",
    criterion: int = BIC,
    settings_: NDArray[np.float64] | None = None,
    hold: bool = False,
) -> tuple[NDArray[np.float64], NDArray[np.int8], NDArray[np.float64]]:
    """The compiled comparison over a ragged batch; years are those of the stations, in order.

    forced : the forms to use whatever the choice says, (before, after), −1 for the choice's
    own; or one such row an account.
    Returns fits (accounts, 2, forms, columns), chosen (accounts, 2), answers (accounts, …).
    """
    offered = np.ascontiguousarray(batch.wanted, dtype=np.bool_)
    wanted = offered if tried is None else np.ascontiguousarray(offered | tried)
    temp = [y.temp_f if y else np.empty(0) for y in years]
    days = [y.cum_days if y else np.zeros(1) for y in years]
    degrees = [y.cum_degrees if y else np.zeros(1) for y in years]
    pairs = np.broadcast_to(np.asarray(forced, dtype=np.int8), (offered.shape[0], 2))
    # A copy: an array that is broadcast may not be written to, which is another signature.
    force = np.array(pairs, order="C")
    fits: NDArray[np.float64]
    chosen: NDArray[np.int8]
    answers: NDArray[np.float64]
    fits, chosen, answers = compare_batch(
        *gate(batch), *driver_gate(batch), offered, wanted,
        np.ascontiguousarray(batch.net, dtype=np.bool_), force,
        table.temp, table.order, table.offsets, table.first_day,
        np.concatenate(temp).astype(np.float64), _offsets(temp),
        np.concatenate(days).astype(np.float64), np.concatenate(degrees).astype(np.float64),
        _offsets(days), settings() if settings_ is None else settings_, criterion,
        weights == "equal", hold, float(confidence),
    )  # fmt: skip
    return fits, chosen, answers


def _offsets(arrays: Sequence[NDArray[np.float64]]) -> NDArray[np.int64]:
    return np.concatenate([[0], np.cumsum([a.shape[0] for a in arrays])]).astype(np.int64)


def compare(
    aligned: Aligned,
    work: Work,
    year: LongTermYear | None,
    *,
    confidence: float = CONFIDENCE,
    forms: Sequence[str] | None = None,
    occupied_since: int | None = None,
    net_metered: bool = False,
    year_unavailable: str = "",
    delivered: bool = False,
) -> Comparison:
    """Fit both sides of the work and set one against the other.

    year : the long-term year, or None with the reason in ``year_unavailable``.
    forms : names offered to the choice.  delivered : intervals between full fills, not meter
    readings: years are pooled when they are few, and a balance temperature is stated when
    none stands out.  Source: docs/method.md §3-§5.
    """
    offered = tuple(forms) if forms is not None else CHOICE
    labels = labels_of(aligned, work, occupied_since, delivered)
    batch, table = batch_of_one(aligned, codes(labels), offered, net_metered)
    fits, chosen, answers = run_batch(
        batch, table, [year], confidence=confidence, tried=also_tried()
    )
    tried = _tried(aligned, labels, work, batch, table, fits, chosen)
    stated = None
    if delivered and "heating" in offered:
        stated = _stated(batch, table, year, confidence, tried, answers)
    if stated is not None:
        fits[0, :, f.HEATING] = stated[0][0, :, f.HEATING]
        chosen, answers = stated[1], stated[2]
        tried = _tried(aligned, labels, work, batch, table, fits, chosen)
    facts = tuple(
        SideFacts.of(aligned, labels, name, tried[i], offered, delivered)
        for i, name in enumerate(("before", "after"))
    )
    own = answers[0]
    if after_reason(facts[1], work)[0] and facts[1].n:
        own = _without_after(batch, table, year, confidence, tried[0], own)
    held = (answers[0, HELD_BEFORE] == 1.0, answers[0, HELD_AFTER] == 1.0)
    unsure = (answers[0, UNSURE_BEFORE] == 1.0, answers[0, UNSURE_AFTER] == 1.0)
    savings = _assemble(
        own, tried, facts, work, year, year_unavailable, confidence,
        _same_form(batch, table, year, fits[0], chosen[0], confidence),
        Methods.of(unsure, stated is not None), net_metered,
    )  # fmt: skip
    return Comparison(
        savings, tried[0], tried[1], labels, held, unsure, STATED_F if stated else None, fits
    )


def _without_after(
    batch: Batch,
    table: Stations,
    year: LongTermYear | None,
    confidence: float,
    tried: tuple[FormTried, ...],
    answer: NDArray[np.float64],
) -> NDArray[np.float64]:
    """The answer with NAC before as the baseline alone gives it.

    Too few bills after the work must not lend their correlation to the range before it.
    """
    chosen = next((f.form_named(t.form).code for t in tried if t.chosen), -1)
    if chosen < 0 or year is None:
        return answer
    alone = replace(batch, side=np.where(batch.side == AFTER, UNUSED, batch.side).astype(np.uint8))
    found = run_batch(alone, table, [year], confidence=confidence, forced=(chosen, -1))[2][0]
    out = answer.copy()
    out[NAC_BEFORE : NAC_BEFORE + 5] = found[NAC_BEFORE : NAC_BEFORE + 5]
    return out


def labels_of(
    aligned: Aligned, work: Work, occupied_since: int | None, delivered: bool
) -> tuple[str, ...]:
    """The side of every period; few deliveries are pooled over more years."""
    labels = label_periods(aligned, work, occupied_since=occupied_since)
    if delivered and min(labels.count("before"), labels.count("after")) < FEW_INTERVALS:
        return label_periods(
            aligned, work, occupied_since=occupied_since, window_days=POOLED_WINDOW_DAYS
        )
    return labels


def _tried(
    aligned: Aligned,
    labels: tuple[str, ...],
    work: Work,
    batch: Batch,
    table: Stations,
    fits: NDArray[np.float64],
    chosen: NDArray[np.int8],
) -> tuple[tuple[FormTried, ...], ...]:
    return tuple(
        as_tried(
            fits[0, code],
            batch.wanted[0],
            int(chosen[0, code]),
            side_data(batch, table, code),
            _set_aside(aligned, labels, work, code),
            "bic",
        )
        for code in (BEFORE, AFTER)
    )


def _stated(
    batch: Batch,
    table: Stations,
    year: LongTermYear | None,
    confidence: float,
    tried: tuple[tuple[FormTried, ...], ...],
    answers: NDArray[np.float64],
) -> tuple[NDArray[np.float64], NDArray[np.int8], NDArray[np.float64]] | None:
    """The answer at a stated balance temperature, where deliveries place none on a side."""
    open_before = needs_stated(tried[0], answers[0, HELD_BEFORE] == 1.0)
    after = int((batch.side == AFTER).sum())
    open_after = after > 0 and needs_stated(tried[1], answers[0, HELD_AFTER] == 1.0)
    if not (open_before or open_after):
        return None
    return at_stated(batch, table, year, confidence=confidence)


def _set_aside(aligned: Aligned, labels: tuple[str, ...], work: Work, code: int) -> int:
    early = aligned.start < work.start
    side = early if code == BEFORE else ~early
    return sum(1 for i, label in enumerate(labels) if label == "set aside" and side[i])


def _same_form(
    batch: Batch,
    table: Stations,
    year: LongTermYear | None,
    fits: NDArray[np.float64],
    chosen: NDArray[np.int8],
    confidence: float,
) -> tuple[tuple[str, Estimate], ...]:
    """When the forms differ: the answer with each of the two on both sides (method §7)."""
    if year is None or chosen.min() < 0 or chosen[0] == chosen[1]:
        return ()
    out = []
    for code in (int(chosen[0]), int(chosen[1])):
        if np.isnan(fits[0, code, BASE]) or np.isnan(fits[1, code, BASE]):
            reason = "this form could not be fitted on both sides"
            out.append((f.BY_CODE[code].name, Estimate.none(reason, confidence=confidence)))
            continue
        mask = np.zeros((1, f.N_FORMS), dtype=np.bool_)
        mask[0, code] = True
        _, _, answers = run_batch(
            batch, table, [year], confidence=confidence, tried=mask, forced=(code, code)
        )
        unsure = answers[0, UNSURE_BEFORE] == 1.0 or answers[0, UNSURE_AFTER] == 1.0
        method = METHOD_UNSURE if unsure else METHOD
        out.append(
            (
                f.BY_CODE[code].name,
                normalized_of(answers[0], confidence, method, bool(batch.net[0])),
            )
        )
    return tuple(out)


def _assemble(
    answer: NDArray[np.float64],
    tried: tuple[tuple[FormTried, ...], ...],
    facts: tuple[SideFacts, ...],
    work: Work,
    year: LongTermYear | None,
    year_unavailable: str,
    confidence: float,
    same_form: tuple[tuple[str, Estimate], ...],
    methods: Methods,
    net: bool,
) -> Savings:
    before_no, _ = before_reason(facts[0])
    after_no, known_from = after_reason(facts[1], work)
    no_year = "" if year is not None else (year_unavailable or "there is no long-term year")

    def side(at: int, reason: str, when: int | None, method: str) -> Estimate:
        if reason:
            return Estimate.none(reason, known_from=when, confidence=confidence)
        return estimate_at(answer, at, None, confidence, method)

    normalized_no = before_no or no_year or after_no
    days = facts[1].days
    if before_no:
        avoided = Estimate.none(before_no, confidence=confidence)
    elif facts[1].n == 0:
        reason = "there are no usable bills after the work yet"
        avoided = Estimate.none(
            reason, known_from=work.end + facts[0].typical, confidence=confidence
        )
    else:
        avoided = estimate_at(
            answer, AVOIDED, float(answer[PREDICTED]), confidence, methods.avoided, net
        )
        if days < SHORT_YEAR_DAYS:
            avoided = _so_far(avoided)
    return Savings(
        before=None if before_no else chosen_of(tried[0]),
        after=None if after_no else chosen_of(tried[1]),
        nac_before=side(NAC_BEFORE, before_no or no_year, None, methods.before),
        nac_after=side(NAC_AFTER, after_no or no_year or before_no, known_from, methods.after),
        normalized=(
            Estimate.none(
                normalized_no,
                known_from=known_from if not (before_no or no_year) else None,
                confidence=confidence,
            )
            if normalized_no
            else normalized_of(answer, confidence, methods.both, net)
        ),
        avoided=avoided,
        before_unavailable=before_no,
        after_unavailable=after_no,
        predicted_use=float(answer[PREDICTED]) if avoided.available else None,
        actual_use=float(answer[ACTUAL]) if avoided.available else None,
        reporting_days=days,
        same_form=() if normalized_no else same_form,
    )


def _so_far(estimate: Estimate) -> Estimate:
    return replace(estimate, so_far=True)


def measure_savings(
    bills: Bills,
    weather: DailyTemperature,
    *,
    upgrade: tuple[Moment, Moment],
    long_term: LongTermYear | None,
    confidence: float = CONFIDENCE,
    forms: Sequence[str] | None = None,
    occupied_since: int | None = None,
    net_metered: bool = False,
) -> Savings:
    """How much an account's use changed after the work.

    upgrade : first and last day of the work, as dates or ISO text, both in it; or day numbers
    ``[start, end)``.  long_term : see
    ``long_term_year``; None leaves only avoided use.  confidence : two-sided, 0.5 to 0.999.
    Returns Savings; a part that cannot be known carries its reason instead of a value.
    Errors: NoUpgrade when the window is empty.  Source: docs/method.md §3-§5.
    """
    if not 0.5 <= confidence <= 0.999:
        raise NoUpgrade(f"confidence {confidence}", wanted="a share between 0.5 and 0.999")
    return compare(
        align(bills.periods, weather),
        Work.of(upgrade),
        long_term,
        confidence=confidence,
        forms=forms,
        occupied_since=occupied_since,
        net_metered=net_metered,
    ).savings
