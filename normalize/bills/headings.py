"""Headings of columns, taken apart and scored against the vocabulary.

What belongs here: one heading to its words, unit and possible roles; one line to how much it
looks like a header.  Which column is used for what is decided in columns.py.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache

from normalize.bills.amounts import as_text
from normalize.bills.table import Cell
from normalize.bills.vocabulary import COMPOUNDS, WORDS
from normalize.units import is_unit

_PHRASES = tuple((role, tuple(phrase.split()), weight) for role, phrase, weight in WORDS)
_STARTS = {"start", "from", "begin", "beginning", "previous", "prior"}
_ENDS = {"end", "to", "thru", "through", "current", "present", "ending"}
_FUEL_WORDS = {
    "gas": "natural gas", "electric": "electricity", "electricity": "electricity",
    "elec": "electricity", "oil": "heating oil", "propane": "propane", "kerosene": "kerosene",
    "pellets": "pellets", "wood": "wood", "steam": "district steam",
}  # fmt: skip
# Words of the vocabulary are no units, and only these begin a unit of several words; asking
# units.py about every other word would cost a search for the nearest known unit each time.
_NO_UNITS = {w for _, phrase, _ in WORDS for w in phrase.split()}
_UNIT_STARTS = {
    "cubic", "cu", "short", "metric", "imp", "imperial", "us", "uk", "watt", "kilowatt",
    "thousand", "million", "hundred", "100", "1000", "full", "face", "deca", "deka", "ft",
}  # fmt: skip
_BRACKETS = re.compile(r"[(\[]([^)\]]*)[)\]]")
_CAMEL = re.compile(r"(?<=[a-z])(?=[A-Z][a-z])")
_LETTERS = re.compile(r"[^\W\d_]+\d?")
_PER_DAY = re.compile(r"(?:/|\bper\b)\s*d(?:ay)?\b|\bdaily\b|\ba day\b", re.IGNORECASE)
_PER_OTHER = re.compile(r"/|\bper\b", re.IGNORECASE)
_WORD = re.compile(r"[^\W_]+|[$%°#]")
_DATES = {"start", "end", "read", "range", "delivery", "bill date", "month", "time"}
_AMOUNTS = {"usage", "register", "cost"}
MIN_SCORE = 4.0  # below this a word in a longer heading says nothing (our own, no source)


@dataclass(frozen=True, slots=True)
class Heading:
    """One heading. text : as written, short.  words : without the unit, lower case.
    unit : as written, "" if none.  per_day : a rate, not an amount.  hints : in brackets.
    fuel : that its words name, or "".
    """

    text: str
    words: tuple[str, ...]
    unit: str
    per_day: bool
    hints: tuple[str, ...]
    fuel: str
    price: bool = False

    @property
    def role(self) -> str:
        """The likeliest role, "" if none."""
        found = roles_of(self)
        return max(found, key=lambda r: found[r]) if found else ""

    @property
    def score(self) -> float:
        """How strongly the likeliest role is suggested."""
        return max(roles_of(self).values(), default=0.0)


def known_unit(text: str) -> bool:
    """Whether the text is a unit, or a word that the trade uses for two units."""
    # A unit with two meanings is still a unit: the question is asked when it is used.
    return bool(text) and len(text) <= 25 and is_unit(text)


@lru_cache(maxsize=4096)
def take_apart(text: str) -> Heading:
    """A heading as words, unit and hints.

    >>> h = take_apart("Usage (kWh)")
    >>> h.words, h.unit, h.role
    (('usage',), 'kWh', 'usage')
    >>> take_apart("thermsPerDay").per_day
    True
    """
    hints = tuple(h.strip() for h in _BRACKETS.findall(text) if h.strip())
    bare = _BRACKETS.sub(" ", text)
    pieces = []
    for word in re.split(r"[\s_]+", bare):
        joined = COMPOUNDS.get(re.sub(r"[^a-z]", "", word.lower()))
        pieces.append(joined or _LETTERS.sub(_uncamel, word))
    spaced = " ".join(pieces)
    per_day = bool(_PER_DAY.search(spaced)) or any(_PER_DAY.search(h) for h in hints)
    plain = _PER_DAY.sub(" ", spaced)
    words = [_plain_word(w) for w in _WORD.findall(plain.lower())]
    words, unit = _without_unit(words)
    for hint in hints:
        cut = _PER_DAY.sub("", hint).strip()
        if not unit and known_unit(cut):
            unit = cut
    if per_day:
        words = [w for w in words if w not in ("average", "avg", "mean")] or words
    fuel = next((_FUEL_WORDS[w] for w in words if w in _FUEL_WORDS), "")
    price = bool(unit) and bool(_PER_OTHER.search(plain)) and not per_day
    shown = text if len(text) <= 40 else text[:39] + "…"
    return Heading(shown, tuple(words), unit, per_day, tuple(h.lower() for h in hints), fuel, price)


def _uncamel(found: re.Match[str]) -> str:
    """thermsPerDay as three words, kWh as it is."""
    parts = _CAMEL.sub(" ", found[0])
    return found[0] if parts != found[0] and known_unit(found[0]) else parts


def _plain_word(word: str) -> str:
    return {"#": "number", "no": "no", "nr": "no", "num": "num"}.get(word, word)


def _without_unit(words: list[str]) -> tuple[list[str], str]:
    """Words without the first run that names a unit.  Single letters name none here, and
    neither do words with another use in headings.
    """
    for size in (3, 2, 1):
        for k in range(len(words) - size + 1):
            run = "".join(words[k : k + size])
            if len(run) < 2 or run in ("unit", "units", "th", "dt", "ton", "tons", "mm", "kw"):
                continue
            if words[k] in _NO_UNITS if size == 1 else words[k] not in _UNIT_STARTS:
                continue
            if known_unit(run):
                return words[:k] + words[k + size :], " ".join(words[k : k + size])
    return words, ""


@lru_cache(maxsize=4096)
def roles_of(heading: Heading) -> dict[str, float]:
    """Role → score of a heading; the table is vocabulary.WORDS."""
    words = heading.words
    found: dict[str, float] = {}
    for role, phrase, weight in _PHRASES:
        size = len(phrase)
        places = range(len(words) - size + 1)
        if any(words[k : k + size] == phrase for k in places):
            score = weight + size - (len(words) - size)
            if score >= MIN_SCORE:
                found[role] = max(found.get(role, 0.0), score)
    if heading.unit:
        found["usage"] = max(found.get("usage", 0.0), 11.0 if not words else 8.5)
    about_time = {"date", "read", "reading", "period", "day", "service"} & set(words)
    if about_time and not {"meter", "kwh"} & set(words) - {"meter"}:
        if _STARTS & set(words) and "date" in words:
            found["start"] = 14.0
        elif _ENDS & set(words) and "date" in words:
            found["end"] = 14.0
    if heading.price:
        found["ignore"] = 20.0
    return found


def header_score(cells: Sequence[Cell], names: frozenset[str] = frozenset()) -> float:
    """How much a line looks like the header of a bill table; 0 when it does not at all.

    names : headings that the user named, squeezed; each found counts heavily.
    """
    best: dict[str, float] = {}
    numbers, named = 0, 0
    for cell in cells:
        text = as_text(cell)
        if not text:
            continue
        if squeeze(text) in names:
            named += 1
        if not isinstance(cell, str) or not any(c.isalpha() or c == "$" for c in text):
            numbers += 1
        elif len(text) <= 80:
            heading = take_apart(text)
            if heading.role:
                best[heading.role] = max(best.get(heading.role, 0.0), heading.score)
    useful = sum(v for role, v in best.items() if role not in ("ignore", "private"))
    score = useful + 0.5 * (len(best) > 1) - 6.0 * numbers
    if not (_DATES & set(best) and _AMOUNTS & set(best)):
        score *= 0.25
    return max(0.0, score) + 30.0 * named


def squeeze(text: object) -> str:
    """A heading for comparing: lower case, letters and digits only."""
    return _squeezed(text) if isinstance(text, str) else _squeezed(as_text(text))


@lru_cache(maxsize=50_000)
def _squeezed(text: str) -> str:
    return "".join(c for c in as_text(text).lower() if c.isalnum() or c in "$%")
