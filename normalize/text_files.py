"""Files from a stranger: their bytes, of a sane size, and their text in whatever encoding.

What belongs here: what bills and weather share in opening a file.  Which files each reads, how
large they may be and what is said of the others is decided in either room.
"""

from __future__ import annotations

import os
import stat
from collections.abc import Sequence
from pathlib import Path

from normalize.errors import MissingFile, NormalizeError

UTF16_MARKS = (b"\xff\xfe", b"\xfe\xff")
SAMPLE = 4096  # bytes by which UTF-16 without a mark is known
ZEROS = 0.4  # of every other byte of it: Western text has nearly all, a table of names fewer

# (how a file begins, what it then is): what people save in place of a table.
WORKBOOK, GZIP = b"PK\x03\x04", b"\x1f\x8b"
NO_TEXT: tuple[tuple[bytes, str], ...] = (
    (b"\xd0\xcf\x11\xe0", "an old Excel workbook (.xls)"),
    (b"%PDF", "a PDF"),
    (b"\x89PNG", "a picture"),
    (b"\xff\xd8\xff", "a picture"),
    (b"\x89HDF", "a binary data file"),
    (b"CDF", "a binary data file"),
)


def read_bytes(
    path: str | os.PathLike[str],
    *,
    most: int,
    wanted: str,
    error: type[NormalizeError],
    missing: type[NormalizeError] = MissingFile,
) -> bytes:
    """The bytes of an ordinary file.  Raises ``missing`` or ``error``.

    most : bytes it may have.  wanted : what it should be, for the messages.
    """
    file = Path(path)
    try:
        info = file.stat()
        if stat.S_ISDIR(info.st_mode):
            raise error("this is a folder", where=file.name, wanted=f"one file: {wanted}",
                        next_step="Name the file.")  # fmt: skip
        if not stat.S_ISREG(info.st_mode):
            raise error("this is not an ordinary file", where=file.name)
        if info.st_size > most:
            raise error(
                f"the file has {info.st_size / 1e6:,.0f} MB",
                where=file.name,
                wanted=f"at most {most / 1e6:.0f} MB",
                next_step=f"Check that it is {wanted}; else keep the years and columns needed.",
            )
        data = file.read_bytes()
    except FileNotFoundError:
        raise missing(
            "there is no such file", where=file.name, next_step="Check the name and the folder."
        ) from None
    except (OSError, ValueError) as err:  # ValueError: a NUL in the path
        reason = err.strerror if isinstance(err, OSError) and err.strerror else "its name is odd"
        raise error(f"the file cannot be opened ({reason})", where=file.name) from None
    if not data.strip(b"\0\t\r\n \xef\xbb\xbf"):
        raise error("the file is empty", where=file.name, wanted=wanted)
    return data


def kind_of(data: bytes, kinds: Sequence[tuple[bytes, str]] = NO_TEXT) -> str:
    """What a file that is no text is, by how it begins; "" for anything else.

    >>> kind_of(b"%PDF-1.7"), kind_of(b"Start,End")
    ('a PDF', '')
    """
    return next((what for magic, what in kinds if data.startswith(magic)), "")


def encoding_of(data: bytes) -> str:
    """The encoding of text: by its mark, UTF-16 without one, UTF-8, else Windows-1252.

    Windows-1252 is what spreadsheets write; only names and money or degree signs depend on it.

    >>> encoding_of("Preis €".encode("cp1252")), encoding_of("Use".encode("utf-16-le") * 9)
    ('cp1252', 'utf-16-le')
    """
    if data.startswith(UTF16_MARKS):
        return "utf-16"
    sample = data[:SAMPLE]
    if b"\0" in sample and len(sample) > 8:
        for start, codec in ((1, "utf-16-le"), (0, "utf-16-be")):
            every_other = sample[start::2]
            if every_other.count(0) > ZEROS * len(every_other):
                return codec
    if data.isascii():
        return "ascii"
    try:
        data.decode("utf-8-sig")
    except UnicodeDecodeError:
        return "cp1252"
    return "utf-8-sig"


def decoded(data: bytes) -> str:
    """The text of a file; bytes that its encoding does not have become U+FFFD.

    >>> decoded("Bôlâns\\n".encode("utf-8-sig"))
    'Bôlâns\\n'
    """
    return data.decode(encoding_of(data), errors="replace")
