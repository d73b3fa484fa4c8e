"""Numbers as people write them on bills: thousands, decimal commas, brackets, money signs.

What belongs here: one cell to one number, and which decimal mark a whole file uses.
"""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Iterable
from dataclasses import dataclass
from functools import lru_cache
from typing import Literal

from normalize.errors import AmbiguousBills

Decimal = Literal["point", "comma"]

_BLANK = {"", "-", "--", "---", "n/a", "na", "nan", "none", "null", "#n/a", "nil", "missing", "?"}
_MONEY = re.compile(r"[$€£¥₹]|\b(?:usd|cad|eur|gbp|aud|nzd|chf)\b", re.IGNORECASE)
_SHAPE = re.compile(
    r"^(?P<open>\()?\s*(?P<sign>[+-]?)\s*(?P<body>\d[\d.,' ]*|[.,]\d+)"
    r"(?P<power>[eE][+-]?\d{1,3})?\s*(?P<minus>-)?\s*(?P<close>\))?"
    r"\s*(?P<rest>[^\d\s][^\d]{0,20}\d?)?$"
)


@dataclass(frozen=True, slots=True)
class Amount:
    """A number as written: digits with separators, and what hung on it.

    suffix : what follows the digits, such as a unit or "E" for estimated; lower case.
    """

    body: str
    negative: bool
    power: str
    suffix: str


def as_text(cell: object) -> str:
    """A cell as plain text: compatibility form, no odd spaces, dashes made hyphens.

    >>> as_text("\\u00a0\\u22125 ")
    '-5'
    """
    return "" if cell is None else _plain(str(cell))


@lru_cache(maxsize=50_000)  # a file of many accounts says the same words over and over
def _plain(text: str) -> str:
    if not text.isascii():
        text = unicodedata.normalize("NFKC", text)
        text = re.sub(r"[\u2010-\u2015\u2212]", "-", text).replace("\u2019", "'")
    return " ".join(text.split()).lstrip("'").strip()


def is_blank(cell: object) -> bool:
    """Whether the cell says nothing: empty, a dash, "n/a"."""
    return cell is None or (isinstance(cell, str) and as_text(cell).lower() in _BLANK)


def split_amount(cell: object) -> Amount | None:
    """The parts of a written number; None if it is none.

    >>> split_amount("($1,234.50)")
    Amount(body='1,234.50', negative=True, power='', suffix='')
    >>> split_amount("512 E").suffix
    'e'
    """
    return _amount(as_text(cell))


@lru_cache(maxsize=50_000)
def _amount(cell: str) -> Amount | None:
    text = _MONEY.sub("", cell).replace("- ", "-").strip()
    found = _SHAPE.match(text)
    if found is None or bool(found["open"]) != bool(found["close"]):
        return None
    rest = (found["rest"] or "").strip().lower()
    negative = found["sign"] == "-" or bool(found["minus"]) or bool(found["open"])
    if rest in ("cr", "credit"):
        return Amount(found["body"].strip(), True, found["power"] or "", "")
    if rest in ("dr", "%", "°", "."):
        rest = ""
    return Amount(found["body"].strip(), negative, found["power"] or "", rest)


def number_of(cell: object, decimal: Decimal) -> float | None:
    """The number in a cell; None if it holds none.

    >>> number_of("1.234,5", "comma"), number_of("1,234.5 CR", "point")
    (1234.5, -1234.5)
    >>> number_of("12,34", "point") is None
    True
    """
    if isinstance(cell, (int, float)) and not isinstance(cell, bool):
        try:
            return float(cell)
        except OverflowError:
            return float("inf")
    amount = split_amount(cell)
    if amount is None:
        return None
    point, thousands = (".", ",") if decimal == "point" else (",", ".")
    whole, _, part = amount.body.partition(point)
    if thousands in part or " " in part or "'" in part or point in part:
        return None
    for mark in (thousands, "'", " "):
        groups = whole.split(mark)
        if len(groups) > 1:
            # Groups of two before the last are the Indian way: 1,23,456.
            if len(groups[-1]) != 3 or any(len(g) not in (2, 3) for g in groups[1:-1]):
                return None
            if not 1 <= len(groups[0]) <= 3:
                return None
            whole = "".join(groups)
    if not (whole + part).isdigit():
        return None
    value = float(f"{whole or '0'}.{part or '0'}{amount.power}")
    return -value if amount.negative else value


def _evidence(body: str) -> str:
    """Which decimal mark the digits prove: "point", "comma", "either" (one mark, then three
    digits) or "" (no mark).
    """
    point, comma = body.count("."), body.count(",")
    if point and comma:
        return "point" if body.rfind(".") > body.rfind(",") else "comma"
    if not point and not comma:
        return ""
    mark, other = (".", "comma") if point else (",", "point")
    if point + comma > 1:  # a repeated mark separates thousands
        return other
    before, _, after = body.partition(mark)
    digits = before.replace(" ", "").replace("'", "")
    if len(after.strip()) == 3 and 1 <= len(digits) <= 3 and digits != "0":
        return f"either {mark}"
    return "point" if point else "comma"


def decide_decimal(
    cells: Iterable[object], *, delimiter: str, answer: Decimal | None, where: str
) -> tuple[Decimal, str]:
    """The file's decimal mark, and how it was settled.

    delimiter : of the CSV; a comma between columns means that "1,234" was a choice made where
    the comma separates thousands.  Raises AmbiguousBills.
    """
    if answer is not None:
        return answer, f"decimal {answer}, as you said"
    seen = {"point": 0, "comma": 0, "either .": 0, "either ,": 0, "": 0}
    for cell in cells:
        if isinstance(cell, str) and (amount := split_amount(cell)) is not None:
            seen[_evidence(amount.body)] += 1
    point, comma = seen["point"], seen["comma"]
    if point and comma and min(point, comma) * 10 > max(point, comma):
        raise _which_decimal("numbers have decimal points and decimal commas", where)
    if point or comma:
        return ("point" if point > comma else "comma"), ""
    if seen["either ."] or seen["either ,"]:
        if seen["either ."] and seen["either ,"]:
            raise _which_decimal("numbers have points and commas before three digits", where)
        if delimiter != ",":
            raise _which_decimal("numbers such as 1,234 or 1.234 can be read in two ways", where)
    return "point", ""


def _which_decimal(found: str, where: str) -> AmbiguousBills:
    return AmbiguousBills(
        found,
        where=where,
        wanted="one decimal mark",
        next_step='Say which: decimal = "point" or decimal = "comma" under [[account]] in '
        "site.toml, or --decimal.",
    )
