"""The bytes of a weather file: read once, fingerprinted, and turned into text."""

from __future__ import annotations

import hashlib
import re
import zlib
from dataclasses import dataclass
from pathlib import Path
from typing import Final

from normalize.errors import UnreadableWeather
from normalize.text_files import GZIP, WORKBOOK, encoding_of, kind_of, read_bytes

MAX_BYTES: Final = 300 * 1024 * 1024  # 30 years of hourly rows are about 30 MB
HEAD_BYTES: Final = 64 * 1024  # what a recogniser may look at
MAX_NAME: Final = 80  # characters of a station's name that are kept

_CSV: Final = "Save the table, or download the data, as CSV."


@dataclass(frozen=True, slots=True)
class SourceFile:
    """A weather file's bytes, unpacked. name : without folders; sha256 : of the file as it is."""

    path: Path
    data: bytes
    sha256: str

    @property
    def name(self) -> str:
        """The file's name, without its folder."""
        return self.path.name

    @property
    def head(self) -> bytes:
        """The beginning, for recognisers."""
        return self.data[:HEAD_BYTES]

    @property
    def fingerprint(self) -> tuple[tuple[str, str], ...]:
        """What a result says of its input: (file name, SHA-256)."""
        return ((self.name, self.sha256),)


def read_source(path: str | Path) -> SourceFile:
    """Read a file's bytes; UnreadableWeather when there is no readable text in it."""
    path = Path(path)
    data = read_bytes(
        path, most=MAX_BYTES, wanted="a weather file", error=UnreadableWeather,
        missing=UnreadableWeather,
    )  # fmt: skip
    sha256 = hashlib.sha256(data).hexdigest()
    if data.startswith(GZIP):
        data = unpacked(data, path.name)
    _refuse_empty_or_binary(path.name, data)
    return SourceFile(path=path, data=data, sha256=sha256)


def unpacked(data: bytes, name: str) -> bytes:
    """What a gzip file holds; UnreadableWeather when it is torn or swells beyond the limit.

    >>> import gzip
    >>> unpacked(gzip.compress(b"date,mean_f"), "a.csv.gz")
    b'date,mean_f'
    """
    parts, size, rest = [], 0, data
    try:
        while rest.startswith(GZIP):  # archives may be several gzip files on end
            unpacker = zlib.decompressobj(wbits=31)
            parts.append(unpacker.decompress(rest, MAX_BYTES + 1 - size))
            size += len(parts[-1])
            if size > MAX_BYTES:
                raise UnreadableWeather(
                    f"unpacks to more than {MAX_BYTES // 1024**2} MB",
                    where=name,
                    next_step="Unpack it and keep the years that are needed.",
                )
            if not unpacker.eof:
                raise _torn_gzip(name)
            rest = unpacker.unused_data
    except zlib.error:
        raise _torn_gzip(name) from None
    return b"".join(parts)


def _torn_gzip(name: str) -> UnreadableWeather:
    return UnreadableWeather(
        "is compressed (gzip) and cut off or damaged",
        where=name,
        wanted="the whole file",
        next_step="Download it again.",
    )


def _refuse_empty_or_binary(name: str, data: bytes) -> None:
    if not data.strip(b"\x00\t\r\n \xef\xbb\xbf"):
        raise UnreadableWeather(
            "the file is empty",
            where=name,
            wanted="a table of daily or hourly temperatures",
            next_step="Download it again.",
        )
    what = "a workbook or a zip archive" if data.startswith(WORKBOOK) else kind_of(data)
    if what:
        cure = "Save the table as CSV, or unpack it." if data.startswith(WORKBOOK) else _CSV
        raise UnreadableWeather(f"the file is {what}", where=name, wanted="text", next_step=cure)


def decode(source: SourceFile) -> str:
    """The file as text: UTF-8 or UTF-16 (with or without a mark), else Windows-1252.

    Raises UnreadableWeather for binary data and for web pages saved in place of data.
    """
    text = _decode(source.name, source.data)
    if re.match(r"\s*<(!doctype\s+html|html|\?xml)", text[:500], re.IGNORECASE):
        raise UnreadableWeather(
            "holds a web page rather than data",
            where=source.name,
            wanted="a table of temperatures as text (CSV)",
            next_step="Download the data itself.",
        )
    return text


def _decode(name: str, data: bytes) -> str:
    encoding = encoding_of(data)
    if b"\x00" in data and not encoding.startswith("utf-16"):
        raise UnreadableWeather(
            "holds NUL bytes, so it is damaged or not text",
            where=name,
            wanted="text (CSV)",
            next_step="Download it again or save it as CSV.",
        )
    return data.decode(encoding, errors="replace")


def clean_name(text: str) -> str:
    """A station's name fit to print: one line, no control characters, not too long.

    >>> clean_name("  HARROW  VALLEY\\n AIRPORT ")
    'HARROW VALLEY AIRPORT'
    """
    printable = "".join(c if c.isprintable() else " " for c in text)
    return " ".join(printable.split())[:MAX_NAME]
