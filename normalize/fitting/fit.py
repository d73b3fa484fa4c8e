"""Fitting one account's periods: every form tried, one chosen."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from normalize.bills.periods import Bills
from normalize.errors import TooFewPeriods, UnknownForm
from normalize.fitting.align import Aligned, align
from normalize.fitting.batch import (
    CRITERIA,
    Batch,
    Stations,
    fit_batch,
    stations,
    take_side,
    wanted_mask,
)
from normalize.fitting.columns import BEFORE, UNUSED
from normalize.fitting.describe import SideData, as_tried
from normalize.fitting.forms import FORMS, LINE, TWO_SLOPES
from normalize.fitting.results import Fit, FormTried
from normalize.weather.temperature import DailyTemperature

#: Offered to the choice when nobody says otherwise.  A line has no balance temperature and
#: may promise negative use in mild weather; two slopes fit noise where one slope is right.
#: Both are fitted and shown, and chosen only when asked for.
CHOICE = ("flat", "heating", "cooling", "heating and cooling")
WEIGHTS = ("days", "equal")


def batch_of_one(
    aligned: Aligned, side: NDArray[np.uint8], forms: Sequence[str], net: bool = False
) -> tuple[Batch, Stations]:
    """One account as a ragged batch, and its station table."""
    used = (side != UNUSED) & aligned.usable
    codes = np.where(used, side, UNUSED).astype(np.uint8)
    first = int(aligned.start[used].min()) if used.any() else 0
    last = int(aligned.end[used].max()) if used.any() else 0
    table = stations([(aligned.weather.first_day, aligned.weather.temp_f)], first, last)
    batch = Batch(
        start=aligned.start,
        end=aligned.end,
        use=aligned.use,
        side=codes,
        offsets=np.array([0, aligned.n], dtype=np.int64),
        station=np.zeros(1, dtype=np.int32),
        wanted=wanted_mask(forms)[None, :],
        net=np.array([net]),
        drivers=aligned.drivers.values if aligned.drivers is not None else None,
    )
    return batch, table


def side_data(batch: Batch, table: Stations, code: int, weights: str = "days") -> SideData:
    """The arrays of one side of a batch of one, as the kernels see them."""
    from normalize.fitting.batch import driver_gate, gate

    start, end, use, side, _, _ = gate(batch)
    drivers, _ = driver_gate(batch)
    ts, ps, y, d, w, first, last = take_side(
        start, end, use, side, code, table.temp, table.first_day[0], table.order,
        weights == "equal",
    )  # fmt: skip
    own = np.ascontiguousarray(drivers[side == code])
    return SideData(ts, ps, y, d, w, first, last, own)


def also_tried() -> NDArray[np.bool_]:
    """(1, N_FORMS) the forms that are fitted and shown even when they are not offered."""
    return wanted_mask(tuple(FORMS))[None, :]


def fit_periods(
    aligned: Aligned,
    *,
    forms: Sequence[str] | None = None,
    weights: str = "days",
    criterion: str = "bic",
    net_metered: bool = False,
) -> tuple[FormTried, ...]:
    """Every form on the usable periods, with the chosen one marked.

    forms : names offered to the choice; default ``CHOICE``.  weights : "days" or "equal".
    criterion : "bic" or "aicc".  Errors: UnknownForm.  Source: docs/method.md §2-§3.
    """
    offered = tuple(forms) if forms is not None else CHOICE
    if criterion not in CRITERIA or weights not in WEIGHTS:
        raise UnknownForm(
            f"criterion {criterion!r} or weights {weights!r} is unknown",
            wanted=f"criterion one of {sorted(CRITERIA)}, weights one of {sorted(WEIGHTS)}",
        )
    side = np.full(aligned.n, BEFORE, dtype=np.uint8)
    batch, table = batch_of_one(aligned, side, offered, net_metered)
    fits, chosen = fit_batch(
        batch, table, BEFORE, criterion=criterion, weights=weights, tried=also_tried()
    )
    data = side_data(batch, table, BEFORE, weights)
    set_aside = int((~aligned.usable).sum())
    return as_tried(fits[0], batch.wanted[0], int(chosen[0]), data, set_aside, criterion)


def chosen_of(tried: Sequence[FormTried]) -> Fit | None:
    """The fit that was chosen among the forms tried."""
    for form in tried:
        if form.chosen:
            return form.fit
    return None


def fit(
    bills: Bills,
    weather: DailyTemperature,
    *,
    forms: Sequence[str] | None = None,
    weights: str = "days",
    criterion: str = "bic",
    net_metered: bool = False,
) -> Fit:
    """How an account's use answers to weather: align, fit every form, choose one.

    bills : as ``read_bills`` gives them; weather : as ``read_weather`` does.
    Errors: TooFewPeriods when no form can be fitted; UnknownForm for a wrong name.
    Source: docs/method.md §1-§3.
    """
    aligned = align(bills.periods, weather)
    tried = fit_periods(
        aligned, forms=forms, weights=weights, criterion=criterion, net_metered=net_metered
    )
    best = chosen_of(tried)
    if best is None:
        usable = int(aligned.usable.sum())
        raise TooFewPeriods(
            f"no form fits the {usable} usable periods",
            where=bills.account or "bills",
            wanted="at least 4 periods for a flat load and 6 that span cold and mild weather "
            "for a balance temperature",
            next_step="Add older bills, or weather that covers them.",
        )
    return best


__all__ = [
    "CHOICE", "LINE", "TWO_SLOPES", "batch_of_one", "chosen_of", "fit", "fit_periods", "side_data",
]  # fmt: skip
