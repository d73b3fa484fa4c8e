"""Thirty years of one station's .dly and its long-term year, against pandas.read_fwf.

``python benchmarks/weather_read.py``.  Ours reads the flags, fills gaps and averages the years;
the peer only parses the same file into columns.
"""

from __future__ import annotations

import tempfile
import time
from calendar import monthrange
from collections.abc import Callable
from pathlib import Path

import numpy as np

TRIALS = 5
FIRST_YEAR, YEARS = 1994, 30
ELEMENTS = ("TMAX", "TMIN", "PRCP", "SNOW", "SNWD", "AWND")  # as an airport's file has


def write_station(file: Path) -> None:
    """An invented station's file as the archive lays it out, 269 characters a line."""
    rng = np.random.default_rng(1)
    lines = []
    for year in range(FIRST_YEAR, FIRST_YEAR + YEARS):
        for month in range(1, 13):
            middle = 100 - 130 * np.cos(2 * np.pi * (month - 0.5) / 12)
            days = monthrange(year, month)[1]
            mean = rng.normal(middle, 45, days)
            for element in ELEMENTS:
                shift = {"TMAX": 50, "TMIN": -50}.get(element, 0)
                values = np.round(mean + shift).astype(int).tolist() + [-9999] * (31 - days)
                cells = "".join(f"{v:5d}  W" if v != -9999 else "-9999   " for v in values)
                lines.append(f"USW00000001{year}{month:02d}{element}{cells}")
    file.write_text("\n".join(lines) + "\n")


def best(what: Callable[[], object]) -> float:
    """Seconds of the fastest of a few trials."""
    times = []
    for _ in range(TRIALS):
        begin = time.perf_counter()
        what()
        times.append(time.perf_counter() - begin)
    return min(times)


def measure() -> list[tuple[str, float, str]]:
    """(name, ratio, what): our time over that of pandas.read_fwf on the same file."""
    import pandas as pd

    from normalize.weather.read import read_weather
    from normalize.weather.year import long_term_year

    widths = [11, 4, 2, 4, *[5, 1, 1, 1] * 31]
    with tempfile.TemporaryDirectory() as folder:
        file = Path(folder) / "USW00000001.dly"
        write_station(file)
        ours = best(lambda: long_term_year(read_weather(file), years=YEARS).heating(60.0))
        theirs = best(lambda: pd.read_fwf(file, widths=widths, header=None))
    return [
        (
            "30 years of .dly and their long-term year",
            ours / theirs,
            f"x pandas.read_fwf of the same file, at most 1; ours {1000 * ours:.0f} ms, "
            f"theirs {1000 * theirs:.0f} ms",
        )
    ]


if __name__ == "__main__":
    for name, ratio, what in measure():
        print(f"{name}: {ratio:.3f} {what}")
