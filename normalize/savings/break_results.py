"""What a scan for dates of change found: dates and sizes, never causes."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

LEVEL: Final = 0.05  # a change, or an odd bill, is announced when its p is at most this


@dataclass(frozen=True, slots=True)
class ClaimedDate:
    """What the bills say of the date of the work.

    f, p : of a change at the work, whose date was known (bills that touch it left out); None
    where one side has too few bills.  day, low, high : the most likely date of change when
    nobody names one, and the range of dates that cannot be told from it.  f_any, p_any,
    threshold : of the largest F over all dates.  meets : range and work window meet.
    """

    f: float | None
    p: float | None
    day: int
    low: int
    high: int
    f_any: float
    p_any: float
    threshold: float
    meets: bool

    @property
    def announced(self) -> bool:
        """Whether the bills single out a change without being told its date."""
        return self.p_any <= LEVEL


@dataclass(frozen=True, slots=True)
class FoundChange:
    """A change beside the work. day, low, high : as of the claimed date.

    side : "before" or "after" the work.  change : of a normal year's use, in units; a rise
    is positive.  fraction : of the normal year before it.  explained : what site.toml says
    happened about then.  mixed : bills on both of its sides took part in the answer.
    """

    day: int
    low: int
    high: int
    side: str
    change: float
    change_low: float
    change_high: float
    fraction: float | None
    fraction_low: float | None
    fraction_high: float | None
    p: float
    explained: str = ""
    mixed: bool = False


@dataclass(frozen=True, slots=True)
class OddPeriod:
    """A period that stands out. numbers : the account's periods in it, counted from 1.

    expected_per_day : what the others lead one to expect.  t : externally studentised
    residual; p : Bonferroni's.  explained : as of a found change.
    """

    start: int
    end: int
    numbers: tuple[int, ...]
    use_per_day: float
    expected_per_day: float
    t: float
    p: float
    explained: str = ""


@dataclass(frozen=True, slots=True)
class Step:
    """One period with weather taken out, for a picture.

    departure : use less what its weather and the bills before the work lead one to expect,
    as a share of average use.  part : "before", "work", "after" or "odd".
    """

    start: int
    end: int
    departure: float
    part: str


@dataclass(frozen=True, slots=True)
class Breaks:
    """The scan of one account.

    n : periods scanned; joined : daily data joined to months.  form, power, rho : of the
    regression, its errors' growth with use, and their lag-1 correlation with the work
    allowed for.  dates, f : F at every date, the work not allowed for.  p_rest : of any
    further change beyond those found; None where no side is long enough.  not_searched :
    why a side was not.  levels : (start, end, departure) between changes.
    """

    n: int = 0
    joined: bool = False
    form: str = ""
    power: float = 0.0
    rho: float = 0.0
    claimed: ClaimedDate | None = None
    dates: tuple[int, ...] = ()
    f: tuple[float, ...] = ()
    changes: tuple[FoundChange, ...] = ()
    p_rest: float | None = None
    not_searched: tuple[str, ...] = ()
    odd: tuple[OddPeriod, ...] = ()
    steps: tuple[Step, ...] = ()
    levels: tuple[tuple[int, int, float], ...] = ()
    unavailable: str = ""
