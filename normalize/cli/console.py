"""What every command needs of the console: streams that never fail, words about waiting."""

from __future__ import annotations

import codecs
import sys
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
    "°": " deg ",
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


def say(message: str) -> None:
    """One line to the person, apart from the results: on stderr."""
    import click

    click.echo(f"normalize: {message}", err=True)


def say_if_preparing() -> None:
    """Before the first compilation, say why this run takes longer."""
    from normalize.jit import kernels_are_ready

    if not kernels_are_ready():
        say("preparing the calculation for this computer, once; later runs start at once …")
