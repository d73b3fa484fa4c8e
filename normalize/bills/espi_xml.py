"""ESPI XML taken apart: entries with their links, their fields and their readings.

What belongs here: XML from a stranger, read without entities, document types or fetching, in
bounded memory.  Elements are known by namespace and name, never by prefix.  Names and addresses
(titles, the customer feed) are not kept.
"""

from __future__ import annotations

import re
from dataclasses import dataclass, field
from urllib.parse import urlsplit

from normalize.bills.espi_codes import ESTIMATED_QUALITIES, SUSPECT_QUALITY, WEATHER_NORMALIZED
from normalize.errors import UnreadableBills

ATOM = "http://www.w3.org/2005/Atom"
ESPI = "http://naesb.org/espi"
MAX_ENTRIES = 200_000
MAX_READINGS = 3_000_000  # 85 years of quarter hours
MAX_DEPTH = 100
PIECE = 1 << 16  # bytes handed to the parser at once
MAX_TEXT = 200  # characters of a field that is kept
MILLISECONDS = 1e11  # an instant above it would lie after the year 5138

KINDS = {
    "usagepoint", "meterreading", "readingtype", "intervalblock", "usagesummary",
    "electricpowerusagesummary", "electricpowerqualitysummary", "localtimeparameters",
    "timeconfiguration",
}  # fmt: skip
OTHER, FIELD, OBJECT, LINK, ENTRY = range(5)  # what an element can be
MOST_TAGS = 1000  # that are remembered: a file has few names and many elements


@dataclass(slots=True)
class Reading:
    """One reading. start : epoch seconds or None.  value : as written, unscaled."""

    number: int
    start: float | None
    seconds: float | None
    value: float | None
    cost: float | None
    quality: int | None
    tou: int


@dataclass(slots=True)
class Block:
    """One IntervalBlock. start, seconds : of the whole, or None."""

    start: float | None
    seconds: float | None
    readings: list[Reading] = field(default_factory=list)


@dataclass(slots=True)
class Entry:
    """One object of the file. kind : lower-case element name.  fields : "a/b" → text."""

    kind: str
    own: str
    up: str
    related: tuple[str, ...]
    fields: dict[str, str]
    blocks: list[Block] = field(default_factory=list)

    def whole(self, name: str) -> int | None:
        """A field as a whole number; None if it is absent, empty or no number."""
        value = number(self.fields.get(name))
        return int(value) if value is not None and abs(value) < 2**53 else None


def number(text: str | None) -> float | None:
    """A finite number in a field, else None.

    >>> number(" 1721154384.66136 "), number("nan"), number(None)
    (1721154384.66136, None, None)
    """
    try:
        value = float(text) if text is not None else None
    except ValueError:
        return None
    return value if value is not None and abs(value) < 1e300 else None


def instant(text: str | None) -> float | None:
    """An instant in epoch seconds; milliseconds, which some write, are divided."""
    value = number(text)
    return value / 1e3 if value is not None and abs(value) > MILLISECONDS else value


def looks_like_xml(data: bytes) -> bool:
    """Whether a file's first letter, in any of the usual encodings, is an angle bracket."""
    head = data[:400].replace(b"\0", b"").lstrip(b"\xef\xbb\xbf\xff\xfe \t\r\n")
    return head.startswith(b"<")


def read_entries(data: bytes, name: str) -> list[Entry]:
    """Every object of a feed.  Raises UnreadableBills."""
    from xml.etree.ElementTree import ParseError

    from defusedxml.common import DefusedXmlException

    if re.search(rb"<!(?:DOCTYPE|ENTITY)", data.replace(b"\0", b"")[:100_000], re.IGNORECASE):
        raise _unsafe(name)
    walk = _Walk(name)
    try:
        _parse(data.lstrip(b" \t\r\n"), walk)
    except DefusedXmlException:
        raise _unsafe(name) from None
    except ParseError as err:
        raise UnreadableBills(
            f"the XML breaks off or is damaged (line {err.position[0]})",
            where=name,
            next_step="Download the file again.",
        ) from None
    except (ValueError, LookupError, UnicodeError):  # an encoding nobody knows
        raise UnreadableBills("the XML is in an unknown encoding", where=name) from None
    return walk.finish()


class _Silence:
    """A target that keeps nothing: no tree is built."""

    def close(self) -> None:
        """Nothing to hand over."""


def _parse(data: bytes, walk: _Walk) -> None:
    """Run defusedxml's parser, the one its iterparse runs, with the walk's own handlers.

    Document types, entities and external references are refused by the parser as ever; but a
    reading costs no elements, events and second walk over them, which took most of the time.
    """
    from defusedxml.ElementTree import DefusedXMLParser

    parser = DefusedXMLParser(target=_Silence(), forbid_dtd=True)
    inner = parser.parser
    inner.StartElementHandler = walk.start
    inner.EndElementHandler = walk.end
    inner.CharacterDataHandler = walk.text
    view = memoryview(data)
    for begin in range(0, len(data), PIECE):
        parser.feed(bytes(view[begin : begin + PIECE]))
    parser.close()


def _unsafe(name: str) -> UnreadableBills:
    return UnreadableBills(
        "the file was not opened, for safety: it declares a document type or XML entities, "
        "which no file of readings needs",
        where=name,
        next_step="Download it again from your utility.",
    )


def _local(tag: str) -> tuple[str, str]:
    """(namespace, lower-case name); typing errors such as IntervalBLock then do no harm."""
    space, _, name = tag.rpartition("}")
    return space, name.lower()


class _Walk:
    """Gathers entries while the parser runs: an object's fields by their path below it.

    fields : of the object or reading that is open, by path; None where none is.  outer : what a
    reading or an object within an object interrupts.  paths : of the elements open within it;
    None for those of other namespaces, which are passed over.  leaf : no child came yet.
    """

    def __init__(self, name: str) -> None:
        self.name = name
        self.found: list[Entry] = []
        self.waiting: list[Entry] = []  # objects of the entry that is open
        self.links: list[tuple[str, str]] = []
        self.blocks: list[Block] = []
        self.readings = 0
        self.is_espi = False
        self.depth = 0
        self.tags: dict[str, tuple[int, str]] = {}
        self.fields: dict[str, str] | None = None
        self.outer: list[tuple[dict[str, str] | None, list[str | None]]] = []
        self.paths: list[str | None] = []
        self.marks: list[str] = []  # of quality, of the reading that is open
        self.pieces: list[str] = []
        self.leaf = False

    def start(self, tag: str, attributes: list[str]) -> None:
        """An element begins. attributes : names and values in turn."""
        self.depth += 1
        if self.depth > MAX_DEPTH:
            raise UnreadableBills("the XML is nested too deeply", where=self.name)
        what, name = self.tags.get(tag) or self._tag(tag)
        if what == FIELD:
            if self.fields is not None:
                paths = self.paths
                above = paths[-1] if paths else ""
                self.leaf = above is not None
                paths.append(f"{above}/{name}" if above else name if self.leaf else None)
                self.pieces = []
            return
        self.leaf = False
        if what == OBJECT:
            self._open(name)
        elif self.fields is not None:
            self.paths.append(None)
        elif what == LINK:
            of = dict(zip(attributes[::2], attributes[1::2], strict=True))
            self.links.append((of.get("rel", ""), path_of(of.get("href", ""))))

    def _tag(self, tag: str) -> tuple[int, str]:
        """What a tag is, and its lower-case name, kept for the next time."""
        space, name = _local(tag)
        what = OTHER
        if space == ESPI:
            self.is_espi = True
            what = OBJECT if name == "intervalreading" or name in KINDS else FIELD
        elif space == ATOM and name in ("link", "entry"):
            what = LINK if name == "link" else ENTRY
        if len(self.tags) < MOST_TAGS:
            self.tags[tag] = what, name
        return what, name

    def _open(self, name: str) -> None:
        """An object or a reading begins."""
        self.outer.append((self.fields, self.paths))
        self.fields, self.paths = {}, []
        if name == "intervalreading":
            self.marks = []
        elif name == "intervalblock":
            self.blocks.append(Block(None, None))

    def text(self, data: str) -> None:
        """Characters of an element; more than a field can be is not kept."""
        if self.leaf and len(self.pieces) < MAX_TEXT:
            self.pieces.append(data[: 2 * MAX_TEXT])

    def end(self, tag: str) -> None:
        """An element ends."""
        self.depth -= 1
        if self.paths:
            place = self.paths.pop()
            if self.leaf and place is not None and self.fields is not None:
                self._keep(place)
            self.leaf = False
            return
        self.leaf = False
        what, name = self.tags.get(tag) or self._tag(tag)
        if what == OBJECT and self.fields is not None:
            fields = self.fields
            self.fields, self.paths = self.outer.pop()
            if name == "intervalreading":
                self._reading(fields)
            else:
                self._object(name, fields)
        elif what == ENTRY:
            self._close()

    def _keep(self, place: str) -> None:
        """The text of a leaf, the first of its name; of marks of quality, every one."""
        text = "".join(self.pieces).strip()[:MAX_TEXT] if self.pieces else ""
        if self.fields is not None and place not in self.fields:
            self.fields[place] = text
        if place == "quality" or place.endswith("/quality"):
            self.marks.append(text)

    def _reading(self, fields: dict[str, str]) -> None:
        self.readings += 1
        if self.readings > MAX_READINGS:
            raise UnreadableBills(
                f"the file holds more than {MAX_READINGS:,} readings", where=self.name
            )
        tou = number(fields.get("tou"))
        reading = Reading(
            self.readings,
            instant(fields.get("timeperiod/start")),
            number(fields.get("timeperiod/duration")),
            number(fields.get("value")),
            number(fields.get("cost")),
            _worst_quality(self.marks) if self.marks else None,
            int(tou) if tou is not None and abs(tou) < 1e6 else 0,
        )
        if self.blocks:
            self.blocks[-1].readings.append(reading)

    def _object(self, name: str, fields: dict[str, str]) -> None:
        entry = Entry(name, "", "", (), fields)
        if name == "intervalblock" and self.blocks:
            block = self.blocks.pop()
            block.start = instant(fields.get("interval/start"))
            block.seconds = number(fields.get("interval/duration"))
            entry.blocks.append(block)
        self.waiting.append(entry)
        if len(self.found) + len(self.waiting) > MAX_ENTRIES:
            raise UnreadableBills(f"the file holds more than {MAX_ENTRIES:,} entries",
                                  where=self.name)  # fmt: skip

    def finish(self) -> list[Entry]:
        """Every entry of the file.  Raises UnreadableBills where there is none."""
        self._close()
        if not self.found:
            self._refuse()
        return self.found

    def _close(self) -> None:
        """An entry ends: its objects get its links."""
        own = next((href for rel, href in self.links if rel == "self"), "")
        up = next((href for rel, href in self.links if rel == "up"), "")
        related = tuple(href for rel, href in self.links if rel == "related")
        for entry in self.waiting:
            entry.own, entry.up, entry.related = own, up, related
            self.found.append(entry)
        self.waiting, self.links = [], []

    def _refuse(self) -> None:
        if self.is_espi:
            raise UnreadableBills(
                "this file of the utility-data standard (ESPI) holds no readings",
                where=self.name,
                next_step="Ask for usage data, not for customer data.",
            )
        raise UnreadableBills(
            "this is XML or HTML, but no file of the utility-data standard (ESPI)",
            where=self.name,
            wanted="a CSV or XLSX table, or ESPI XML",
            next_step="Look for a CSV or spreadsheet download at the same place.",
        )


def _worst_quality(texts: list[str]) -> int | None:
    """Of several marks of quality, the one that says most against the reading."""
    if len(texts) == 1:
        value = number(texts[0])
        return int(value) if value is not None and abs(value) < 1e6 else None
    marks = [int(value) for t in texts if (value := number(t)) is not None and abs(value) < 1e6]
    bad = (WEATHER_NORMALIZED, SUSPECT_QUALITY, *ESTIMATED_QUALITIES)
    return next((mark for mark in bad if mark in marks), marks[0] if marks else None)


def path_of(href: str) -> str:
    """A link as a path to compare: without host, query or what stands before the resource.

    >>> path_of("https://h.example/espi/1_1/resource/UsagePoint/01/")
    'UsagePoint/01'
    """
    try:
        path = urlsplit(href.strip()[:500]).path
    except ValueError:
        return ""
    head, mark, tail = path.rpartition("/resource/")
    return (tail if mark else head + tail or path).strip("/")
