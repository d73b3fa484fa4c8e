"""Cook's distances at which one bill is worth a look, and at which it moves a fit a lot."""

from __future__ import annotations

from typing import Final

LOOK_COOK: Final = 4.0  # over this ÷ n is worth a look (common practice, no source)
STRONG_COOK: Final = 1.0  # over this one bill moves the fit a lot: Cook & Weisberg 1982 (memory)
