"""Interval files: the whole reader against pandas.read_csv on the same file.

``python -m benchmarks.bills_intervals``.  The reader does everything: it finds the header,
settles dates and units, sums to local days, counts what is missing and repairs; pandas splits
the lines and leaves dates as text.  Both are timed in turn, and the best of each is compared, for
other work on the machine only ever adds time.  ESPI XML has no peer here: its time is given
against a bare run of the C parser of the standard library over the same bytes.
"""

from __future__ import annotations

import tempfile
import time
from collections.abc import Callable
from functools import partial
from pathlib import Path
from typing import Any

import numpy as np

TRIALS = 9
STYLES = {
    "ISO stamps": ("Timestamp,Usage (kWh)", ",", "."),
    "date and time apart": ("Date,Start Time,Usage,Unit,Cost", ",", "."),
    "ISO with offset": ("Interval start,kWh", ",", "."),
    "m/d/Y with AM and PM": ("Date/Time,kWh", ",", "."),
    "decimal comma": ("Timestamp;kWh", ";", ","),
    "wide, a line for each day": ("", ",", "."),
}


def write_quarter_hours(file: Path, years: float, style: str) -> None:
    """An invented file of quarter hours from 2005-01-01 on, in one of the styles."""
    n = int(years * 365) * 96
    stamps = np.datetime64("2005-01-01T00:00") + np.arange(n) * np.timedelta64(15, "m")
    use = np.round(np.random.default_rng(1).gamma(2.0, 0.2, n), 3)
    head = STYLES[style][0]
    pairs = zip(stamps.astype(str).tolist(), use.tolist(), strict=True)
    if style == "ISO stamps":
        lines = [f"{t.replace('T', ' ')},{u}" for t, u in pairs]
    elif style == "date and time apart":
        lines = [f"{t[5:7]}/{t[8:10]}/{t[:4]},{t[11:]},{u},kWh,$0.05" for t, u in pairs]
    elif style == "ISO with offset":
        lines = [f"{t}:00-05:00,{u}" for t, u in pairs]
    elif style == "m/d/Y with AM and PM":
        lines = [
            f"{t[5:7]}/{t[8:10]}/{t[:4]} {int(t[11:13]) % 12 or 12}:{t[14:]} "
            f"{'AM' if t[11:13] < '12' else 'PM'},{u}"
            for t, u in pairs
        ]
    elif style == "decimal comma":
        lines = [f"{t[8:10]}.{t[5:7]}.{t[:4]} {t[11:]};{u}".replace(".", ",", -1) for t, u in pairs]
        lines = [line.replace(",", ".", 2) for line in lines]
    else:
        clocks = [f"kWh {h}:{m:02}" for h in range(24) for m in (0, 15, 30, 45)]
        head = ",".join(["Date", *clocks])
        days = np.datetime64("2005-01-01") + np.arange(n // 96)
        rows = use.reshape(-1, 96).tolist()
        lines = [
            f"{d},{','.join(map(str, row))}"
            for d, row in zip(days.astype(str).tolist(), rows, strict=True)
        ]
    file.write_text("\n".join([head, *lines]) + "\n")


def write_espi(file: Path, readings: int) -> None:
    """An invented ESPI file of quarter hours, a block for each day."""
    begin = 1_262_322_000  # 2010-01-01 in New York
    parts = [
        '<feed xmlns="http://www.w3.org/2005/Atom"><entry><content><LocalTimeParameters '
        'xmlns="http://naesb.org/espi"><dstEndRule>B40E2000</dstEndRule><dstOffset>3600'
        "</dstOffset><dstStartRule>360E2000</dstStartRule><tzOffset>-18000</tzOffset>"
        "</LocalTimeParameters></content></entry><entry><content><ReadingType "
        'xmlns="http://naesb.org/espi"><accumulationBehaviour>4</accumulationBehaviour><commodity>'
        "1</commodity><uom>72</uom></ReadingType></content></entry>"
    ]
    for day in range(0, readings, 96):
        parts.append('<entry><content><IntervalBlock xmlns="http://naesb.org/espi">')
        parts += [
            f"<IntervalReading><cost>12</cost><ReadingQuality><quality>17</quality>"
            f"</ReadingQuality><timePeriod><duration>900</duration><start>{begin + 900 * k}</start>"
            f"</timePeriod><value>{100 + k % 7}</value></IntervalReading>\n"
            for k in range(day, min(day + 96, readings))
        ]
        parts.append("</IntervalBlock></content></entry>")
    file.write_text("".join([*parts, "</feed>"]))


def best(whats: list[Callable[[], object]], trials: int = TRIALS) -> list[float]:
    """Seconds of the fastest trial of each, taken in turn."""
    times = [[0.0] * trials for _ in whats]
    for trial in range(trials):
        for k, what in enumerate(whats):
            begin = time.perf_counter()
            what()
            times[k][trial] = time.perf_counter() - begin
    return [min(t) for t in times]


def measure() -> list[tuple[str, float, str]]:
    """(name, ratio, what): time of reading an interval file over that of its peer."""
    import pandas as pd

    from normalize.bills.read import read_bills

    found = []
    with tempfile.TemporaryDirectory() as folder:
        for style in STYLES:
            file = Path(folder) / "intervals.csv"
            write_quarter_hours(file, 20, style)
            head, delimiter, decimal = STYLES[style]
            size = file.stat().st_size / 1e6
            options: dict[str, Any] = {"fuel": "electricity"} if not head else {}
            read_bills(file, **options)
            peer = partial(pd.read_csv, file, sep=delimiter, decimal=decimal)
            ours, theirs = best([partial(read_bills, file, **options), peer])
            what = f"read_bills {ours:.2f} s, pandas.read_csv {theirs:.2f} s; at most 3"
            found.append((f"quarter hours, {style}, {size:.0f} MB", ours / theirs, what))
        found.append(_espi(Path(folder)))
    return found


def _espi(folder: Path) -> tuple[str, float, str]:
    from xml.parsers import expat

    from normalize.bills.read import read_bills

    file = folder / "espi.xml"
    write_espi(file, 100_000)
    ours, theirs = best(
        [lambda: read_bills(file), lambda: expat.ParserCreate().Parse(file.read_bytes(), True)], 3
    )
    what = f"read_bills {ours:.2f} s, a bare pass of expat {theirs:.2f} s; lower is better"
    return "100,000 readings of ESPI XML", ours / theirs, what


if __name__ == "__main__":
    for name, ratio, what in measure():
        print(f"{name}: {ratio:.2f} ({what})")
