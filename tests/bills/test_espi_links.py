"""Which parts of an ESPI file belong together, found by index: as a search through all would.

The rule is written down here once more, parent by parent, as the reference.
"""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from normalize.bills.accounts import read_accounts
from normalize.bills.espi_links import MOST_LINKS, Parents
from normalize.bills.espi_xml import Entry
from normalize.errors import UnreadableBills
from tests.bills import espi_makers as espi


def same(a: str, b: str) -> bool:
    short, long = sorted((a, b), key=len)
    return bool(a) and (a == b or ("/" in short and long.endswith("/" + short)))


def belongs(child: Entry, parent: Entry) -> bool:
    to_child = any(same(path, link) for path in (child.own, child.up) for link in parent.related)
    to_parent = any(same(parent.own, link) for link in child.related)
    below = any(f"/{parent.own}/" in f"/{link}/" for link in (child.up, child.own) if link)
    return to_child or to_parent or (bool(parent.own) and below)


def searched(child: Entry, parents: Sequence[Entry]) -> int | None:
    hits = [n for n, parent in enumerate(parents) if belongs(child, parent)]
    if hits:
        return max(hits, key=lambda n: len(parents[n].own))
    return 0 if len(parents) == 1 else None


PATHS = st.lists(st.sampled_from(["U", "P", "M", "1", "2"]), max_size=5).map("/".join)
ENTRIES = st.builds(
    Entry, st.just("x"), PATHS, PATHS, st.lists(PATHS, max_size=2).map(tuple), st.just({})
)


@given(ENTRIES, st.lists(ENTRIES, max_size=4))
def test_the_index_finds_what_a_search_finds(child: Entry, parents: list[Entry]) -> None:
    assert Parents(parents, "x.xml").place(child) == searched(child, parents)


def test_the_parent_that_is_named_most_fully() -> None:
    parents = [Entry("meterreading", own, "", (), {}) for own in ("U/1", "U/1/P/2", "P/2")]
    child = Entry("intervalblock", "U/1/P/2/M/3", "U/1/P/2/M", (), {})
    assert Parents(parents, "x.xml").place(child) == 1
    assert Parents(parents, "x.xml").place(Entry("intervalblock", "Q/9", "", (), {})) is None


def test_a_file_of_links_without_end_is_refused() -> None:
    parents = [Entry("usagepoint", "U/1", "", ("U/1",) * (MOST_LINKS + 1), {})]
    with pytest.raises(UnreadableBills, match="links"):
        Parents(parents, "x.xml")


def test_kinds_of_readings_that_hang_below_their_meter(tmp_path: Path) -> None:
    """No link names them; their own paths do.  Two meters, kWh and Wh."""
    entries = [espi.clock()]
    for n, power in ((1, 0), (2, 3)):
        own = f"U/1/UsagePoint/{n}"
        months = [espi.reading(espi.JAN, espi.FEB - espi.JAN, 5000),
                  espi.reading(espi.FEB, espi.MAR - espi.FEB, 6000)]  # fmt: skip
        entries += [
            espi.point("0", own), espi.meter(f"{own}/MeterReading/1", "nothing"),
            espi.block(months, own=f"{own}/MeterReading/1/IntervalBlock/1"),
            espi.reading_type(
                f"{own}/MeterReading/1/ReadingType/1", uom=72, powerOfTenMultiplier=power
            ),
        ]  # fmt: skip
    file = tmp_path / "usage.xml"
    file.write_text(espi.feed(*entries))
    found = [b.periods.use.tolist() for b in read_accounts(file).bills]
    assert found == [[5.0, 6.0], [5000.0, 6000.0]]
