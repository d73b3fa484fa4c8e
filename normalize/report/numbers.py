"""Numbers, dates and names as a reader sees them: US English, no locale, nothing computed.

Sentences carry two significant digits, tables carry full digits.  Every user string passes
through ``clean`` (no control characters, no direction overrides) and, unless accounts are to
be shown, through ``mask``.
"""

from __future__ import annotations

import math
import re
import unicodedata
from typing import Final

from normalize.days import date_of, iso

NBSP: Final = "\u00a0"
MINUS: Final = "\u2212"
NDASH: Final = "\u2013"
UNKNOWN: Final = NDASH  # what a table shows where a number is not known

MONTHS: Final = (
    "January", "February", "March", "April", "May", "June", "July", "August", "September",
    "October", "November", "December",
)  # fmt: skip

MIN_MASKED_DIGITS: Final = 6  # shorter runs are house numbers, years and amounts
MIN_MASKED_GROUPED: Final = 8  # in groups ("1234-5678"); shorter ones name standards ("14-2014")
SHOWN_DIGITS: Final = 4  # enough to tell one's own accounts apart (common practice, no source)
MAX_NAME: Final = 200  # a longer name is cut; nobody reads it and it can break a page
MAX_TEXT: Final = 2000  # so is a sentence

_DIGITS = re.compile(
    r"\b(?:US[1CRSW]|CA[01N])\d{8}\b"  # a public weather station's identifier: kept
    r"|\d{4}-\d{2}-\d{2}(?!\d)"  # a date: kept
    r"|\d{1,3}(?:,\d{3})+(?:\.\d+)?"  # an amount with separators: kept
    r"|\d+\.\d+"  # an amount with decimals: kept
    r"|\d(?:[ \-]?\d)+"
)
_DATES = re.compile(
    r"\d{4}-\d{2}-\d{2}"
    r"|(19|20)\d\d(0[1-9]|1[0-2])(0[1-9]|[12]\d|3[01])"  # without hyphens
    r"|(19|20)\d\d[- ](19|20)\d\d"  # from year to year
)
_BIDI = frozenset("\u061c\u200e\u200f\u202a\u202b\u202c\u202d\u202e\u2066\u2067\u2068\u2069")

CURRENCY_SIGNS: Final = {"USD": "$", "EUR": "€", "GBP": "£"}

_ASCII = str.maketrans(
    {
        NBSP: " ", MINUS: "-", NDASH: "-", "\u2014": "-", "\u2018": "'", "\u2019": "'",
        "\u201c": '"', "\u201d": '"', "\u2026": "...", "×": "x", "±": "+/-", "°": " deg ",
        "·": "*", "≥": ">=", "≤": "<=", "²": "^2", "₂": "2", "⁺": "+", "τ": "tau",
        "ρ": "rho", "§": "section ", "€": "EUR ", "£": "GBP ", "÷": "/", "Σ": "sum of",
        "½": "1/2", "⅓": "1/3",
    }
)  # fmt: skip


def clean(text: str) -> str:
    """User text without control characters, line breaks, direction overrides, half characters.

    >>> clean("gas\\x1b[31m\\u202e bills\\n2")
    'gas[31m bills 2'
    """
    kept = []
    for char in text[:MAX_TEXT]:
        kind = unicodedata.category(char)
        if char in "\t\n\r" or kind in ("Zl", "Zp"):
            kept.append(" ")
        elif kind == "Cs":
            kept.append("\ufffd")
        elif kind != "Cc" and char not in _BIDI:
            kept.append(char)
    return " ".join("".join(kept).split(" ")).strip()


def name(text: str) -> str:
    """A cleaned name of reasonable length.

    >>> len(name("x" * 5000))
    200
    """
    text = clean(text)
    return text if len(text) <= MAX_NAME else text[: MAX_NAME - 1] + "\u2026"


def mask(text: str) -> str:
    """Long runs of digits (account and meter numbers) cut to their last four.

    Dates and amounts stay.

    >>> mask("gas_0012345678.csv")
    'gas_…5678.csv'
    >>> mask("12 Quince Street, read 2023-09-11, 20230911")
    '12 Quince Street, read 2023-09-11, 20230911'
    >>> mask("station USW00094765, account ACW00094765")
    'station USW00094765, account ACW…4765'
    """
    return _DIGITS.sub(_masked, text)


def _masked(match: re.Match[str]) -> str:
    text = match.group()
    if text[0].isalpha():
        return text
    digits = "".join(c for c in text if c.isdigit())
    least = MIN_MASKED_DIGITS if digits == text else MIN_MASKED_GROUPED
    if "," in text or "." in text or len(digits) < least or _DATES.fullmatch(text):
        return text
    return f"\u2026{digits[-SHOWN_DIGITS:]}"


def to_ascii(text: str) -> str:
    """Text for a terminal that cannot show more; nothing is lost in silence.

    >>> to_ascii("18\\u00a0% less, \\u22122 °F, \\u05d0")
    '18 % less, -2 deg F, \\\\u05d0'
    """
    plain = text.translate(_ASCII).replace("  deg ", " deg ")
    return plain.encode("ascii", "backslashreplace").decode("ascii")


def known(value: float | None) -> bool:
    """Whether there is a finite number.

    >>> known(float("nan")), known(None), known(0.0)
    (False, False, True)
    """
    return value is not None and math.isfinite(value)


def significant(value: float | None, digits: int = 2) -> str:
    """A number for a sentence: so many significant digits, thousands separated.

    >>> significant(1234.5), significant(0.0713), significant(-5.25), significant(99.6)
    ('1,200', '0.071', '−5.2', '100')
    """
    if value is None or not math.isfinite(value):
        return UNKNOWN
    if value == 0.0:
        return "0"
    size = abs(value)
    rounded = float(f"{size:.{digits - 1}e}")
    exponent = math.floor(math.log10(rounded)) if rounded > 0 else 0
    if exponent > 15 or exponent < -6:
        text = f"{rounded:.{digits - 1}e}"
    else:
        text = f"{rounded:,.{max(digits - 1 - exponent, 0)}f}"
    return (MINUS if value < 0 else "") + text


def plain(value: float | None, decimals: int = 2) -> str:
    """A number for a table: fixed decimals, thousands separated.

    >>> plain(1234.5), plain(-0.001), plain(None)
    ('1,234.50', '0.00', '–')
    """
    if value is None or not math.isfinite(value):
        return UNKNOWN
    text = f"{value:,.{decimals}f}" if abs(value) < 1e15 else f"{value:.6e}"
    if text.startswith("-"):
        text = text[1:] if float(text.replace(",", "")) == 0.0 else MINUS + text[1:]
    return text


def full(value: float | None) -> str:
    """A coefficient for a table: six significant digits.

    >>> full(0.1213456789), full(812.40001), full(1234567.0), full(-1.2e-16)
    ('0.121346', '812.400', '1,234,567', '−1.20000e-16')
    """
    if value is None or not math.isfinite(value):
        return UNKNOWN
    size = abs(value)
    if size != 0.0 and not 1e-4 <= size < 1e12:
        text = f"{size:.5e}"
    else:
        whole = len(str(int(size))) if size >= 1.0 else 0
        text = f"{size:,.{min(max(6 - whole, 0), 6)}f}"
    return (MINUS if value < 0 else "") + text


def short(value: float | None) -> str:
    """A coefficient inside an equation: four significant digits, no trailing zeros.

    >>> short(0.61), short(1234.56), short(-0.09412)
    ('0.61', '1,235', '−0.09412')
    """
    text = significant(value, 4)
    if "." in text and "e" not in text:
        text = text.rstrip("0").rstrip(".")
    return text


def percent(fraction: float | None, digits: int = 2) -> str:
    """A fraction as percent for a sentence.

    >>> percent(0.186)
    '19\\xa0%'
    """
    if fraction is None or not math.isfinite(fraction):
        return UNKNOWN
    return f"{significant(100.0 * fraction, digits)}{NBSP}%"


def percent_plain(fraction: float | None, decimals: int = 1) -> str:
    """A fraction as percent for a table.

    >>> percent_plain(0.0713)
    '7.1\\xa0%'
    """
    if fraction is None or not math.isfinite(fraction):
        return UNKNOWN
    return f"{plain(100.0 * fraction, decimals)}{NBSP}%"


def money(value: float | None, currency: str, digits: int = 2) -> str:
    """An amount of money for a sentence: significant digits, cents in pairs.

    >>> money(216.7, "USD"), money(3.61, "USD"), money(1354.0, "CAD")
    ('$220', '$3.60', '1,400\\xa0CAD')
    """
    text = significant(value, digits)
    whole, point, cents = text.partition(".")
    if point and len(cents) == 1:
        text = f"{whole}.{cents}0"
    return _with_currency(text, currency)


def price(value: float | None, currency: str) -> str:
    """A price of one unit: at least cents, four significant digits below one.

    >>> price(1.32, "USD"), price(0.1714, "USD")
    ('$1.32', '$0.1714')
    """
    if value is None or not math.isfinite(value):
        return UNKNOWN
    text = plain(value, 2)
    if abs(value) < 1.0 and abs(value - round(value, 2)) > 1e-9:
        text = plain(value, 4).rstrip("0")
    return _with_currency(text, currency)


def amount(value: float | None, currency: str) -> str:
    """An amount of money in full.

    >>> amount(4150.0, "USD"), amount(0.5, "USD")
    ('$4,150', '$0.50')
    """
    return _with_currency(plain(value, 2).removesuffix(".00"), currency)


def _with_currency(text: str, currency: str) -> str:
    sign = CURRENCY_SIGNS.get(currency)
    if sign is None:
        return f"{text}{NBSP}{name(currency)}"
    return f"{MINUS}{sign}{text[1:]}" if text.startswith(MINUS) else f"{sign}{text}"


def long_date(day: int | None) -> str:
    """A day for a sentence.

    >>> long_date(19000)
    'January\\xa08, 2022'
    """
    if day is None:
        return UNKNOWN
    when = date_of(day)
    return f"{MONTHS[when.month - 1]}{NBSP}{when.day}, {when.year}"


def span(start: int | None, end: int | None) -> str:
    """A half-open stretch of days for a sentence, with its last day named.

    >>> span(19000, 19010)
    'January\\xa08, 2022 to January\\xa017, 2022'
    >>> span(19000, 19001)
    'January\\xa08, 2022'
    """
    if start is None or end is None:
        return UNKNOWN
    if end - 1 <= start:
        return long_date(start)
    return f"{long_date(start)} to {long_date(end - 1)}"


def short_date(day: int | None) -> str:
    """A day for a table.

    >>> short_date(19000)
    '2022-01-08'
    """
    return UNKNOWN if day is None else iso(day)
