"""What every command needs of the console: streams that never fail, words about waiting."""

from __future__ import annotations

import codecs
import re
import shutil
import sys
import threading
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from typing import Final

# What a console without Unicode shows instead; anything else becomes "?".
_PLAIN: Final = {
    "–": "-",
    "—": "-",
    "−": "-",
    "‑": "-",
    "’": "'",
    "‘": "'",
    "“": '"',
    "”": '"',
    "…": "...",
    "·": ".",
    "×": "x",
    "÷": "/",
    "±": "+/-",
    "≤": "<=",
    "≥": ">=",
    "≈": "~",
    "→": "->",
    "°": "deg ",
    "²": "2",
    "₂": "2",
    "³": "3",
    "½": "1/2",
    "τ": "tau",
    "ρ": "rho",
    "\u00a0": " ",
    "\u202f": " ",
    "\u2009": " ",
}

SLOW_SECONDS: Final = 5.0  # a warm run is done by then
SOON_SECONDS: Final = 1.0
PREPARING: Final = (
    "preparing the calculation for this computer, once: a few minutes. Later runs take seconds."
)
STILL_WORKING: Final = "still working."
_SPACES: Final = frozenset("\n\u00a0\u202f\u2009")


def _in_plain_letters(error: UnicodeError) -> tuple[str, int]:
    if not isinstance(error, UnicodeEncodeError):
        raise error
    text = error.object[error.start : error.end]
    return "".join(_PLAIN.get(letter, "?") for letter in text), error.end


def forgiving_streams() -> None:
    """Let no character end a command: what the console cannot show is written plainly."""
    codecs.register_error("normalize_plain", _in_plain_letters)
    for stream in (sys.stdout, sys.stderr):
        reconfigure = getattr(stream, "reconfigure", None)
        if reconfigure is not None:
            reconfigure(errors="normalize_plain")


def console_width() -> int:
    """Characters a line: the terminal's, up to 100; 80 where the output goes elsewhere."""
    if not sys.stdout.isatty():
        return 80
    return max(40, min(100, shutil.get_terminal_size().columns))


def only_ascii() -> bool:
    """Whether stdout cannot carry more than plain letters."""
    try:
        "°−–τ²".encode(sys.stdout.encoding or "utf-8")
    except (UnicodeEncodeError, LookupError):
        return True
    return False


def show(text: str) -> None:
    """A result, on stdout.  (click's own echo sends UTF-8 even to a console without it.)"""
    sys.stdout.write(harmless(text) + "\n")
    sys.stdout.flush()


def say(message: str) -> None:
    """One line to the person, apart from the results: on stderr."""
    sys.stderr.write(f"normalize: {harmless(message)}\n")
    sys.stderr.flush()


def harmless(text: str) -> str:
    """Text from a file as a console may show it: no escape codes, no tricks with direction.

    >>> harmless("a\\x1b[31mb")
    'a?[31mb'
    """
    return "".join(c if c.isprintable() or c in _SPACES else "?" for c in text)


def private(text: str, *, known: Sequence[str]) -> str:
    """A message with long numbers masked, as they may be account numbers.

    known : words that the person has just typed, which may be shown.

    >>> private("a/12345678.csv: line 7 of 987654321", known=["a/12345678.csv"])
    'a/12345678.csv: line 7 of …4321'
    """
    from normalize.report.numbers import mask

    typed = [word for word in known if word and word in text]
    # Longest first: one word may stand within another.
    split = "|".join(re.escape(word) for word in sorted(typed, key=len, reverse=True))
    if not split:
        return mask(text)
    parts = re.split(f"({split})", text)
    return "".join(part if i % 2 else mask(part) for i, part in enumerate(parts))


@contextmanager
def patience() -> Iterator[None]:
    """Around a calculation: say why it takes long, if it does.

    The first run compiles the calculation for this computer, which takes minutes.
    """
    from normalize.jit import kernels_are_ready

    # Said only once it takes long: a file that cannot be read is told at once, and alone.
    ready = kernels_are_ready()
    later = threading.Timer(
        SLOW_SECONDS if ready else SOON_SECONDS, say, [STILL_WORKING if ready else PREPARING]
    )
    later.daemon = True  # never keeps a finished or interrupted command alive
    later.start()
    try:
        yield
    finally:
        later.cancel()
