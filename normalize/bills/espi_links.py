"""Which parts of an ESPI file belong together: by their links, for they are not nested.

What belongs here: series of readings with their type and their usage point, and what is
passed over because nothing says what it is.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

from normalize.bills import espi_codes as codes
from normalize.bills.espi_xml import Entry, Reading
from normalize.errors import UnreadableBills


@dataclass(slots=True)
class Series:
    """Readings of one meter reading.

    type : its ReadingType, or an empty entry.  point : its UsagePoint's place in the file from
    1, or 0.  kind : of the service (0 electricity, 1 gas …), None where not said.
    """

    type: Entry
    point: int
    kind: int | None
    readings: list[Reading] = field(default_factory=list)

    def code(self, name: str) -> int | None:
        """A code of the reading type."""
        return self.type.whole(name)


NOTHING = Entry("readingtype", "", "", (), {})


def belongs(child: Entry, parent: Entry) -> bool:
    """Whether links say that one entry hangs below, or is named by, another.

    Sound links come in either direction, and some files carry only one of them.
    """
    if child.own and any(_same(child.own, link) for link in parent.related):
        return True
    if parent.own and any(_same(parent.own, link) for link in child.related):
        return True
    if child.up and any(_same(child.up, link) for link in parent.related):
        return True
    return bool(parent.own) and any(
        _below(link, parent.own) for link in (child.up, child.own) if link
    )


def _same(a: str, b: str) -> bool:
    """Equal paths, or one written from further up: /a/UsagePoint/1 and UsagePoint/1."""
    if a == b:
        return bool(a)
    short, long = sorted((a, b), key=len)
    return "/" in short and long.endswith("/" + short)


def _below(link: str, parent: str) -> bool:
    return link == parent or link.startswith(parent + "/") or f"/{parent}/" in f"/{link}/"


def join(entries: Sequence[Entry], name: str) -> list[Series]:
    """Series of a file, in its order.  Raises UnreadableBills if the links leave it open."""
    of = {k: [e for e in entries if e.kind == k] for k in ("usagepoint", "meterreading")}
    types = [e for e in entries if e.kind == "readingtype"]
    found: dict[tuple[int, int, str], Series] = {}
    parents: dict[tuple[str, str], Entry | None] = {}
    for block in (e for e in entries if e.kind == "intervalblock"):
        if block.own and (block.up, "") not in parents:
            parents[block.up, ""] = _one(block, of["meterreading"])
        meter = parents[block.up, ""] if block.own else _one(block, of["meterreading"])
        kind = _type_of(block, meter, types, name)
        point = _point_of(block, meter, of["usagepoint"])
        key = (id(kind), id(point), "" if meter is not None else block.up)
        if key not in found:
            place = _place(point, of["usagepoint"])
            service = point.whole("servicecategory/kind") if point is not None else None
            found[key] = Series(kind, place, service)
        for each in block.blocks:
            found[key].readings += _with_times(each.readings, each.start, kind)
    return list(found.values())


def place_of(entry: Entry, points: Sequence[Entry]) -> int:
    """The place, from 1, of an entry's usage point in the file; 0 where links do not say."""
    return _place(_one(entry, points), points)


def _place(point: Entry | None, points: Sequence[Entry]) -> int:
    return next((n for n, p in enumerate(points, start=1) if p is point), 0)


def _one(child: Entry, parents: Sequence[Entry]) -> Entry | None:
    """The parent of an entry; the only one there is if links say nothing."""
    hits = [p for p in parents if belongs(child, p)]
    if hits:
        return max(hits, key=lambda p: len(p.own))
    return parents[0] if len(parents) == 1 else None


def _type_of(block: Entry, meter: Entry | None, types: Sequence[Entry], name: str) -> Entry:
    for child in (meter, block):
        if child is None:
            continue
        hits = [t for t in types if any(_same(t.own, link) for link in child.related if t.own)]
        hits = hits or [t for t in types if belongs(t, child)]
        if len({id(t) for t in hits}) == 1:
            return hits[0]
    if len(types) > 1:
        raise UnreadableBills(
            f"the file describes {len(types)} kinds of readings, and its links do not say which "
            "readings are of which kind",
            where=name,
            next_step="Download a file of one meter, or a CSV.",
        )
    return types[0] if types else NOTHING


def _point_of(block: Entry, meter: Entry | None, points: Sequence[Entry]) -> Entry | None:
    found = _one(meter, points) if meter is not None else None
    return found or _one(block, points)


def _with_times(
    readings: Sequence[Reading], block_start: float | None, kind: Entry
) -> list[Reading]:
    """Readings without a time follow each other at the interval length of their type."""
    length = kind.whole("intervallength")
    at = block_start
    for reading in readings:
        if reading.start is None:
            reading.start = at
        if reading.seconds is None and length:
            reading.seconds = float(length)
        at = (
            reading.start + reading.seconds
            if reading.start is not None and reading.seconds is not None
            else None
        )
    return list(readings)


def refusal(series: Series) -> str:
    """Why a series cannot be used, in plain words; "" if it can."""
    commodity, kind, uom = series.code("commodity"), series.kind, series.code("uom")
    if uom in (6, 23):
        return "temperatures, not energy"
    if kind == codes.WATER_KIND or commodity == codes.WATER_COMMODITY:
        return "water, not energy"
    if commodity in codes.OTHER_COMMODITIES:
        return codes.OTHER_COMMODITIES[commodity]
    if uom is not None and uom in codes.OTHER_UNITS and uom != 0:
        return codes.OTHER_UNITS[uom]
    if uom not in (None, 0) and uom not in codes.USABLE_UNITS:
        return f"a measure that is no energy (unit code {uom})"
    measured, summed = series.code("kind"), series.code("accumulationbehaviour")
    if measured in codes.OTHER_KINDS:
        return codes.OTHER_KINDS[measured]
    if series.code("dataqualifier") in codes.EXTREMES:
        return codes.EXTREMES[series.code("dataqualifier") or 0]
    if summed in codes.SUMMATION_WORDS:
        return codes.SUMMATION_WORDS[summed]
    if summed not in (*codes.USE_BETWEEN_READINGS, *codes.REGISTER):
        return f"numbers added up in a way that is not known (code {summed})"
    multiplier = series.code("poweroftenmultiplier")
    if multiplier is not None and multiplier not in codes.MULTIPLIERS:
        return f"numbers with a multiplier that the standard does not have ({multiplier})"
    return ""
