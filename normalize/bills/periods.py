"""What was billed: rows as given, usage periods as cleaned, and the ledger between them.

Days are integers, counted from 1970-01-01.  Periods are half-open: ``[start, end)``, and a
reading dated *d* is the meter as it stood at the start of day *d*.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray


@dataclass(frozen=True, slots=True)
class BillRow:
    """One row as the utility or dealer gave it, coerced but not repaired.

    start, end : day numbers; None where the row did not say (or said nonsense: see problem).
    use : in the account's unit; None where missing.
    cost : in the account's currency; None where missing.
    mean_temp_f : the bill's own mean outdoor temperature, °F, where it carries one.
    problem : why the row cannot be used, in plain words; empty when it can.
    note : what reading it took, for the ledger; empty for most.
    """

    file: str
    line: int
    start: int | None
    end: int | None
    use: float | None
    cost: float | None = None
    estimated: bool = False
    mean_temp_f: float | None = None
    problem: str = ""
    note: str = ""


@dataclass(frozen=True, slots=True)
class LedgerEntry:
    """What became of one row (or one repair note on it).

    fate : ``"period 12"`` (periods are numbered from 1) or ``"left out"``.
    note : the reason, or the repair; empty for a row that became a period unchanged.
    """

    file: str
    line: int
    fate: str
    note: str = ""


@dataclass(frozen=True, slots=True)
class Periods:
    """Cleaned usage periods of one account, in order of time, never overlapping.

    start, end : (n,) int32 day numbers, half-open.
    use : (n,) float64, the account's unit, whole period.
    cost : (n,) float64, NaN where unknown.
    estimated : (n,) bool, true where an estimate remains part of the period's end (never
        for a period that ends on an actual reading).
    joined : (n,) int32, how many bills were joined into the period.
    mean_temp_f : (n,) float64 from the bills themselves, or None when bills carry none.
    """

    start: NDArray[np.int32]
    end: NDArray[np.int32]
    use: NDArray[np.float64]
    cost: NDArray[np.float64]
    estimated: NDArray[np.bool_]
    joined: NDArray[np.int32]
    mean_temp_f: NDArray[np.float64] | None = None

    @property
    def n(self) -> int:
        """How many periods."""
        return int(self.start.shape[0])

    @property
    def days(self) -> NDArray[np.int32]:
        """(n,) days of each period."""
        return self.end - self.start


@dataclass(frozen=True, slots=True)
class Spans:
    """The periods of bills, to which days are to be summed.

    start, end : (n,) int64 day numbers, half-open, in order, never overlapping.  use, cost : (n,)
    as billed, NaN where not known; use in the unit of the days.  source : whose periods they are.
    files : (name, SHA-256) of the file that told of them, where it is another.
    """

    start: NDArray[np.int64]
    end: NDArray[np.int64]
    use: NDArray[np.float64]
    cost: NDArray[np.float64]
    source: str
    files: tuple[tuple[str, str], ...] = ()


@dataclass(frozen=True, slots=True)
class Flag:
    """Something odd about a period, left as it is. period : from 1.  what : a code's name.

    what : "zero use", "repeated number", "multiplier", "empty house", "alternating".
    note : the same in words.
    """

    period: int
    what: str
    note: str


@dataclass(frozen=True, slots=True)
class Bills:
    """One account's bills: rows, periods and the ledger that connects them.

    fuel, unit : canonical names from ``normalize.units``.
    rows, ledger : tuples; of interval files, sequences whose items are made when looked at.
    source : file names with their SHA-256, for the report's list of inputs.
    reading : how the file was understood, as short sentences ("usage from column 'kWh'").
    kind : "meter" for read meters, "delivery" for dealer deliveries.
    unfit : why this account's use cannot answer to weather in the way of this method (solar
        panels whose generation is not known); empty for most.
    flags : what is odd about single periods and was left as it is.
    gross : generation was added back, so that use is what the house used.
    """

    account: str
    fuel: str
    unit: str
    rows: Sequence[BillRow]
    periods: Periods
    ledger: Sequence[LedgerEntry]
    source: tuple[tuple[str, str], ...] = ()
    reading: tuple[str, ...] = ()
    kind: str = "meter"
    currency: str = "USD"
    cautions: tuple[str, ...] = field(default=())
    unfit: str = ""
    flags: tuple[Flag, ...] = ()
    gross: bool = False
