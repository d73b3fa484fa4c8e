"""ESPI XML taken apart: entries with their links, their fields and their readings.

What belongs here: XML from a stranger, read without entities, document types or fetching, in
bounded memory.  Elements are known by namespace and name, never by prefix.  Names and addresses
(titles, the customer feed) are not kept.
"""

from __future__ import annotations

import io
import re
from collections.abc import Iterator
from dataclasses import dataclass, field
from functools import lru_cache
from typing import TYPE_CHECKING
from urllib.parse import urlsplit

from normalize.bills.espi_codes import ESTIMATED_QUALITIES, SUSPECT_QUALITY, WEATHER_NORMALIZED
from normalize.errors import UnreadableBills

if TYPE_CHECKING:
    from xml.etree.ElementTree import Element

ATOM = "http://www.w3.org/2005/Atom"
ESPI = "http://naesb.org/espi"
MAX_ENTRIES = 200_000
MAX_READINGS = 3_000_000  # 85 years of quarter hours
MAX_TEXT = 200  # characters of a field that is kept
MILLISECONDS = 1e11  # an instant above it would lie after the year 5138

KINDS = {
    "usagepoint", "meterreading", "readingtype", "intervalblock", "usagesummary",
    "electricpowerusagesummary", "electricpowerqualitysummary", "localtimeparameters",
    "timeconfiguration",
}  # fmt: skip
_FIELD = re.compile(r"[^a-z0-9/]")


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
    from defusedxml.ElementTree import iterparse

    if re.search(rb"<!(?:DOCTYPE|ENTITY)", data.replace(b"\0", b"")[:100_000], re.IGNORECASE):
        raise _unsafe(name)
    stream = io.BytesIO(data.lstrip(b" \t\r\n"))
    try:
        return _Walk(name).entries(iterparse(stream, events=("start", "end"), forbid_dtd=True))
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


def _unsafe(name: str) -> UnreadableBills:
    return UnreadableBills(
        "the file was not opened, for safety: it declares a document type or XML entities, "
        "which no file of readings needs",
        where=name,
        next_step="Download it again from your utility.",
    )


@lru_cache(maxsize=512)  # a file has few names and many elements
def _local(tag: object) -> tuple[str, str]:
    """(namespace, lower-case name); typing errors such as IntervalBLock then do no harm."""
    if not isinstance(tag, str):
        return "", ""
    space, _, name = tag.rpartition("}")
    return space.lstrip("{"), name.lower()


class _Walk:
    """Gathers entries while the parser runs, and lets go of what it has gathered."""

    def __init__(self, name: str) -> None:
        self.name = name
        self.found: list[Entry] = []
        self.waiting: list[Entry] = []  # objects of the entry that is open
        self.links: list[tuple[str, str]] = []
        self.block: Block | None = None
        self.readings = 0
        self.is_espi = False

    def entries(self, events: Iterator[tuple[str, Element]]) -> list[Entry]:
        depth, root = 0, None
        for event, element in events:
            space, name = _local(element.tag)
            if event == "start":
                root = element if root is None else root
                depth += 1
                self.is_espi = self.is_espi or space == ESPI
                if depth > 100:
                    raise UnreadableBills("the XML is nested too deeply", where=self.name)
                if space == ESPI and name == "intervalblock":
                    self.block = Block(None, None)
                continue
            depth -= 1
            self._ended(space, name, element)
            if name == "entry" and root is not None:
                root.clear()
        self._close()
        if not self.found:
            self._refuse()
        return self.found

    def _ended(self, space: str, name: str, element: Element) -> None:
        if space == ATOM and name == "link":
            self.links.append((element.get("rel", ""), path_of(element.get("href", ""))))
        elif space == ATOM and name == "entry":
            self._close()
        elif space == ESPI and name == "intervalreading":
            self._reading(element)
        elif space == ESPI and name in KINDS:
            self._object(name, element)

    def _reading(self, element: Element) -> None:
        self.readings += 1
        if self.readings > MAX_READINGS:
            raise UnreadableBills(
                f"the file holds more than {MAX_READINGS:,} readings", where=self.name
            )
        fields = dict(_leaves(element, ""))
        quality = _worst_quality(element)
        tou = number(fields.get("tou"))
        reading = Reading(
            self.readings,
            instant(fields.get("timeperiod/start")),
            number(fields.get("timeperiod/duration")),
            number(fields.get("value")),
            number(fields.get("cost")),
            quality,
            int(tou) if tou is not None and abs(tou) < 1e6 else 0,
        )
        if self.block is not None:
            self.block.readings.append(reading)
        element.clear()

    def _object(self, name: str, element: Element) -> None:
        entry = Entry(name, "", "", (), dict(_leaves(element, "")))
        if name == "intervalblock" and self.block is not None:
            self.block.start = instant(entry.fields.get("interval/start"))
            self.block.seconds = number(entry.fields.get("interval/duration"))
            entry.blocks.append(self.block)
            self.block = None
        self.waiting.append(entry)
        element.clear()
        if len(self.found) + len(self.waiting) > MAX_ENTRIES:
            raise UnreadableBills(f"the file holds more than {MAX_ENTRIES:,} entries",
                                  where=self.name)  # fmt: skip

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


def _worst_quality(element: Element) -> int | None:
    """Of several marks of quality, the one that says most against the reading."""
    marks = [
        int(value)
        for node in element.iter(f"{{{ESPI}}}quality")
        if (value := number(node.text)) is not None and abs(value) < 1e6
    ]
    bad = (WEATHER_NORMALIZED, SUSPECT_QUALITY, *ESTIMATED_QUALITIES)
    return next((mark for mark in bad if mark in marks), marks[0] if marks else None)


def _leaves(element: Element, path: str) -> Iterator[tuple[str, str]]:
    """Text of every leaf below an element, the first of each name."""
    seen: set[str] = set()
    stack = [(child, "") for child in reversed(list(element))]
    while stack:
        node, above = stack.pop()
        space, name = _local(node.tag)
        if space != ESPI or name == "intervalreading":
            continue
        place = f"{above}/{name}" if above else name
        children = list(node)
        if children:
            stack.extend((child, place) for child in reversed(children))
        elif place not in seen:
            seen.add(place)
            yield place, (node.text or "").strip()[:MAX_TEXT]


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
