"""Small tables in plain text."""

from __future__ import annotations

import unicodedata
from collections.abc import Sequence
from textwrap import wrap


def table(head: Sequence[str], rows: Sequence[Sequence[str]], *, left: int = 1) -> str:
    """Columns of text under a head; the first ``left`` columns are set left, the others right.

    >>> print(table(["year", "HDD"], [["2021", "5878"], ["2022", "612"]]))
    year   HDD
    ----  ----
    2021  5878
    2022   612
    """
    lines = [list(head), *(list(row) for row in rows)]
    widths = [max(_width(line[i]) for line in lines) for i in range(len(head))]
    lines.insert(1, ["-" * width for width in widths])
    return "\n".join(
        "  ".join(
            cell + pad if i < left else pad + cell
            for i, cell in enumerate(line)
            for pad in [" " * (widths[i] - _width(cell))]
        ).rstrip()
        for line in lines
    )


def paragraph(text: str, *, width: int = 88, indent: str = "") -> str:
    """Text in lines of at most that width.

    >>> paragraph("one two three", width=8)
    'one two\\nthree'
    """
    return "\n".join(wrap(text, width, initial_indent=indent, subsequent_indent=indent))


def _width(text: str) -> int:
    wide = sum(unicodedata.east_asian_width(letter) in "WF" for letter in text)
    joined = sum(unicodedata.combining(letter) > 0 for letter in text)
    return len(text) + wide - joined
