"""One site's folder, read and assessed: the whole pipeline in one place, top to bottom."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from normalize.sitefile import AccountPlan, Change, Upgrade

if TYPE_CHECKING:
    from pathlib import Path

    import numpy as np
    from numpy.typing import NDArray

    from normalize.bills.periods import Bills
    from normalize.fitting.results import FormTried
    from normalize.savings.results import Check, Price, Savings, Total
    from normalize.units import Factor
    from normalize.weather.temperature import DailyTemperature
    from normalize.weather.year import LongTermYear


@dataclass(frozen=True, slots=True)
class Site:
    """A site folder, read: everything that assess() needs.

    read_errors : (account, message) of accounts whose bills could not be read at all.
    """

    name: str
    folder: Path
    weather: DailyTemperature
    year: LongTermYear | None
    year_unavailable: str
    accounts: tuple[AccountPlan, ...]
    bills: tuple[Bills | None, ...]
    read_errors: tuple[tuple[str, str], ...]
    upgrades: tuple[Upgrade, ...]
    changes: tuple[Change, ...] = ()
    floor_area_ft2: float | None = None
    currency: str = "USD"
    inputs: tuple[tuple[str, str], ...] = ()  # (file, SHA-256) of every input


@dataclass(frozen=True, slots=True)
class PeriodRow:
    """One usage period as a report shows it.

    side : "before", "after", "work window", "older", "later", "between", "set aside" or
        "earlier occupant".
    reason : why it is not used, empty for before/after periods that are.
    mean_temp_f : mean of its days.  use_per_day, fitted_per_day (own side's fit),
    without_work_per_day (the baseline fit at this period's weather); NaN where unknown.
    """

    number: int
    start: int
    end: int
    use: float
    cost: float
    estimated: bool
    joined: int
    side: str
    reason: str
    mean_temp_f: float
    use_per_day: float
    fitted_per_day: float
    without_work_per_day: float


@dataclass(frozen=True, slots=True)
class Curve:
    """A fit as a line to draw: temp_f, use_per_day both (m,)."""

    temp_f: NDArray[np.float64]
    use_per_day: NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class AccountResult:
    """One account, assessed, with all that a report draws.

    bills : None when they could not be read; ``unavailable`` then says why.
    periods : every period in order of time, used or not.
    tried_before, tried_after : every form with its numbers or its reason.
    cautions : sentences; the first are the most important.
    """

    account: str
    fuel: str
    unit: str
    bills: Bills | None
    unavailable: str
    periods: tuple[PeriodRow, ...]
    tried_before: tuple[FormTried, ...]
    tried_after: tuple[FormTried, ...]
    savings: Savings
    curve_before: Curve | None
    curve_after: Curve | None
    price: Price
    co2: Factor | None
    mmbtu_per_unit: Factor | None
    checks: tuple[Check, ...]
    cautions: tuple[str, ...]
    work_start: int | None = None
    work_end: int | None = None

    @property
    def has_answer(self) -> bool:
        """Whether normalized savings or avoided use is known."""
        return self.savings.normalized.available or self.savings.avoided.available


@dataclass(frozen=True, slots=True)
class SiteResult:
    """A site, assessed, with its inputs, so that a report can draw without computing."""

    site: Site
    confidence: float
    accounts: tuple[AccountResult, ...]
    total_normalized: Total
    total_avoided: Total
    cautions: tuple[str, ...]
    settings: tuple[tuple[str, str], ...]  # the defaults that mattered, name and value
    versions: tuple[tuple[str, str], ...]  # normalize, python, numpy, numba
