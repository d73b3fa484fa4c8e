"""Small turns of phrase shared by the weather room's notes and messages."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import Final

MAX_LISTED: Final = 5  # lines, gaps or names that a sentence lists before "and n more"


def counted(n: int, noun: str, plural: str = "") -> str:
    """A number with its noun.

    >>> counted(1, "day"), counted(3, "day")
    ('1 day', '3 days')
    """
    return f"{n} {noun}" if n == 1 else f"{n} {plural or noun + 's'}"


def listed(items: Iterable[object]) -> str:
    """The first few of a list, and how many more there are.

    >>> listed([4, 7, 9])
    '4, 7, 9'
    >>> listed(range(8))
    '0, 1, 2, 3, 4 and 3 more'
    """
    texts = [str(item) for item in items]
    shown = ", ".join(texts[:MAX_LISTED])
    more = len(texts) - MAX_LISTED
    return f"{shown} and {more} more" if more > 0 else shown


def at_lines(lines: Sequence[int]) -> str:
    """Where in the file, in brackets.

    >>> at_lines([4]), at_lines([4, 7])
    ('(line 4)', '(lines 4, 7)')
    """
    return f"({'line' if len(lines) == 1 else 'lines'} {listed(lines)})"


def counts(n: int) -> str:
    """The verb that goes with a count, in the present: "counts" or "count"."""
    return "counts" if n == 1 else "count"


def was(n: int) -> str:
    """The verb that goes with a count."""
    return "was" if n == 1 else "were"
