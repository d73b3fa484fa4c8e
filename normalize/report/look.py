"""The tokens of the look: one set of colours and marks for figures and pages.

Colour never speaks alone: before is open circles and dashed lines, after is filled diamonds
and solid lines, what would have been used is dotted, left out is a small cross, an estimated
reading is open with a bar.
"""

from __future__ import annotations

from typing import Final

PAPER: Final = "#fbfaf6"
INK: Final = "#1d2a2f"
QUIET: Final = "#5c666a"
RULE: Final = "#d8d4c8"
BEFORE: Final = "#35597c"
AFTER: Final = "#9a5b12"
WEATHER: Final = "#6f3b63"
CARE: Final = "#a0331f"

# token → (light, dark).  Contrast on paper: ink 14 : 1, quiet ≥ 5 : 1, before ≥ 6.5 : 1,
# after ≥ 5 : 1.
TOKENS: Final[dict[str, tuple[str, str]]] = {
    "paper": (PAPER, "#14191b"),
    "ink": (INK, "#e9e5da"),
    "quiet": (QUIET, "#a3aaab"),
    "rule": (RULE, "#39413f"),
    "before": (BEFORE, "#8db4d8"),
    "after": (AFTER, "#e2a64a"),
    "weather": (WEATHER, "#cf9ac2"),
    "care": (CARE, "#f08a72"),
}

DASHES: Final = (0, (6.0, 3.0))  # before
DOTS: Final = (0, (1.2, 2.4))  # what would have been used

SERIF: Final = 'Charter, "Bitstream Charter", "Iowan Old Style", Georgia, Cambria, serif'

WIDTH: Final = 680.0  # a figure's width in px, equal to the column of text
TITLE_SIZE: Final = 16.0
TEXT_SIZE: Final = 12.5
SMALL_SIZE: Final = 11.5
