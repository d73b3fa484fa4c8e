"""Faults of every kind, put into clean histories: does the truth stay inside its range as often?

``python -m tests.prove.bills_faults [homes]`` prints tables for docs/evidence-bills.md.  Each
faulty history is written as a file, read, repaired and compared like any user's; the same homes
without faults stand beside them.  Own invented homes and weather.
"""

from __future__ import annotations

import platform
import sys
import tempfile
import time
from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np

from normalize.bills import rules
from normalize.bills.flags import flag_batch
from normalize.bills.periods import Bills
from normalize.bills.read import read_bills
from normalize.days import day_of_iso, iso
from normalize.errors import NormalizeError
from normalize.savings.compare import measure_savings
from normalize.weather.temperature import DailyTemperature
from normalize.weather.year import LongTermYear, long_term_year

NOISE = 0.08  # of each bill, lognormal with mean one
FIRST = day_of_iso("2010-01-01")
BEGIN = day_of_iso("2019-01-04")
WORK = (day_of_iso("2021-01-10"), day_of_iso("2021-01-20"))
Lines = list[list[object]]
Outcome = tuple[bool, float] | None
Outcomes = list[Outcome]


@dataclass(frozen=True)
class Home:
    """Clean bills [start, end, use, estimated] and the true NAC before the work."""

    lines: Lines
    truth: float


def weather_of(rng: np.random.Generator) -> DailyTemperature:
    """Fourteen years of invented days: a season and weather that lasts some days."""
    n = 14 * 365
    noise = np.zeros(n)
    shocks = rng.normal(0.0, 5.0, n)
    for t in range(1, n):
        noise[t] = 0.7 * noise[t - 1] + shocks[t]
    season = 52.0 - 22.0 * np.cos(2 * np.pi * (np.arange(n) - 20) / 365.25)
    return DailyTemperature("invented", FIRST, season + noise, np.zeros(n, bool))


def home_of(rng: np.random.Generator, weather: DailyTemperature, year: LongTermYear) -> Home:
    """A gas home: some base load, a slope, a balance temperature; the work takes a fifth off."""
    base, slope = rng.uniform(0.3, 1.0), rng.uniform(0.08, 0.2)
    tau = rng.uniform(57.0, 65.0)
    lines: Lines = []
    day = BEGIN
    while day < day_of_iso("2023-01-20"):
        end = day + int(rng.integers(28, 34))
        temp = weather.temp_f[day - FIRST : end - FIRST]
        use = (base + slope * np.maximum(0.0, tau - temp)).sum()
        use *= 0.8 if day >= WORK[0] else 1.0
        use *= np.exp(rng.normal(0.0, NOISE) - NOISE**2 / 2)
        lines.append([day, end, round(float(use), 1), "A"])
        day = end
    days = np.asarray(year.temp_f)
    heat = np.sum(np.asarray(year.weight) * np.maximum(0.0, tau - days))
    total = float(np.asarray(year.weight).sum())
    return Home(lines, float(base * total + slope * heat))


def estimated(rng: np.random.Generator, lines: Lines) -> Lines:
    """A fifth of the readings are guesses, 15 % off, marked; the error comes back in the next."""
    for k in np.flatnonzero(rng.random(len(lines) - 1) < 0.2):
        error = round(float(lines[k][2]) * rng.normal(0.0, 0.15), 1)  # type: ignore[arg-type]
        lines[k][2] = round(lines[k][2] + error, 1)  # type: ignore[operator]
        lines[k + 1][2] = round(lines[k + 1][2] - error, 1)  # type: ignore[operator]
        lines[k][3] = "E"
    return lines


def unmarked(rng: np.random.Generator, lines: Lines) -> Lines:
    """The same guesses without their mark."""
    return [[*line[:3], "A"] for line in estimated(rng, lines)]


def _some(rng: np.random.Generator, lines: Lines, share: float) -> list[int]:
    return [int(k) for k in np.flatnonzero(rng.random(len(lines)) < share)[::-1]]


def doubled(rng: np.random.Generator, lines: Lines) -> Lines:
    """A tenth of the bills are there twice."""
    for k in _some(rng, lines, 0.1):
        lines.insert(k + 1, list(lines[k]))
    return lines


def rebilled(rng: np.random.Generator, lines: Lines) -> Lines:
    """A tenth of the bills were wrong by half, cancelled and billed again."""
    for k in _some(rng, lines, 0.1):
        start, end, use, mark = lines[k]
        wrong = round(1.5 * use, 1)  # type: ignore[operator]
        lines[k : k + 1] = [
            [start, end, wrong, mark], [start, end, -wrong, mark], [start, end, use, mark],
        ]  # fmt: skip
    return lines


def overlapping(rng: np.random.Generator, lines: Lines) -> Lines:
    """A tenth of the bills claim to start two days before the one before them ended."""
    for k in _some(rng, lines, 0.1):
        lines[k][0] = lines[k][0] - 2  # type: ignore[operator]
    return lines


def missing(rng: np.random.Generator, lines: Lines) -> Lines:
    """A tenth of the bills are missing."""
    for k in _some(rng, lines, 0.1):
        del lines[k]
    return lines


def stubs(rng: np.random.Generator, lines: Lines) -> Lines:
    """A tenth of the bills are split three days before their end, by days."""
    for k in _some(rng, lines, 0.1):
        start, end, use, mark = lines[k]
        part = round(use * 3 / (end - start), 1)  # type: ignore[operator]
        lines[k : k + 1] = [
            [start, end - 3, round(use - part, 1), mark],  # type: ignore[operator]
            [end - 3, end, part, mark],  # type: ignore[operator]
        ]
    return lines


def trailing(rng: np.random.Generator, lines: Lines) -> Lines:
    """The record ends on two guesses."""
    for k in (-1, -2):
        lines[k][2] = round(lines[k][2] * rng.uniform(0.5, 1.5), 1)  # type: ignore[operator]
        lines[k][3] = "E"
    return lines


def subtotals(rng: np.random.Generator, lines: Lines) -> Lines:
    """A line of each year's total stands among the bills."""
    for k in (24, 12):
        year = lines[k - 12 : k]
        total = round(sum(float(str(line[2])) for line in year), 1)
        lines.insert(k, [year[0][0], year[-1][1], total, "A"])
    return lines


def newest_first(rng: np.random.Generator, lines: Lines) -> Lines:
    """Newest bill first."""
    return lines[::-1]


def everything(rng: np.random.Generator, lines: Lines) -> Lines:
    """All of the above that can be repaired."""
    for fault in (estimated, stubs, rebilled, doubled, missing, newest_first):
        lines = fault(rng, lines)
    return lines


def times_ten(rng: np.random.Generator, lines: Lines) -> Lines:
    """One bill before the work has a multiplier of ten too many: flagged, not repaired."""
    lines[7][2] = round(10 * lines[7][2], 1)  # type: ignore[operator]
    return lines


FAULTS: dict[str, Callable[[np.random.Generator, Lines], Lines]] = {
    "none": lambda _, lines: lines,
    "estimates, marked": estimated,
    "estimates at the end": trailing,
    "bills twice": doubled,
    "cancelled and billed again": rebilled,
    "overlaps of two days": overlapping,
    "bills missing": missing,
    "bills split in two": stubs,
    "yearly totals among the bills": subtotals,
    "newest first": newest_first,
    "six kinds at once": everything,
    "estimates, not marked (flagged at best)": unmarked,
    "one bill times ten (flagged, not repaired)": times_ten,
}


def as_csv(lines: Lines) -> str:
    """A file with these bills."""
    body = [f"{iso(a)},{iso(b)},{use},{mark}" for a, b, use, mark in lines]  # type: ignore[arg-type]
    return "\n".join(["Start,End,Therms,A/E", *body]) + "\n"


def as_register(lines: Lines, rng: np.random.Generator) -> str:
    """The same use as readings of a register that passes 9999.9 once or more."""
    at = float(rng.uniform(8000.0, 9800.0))
    body = [f"{iso(lines[0][0])},{at:.1f}"]  # type: ignore[arg-type]
    for line in lines:
        at = (at + float(line[2])) % 10_000.0  # type: ignore[arg-type]
        body.append(f"{iso(line[1])},{at:.1f}")  # type: ignore[arg-type]
    return "\n".join(["Read date,Meter reading (therms)", *body]) + "\n"


def prove(homes: int = 400) -> str:
    """The tables, as Markdown."""
    began, worked = time.perf_counter(), time.process_time()
    rng = np.random.default_rng(20261201)
    weather = weather_of(rng)
    year = long_term_year(weather, years=10)
    clean = [home_of(rng, weather, year) for _ in range(homes)]
    study = Study(clean, weather, year)
    lines = [
        "| fault | truth inside its range | less than without faults | unavailable, with a reason "
        "| mean NAC ÷ truth |",
        "| --- | --: | --: | --: | --: |",
    ]
    for name, fault in FAULTS.items():
        texts = [as_csv(fault(np.random.default_rng(k), [list(x) for x in h.lines]))
                 for k, h in enumerate(clean)]  # fmt: skip
        lines.append(study.row(name, texts))
    texts = [as_register(h.lines, np.random.default_rng(k)) for k, h in enumerate(clean)]
    lines.append(study.row("readings only, through rollover", texts))
    lines += ["", *_flags(clean)]
    took, cpu = time.perf_counter() - began, time.process_time() - worked
    version = f"Python {platform.python_version()}, numpy {np.__version__}"
    head = f"{homes} homes a row, {took:.0f} s, {cpu:.0f} s of them at work; {version}."
    return "\n".join([head, "", *lines])


@dataclass
class Study:
    """The homes, and what became of each without faults, to compare the same homes with."""

    clean: list[Home]
    weather: DailyTemperature
    year: LongTermYear
    without: Outcomes | None = None
    known: dict[tuple[int, bytes], Outcome] = field(default_factory=dict)

    def row(self, name: str, texts: list[str]) -> str:
        """One row of the table; the first one is that without faults."""
        found = self.outcomes(texts)
        self.without = self.without or found
        answered = [f for f in found if f is not None]
        n = max(1, len(answered))
        share = sum(inside for inside, _ in answered) / n
        error = np.sqrt(share * (1 - share) / n)
        # The same homes stand in both, so their difference is known better than either share.
        less = [float(a[0]) - float(b[0]) for a, b in zip(self.without, found, strict=True)
                if a is not None and b is not None]  # fmt: skip
        spread = float(np.std(less) / np.sqrt(max(1, len(less))))
        ratio = np.mean([r for _, r in answered])
        return (
            (
                f"| {name} | {share:.3f} ± {error:.3f} | {np.mean(less):+.3f} ± {spread:.3f} | "
                f"{len(found) - len(answered)} | {ratio:.4f} |"
            )
            .replace("+0.000", "0.000")
            .replace("-", "\u2212")
        )

    def outcomes(self, texts: list[str]) -> Outcomes:
        """Per home: whether the truth is inside, and NAC ÷ truth; None where unavailable."""
        found: Outcomes = []
        with tempfile.TemporaryDirectory() as folder:
            file = Path(folder) / "gas.csv"
            for k, text in enumerate(texts):
                file.write_text(text)
                try:
                    bills = read_bills(file, fuel="natural gas")
                except NormalizeError:
                    found.append(None)
                    continue
                p = bills.periods
                same = (k, p.start.tobytes() + p.end.tobytes() + np.round(p.use, 6).tobytes())
                if same not in self.known:  # a repair that gives the clean periods back is the same
                    self.known[same] = self.outcome(bills, self.clean[k])
                found.append(self.known[same])
        return found

    def outcome(self, bills: Bills, home: Home) -> Outcome:
        """One home's NAC before the work, beside the truth."""
        saved = measure_savings(bills, self.weather, upgrade=WORK, long_term=self.year)
        found = saved.nac_before
        if found.value is None or found.low is None or found.high is None:
            return None
        return found.low <= home.truth <= found.high, found.value / home.truth


def _flags(clean: list[Home]) -> list[str]:
    """How often the flags speak: where they should, and where they should not."""
    out = ["| history | any flag | alternating | multiplier | empty house |",
           "| --- | --: | --: | --: | --: |"]  # fmt: skip
    for name in ("none", "estimates, not marked (flagged at best)",
                 "one bill times ten (flagged, not repaired)"):  # fmt: skip
        shares = {"any": 0, "alternating": 0, "multiplier": 0, "empty house": 0}
        for k, home in enumerate(clean):
            lines = FAULTS[name](np.random.default_rng(k), [list(x) for x in home.lines])
            start, end, use = (np.array([line[j] for line in lines], float) for j in range(3))
            bits = int(np.bitwise_or.reduce(flag_batch(start, end, use, [0, len(lines)])))
            names = {rules.FLAGS[b][0] for b in rules.FLAGS if bits & b}
            shares["any"] += bool(names)
            for each in names & set(shares):
                shares[each] += 1
        total = len(clean)
        cells = " | ".join(f"{shares[c] / total:.3f}" for c in shares)
        out.append(f"| {name} | {cells} |")
    return out


if __name__ == "__main__":
    print(prove(int(sys.argv[1]) if len(sys.argv) > 1 else 400))
