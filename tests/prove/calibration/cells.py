"""One cell of the study: a kind of home, its bills and how they err."""

from __future__ import annotations

import zlib
from dataclasses import asdict, dataclass

from normalize.fitting.fit import CHOICE

FORMS = ("flat", "line", "heating", "cooling", "two slopes", "heating and cooling")
TYPICAL_DAYS = {"monthly": 30.5, "two-monthly": 61.0, "daily": 1.0}


@dataclass(frozen=True, slots=True)
class Cell:
    """What a cell's homes have in common.

    form : the true one.  bills : a side, before folding (days a side where they are daily).
    rho : lag-1 correlation of neighbouring bills' errors.  noise : standard deviation of an
    error of a bill of ordinary length, as a share of mean use.  schedule : "monthly",
    "two-monthly", "delivered" or "daily".  a_year : deliveries a year.  tails : "normal",
    "t3" or "outliers".  spread : how errors scale: "days" (an average of independent days),
    "equal" (whatever the length) or "use" (in proportion to expected use).
    pattern : daily errors beyond the autoregression: "", "weekly" or "slow".
    folded : one bill in six is an estimate, joined to the next.  offer : forms offered to the
    choice: "all" (the default four), "heat" (a heating fuel's two) or "asked" (flat and the
    true form, as a site file may ask).
    """

    form: str
    bills: int
    rho: float = 0.0
    noise: float = 0.10
    schedule: str = "monthly"
    a_year: int = 0
    climate: str = "temperate"
    tails: str = "normal"
    spread: str = "days"
    pattern: str = ""
    folded: bool = False
    offer: str = "all"

    @property
    def seed(self) -> int:
        """A seed of the cell's own, from what it is; not from where it stands in a list.

        >>> Cell("flat", 12).seed == Cell("flat", 12).seed != Cell("flat", 24).seed
        True
        """
        return zlib.crc32(repr(sorted(asdict(self).items())).encode())

    @property
    def offered(self) -> tuple[str, ...]:
        """Names of the forms offered to the choice."""
        if self.offer == "asked":
            return ("flat", self.form)
        return ("flat", "heating") if self.offer == "heat" else CHOICE

    @property
    def typical_days(self) -> float:
        """Days of an ordinary bill."""
        return 365.0 / self.a_year if self.schedule == "delivered" else TYPICAL_DAYS[self.schedule]
