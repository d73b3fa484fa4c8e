"""Repair: rows as billed become periods that never overlap, and a ledger of what was done.

What belongs here: the gate that coerces to bare arrays, the one call of the kernel, and the
words of the ledger.  The rules are in rules.py; the kernels in repair_versions.py,
repair_overlaps.py and repair_join.py.  One account is a batch of one.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import partial
from typing import TYPE_CHECKING, Literal

import numpy as np

from normalize.bills import rules
from normalize.bills.day_rows import DayLedger, DayRows
from normalize.bills.periods import BillRow, Bills, LedgerEntry, Periods
from normalize.bills.repair_join import repair_accounts
from normalize.errors import BillError

if TYPE_CHECKING:
    from numpy.typing import ArrayLike, NDArray

Kind = Literal["meter", "delivery"]


@dataclass(frozen=True, slots=True)
class RepairedBatch:
    """Many accounts, repaired.

    fate, reason, note, other : (rows,) int32, uint8, int32, int32.  ``fate`` is the period's
        number within its account from 0, or -1 for left out; ``reason`` a code of
        rules.REASONS; ``note`` bits of rules.NOTES; ``other`` the row, within the account,
        that the reason or note speaks of, or -1.
    start, end, use, cost, mean_temp_f, joined : (periods,), as in Periods.
    offsets : (accounts + 1,) int64, account a owns periods offsets[a]:offsets[a + 1].
    """

    fate: NDArray[np.int32]
    reason: NDArray[np.uint8]
    note: NDArray[np.int32]
    other: NDArray[np.int32]
    start: NDArray[np.int32]
    end: NDArray[np.int32]
    use: NDArray[np.float64]
    cost: NDArray[np.float64]
    mean_temp_f: NDArray[np.float64]
    joined: NDArray[np.int32]
    offsets: NDArray[np.int64]


def repair_batch(
    start: ArrayLike,
    end: ArrayLike,
    use: ArrayLike,
    cost: ArrayLike,
    estimated: ArrayLike,
    offsets: ArrayLike,
    *,
    mean_temp_f: ArrayLike | None = None,
    delivery: ArrayLike = False,
    net_metered: ArrayLike = False,
) -> RepairedBatch:
    """Repair a ragged batch of accounts: account a owns rows offsets[a]:offsets[a + 1].

    start, end : (rows,) day numbers, half-open.  use : (rows,) each account's own unit.
    cost : (rows,) NaN where unknown.  estimated : (rows,) true for an estimated reading (or
    a partial fill).  mean_temp_f : (rows,) °F.  delivery, net_metered : one or (accounts,).
    Raises ValueError if the arrays do not belong together (a fault of the caller).

    >>> batch = repair_batch([0, 30], [30, 61], [10, 12], [5, 6], [True, False], [0, 2])
    >>> batch.start.tolist(), batch.end.tolist(), batch.use.tolist()
    ([0], [61], [22.0])
    """
    days = [np.ascontiguousarray(a, np.int32) for a in (start, end)]
    n = days[0].shape[0]
    if mean_temp_f is None:
        mean_temp_f = np.full(n, np.nan)
    amounts = [np.ascontiguousarray(a, np.float64) for a in (use, cost, mean_temp_f)]
    marks = np.ascontiguousarray(estimated, np.bool_).astype(np.uint8)
    bounds = np.ascontiguousarray(offsets, np.int64)
    accounts = bounds.shape[0] - 1
    _check_shapes(n, [*days, *amounts, marks], bounds)
    flags = [
        np.ascontiguousarray(np.broadcast_to(np.asarray(a, np.bool_), accounts)).astype(np.uint8)
        for a in (delivery, net_metered)
    ]
    fate, other = np.full(n, -1, np.int32), np.full(n, -1, np.int32)
    reason, note = np.zeros(n, np.uint8), np.zeros(n, np.int32)
    out_days = [np.zeros(n, np.int32) for _ in range(3)]
    out_amounts = [np.zeros(n, np.float64) for _ in range(3)]
    counts = np.zeros(accounts, np.int32)
    repair_accounts(
        days[0], days[1], amounts[0], amounts[1], marks, amounts[2], bounds, flags[0], flags[1],
        fate, reason, note, other,
        out_days[0], out_days[1], out_amounts[0], out_amounts[1], out_amounts[2], out_days[2],
        counts,
    )  # fmt: skip
    ends = np.concatenate([[0], np.cumsum(counts, dtype=np.int64)])
    # Slot k of the output is account a's period k - offsets[a]; keep the slots that were used.
    used = np.arange(n) - np.repeat(bounds[:-1], np.diff(bounds)) < np.repeat(
        counts, np.diff(bounds)
    )
    return RepairedBatch(
        fate, reason, note, other,
        out_days[0][used], out_days[1][used],
        out_amounts[0][used], out_amounts[1][used], out_amounts[2][used],
        out_days[2][used], ends,
    )  # fmt: skip


def _check_shapes(n: int, arrays: Sequence[NDArray[np.generic]], bounds: NDArray[np.int64]) -> None:
    if any(a.shape != (n,) for a in arrays):
        raise ValueError("start, end, use, cost, estimated must have one value per row")
    if bounds.ndim != 1 or bounds.shape[0] < 1 or bounds[0] != 0 or bounds[-1] != n:
        raise ValueError("offsets must run from 0 to the number of rows")
    if np.any(np.diff(bounds) < 0):
        raise ValueError("offsets must not fall")
    if n >= 1 << 29:
        raise ValueError("a batch holds at most 536 million rows")


def repair(
    rows: Sequence[BillRow], *, kind: Kind = "meter", net_metered: bool = False
) -> tuple[Periods, Sequence[LedgerEntry]]:
    """Repair one account's rows; the ledger has one entry per row, in the rows' order.

    kind : "delivery" reads ``estimated`` as a partial fill and adds deliveries of one day.
    net_metered : negative use is then ordinary.

    >>> row = BillRow("gas.csv", 2, 0, 30, 41.0)
    >>> periods, ledger = repair([row, row])
    >>> periods.n, ledger[0].note
    (1, 'the same bill as line 2')
    """
    if isinstance(rows, DayRows):
        return _repair_days(rows, kind, net_metered=net_metered)
    good = [row for row in rows if _usable(row)]
    batch = repair_batch(
        _days([row.start for row in good]),
        _days([row.end for row in good]),
        _numbers([row.use for row in good]),
        _numbers([row.cost for row in good]),
        [row.estimated for row in good],
        [0, len(good)],
        mean_temp_f=_numbers([row.mean_temp_f for row in good]),
        delivery=kind == "delivery",
        net_metered=net_metered,
    )
    return _periods(batch), tuple(_fates(rows, batch, [row.line for row in good], kind))


def _repair_days(
    rows: DayRows, kind: Kind, *, net_metered: bool
) -> tuple[Periods, Sequence[LedgerEntry]]:
    """The same for days, whose rows are arrays already."""
    s, good = rows.sums, rows.usable
    day = s.day[good]
    batch = repair_batch(
        day, day + 1, s.use[good], s.cost[good], np.zeros(day.shape, np.bool_), [0, day.size],
        delivery=kind == "delivery", net_metered=net_metered,
    )  # fmt: skip
    place = np.where(good, np.cumsum(good) - 1, -1)
    entry = partial(_entry, batch=batch, lines=s.line[good], kind=kind)
    return _periods(batch), DayLedger(rows, place, batch.fate, entry)


def _fates(
    rows: Sequence[BillRow], batch: RepairedBatch, lines: list[int], kind: Kind
) -> Iterator[LedgerEntry]:
    """One entry for each row. lines : of the rows that went to the kernel."""
    # A million readings come to ten thousand days, most of them without a word to say.
    plain = ((batch.note == 0) & (batch.fate >= 0)).tolist()
    names = [f"period {k}" for k in (batch.fate + 1).tolist()]
    i = 0
    for row in rows:
        if not _usable(row):
            yield LedgerEntry(row.file, row.line, "left out", row.problem or _missing(row))
            continue
        if plain[i]:
            yield LedgerEntry(row.file, row.line, names[i], row.note)
        else:
            yield _entry(row, i, batch=batch, lines=lines, kind=kind)
        i += 1


def _usable(row: BillRow) -> bool:
    return not (row.problem or row.start is None or row.end is None or row.use is None)


def _missing(row: BillRow) -> str:
    names = (("a start date", row.start), ("an end date", row.end), ("usage", row.use))
    return "without " + " and ".join(name for name, value in names if value is None)


def _days(days: list[int | None]) -> NDArray[np.int32]:
    """Day numbers that fit 32 bits; far-off days stay far off and are screened out."""
    far = 2.0**30
    return np.clip(np.array(days, np.float64), -far, far).astype(np.int32)


def _numbers(values: list[float | None]) -> NDArray[np.float64]:
    return np.array([np.nan if v is None else v for v in values], np.float64)


def _periods(batch: RepairedBatch) -> Periods:
    temp = batch.mean_temp_f
    return Periods(
        start=batch.start,
        end=batch.end,
        use=batch.use,
        cost=batch.cost,
        # A run of estimates is joined to an actual reading or left out: none remains.
        estimated=np.zeros(batch.start.shape[0], np.bool_),
        joined=batch.joined,
        mean_temp_f=None if temp.size == 0 or bool(np.all(np.isnan(temp))) else temp,
    )


def _entry(
    row: BillRow, i: int, *, batch: RepairedBatch, lines: Sequence[int] | NDArray[np.int64],
    kind: Kind,
) -> LedgerEntry:  # fmt: skip
    partner = int(batch.other[i])
    other = int(lines[partner]) if partner >= 0 else 0
    if batch.fate[i] < 0:
        code = int(batch.reason[i])
        words = rules.REASONS[code]
        if kind == "delivery" and code == rules.OPEN_ESTIMATE:
            words = rules.OPEN_PARTIAL
        return LedgerEntry(row.file, row.line, "left out", words.format(other=other))
    book = rules.NOTES | (rules.DELIVERY_NOTES if kind == "delivery" else {})
    notes = [row.note] if row.note else []
    notes += [text.format(other=other) for bit, text in book.items() if int(batch.note[i]) & bit]
    return LedgerEntry(row.file, row.line, f"period {int(batch.fate[i]) + 1}", "; ".join(notes))


def reconcile(bills: Bills) -> None:
    """Check that nothing was lost: every row has one fate, and rows and periods add up.

    Raises BillError, which would be a fault of the program and not of the file.
    """
    periods = bills.periods
    if len(bills.rows) != len(bills.ledger):
        raise _does_not_add_up(bills, f"{len(bills.rows)} rows but {len(bills.ledger)} fates")
    fates, uses = _fates_and_uses(bills)
    counted = fates >= 0
    sums = np.bincount(fates[counted], uses[counted], minlength=periods.n)
    sizes = np.bincount(fates[counted], np.abs(uses[counted]), minlength=periods.n)
    if np.any(np.bincount(fates[counted], minlength=periods.n) == 0):
        raise _does_not_add_up(bills, "a period has no bill")
    if np.any(np.abs(sums - periods.use) > 1e-9 * np.maximum(sizes, 1.0)):
        raise _does_not_add_up(bills, "usage of rows and of periods differs")
    if np.any(periods.start[1:] < periods.end[:-1]) or np.any(periods.days <= 0):
        raise _does_not_add_up(bills, "periods overlap")


def _fates_and_uses(bills: Bills) -> tuple[NDArray[np.int64], NDArray[np.float64]]:
    """Each row's period from 0 (-1 for left out) and its use.  Raises BillError."""
    if isinstance(bills.rows, DayRows) and isinstance(bills.ledger, DayLedger):
        return bills.ledger.fates, bills.rows.sums.use
    fates, uses = np.full(len(bills.rows), -1, np.int64), np.zeros(len(bills.rows))
    for k, (row, entry) in enumerate(zip(bills.rows, bills.ledger, strict=True)):
        if (row.file, row.line) != (entry.file, entry.line):
            raise _does_not_add_up(bills, f"line {row.line} is entered as line {entry.line}")
        if entry.fate == "left out":
            if not entry.note:
                raise _does_not_add_up(bills, f"line {row.line} is left out without a reason")
            continue
        fates[k] = int(entry.fate.removeprefix("period ")) - 1
        uses[k] = 0.0 if row.use is None else row.use
    return fates, uses


def _does_not_add_up(bills: Bills, what: str) -> BillError:
    return BillError(
        f"the repaired bills do not add up ({what})",
        where=bills.rows[0].file if bills.rows else "",
        next_step="This is a fault of normalize; please report it with the file.",
    )
