"""The bytes of a weather file: read once, fingerprinted, and turned into text."""

from __future__ import annotations

import hashlib
import re
import zlib
from dataclasses import dataclass
from pathlib import Path
from typing import Final

from normalize.errors import UnreadableWeather

MAX_BYTES: Final = 300 * 1024 * 1024  # 30 years of hourly rows are about 30 MB
HEAD_BYTES: Final = 64 * 1024  # what a recogniser may look at
MAX_NAME: Final = 80  # characters of a station's name that are kept

GZIP: Final = b"\x1f\x8b"  # how a compressed file begins

# What a file that is not text starts with, and what to do about it.
_NOT_TEXT: Final = (
    (b"PK\x03\x04", "is a workbook or a zip archive", "Save the table as CSV, or unpack it."),
    (b"%PDF", "is a PDF", "Download the data as CSV."),
    (b"\xd0\xcf\x11\xe0", "is an old Excel workbook", "Save the table as CSV."),
    (b"\x89HDF", "is a binary data file", "Export the daily temperatures as CSV."),
    (b"CDF", "is a binary data file", "Export the daily temperatures as CSV."),
)


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
    try:
        size = path.stat().st_size
        if path.is_dir():
            raise UnreadableWeather(
                "is a folder",
                where=path.name,
                wanted="one weather file",
                next_step="Name the file.",
            )
        if size > MAX_BYTES:
            raise UnreadableWeather(
                f"is {size / 1024**2:.0f} MB",
                where=path.name,
                wanted=f"at most {MAX_BYTES // 1024**2} MB",
                next_step="Keep the years and the columns that are needed.",
            )
        data = path.read_bytes()
    except FileNotFoundError:
        raise UnreadableWeather(
            "there is no such file", where=str(path), next_step="Check the name and the folder."
        ) from None
    except (OSError, ValueError) as err:
        raise UnreadableWeather(
            f"cannot be opened ({type(err).__name__})",
            where=path.name,
            next_step="Check that it is a readable file.",
        ) from None
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
    for magic, what, do in _NOT_TEXT:
        if data.startswith(magic):
            raise UnreadableWeather(f"the file {what}", where=name, wanted="text", next_step=do)


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
    if data.startswith((b"\xff\xfe", b"\xfe\xff")):
        return data.decode("utf-16", errors="replace")
    if b"\x00" in data:
        return _decode_nul(name, data)
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError:
        # Windows-1252 is what spreadsheets write; only the degree sign and names depend on it.
        return data.decode("cp1252", errors="replace")


def _decode_nul(name: str, data: bytes) -> str:
    """UTF-16 without a mark shows as a NUL in every other byte; anything else is not text."""
    sample = data[:4096]
    for start, codec in ((1, "utf-16-le"), (0, "utf-16-be")):
        every_other = sample[start::2]
        if every_other.count(0) > 0.9 * len(every_other):
            return data.decode(codec, errors="replace")
    raise UnreadableWeather(
        "holds NUL bytes, so it is damaged or not text",
        where=name,
        wanted="text (CSV)",
        next_step="Download it again or save it as CSV.",
    )


def clean_name(text: str) -> str:
    """A station's name fit to print: one line, no control characters, not too long.

    >>> clean_name("  HARROW  VALLEY\\n AIRPORT ")
    'HARROW VALLEY AIRPORT'
    """
    printable = "".join(c if c.isprintable() else " " for c in text)
    return " ".join(printable.split())[:MAX_NAME]
