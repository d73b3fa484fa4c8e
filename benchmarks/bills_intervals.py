"""Interval files: the whole reader against pandas.read_csv on the same file.

``python benchmarks/bills_intervals.py``.  The reader does everything: it finds the header,
settles dates and units, sums to local days, counts what is missing and repairs.
"""

from __future__ import annotations

import tempfile
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np

TRIALS = 3


def write_quarter_hours(file: Path, years: float, style: str) -> None:
    """An invented file of quarter hours from 2005-01-01 on, in one of two styles."""
    n = int(years * 365 * 96)
    stamps = np.datetime64("2005-01-01T00:00") + np.arange(n) * np.timedelta64(15, "m")
    use = np.round(np.random.default_rng(1).gamma(2.0, 0.2, n), 3)
    text = stamps.astype(str)
    if style == "iso":
        lines = [f"{t.replace('T', ' ')},{u}" for t, u in zip(text, use, strict=True)]
        head = "Timestamp,Usage (kWh)"
    else:
        lines = [
            f"{t[5:7]}/{t[8:10]}/{t[:4]},{t[11:]},{u},kWh,$0.05"
            for t, u in zip(text, use, strict=True)
        ]
        head = "Date,Start Time,Usage,Unit,Cost"
    file.write_text("\n".join([head, *lines]) + "\n")


def best(what: Callable[[], object]) -> float:
    """Seconds of the fastest of a few trials."""
    times = []
    for _ in range(TRIALS):
        begin = time.perf_counter()
        what()
        times.append(time.perf_counter() - begin)
    return min(times)


def measure() -> list[tuple[str, float, str]]:
    """(name, ratio, what): time of reading an interval file over that of pandas.read_csv."""
    import pandas as pd

    from normalize.bills.read import read_bills

    found = []
    with tempfile.TemporaryDirectory() as folder:
        for style, years in (("iso", 1), ("iso", 30), ("date and time apart", 20)):
            file = Path(folder) / "intervals.csv"
            write_quarter_hours(file, years, style)
            size = file.stat().st_size / 1e6
            read_bills(file)
            ours, theirs = best(lambda f=file: read_bills(f)), best(lambda f=file: pd.read_csv(f))
            what = f"read_bills {ours:.2f} s, pandas.read_csv {theirs:.2f} s"
            found.append((f"quarter hours, {style}, {size:.0f} MB", ours / theirs, what))
    return found


if __name__ == "__main__":
    for name, ratio, what in measure():
        print(f"{name}: {ratio:.2f} ({what})")
