"""The bills that an ESPI file's usage summaries tell of: their dates and what they came to.

What belongs here: from summaries to spans of local days, to which readings can be summed.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from normalize.bills import espi_codes as codes
from normalize.bills.espi_links import points_of
from normalize.bills.espi_xml import Entry
from normalize.bills.local_days import Clock
from normalize.bills.periods import Spans

HALF_A_DAY = 43_200  # seconds: a bill begins and ends at the midnight nearest to its instants
LONGEST_BILL = 800 * 86_400  # seconds; a longer one is a mistake


def summaries_of(entries: Sequence[Entry], name: str) -> dict[int, list[Entry]]:
    """Usage summaries by the place, from 1, of their usage point; 0 where links do not say.

    In a file of one usage point, or none, they are its own.
    """
    points = points_of(entries, name)
    found: dict[int, list[Entry]] = {}
    for entry in entries:
        if entry.kind.endswith("usagesummary"):
            place = points.place(entry)
            found.setdefault(0 if place is None else place + 1, []).append(entry)
    return found


def billed_spans(summaries: Sequence[Entry], clock: Clock) -> Spans | None:
    """The bills of one meter, in order; None where there are none.

    Of summaries of the same days the last counts; one that overlaps the bill before it starts
    where that one ends, or is passed over where nothing of it is left.
    """
    found: dict[tuple[int, int], float] = {}
    for entry in summaries:
        start, seconds = entry.whole("billingperiod/start"), entry.whole("billingperiod/duration")
        if start is None or seconds is None or not abs(start) < 2**40:
            continue
        if not 86_400 <= seconds <= LONGEST_BILL:
            continue
        ends = clock.local(np.array([start, start + seconds], np.int64)) + HALF_A_DAY
        first, last = (ends // 86_400).tolist()
        money = entry.whole("billlastperiod")
        found[first, last] = np.nan if money is None else money * codes.MONEY
    spans: list[tuple[int, int, float]] = []
    for (first, last), cost in sorted(found.items()):
        begin = max(first, spans[-1][1]) if spans else first
        if last > begin:
            spans.append((begin, last, cost))
    if not spans:
        return None
    return Spans(
        np.array([s[0] for s in spans], np.int64),
        np.array([s[1] for s in spans], np.int64),
        np.full(len(spans), np.nan),
        np.array([s[2] for s in spans]),
        "the bills that the file itself tells of",
    )
