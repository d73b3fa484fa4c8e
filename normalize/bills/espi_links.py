"""Which parts of an ESPI file belong together: by their links, for they are not nested.

What belongs here: series of readings with their type and their usage point, and what is
passed over because nothing says what it is.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
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


MOST_PARTS = 20  # of a path; the standard's have eight, and what is longer links nothing
MOST_LINKS = 200_000  # of meters and usage points (our own, against files made to exhaust)
MOST_OF_TYPE = 100  # links of a kind of readings that are looked at
NOTHING = Entry("readingtype", "", "", (), {})


class _Paths:
    """Places of entries under the paths of some of their links.

    Of entries under one path the best is kept, so that a search takes as long with two as with
    two thousand.  Paths are the same when they are equal, or when one is written from further
    up: /a/UsagePoint/1 and UsagePoint/1.
    """

    def __init__(self) -> None:
        self.whole: dict[str, tuple[int, bool]] = {}
        self.ends: dict[str, tuple[int, bool]] = {}

    def add(self, path: str, place: int, rank: Sequence[int]) -> None:
        """rank : of every place; of equals the first is the best."""
        if path.count("/") < MOST_PARTS:
            _keep(self.whole, path, place, rank)
            for end in _ends(path):
                _keep(self.ends, end, place, rank)

    def same(self, path: str) -> Iterator[tuple[int, bool]]:
        """(best place, whether it is one of several) under the same path, once or more."""
        if path.count("/") >= MOST_PARTS:
            return
        wanted = ((self.whole, path), (self.ends, path), *((self.whole, e) for e in _ends(path)))
        for table, key in wanted:
            if key and key in table:
                yield table[key]


def _keep(table: dict[str, tuple[int, bool]], key: str, place: int, rank: Sequence[int]) -> None:
    if not key:
        return
    if key not in table:
        table[key] = (place, False)
    elif (before := table[key][0]) != place:
        table[key] = (max(before, place, key=lambda p: (rank[p], -p)), True)


def _ends(path: str) -> Iterator[str]:
    """What a path ends on, down to two parts: the last part alone is a number that many share.

    >>> list(_ends("a/b/c"))
    ['b/c']
    """
    at = path.find("/")
    while at >= 0 and (following := path.find("/", at + 1)) >= 0:
        yield path[at + 1 :]
        at = following


def _stretches(path: str, lengths: Iterable[int]) -> Iterator[str]:
    """Every run of parts of a path: what it can hang below.

    >>> list(_stretches("a/b/c", [2]))
    ['a/b', 'b/c']
    """
    parts = path.split("/")
    if len(parts) <= MOST_PARTS:
        for n in lengths:
            for k in range(len(parts) - n + 1):
                yield "/".join(parts[k : k + n])


class Parents:
    """Entries that others hang below, by their links.

    Links say so in either direction, and some files carry only one of them: a link to, or from,
    or a path that is written below the parent's.
    """

    def __init__(self, parents: Sequence[Entry], name: str) -> None:
        self.parents = parents
        self.own, self.related = _Paths(), _Paths()
        rank = [len(p.own) for p in parents]
        links = sum(len(p.related) for p in parents)
        if links > MOST_LINKS:
            raise UnreadableBills(f"its meters have more than {MOST_LINKS:,} links", where=name)
        for place, parent in enumerate(parents):
            self.own.add(parent.own, place, rank)
            for link in parent.related:
                self.related.add(link, place, rank)
        self.lengths = sorted({p.own.count("/") + 1 for p in parents if p.own})
        self.rank = rank

    def place(self, child: Entry) -> int | None:
        """The parent's place, the one named most fully; the only one if links say nothing."""
        found = [
            *self.related.same(child.own), *self.related.same(child.up),
            *(hit for link in child.related for hit in self.own.same(link)),
            *(self.own.whole[s] for link in (child.up, child.own) if link
              for s in _stretches(link, self.lengths) if s in self.own.whole),
        ]  # fmt: skip
        if found:
            return max((place for place, _ in found), key=lambda p: (self.rank[p], -p))
        return 0 if len(self.parents) == 1 else None

    def of(self, child: Entry) -> Entry | None:
        """The parent."""
        place = self.place(child)
        return None if place is None else self.parents[place]


class _Types:
    """Kinds of readings, by links."""

    def __init__(self, types: Sequence[Entry], users: Sequence[Entry], name: str) -> None:
        self.types, self.name = types, name
        self.own, self.related, self.up = _Paths(), _Paths(), _Paths()
        self.below: dict[str, tuple[int, bool]] = {}
        rank = [0] * len(types)
        users_own = {u.own for u in users if u.own}
        lengths = sorted({own.count("/") + 1 for own in users_own})
        for place, kind in enumerate(types):
            self.own.add(kind.own, place, rank)
            self.up.add(kind.up, place, rank)
            for link in kind.related[:MOST_OF_TYPE]:
                self.related.add(link, place, rank)
            for link in (kind.up, kind.own):
                for stretch in _stretches(link, lengths):
                    if stretch in users_own:
                        _keep(self.below, stretch, place, rank)

    def of(self, block: Entry, meter: Entry | None) -> Entry:
        """The kind of a block's readings.  Raises UnreadableBills if the links leave it open."""
        for child in (meter, block):
            if child is None:
                continue
            hits = [hit for link in child.related for hit in self.own.same(link)]
            hits = hits or [
                *self.related.same(child.own),
                *(hit for link in child.related for hit in self.up.same(link)),
                *([self.below[child.own]] if child.own in self.below else []),
            ]
            if len({place for place, _ in hits}) == 1 and not any(many for _, many in hits):
                return self.types[hits[0][0]]
        if len(self.types) > 1:
            raise UnreadableBills(
                f"the file describes {len(self.types)} kinds of readings, and its links do not "
                "say which readings are of which kind",
                where=self.name,
                next_step="Download a file of one meter, or a CSV.",
            )
        return self.types[0] if self.types else NOTHING


def join(entries: Sequence[Entry], name: str) -> list[Series]:
    """Series of a file, in its order.  Raises UnreadableBills if the links leave it open."""
    meters = Parents([e for e in entries if e.kind == "meterreading"], name)
    points = points_of(entries, name)
    blocks = [e for e in entries if e.kind == "intervalblock"]
    types = _Types(
        [e for e in entries if e.kind == "readingtype"], [*meters.parents, *blocks], name
    )
    found: dict[tuple[int, int | None, str], Series] = {}
    parents: dict[str, Entry | None] = {}
    for block in blocks:
        if block.own and block.up not in parents:
            parents[block.up] = meters.of(block)
        meter = parents[block.up] if block.own else meters.of(block)
        kind = types.of(block, meter)
        place = points.place(meter) if meter is not None else None
        place = points.place(block) if place is None else place
        key = (id(kind), place, "" if meter is not None else block.up)
        if key not in found:
            point = None if place is None else points.parents[place]
            service = point.whole("servicecategory/kind") if point is not None else None
            found[key] = Series(kind, 0 if place is None else place + 1, service)
        for each in block.blocks:
            found[key].readings += _with_times(each.readings, each.start, kind)
    return list(found.values())


def points_of(entries: Sequence[Entry], name: str) -> Parents:
    """The usage points of a file, to look up whose something is."""
    return Parents([e for e in entries if e.kind == "usagepoint"], name)


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
