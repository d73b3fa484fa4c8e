"""Many accounts at once: the ragged arrays that kernels take, and the one gate to them.

Account *i* owns rows ``offsets[i]:offsets[i+1]``; its weather is row ``station[i]`` of a
station table.  One account is a batch of one, so a site's answer and its row in a program
come from the same instructions.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from normalize import defaults
from normalize.fitting.blocks import judge_in_blocks
from normalize.fitting.columns import AICC, BIC, WIDTH
from normalize.fitting.forms import BY_CODE, N_FORMS, form_named
from normalize.fitting.side import choose, fit_side
from normalize.fitting.sweep import gather
from normalize.jit import kernel

CRITERIA = {"bic": BIC, "aicc": AICC}


@dataclass(frozen=True, slots=True)
class Stations:
    """Daily temperatures of several stations, with each one's days in order of temperature.

    temp (all days,) float64 °F; order (all days,) int32, positions within the station;
    offsets (stations+1,) int64; first_day (stations,) int32.
    """

    temp: NDArray[np.float64]
    order: NDArray[np.int32]
    offsets: NDArray[np.int64]
    first_day: NDArray[np.int32]


@dataclass(frozen=True, slots=True)
class Batch:
    """Periods of many accounts. side (rows,) uint8: BEFORE, AFTER or UNUSED (columns.py)."""

    start: NDArray[np.int32]
    end: NDArray[np.int32]
    use: NDArray[np.float64]
    side: NDArray[np.uint8]
    offsets: NDArray[np.int64]
    station: NDArray[np.int32]
    wanted: NDArray[np.bool_]  # (accounts, N_FORMS): offered to the choice
    net: NDArray[np.bool_]  # (accounts,)
    # Other things that use answers to, means over each period from their normal level:
    drivers: NDArray[np.float64] | None = None  # (rows, K)
    n_drivers: NDArray[np.int64] | None = None  # (accounts,) of the columns; None: all K


def stations(series: Sequence[tuple[int, NDArray[np.float64]]], first: int, last: int) -> Stations:
    """A station table of (first day, temperatures), cut to the days [first, last) in use.

    Days that are missing are left out of the order, so they can belong to no period.
    """
    temps, orders, offsets, firsts = [], [], [0], []
    for first_day, temp_f in series:
        lo = max(first - first_day, 0)
        cut = np.ascontiguousarray(temp_f[lo : max(last - first_day, lo)], dtype=np.float64)
        order = np.argsort(cut, kind="stable").astype(np.int32)
        known = np.where(np.isnan(cut[order]), -1, order)
        temps.append(cut)
        orders.append(known.astype(np.int32))
        offsets.append(offsets[-1] + cut.shape[0])
        firsts.append(first_day + lo)
    return Stations(
        temp=np.concatenate(temps) if temps else np.empty(0),
        order=np.concatenate(orders) if orders else np.empty(0, np.int32),
        offsets=np.array(offsets, dtype=np.int64),
        first_day=np.array(firsts, dtype=np.int32),
    )


def wanted_mask(forms: Sequence[str]) -> NDArray[np.bool_]:
    """(N_FORMS,) which forms are offered; UnknownForm for a name that is none."""
    mask = np.zeros(N_FORMS, dtype=np.bool_)
    for name in forms:
        mask[form_named(name).code] = True
    return mask


def settings() -> NDArray[np.float64]:
    """The defaults as the kernels take them, in the order of side.py's S_ positions."""
    return np.array(
        [
            *defaults.HEATING_RANGE_F,
            *defaults.COOLING_RANGE_F,
            defaults.MIN_COLD_PERIODS,
            defaults.MIN_MILD_PERIODS,
            defaults.SPARE_PERIODS,
            defaults.MIN_ABS_T,
            defaults.BASE_LOAD_T,
        ],
        dtype=np.float64,
    )


@kernel
def take_side(start, end, use, side, code, temp, first_day, order, equal):
    """One side of one account: (ts, ps, use per day, days, weights, start, end)."""
    n = 0
    for p in range(side.shape[0]):
        n += 1 if side[p] == code else 0
    y = np.empty(n)
    d = np.empty(n)
    s = np.empty(n)
    e = np.empty(n)
    pid = np.full(temp.shape[0], np.int32(-1))
    at = 0
    days = 0
    for p in range(side.shape[0]):
        if side[p] != code:
            continue
        length = end[p] - start[p]
        d[at] = length
        y[at] = use[p] / length
        s[at] = start[p]
        e[at] = end[p]
        for t in range(start[p] - first_day, end[p] - first_day):
            pid[t] = at
        days += length
        at += 1
    ts = np.empty(days + 1)  # one more: the gather writes before it decides
    ps = np.empty(days + 1, dtype=np.int32)
    k = 0
    for i in range(order.shape[0]):
        if order[i] < 0:
            break
        k = i + 1
    count = gather(order[:k], temp, pid, ts, ps)
    w = d.copy()
    if equal:
        w[:] = d.sum() / max(n, 1)
    return ts[:count].copy(), ps[:count].copy(), y, d, w, s, e


@kernel
def take_drivers(drivers, count, side, code):
    """(n, count) drivers of one side's periods."""
    n = 0
    for p in range(side.shape[0]):
        n += 1 if side[p] == code else 0
    out = np.empty((n, count))
    at = 0
    for p in range(side.shape[0]):
        if side[p] == code:
            for j in range(count):
                out[at, j] = drivers[p, j]
            at += 1
    return out


@kernel
def _fit_batch(
    start, end, use, side, offsets, station, drivers, n_drivers, wanted, net, code,
    temp, order, soff, first_day, settings, criterion, equal, allowed,
):  # fmt: skip
    accounts = offsets.shape[0] - 1
    fits = np.full((accounts, N_FORMS, WIDTH), np.nan)
    chosen = np.full(accounts, np.int8(-1))
    for i in range(accounts):
        a, b = offsets[i], offsets[i + 1]
        g, h = soff[station[i]], soff[station[i] + 1]
        ts, ps, y, d, w, s, e = take_side(
            start[a:b], end[a:b], use[a:b], side[a:b], code,
            temp[g:h], first_day[station[i]], order[g:h], equal,
        )  # fmt: skip
        own = take_drivers(drivers[a:b], n_drivers[i], side[a:b], code)
        rows = fit_side(ts, ps, y, d, w, own, wanted[i], net[i], settings)
        judge_in_blocks(rows, ts, ps, y, d, w, own, s, e, wanted[i], net[i], settings)
        fits[i] = rows
        chosen[i] = choose(rows, allowed[i], criterion)
    return fits, chosen


def fit_batch(
    batch: Batch,
    table: Stations,
    code: int,
    *,
    criterion: str = "bic",
    weights: str = "days",
    tried: NDArray[np.bool_] | None = None,
) -> tuple[NDArray[np.float64], NDArray[np.int8]]:
    """Every form on one side of every account, and the one chosen.

    Returns (accounts, N_FORMS, WIDTH) rows as in columns.py and (accounts,) form codes, −1
    where no form passed.  tried : forms to fit beyond those offered (to be shown, not
    chosen); default: only those offered.
    """
    offered = np.ascontiguousarray(batch.wanted, dtype=np.bool_)
    wanted = offered if tried is None else np.ascontiguousarray(offered | tried, dtype=np.bool_)
    fits: NDArray[np.float64]
    chosen: NDArray[np.int8]
    fits, chosen = _fit_batch(
        *gate(batch),
        *driver_gate(batch),
        wanted,
        np.ascontiguousarray(batch.net, dtype=np.bool_),
        code,
        table.temp,
        table.order,
        table.offsets,
        table.first_day,
        settings(),
        CRITERIA[criterion],
        weights == "equal",
        offered,
    )
    return fits, chosen


def gate(
    batch: Batch,
) -> tuple[
    NDArray[np.int32],
    NDArray[np.int32],
    NDArray[np.float64],
    NDArray[np.uint8],
    NDArray[np.int64],
    NDArray[np.int32],
]:
    """The one place where arrays are coerced for the kernels: contiguous, one dtype each."""
    return (
        np.ascontiguousarray(batch.start, dtype=np.int32),
        np.ascontiguousarray(batch.end, dtype=np.int32),
        np.ascontiguousarray(batch.use, dtype=np.float64),
        np.ascontiguousarray(batch.side, dtype=np.uint8),
        np.ascontiguousarray(batch.offsets, dtype=np.int64),
        np.ascontiguousarray(batch.station, dtype=np.int32),
    )


def driver_gate(batch: Batch) -> tuple[NDArray[np.float64], NDArray[np.int64]]:
    """Drivers (rows, K) and how many each account has, coerced as ``gate`` does."""
    drivers = batch.drivers if batch.drivers is not None else np.empty((len(batch.start), 0))
    count = batch.n_drivers
    if count is None:
        count = np.full(len(batch.offsets) - 1, drivers.shape[1])
    return (
        np.ascontiguousarray(drivers, dtype=np.float64),
        np.ascontiguousarray(count, dtype=np.int64),
    )


def form_name(code: int) -> str:
    """Name of a form code; "none" for −1."""
    return BY_CODE[code].name if code >= 0 else "none"
