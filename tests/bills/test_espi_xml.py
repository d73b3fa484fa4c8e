"""ESPI XML taken apart: held to the standard library's own tree of the same file.

The tree of xml.etree (another parser of the same bytes, slower and with no safeguards) says what
each object's fields and each reading's numbers are; these files are our own, so it is safe here.
"""

from __future__ import annotations

from xml.etree import ElementTree

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from normalize.bills.espi_xml import ESPI, KINDS, Entry, read_entries
from normalize.errors import UnreadableBills
from tests.bills import espi_makers as make

START = make.at("2023-01-05T05:00")


def feed(*parts: str) -> bytes:
    return (
        make.HEAD + f'<feed xmlns="http://www.w3.org/2005/Atom">{"".join(parts)}</feed>'
    ).encode()


def leaves(node: ElementTree.Element, above: str = "") -> dict[str, str]:
    """Fields by path, as a recursive reading of the tree has them; the first of each name."""
    found: dict[str, str] = {}
    for child in node:
        space, _, name = child.tag.rpartition("}")
        if space != f"{{{ESPI}" or name.lower() == "intervalreading":
            continue
        place = f"{above}/{name.lower()}" if above else name.lower()
        more = leaves(child, place) if len(child) else {place: (child.text or "").strip()[:200]}
        found = {**more, **found}
    return found


def objects(data: bytes) -> list[tuple[str, dict[str, str]]]:
    nodes = ElementTree.fromstring(data).iter()
    named = [(n.tag.rpartition("}")[2].lower(), n) for n in nodes if n.tag.startswith(f"{{{ESPI}")]
    return [(name, leaves(node)) for name, node in named if name in KINDS]


def sample(values: list[int], quality: int, extra: str) -> bytes:
    readings = [
        make.reading(START + 900 * k, 900, v, cost=k, quality=quality) for k, v in enumerate(values)
    ]
    summary = make.entry(
        "s", "", [],
        '<UsageSummary xmlns="http://naesb.org/espi"><billingPeriod><duration>1</duration>'
        f"<start>2</start></billingPeriod>{extra}<currency>840</currency></UsageSummary>",
    )  # fmt: skip
    return feed(make.point(), make.clock(), make.meter(), make.reading_type(), summary,
                make.block(readings, start=START))  # fmt: skip


EXTRAS = (
    "",
    "<billToDate> 12 </billToDate><billToDate>13</billToDate>",
    "<overallConsumptionLastPeriod><value>7</value></overallConsumptionLastPeriod>",
    '<x:note xmlns:x="urn:other"><currency xmlns="http://naesb.org/espi">9</currency></x:note>',
    "<deep><deeper><deepest>1</deepest></deeper><deeper>2</deeper></deep>",
    "<!-- a remark --><empty/><cdata><![CDATA[ <5> ]]></cdata>",
    "<entityOfTheStandard>&lt;&amp;&#65;</entityOfTheStandard>",
)


@settings(deadline=None, max_examples=60)
@given(
    values=st.lists(st.integers(-(2**47), 2**47), min_size=1, max_size=8),
    quality=st.sampled_from([0, 8, 17, 19]),
    extra=st.sampled_from(EXTRAS),
)
def test_the_same_fields_and_readings_as_a_tree(
    values: list[int], quality: int, extra: str
) -> None:
    data = sample(values, quality, extra)
    found: list[Entry] = read_entries(data, "x.xml")
    assert [(e.kind, e.fields) for e in found] == objects(data)
    read = [r for e in found for b in e.blocks for r in b.readings]
    assert [r.value for r in read] == values
    assert [r.start for r in read] == [START + 900 * k for k in range(len(values))]
    assert [(r.cost, r.quality) for r in read] == [(k, quality) for k in range(len(values))]


def test_a_document_type_behind_a_long_comment_is_refused() -> None:
    comment = f"<!--{'x' * 300_000}-->"
    body = sample([1], 0, "").decode().removeprefix(make.HEAD)
    for bad in ('<!DOCTYPE feed [<!ENTITY a "b">]>', "<!DOCTYPE feed>",
                '<!DOCTYPE feed SYSTEM "file:///etc/hostname">'):  # fmt: skip
        with pytest.raises(UnreadableBills, match="for safety"):
            read_entries((make.HEAD + comment + bad + body).encode(), "x.xml")


def test_an_entity_that_nobody_declared_is_damage() -> None:
    with pytest.raises(UnreadableBills, match="damaged"):
        read_entries(sample([1], 0, "<billToDate>&a;</billToDate>"), "x.xml")


def test_a_field_of_megabytes_is_cut_short() -> None:
    long = sample([1], 0, f"<billToDate>{'9' * 3_000_000}</billToDate>")
    fields = next(e.fields for e in read_entries(long, "x.xml") if e.kind == "usagesummary")
    assert fields["billtodate"] == "9" * 200


def test_nesting_beyond_reason_is_refused() -> None:
    with pytest.raises(UnreadableBills, match="nested"):
        read_entries(sample([1], 0, "<a>" * 200 + "</a>" * 200), "x.xml")
