"""Will it show?  The smallest saving that so many more bills could tell from no change.

Asked of the baseline alone, before anything is known of the time after the work: the noise of
its bills, their serial correlation (integrated over, as in every range of this program) and
the weather of the months to come, taken from the long-term years (docs/method.md §7).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from normalize.defaults import (
    CONFIDENCE,
    MIN_COLD_PERIODS,
    MIN_DAYS_A_SIDE,
    MIN_MILD_PERIODS,
    SPARE_PERIODS,
)
from normalize.fitting import forms as f
from normalize.fitting.align import Aligned
from normalize.fitting.correlation import positions, through_rho, weights_of
from normalize.fitting.mixture import difference_range_with, mixture_range_with
from normalize.fitting.results import Fit
from normalize.fitting.rho import RHO
from normalize.fitting.spread import through_errors
from normalize.fitting.student import no_tables
from normalize.savings.evidence import MIDDLE_F, days_of, jacobian_of
from normalize.weather.year import LongTermYear

EVEN: Final = 0.5  # "even odds"
LIKELY: Final = 0.8  # "four times in five"
GROUP: Final = 3  # neighbouring values of ρ that are taken for true together
LEAST: Final = 1e-3  # weight of such a group, below which it is left out
COUNTS: Final = tuple(range(3, 37))  # bills more that are looked at


@dataclass(frozen=True, slots=True)
class Smallest:
    """The smallest saving that would show at even odds, and four times in five.

    even, likely : in the account's unit; of a normal year, or over the bills.  over : what
    their fractions are of, the same unit.
    """

    even: float
    likely: float
    over: float

    @property
    def even_fraction(self) -> float:
        """``even`` as a share of use without the work."""
        return self.even / self.over if self.over > 0.0 else float("inf")

    @property
    def likely_fraction(self) -> float:
        """``likely`` as a share of use without the work."""
        return self.likely / self.over if self.over > 0.0 else float("inf")


@dataclass(frozen=True, slots=True)
class Prospect:
    """What so many bills after the work could tell.

    until : the day after the last of them.  normalized : None with its reason in
    ``unavailable`` while a normal year cannot be formed.
    """

    bills: int
    until: int
    avoided: Smallest
    normalized: Smallest | None
    unavailable: str = ""


@dataclass(frozen=True, slots=True)
class Baseline:
    """A baseline's fit as a straight line about its solution, seen through every correlation.

    jac (n, k); resid, fitted (n,) use a day; lengths (n,) days; start, end (n,) day numbers.
    """

    fit: Fit
    held: bool
    lengths: NDArray[np.float64]
    jac: NDArray[np.float64]
    resid: NDArray[np.float64]
    fitted: NDArray[np.float64]
    start: NDArray[np.float64]
    end: NDArray[np.float64]

    @classmethod
    def of(cls, aligned: Aligned, mine: NDArray[np.intp], fit: Fit, *, held: bool) -> Baseline:
        """The baseline of the chosen periods.  held : its balance temperature was held."""
        days, owner = days_of(aligned, mine)
        lengths = aligned.days[mine].astype(np.float64)
        fitted = np.bincount(owner, fit.predict(days), lengths.shape[0]) / lengths
        start, end = (x[mine].astype(np.float64) for x in (aligned.start, aligned.end))
        return cls(
            fit=fit,
            held=held,
            lengths=lengths,
            jac=jacobian_of(fit, days, owner, lengths, with_tau=not held),
            resid=aligned.use[mine] / lengths - fitted,
            fitted=fitted,
            start=start,
            end=end,
        )

    @property
    def spare(self) -> int:
        """Degrees of freedom: bills less columns."""
        return int(self.jac.shape[0] - self.jac.shape[1])


@dataclass(frozen=True, slots=True)
class Ahead:
    """Bills to come, with their weather as the long-term years had it.

    first : day number of the first; length : days of each.  temp_f (years, days) °F of the
    same days of the year in every one of those years; NaN where a record has none.
    """

    first: int
    length: int
    temp_f: NDArray[np.float64]
    years: tuple[int, ...]


def prospects(
    baseline: Baseline,
    ahead: Ahead,
    year: LongTermYear | None,
    *,
    confidence: float = CONFIDENCE,
    counts: Sequence[int] = COUNTS,
) -> tuple[Prospect, ...]:
    """The smallest saving that shows, for every count of bills after the work.

    A saving shows when the default range excludes zero.  With X the error of a saving and q
    its quantiles, the range excludes zero in a share p of cases when the saving is
    q_p − q_tail: the 5 % quantile is the range's reach at 90 %, q_p the luck allowed for.
    """
    use, jac = _ahead(baseline.fit, ahead, held=baseline.held)
    gradient = np.zeros(baseline.jac.shape[1])
    if year is not None:
        gradient = _gradient(baseline.fit, year, held=baseline.held)
    tables = no_tables()
    out = []
    for n in counts:
        seen = _Seen.of(baseline, ahead, gradient, jac[:n], use[:n], tables)
        lacking = "" if year is not None else "there is no long-term year"
        lacking = lacking or _lacks(baseline, ahead, n)
        normalized = None
        if not lacking and year is not None:
            normalized = _normalized(
                seen, jac[:n], gradient, baseline.fit.nac(year), ahead, confidence
            )
        out.append(
            Prospect(
                bills=n,
                until=ahead.first + n * ahead.length,
                avoided=_avoided(seen, float(ahead.length * use[:n].sum()), confidence),
                normalized=normalized,
                unavailable=lacking,
            )
        )
    return tuple(out)


@dataclass(frozen=True, slots=True)
class _Seen:
    """The baseline through every ρ, as a range sees it.

    shift, scale2 (27, 2) of NAC and of use over the bills to come, their own noise included;
    innovation (27,) variance of what is new in each bill's error; tables of the t
    distribution, made once for all calls.
    """

    like: NDArray[np.float64]
    weight: NDArray[np.float64]
    shift: NDArray[np.float64]
    scale2: NDArray[np.float64]
    innovation: NDArray[np.float64]
    spare: int
    mean_days: float
    tables: tuple[NDArray[np.float64], ...]

    @classmethod
    def of(
        cls,
        baseline: Baseline,
        ahead: Ahead,
        gradient: NDArray[np.float64],
        jac: NDArray[np.float64],
        use: NDArray[np.float64],
        tables: tuple[NDArray[np.float64], ...],
    ) -> _Seen:
        """jac (n, k), use (n,) : of the bills to come."""
        target = np.stack([gradient, ahead.length * jac.sum(axis=0)])
        n, w = jac.shape[0], baseline.lengths
        start = ahead.first + ahead.length * np.arange(n, dtype=np.float64)
        days = np.full(n, float(ahead.length))
        none, no_days = np.empty(0), np.empty(0, dtype=np.int32)
        side = (none, no_days, baseline.resid, w, w, baseline.start, baseline.end)
        rep = (none, no_days, none, days, days, start, start + days)
        like, shift, scale2, _ = through_errors(
            baseline.jac, baseline.resid, baseline.fitted, side, target, rep, use
        )
        place = positions(baseline.start, baseline.end)
        innovation = through_rho(baseline.jac, baseline.resid, w, place, target)[3]
        return cls(
            like=like,
            weight=weights_of(like),
            shift=shift,
            scale2=scale2,
            innovation=innovation,
            spare=baseline.spare,
            mean_days=float(w.mean()),
            tables=tables,
        )

    def column(self, which: int) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """(shift, scale²) of NAC (0) or of use over the bills to come (1)."""
        shift, scale2 = (np.ascontiguousarray(x[:, which]) for x in (self.shift, self.scale2))
        return shift, scale2


def _avoided(seen: _Seen, over: float, confidence: float) -> Smallest:
    """From the baseline alone, as the range of avoided use is."""
    shift, scale2 = seen.column(1)

    def quantiles(level: float) -> tuple[float, float]:
        low, high = mixture_range_with(
            seen.weight, shift, np.sqrt(scale2), seen.spare, level, seen.tables
        )
        return float(low), float(high)

    low = quantiles(confidence)[0]
    return Smallest(quantiles(0.0)[1] - low, quantiles(2.0 * LIKELY - 1.0)[1] - low, over)


def _normalized(
    seen: _Seen,
    jac: NDArray[np.float64],
    gradient: NDArray[np.float64],
    nac: float,
    ahead: Ahead,
    confidence: float,
) -> Smallest:
    """A like fit after the work, with the baseline's noise; ρ shared by both sides.

    The bills to come will say more about ρ.  So each ρ that the baseline leaves plausible is
    taken for true in turn: what the likelihood will then be on average, how far the range
    will reach, and how the error of the saving spreads.
    """
    later = _Later.of(jac, gradient)
    n, k = jac.shape
    # Rows are scaled by √(days ÷ mean days) on each side, so noise a day carries over by days.
    ratio = seen.mean_days / ahead.length
    shift, before2 = seen.column(0)
    weight, centre, scale = [], [], []
    for true, share in _groups(seen.weight):
        trace = later.trace(true)
        noise = trace / (n - k)
        joint = weights_of(seen.like + later.level - 0.5 * (n - k) * np.log(trace))
        sure = seen.innovation[true] * ratio
        low, _ = difference_range_with(
            joint, shift, np.sqrt(before2), seen.spare,
            np.zeros(RHO.shape[0]), np.sqrt(later.unit2 * noise * sure), n - k, confidence,
            seen.tables,
        )  # fmt: skip
        weight.append(share)
        centre.append(shift[true] - low)
        scale.append(np.sqrt(before2[true] + later.unit2[true] * sure))
    mixture = np.array(weight), np.array(centre), np.array(scale)
    even = mixture_range_with(*mixture, seen.spare, 0.0, seen.tables)[1]
    likely = mixture_range_with(*mixture, seen.spare, 2.0 * LIKELY - 1.0, seen.tables)[1]
    return Smallest(float(even), float(likely), nac)


def _groups(weight: NDArray[np.float64]) -> list[tuple[int, float]]:
    """The grid of ρ in threes: (the heaviest of each, the weight of all), what matters of it."""
    out = []
    for first in range(0, RHO.shape[0], GROUP):
        part = weight[first : first + GROUP]
        if part.sum() > LEAST:
            out.append((first + int(part.argmax()), float(part.sum())))
    total = sum(share for _, share in out)
    return [(true, share / total) for true, share in out]


@dataclass(frozen=True, slots=True)
class _Later:
    """A like fit of bills to come, at every ρ, in units of the innovation variance.

    unit2 (27,) variance of the gradient's quantity; level (27,) the restricted likelihood
    without its residuals; vx (27, n, k) V⁻¹X and m (27, k, k) (X'V⁻¹X)⁻¹.
    """

    unit2: NDArray[np.float64]
    level: NDArray[np.float64]
    vx: NDArray[np.float64]
    m: NDArray[np.float64]

    @classmethod
    def of(cls, jac: NDArray[np.float64], gradient: NDArray[np.float64]) -> _Later:
        """Of bills one after another, alike in length: V of a first-order autoregression."""
        size = np.sqrt((jac * jac).sum(axis=0))
        x, g = jac / size, gradient / size
        rho = RHO[:, None, None]
        vx = (1.0 + rho * rho) * x
        vx[:, [0, -1]] = x[[0, -1]]
        vx[:, 1:] -= rho * x[:-1]
        vx[:, :-1] -= rho * x[1:]
        m = np.linalg.inv(x.T @ vx)
        level = 0.5 * np.log(1.0 - RHO * RHO) + 0.5 * np.linalg.slogdet(m)[1]
        return cls(np.einsum("i,rij,j->r", g, m, g), level, vx, m)

    def trace(self, true: int) -> NDArray[np.float64]:
        """(27,) expected residual sum of squares at each ρ when RHO[true] holds: tr(M_ρ V*)."""
        n = self.vx.shape[1]
        star = float(RHO[true])
        apart = np.abs(np.subtract.outer(np.arange(n), np.arange(n)))
        v = star**apart / (1.0 - star * star)
        whole = (2.0 + (n - 2) * (1.0 + RHO * RHO)) * v[0, 0] - 2.0 * (n - 1) * RHO * v[0, 1]
        taken = np.einsum("rij,rji->r", self.m, np.swapaxes(self.vx, 1, 2) @ (v @ self.vx))
        return np.asarray(whole - taken)


def _lacks(baseline: Baseline, ahead: Ahead, n: int) -> str:
    """Why so many bills would not make a normal year; the rules are those of an answer."""
    form = f.form_named(baseline.fit.form)
    needed = form.parameters + SPARE_PERIODS
    if n < needed:
        return f"a normal year needs {needed} bills"
    if n * ahead.length < MIN_DAYS_A_SIDE:
        return f"a normal year needs {MIN_DAYS_A_SIDE} days of bills"
    fit = baseline.fit
    for tau, warm in ((fit.balance_heating_f, False), (fit.balance_cooling_f, True)):
        if tau is None:
            continue
        days = ahead.temp_f[:, : n * ahead.length]
        beyond = days > tau if warm else days < tau
        share = beyond.reshape(days.shape[0], n, ahead.length).mean(axis=2)  # (years, bills)
        cold, mild = (share > 0.5).sum(axis=1), (share < 0.5).sum(axis=1)
        spans = (cold >= MIN_COLD_PERIODS) & (mild >= MIN_MILD_PERIODS)
        if spans.mean() < 0.5:
            return "in most years these bills would not span enough cold and mild weather"
    return ""


def _ahead(
    fit: Fit, ahead: Ahead, *, held: bool
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Expected use a day of every bill to come and (bills, k) derivatives, means over the years."""
    parts = []
    for temp in ahead.temp_f:
        n = temp.shape[0] // ahead.length
        known = np.where(np.isnan(temp), np.nanmean(ahead.temp_f, axis=0), temp)
        days = known[: n * ahead.length]
        owner = np.repeat(np.arange(n), ahead.length)
        lengths = np.full(n, float(ahead.length))
        jac = jacobian_of(fit, days, owner, lengths, with_tau=not held)
        use = np.bincount(owner, fit.predict(days), n) / lengths
        parts.append((use, jac))
    return np.mean([p[0] for p in parts], axis=0), np.mean([p[1] for p in parts], axis=0)


def _gradient(fit: Fit, year: LongTermYear, *, held: bool) -> NDArray[np.float64]:
    """(k,) derivatives of NAC, in the order of ``jacobian_of``."""
    out, last = [365.0], []
    if fit.line_slope is not None:
        out.append(365.0 * (year.mean_f - MIDDLE_F))
    if fit.heating_slope is not None and fit.balance_heating_f is not None:
        out.append(year.heating(fit.balance_heating_f))
        last.append(fit.heating_slope * year.days_below(fit.balance_heating_f))
    if fit.cooling_slope is not None and fit.balance_cooling_f is not None:
        out.append(year.cooling(fit.balance_cooling_f))
        k = int(year.temp_f.searchsorted(fit.balance_cooling_f, side="right"))
        last.append(-fit.cooling_slope * float(year.cum_days[-1] - year.cum_days[k]))
    if fit.form == "two slopes":
        last = [last[0] + last[1]]
    return np.array(out + ([] if held else last))


def needed(
    found: Sequence[Prospect], hoped: float, *, odds: float, normalized: bool
) -> Prospect | None:
    """The first count of bills with which a hoped-for share of use would show; None if none."""
    for one in found:
        smallest = one.normalized if normalized else one.avoided
        if smallest is None:
            continue
        share = smallest.likely_fraction if odds == LIKELY else smallest.even_fraction
        if share <= hoped:
            return one
    return None
