"""Small makers of weather for the tests; every number is invented and seeded."""

from __future__ import annotations

from datetime import date, timedelta
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from normalize.days import day_of
from normalize.weather.temperature import DailyTemperature

SHARED = Path(__file__).resolve().parents[3] / "shared"


def seasons(first: date, last: date, seed: int = 1) -> NDArray[np.float64]:
    """Daily means of an invented place from first to last, both included. °F"""
    n = (last - first).days + 1
    noise = np.random.default_rng(seed).normal(0.0, 8.0, n)
    temp: NDArray[np.float64] = (
        50.0 - 25.0 * np.cos(2 * np.pi * (np.arange(n) - 20) / 365.25) + noise
    )
    return temp


def weather(first: date, temp_f: Any, **more: Any) -> DailyTemperature:
    """Daily temperature from a first date on."""
    temp = np.asarray(temp_f, dtype=np.float64)
    more.setdefault("filled", np.zeros(temp.size, dtype=np.bool_))
    return DailyTemperature(station="Harrow Valley", first_day=day_of(first), temp_f=temp, **more)


def years(first: int, last: int, seed: int = 1) -> DailyTemperature:
    """Whole calendar years of an invented place."""
    start = date(first, 1, 1)
    return weather(start, seasons(start, date(last, 12, 31), seed))


def daily_lines(first: date, temps: Any, pattern: str = "{day},{temp:.1f}") -> list[str]:
    """Rows of a daily table."""
    return [
        pattern.format(day=first + timedelta(days=i), temp=float(t)) for i, t in enumerate(temps)
    ]


def write(folder: Path, lines: list[str], name: str = "station.csv", codec: str = "utf-8") -> Path:
    """A text file of lines."""
    path = folder / name
    path.write_bytes(("\n".join(lines) + "\n").encode(codec))
    return path
