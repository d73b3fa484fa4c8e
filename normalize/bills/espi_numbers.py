"""Readings of ESPI series as arrays: scaled, signed, each once, and added up where they are parts.

What belongs here: arithmetic on readings.  Which series are the account's is decided in espi.py.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from itertools import pairwise
from typing import TYPE_CHECKING

import numpy as np

from normalize.bills import espi_codes as codes
from normalize.bills.espi_links import Series
from normalize.bills.espi_xml import Reading
from normalize.bills.periods import BillRow
from normalize.errors import UnreadableBills

if TYPE_CHECKING:
    from numpy.typing import NDArray

_SAME_START = 2  # more readings than this with one start are a fault of the file


@dataclass(frozen=True, slots=True)
class Numbers:
    """Readings as arrays; export already taken off."""

    start: NDArray[np.int64]
    seconds: NDArray[np.int64]
    use: NDArray[np.float64]
    cost: NDArray[np.float64]
    line: NDArray[np.int64]
    estimated: NDArray[np.int64]
    suspect: int
    untimed: int
    twice: int
    net: bool
    several: int  # series added up; 0 for one alone

    @classmethod
    def of(cls, chosen: Sequence[Series], exports: Sequence[Series], factor: float, name: str
           ) -> Numbers:  # fmt: skip
        signed = [(r, s, 1.0) for s in chosen for r in _as_use(s)]
        signed += [(r, s, -1.0) for s in exports for r in _as_use(s)]
        timed = [t for t in signed if t[0].start is not None and (t[0].seconds or 0) > 0
                 and abs(t[0].start) < 2**40 and (t[0].seconds or 0) < 2**32
                 and t[0].value is not None]  # fmt: skip
        unique = {(r.start, r.seconds, r.value, id(s)): (r, s, sign) for r, s, sign in timed}
        kept = list(unique.values())
        starts = {r.start for r, _, _ in kept}
        if len(kept) > _SAME_START and len(starts) == 1:
            raise UnreadableBills(
                f"all {len(kept)} readings claim to start at the same moment", where=name,
                next_step="Download the file again, or a CSV.",
            )  # fmt: skip
        if not kept:
            raise UnreadableBills("no reading has a time and a value", where=name)
        quality = [r.quality if r.quality is not None else s.code("defaultquality") or 0
                   for r, s, _ in kept]  # fmt: skip
        return cls(
            np.array([round(r.start or 0) for r, _, _ in kept], np.int64),
            np.array([round(r.seconds or 0) for r, _, _ in kept], np.int64),
            np.array([sign * (r.value or 0.0) * factor for r, _, sign in kept]),
            np.array([np.nan if r.cost is None else r.cost * codes.MONEY for r, _, _ in kept]),
            np.array([r.number for r, _, _ in kept], np.int64),
            np.array([q in codes.ESTIMATED_QUALITIES for q in quality], np.int64),
            sum(q == codes.SUSPECT_QUALITY for q in quality),
            len(signed) - len(timed),
            len(timed) - len(kept),
            any(s.code("flowdirection") == codes.NET for s in chosen),
            len(chosen) + len(exports) if len(chosen) + len(exports) > 1 else 0,
        )


def _as_use(series: Series) -> list[Reading]:
    """Readings as use: of a register, differences; a fall of the register is left out."""
    if series.code("accumulationbehaviour") not in codes.REGISTER:
        return series.readings
    known = sorted(
        (r for r in series.readings if r.start is not None and r.value is not None),
        key=lambda r: r.start or 0.0,
    )
    found = []
    for a, b in pairwise(known):
        use = (b.value or 0.0) - (a.value or 0.0)
        if use >= 0 and (b.start or 0) > (a.start or 0):
            seconds = (b.start or 0.0) - (a.start or 0.0)
            found.append(replace(b, start=a.start, seconds=seconds, value=use, cost=None))
    return found


def merged(table: Numbers) -> Numbers:
    """Series added up moment by moment; moments that a series lacks are left out."""
    start, first, back, count = np.unique(
        table.start, return_index=True, return_inverse=True, return_counts=True
    )
    whole = count == table.several
    use, cost = np.bincount(back, table.use), np.bincount(back, np.nan_to_num(table.cost))
    priced = np.bincount(back, ~np.isnan(table.cost)) > 0
    return replace(
        table, start=start[whole], seconds=table.seconds[first][whole], use=use[whole],
        cost=np.where(priced, cost, np.nan)[whole], line=table.line[first][whole],
        estimated=np.minimum(1, np.bincount(back, table.estimated)).astype(np.int64)[whole],
    )  # fmt: skip


def added(
    name: str, table: Numbers, first: NDArray[np.int64], last: NDArray[np.int64]
) -> tuple[BillRow, ...]:
    """Parts of one bill in several series (by tier, or in and out) as one row."""
    groups: dict[tuple[int, int], list[int]] = {}
    for k in range(first.size):
        groups.setdefault((int(first[k]), int(last[k])), []).append(k)
    rows = []
    for (begin, end), group in sorted(groups.items()):
        costs = [c for k in group if not np.isnan(c := float(table.cost[k]))]
        lacking = len(group) < table.several
        rows.append(
            BillRow(
                name, int(table.line[group].min()), begin, end, float(table.use[group].sum()),
                sum(costs) if costs else None, bool(table.estimated[group].any()),
                problem="a part of this bill is missing" if lacking else "",
            )
        )  # fmt: skip
    return tuple(rows)


def cautions_of(table: Numbers) -> tuple[str, ...]:
    said = []
    if table.suspect:
        said.append(f"{table.suspect} readings failed the utility's own check; they were used.")
    if table.untimed:
        said.append(f"{table.untimed} readings without a time or a value were left out.")
    if table.twice:
        said.append(f"{table.twice} readings are there more than once and were counted once.")
    return tuple(said)
