"""One table of site.toml, taken apart strictly: each key once, each value of its own kind.

Every complaint names the file, the line and the table, and says what would have been right.
"""

from __future__ import annotations

import calendar
import difflib
import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from datetime import date, datetime
from pathlib import Path, PurePosixPath, PureWindowsPath

from normalize.days import FIRST_SANE_DAY, LAST_SANE_DAY, day_of
from normalize.errors import MissingFile, SiteError, UnknownKey

MAX_TEXT = 200  # characters of a name or a note: longer is a slip of the paste key
_MONTH = re.compile(r"(\d{4})-(\d{2})")
_HEADER = re.compile(r"\s*\[(\[?)\s*([^\[\]]+?)\s*\]")
_KEY = re.compile(r"""\s*(?:"([^"]+)"|'([^']+)'|([A-Za-z0-9_-]+))\s*[=.]""")


def nearest(word: str, known: Sequence[str]) -> str:
    """The known word that is most like this one, or empty.

    >>> nearest("fule", ["fuel", "unit"])
    'fuel'
    """
    found = difflib.get_close_matches(word.lower(), known, n=1, cutoff=0.5)
    return found[0] if found else ""


def line_numbers(text: str) -> dict[tuple[str, int, str], int]:
    """Where each key stands: (table, its count from 0, key) → line, from 1.

    For messages only, so a scan is enough: a key inside a text of several lines may be taken
    for one, which costs nothing but a wrong line number.

    >>> line_numbers("[site]\\nname = 'x'")
    {('site', 0, ''): 1, ('site', 0, 'name'): 2}
    """
    lines: dict[tuple[str, int, str], int] = {}
    counts: dict[str, int] = {}
    table, index = "", 0
    for number, line in enumerate(text.splitlines(), start=1):
        if header := _HEADER.match(line):
            table = header.group(2)
            index = counts.get(table, 0)
            counts[table] = index + 1
            lines.setdefault((table, index, ""), number)
        elif key := _KEY.match(line):
            lines.setdefault((table, index, next(g for g in key.groups() if g)), number)
    return lines


@dataclass(frozen=True, slots=True)
class Table:
    """One table. file : name for messages. label : "[weather]", "[[account]]" …"""

    file: str
    label: str
    values: Mapping[str, object]
    lines: Mapping[tuple[str, int, str], int]
    index: int = 0

    def where(self, key: str = "") -> str:
        """File, line and table of a key, for a message."""
        name = self.label.strip("[]")
        line = self.lines.get((name, self.index, key)) or self.lines.get((name, self.index, ""))
        return f"{self.file}:{line}, {self.label}" if line else f"{self.file}, {self.label}"

    def bad(self, key: str, found: str, wanted: str, next_step: str = "") -> SiteError:
        """An error about one key."""
        return SiteError(
            f"{key} is {found}", where=self.where(key), wanted=wanted, next_step=next_step
        )

    def check_keys(self, known: Sequence[str]) -> None:
        """Raise UnknownKey for the first key that is not known, naming the nearest one."""
        for key in self.values:
            if key not in known:
                guess = nearest(key, known)
                hint = f"Did you mean {guess!r}? " if guess else ""
                raise UnknownKey(
                    f"the key {shown(key)} is not known",
                    where=self.where(key),
                    next_step=f"{hint}{self.label} may have: {', '.join(known)}.",
                )

    def text(self, key: str) -> str | None:
        """A short text of one line, or None."""
        value = self.values.get(key)
        if value is None:
            return None
        if not isinstance(value, str):
            raise self.bad(key, shown(value), "a text in quotation marks")
        clean = value.strip()
        if not clean:
            raise self.bad(key, "empty", "a text in quotation marks")
        if len(clean) > MAX_TEXT:
            raise self.bad(key, f"{len(clean)} characters long", f"at most {MAX_TEXT}")
        if not clean.isprintable():
            raise self.bad(key, shown(clean), "plain characters on one line")
        return clean

    def required_text(self, key: str) -> str:
        """A short text of one line, which must be there."""
        value = self.text(key)
        if value is None:
            raise SiteError(
                f"there is no {key}",
                where=self.where(),
                next_step=f'Add a line such as {key} = "…".',
            )
        return value

    def number(self, key: str, *, low: float, high: float, unit: str) -> float | None:
        """A finite number from low to high, or None."""
        value = self.values.get(key)
        if value is None:
            return None
        if isinstance(value, bool) or not isinstance(value, int | float):
            raise self.bad(key, shown(value), f"a number, in {unit}, without quotation marks")
        if not low <= value <= high:  # false for NaN and infinities too
            raise self.bad(
                key, shown(value), f"a number from {_plain(low)} to {_plain(high)}, in {unit}"
            )
        return float(value)

    def whole(self, key: str, *, low: int, high: int, unit: str) -> int | None:
        """A whole number from low to high, or None."""
        value = self.values.get(key)
        if value is None:
            return None
        if isinstance(value, bool) or not isinstance(value, int) or not low <= value <= high:
            raise self.bad(key, shown(value), f"a whole number from {low:,} to {high:,}, in {unit}")
        return value

    def flag(self, key: str, *, default: bool) -> bool:
        """True or false."""
        value = self.values.get(key, default)
        if not isinstance(value, bool):
            raise self.bad(key, shown(value), "true or false, without quotation marks")
        return value

    def texts(self, key: str) -> tuple[str, ...] | None:
        """A list of short texts, or None."""
        value = self.values.get(key)
        if value is None:
            return None
        if isinstance(value, str):
            raise self.bad(key, shown(value), f"a list: {key} = [{shown(value)}]")
        if not isinstance(value, list) or not value or not all(isinstance(v, str) for v in value):
            raise self.bad(key, shown(value), 'a list of texts, such as ["gas", "electricity"]')
        return tuple(str(v).strip() for v in value)

    def days(self, key: str) -> tuple[int, int] | None:
        """A date, or a whole month, as day numbers ``[first, last + 1)``; or None."""
        value = self.values.get(key)
        if value is None:
            return None
        wanted = f'a date such as {key} = 2023-09-11, or a month such as {key} = "2023-09"'
        span: tuple[int, int] | None = None
        if isinstance(value, datetime):
            span = _one_day(value.date())
        elif isinstance(value, date):
            span = _one_day(value)
        elif isinstance(value, str):
            span = _span(value.strip())
        if span is None:
            raise self.bad(key, shown(value), wanted)
        if span[0] < FIRST_SANE_DAY or span[1] > LAST_SANE_DAY:
            raise self.bad(key, shown(value), "a date between 1900 and 2100")
        return span

    def path(self, key: str, folder: Path) -> Path | None:
        """A file inside the folder, whether or not it is there; or None."""
        return self.required_path(key, folder) if key in self.values else None

    def required_path(self, key: str, folder: Path) -> Path:
        """A file inside the folder, whether or not it is there."""
        text = self.required_text(key)
        windows = PureWindowsPath(text)
        parts = {*PurePosixPath(text).parts, *windows.parts}
        outside = Path(text).is_absolute() or windows.drive or windows.root or ".." in parts
        if not outside:
            # resolve() follows links, so that a link to a file elsewhere is seen as such.
            outside = not (folder / text).resolve().is_relative_to(folder.resolve())
        if outside:
            raise SiteError(
                f"{key} points out of the folder: {shown(text)}",
                where=self.where(key),
                wanted="the name of a file in the site's own folder",
                next_step="Copy the file into the folder and give its name alone.",
            )
        return folder / text


def must_exist(path: Path, where: str) -> None:
    """Raise MissingFile where there is no such file, naming one that is there and much like it."""
    if path.is_file():
        return
    here = sorted(p.name for p in path.parent.iterdir()) if path.parent.is_dir() else []
    guess = nearest(path.name, here)
    raise MissingFile(
        f"there is no file {shown(path.name)} in the folder",
        where=where,
        next_step=f"Did you mean {guess!r}?" if guess else "Put it there, or correct its name.",
    )


def shown(value: object) -> str:
    """A value as a message shows it: as the file has it, short, on one line.

    >>> shown(True), shown("a" * 99)[:12], shown(float("inf"))
    ('true', "'aaaaaaaaaaa", 'inf')
    """
    if isinstance(value, bool):
        return str(value).lower()
    if isinstance(value, date):
        return value.isoformat()
    if isinstance(value, list | dict):
        return "a list" if isinstance(value, list) else "a table"
    try:
        text = repr(value) if isinstance(value, str | float) else str(value)
    except ValueError:  # Python writes no whole number of more than 4300 digits
        return "a number of thousands of digits"
    return text if len(text) <= 60 else f"{text[:57]}…"


def _one_day(when: date) -> tuple[int, int]:
    day = day_of(when)
    return day, day + 1


def _span(text: str) -> tuple[int, int] | None:
    """Day numbers of ISO text: a day or a whole month."""
    try:
        if month := _MONTH.fullmatch(text):
            first = date(int(month.group(1)), int(month.group(2)), 1)
            start = day_of(first)
            return start, start + calendar.monthrange(first.year, first.month)[1]
        return _one_day(date.fromisoformat(text)) if len(text) == len("2023-09-11") else None
    except ValueError:
        return None


def _plain(number: float) -> str:
    """A limit as people write it; commas also keep it from looking like an account number.

    >>> _plain(100000.0), _plain(0.5), _plain(1e12)
    ('100,000', '0.5', '1,000,000,000,000')
    """
    return f"{number:,.0f}" if number == int(number) else f"{number:g}"
