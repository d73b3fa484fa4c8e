"""What a comparison is: estimates with their ranges, or the reason why there is none."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from normalize.fitting.results import Fit


@dataclass(frozen=True, slots=True)
class Estimate:
    """One number with its range, or the reason why it is not known.

    value, low, high : in the account's unit; positive is a reduction, negative an increase.
    fraction… : of NAC before (normalized) or of the predicted use (avoided).
    plain_low, plain_high : the range if bills erred independently (delta method, ρ = 0).
    confidence : two-sided, e.g. 0.90.  method : how the range was made, in words.
    unavailable : None, or why there is no value, in words a homeowner can follow.
    known_from : day number from which it will be known if bills go on, or None.
    so_far : true for avoided use over less than twelve months.
    """

    value: float | None = None
    low: float | None = None
    high: float | None = None
    fraction: float | None = None
    fraction_low: float | None = None
    fraction_high: float | None = None
    plain_low: float | None = None
    plain_high: float | None = None
    confidence: float = 0.90
    method: str = ""
    unavailable: str | None = None
    known_from: int | None = None
    so_far: bool = False

    @property
    def available(self) -> bool:
        """Whether there is a value."""
        return self.unavailable is None

    @property
    def verdict(self) -> str:
        """One of "reduction", "increase", "cannot tell" and "unavailable"."""
        if self.low is None or self.high is None:
            return "unavailable"
        if self.low > 0.0:
            return "reduction"
        if self.high < 0.0:
            return "increase"
        return "cannot tell"

    @classmethod
    def none(
        cls, reason: str, *, known_from: int | None = None, confidence: float = 0.90
    ) -> Estimate:
        """No value, with its reason."""
        return cls(unavailable=reason, known_from=known_from, confidence=confidence)


@dataclass(frozen=True, slots=True)
class Savings:
    """Before against after, for one account.

    before, after : the fits chosen, or None with the reason in ``before_unavailable`` /
        ``after_unavailable``.
    nac_before, nac_after : Estimate of NAC itself (value and range; fractions unused).
    normalized : NAC before − NAC after.
    avoided : baseline fit at the reporting period's weather − actual use.
    predicted_use, actual_use : the two terms of avoided use.
    reporting_days : days over which use was avoided.
    """

    before: Fit | None
    after: Fit | None
    nac_before: Estimate
    nac_after: Estimate
    normalized: Estimate
    avoided: Estimate
    before_unavailable: str = ""
    after_unavailable: str = ""
    predicted_use: float | None = None
    actual_use: float | None = None
    reporting_days: int = 0
    same_form: tuple[tuple[str, Estimate], ...] = ()


@dataclass(frozen=True, slots=True)
class Price:
    """What the last unit costs. per_unit in the site's currency per account unit.

    source : "site file", "the bills' cost with the fixed charge taken out", …;
    unavailable : why there is none, or None.
    """

    per_unit: float | None
    source: str
    unavailable: str | None = None


@dataclass(frozen=True, slots=True)
class Amount:
    """A total over accounts, with the range if fuels err independently and the worst case.

    missing : accounts without an answer, which the total does not contain.
    """

    value: float | None = None
    low: float | None = None
    high: float | None = None
    worst_low: float | None = None
    worst_high: float | None = None
    missing: tuple[str, ...] = ()
    unavailable: str | None = None


@dataclass(frozen=True, slots=True)
class Total:
    """One kind of savings (normalized or avoided) over all accounts of a site."""

    energy_mmbtu: Amount
    cost: Amount
    co2_kg: Amount


@dataclass(frozen=True, slots=True)
class Check:
    """One check against a published or customary limit, with its meaning in words.

    value, limit : numbers as they are compared; meets : None when it does not apply.
    means : what the outcome means; do : what to do if it is not met.
    source : guideline with its edition, or "common practice, no source"; "(memory)" kept.
    """

    name: str
    side: str
    value: float | None
    limit: float | None
    meets: bool | None
    means: str
    do: str
    source: str
