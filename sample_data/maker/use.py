"""Invented use of energy: what a building would use, and what its meter then says."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import asdict, dataclass
from datetime import date, timedelta
from itertools import pairwise

from maker.chance import Chance, persistent
from maker.station import LONG_TERM_YEARS, Station, days_between, days_of_year

CORRELATION = 0.3  # of one bill's departure with the next one's


@dataclass(frozen=True, slots=True)
class Behaviour:
    """How use answers to weather; per day and per °F·day, °F."""

    base_load: float
    heating_slope: float = 0.0
    balance_heating_f: float = 0.0
    cooling_slope: float = 0.0
    balance_cooling_f: float = 999.0

    def use(self, temp_f: float) -> float:
        """Use of a day of that mean temperature, before chance."""
        cold = max(self.balance_heating_f - temp_f, 0.0)
        hot = max(temp_f - self.balance_cooling_f, 0.0)
        return self.base_load + self.heating_slope * cold + self.cooling_slope * hot


@dataclass(frozen=True, slots=True)
class Account:
    """An account and its truth. work : first and last day of the work.

    driver : an amount a day that use answers to beside the weather; normal : its mean in a
    normal year, which the base loads belong to; each : use for one more, before and after.
    """

    station: Station
    fuel: str
    unit: str
    before: Behaviour
    after: Behaviour
    work: tuple[date, date]
    noise: float  # standard deviation of a bill, as a share of use
    driver: Callable[[date], float] | None = None
    normal: float = 0.0
    each: tuple[float, float] = (0.0, 0.0)

    def use(self, day: date) -> float:
        """Expected use of one day; while the work goes on it moves from before to after."""
        temp, (first, last) = self.station.mean_f(day), self.work
        done = ((day - first).days + 0.5) / ((last - first).days + 1)
        done = min(max(done, 0.0), 1.0)
        weather = (1.0 - done) * self.before.use(temp) + done * self.after.use(temp)
        if self.driver is None:
            return weather
        each = (1.0 - done) * self.each[0] + done * self.each[1]
        return weather + each * (self.driver(day) - self.normal)

    def expected(self, start: date, end: date) -> float:
        """Expected use of ``[start, end)``."""
        return sum(self.use(day) for day in days_between(start, end - timedelta(1)))

    def normal_year(self, behaviour: Behaviour) -> float:
        """Expected use of 365 days of the last ten whole years' weather."""
        temps = [self.station.mean_f(day) for year in LONG_TERM_YEARS for day in days_of_year(year)]
        return 365.0 * sum(behaviour.use(t) for t in temps) / len(temps)

    def truth(self) -> dict[str, object]:
        """What an analysis of the bills should find, within its range."""
        before, after = self.normal_year(self.before), self.normal_year(self.after)
        driver = (
            {}
            if self.driver is None
            else {"driver_each": list(self.each), "driver_normal_a_year": 365.0 * self.normal}
        )
        return {
            "fuel": self.fuel,
            "unit": self.unit,
            "station": self.station.name,
            "work_first_day": self.work[0].isoformat(),
            "work_last_day": self.work[1].isoformat(),
            "before": {**_shown(self.before), "nac": round(before, 3)},
            "after": {**_shown(self.after), "nac": round(after, 3)},
            "normalized": round(before - after, 3),
            "fraction": round((before - after) / before, 6),
            "bill_noise": self.noise,
            "bill_correlation": CORRELATION,
            **driver,
        }


def _shown(behaviour: Behaviour) -> dict[str, float | None]:
    shown: dict[str, float | None] = dict(asdict(behaviour))
    for slope, balance in (
        ("heating_slope", "balance_heating_f"),
        ("cooling_slope", "balance_cooling_f"),
    ):
        if shown[slope] == 0.0:
            shown[slope] = shown[balance] = None
    return shown


def metered(account: Account, reads: list[date], seed: str, decimals: int) -> list[float]:
    """Use between each reading and the next, chance included.

    Half of the chance is a share of the bill, half a share of an average bill, so that
    summer bills are neither exact nor as uncertain as winter's.
    """
    spans = list(pairwise(reads))
    expected = [account.expected(start, end) for start, end in spans]
    per_day = sum(expected) / (reads[-1] - reads[0]).days
    chance = persistent(Chance(seed), len(spans), CORRELATION)
    out = []
    for (start, end), use, luck in zip(spans, expected, chance, strict=True):
        scale = 0.5 * use + 0.5 * per_day * (end - start).days
        out.append(round(max(use + account.noise * luck * scale, 0.0), decimals))
    return out


def read_days(first: date, last: date, months: int, day: int, seed: str) -> list[date]:
    """A meter reader's working days, near the same day of every month or second month."""
    chance, out = Chance(seed), []
    year, month = first.year, first.month
    while (due := date(year, month, day)) <= last:
        when = due + timedelta(chance.between(-2, 2))
        when += timedelta({5: 2, 6: 1}.get(when.weekday(), 0))  # no readings at weekends
        out.append(when)
        year, month = year + (month + months - 1) // 12, (month + months - 1) % 12 + 1
    return out
