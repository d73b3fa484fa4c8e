"""Lines of a table, told apart by account, meter and fuel: split, never added up.

What belongs here: which lines are of one account, which are nobody's, and how one account is
named so that no other answers to it.  Nothing is attributed by guess: a line that does not say
whose it is belongs to an account only where the file holds no other that it could be of.
"""

from __future__ import annotations

import re
from collections import defaultdict
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from itertools import pairwise

from normalize.bills.amounts import as_text, is_blank
from normalize.bills.columns import Columns, fuel_of_unit
from normalize.bills.dates import ORDERS, read_written, settle
from normalize.bills.headings import squeeze
from normalize.bills.table import Cell, RawRow
from normalize.bills.vocabulary import TOTALS
from normalize.errors import BillError, UnknownUnit
from normalize.units import canonical_fuel, canonical_unit

SURE_METER_LINES = 2  # of each meter, before a replacement is believed (our own, no source)
MOST_REPLACED = 4  # meters in a row that are believed to be one account's (our own, no source)
SAMPLE = 50  # values looked at to tell whether a column holds dates
SHOWN_END = 4  # of an account number: its last characters
MOST_LABEL = 60
FEW_DIGITS = 2  # "Unit 12" is a name, not a number
_OWN_NAME = re.compile(r"(?:meter|account) \d{1,6}")
MOST_SHOWN = 5  # of them, to tell two numbers apart; then places in the file do
NO_NUMBER = (
    "the line does not say whose it is, and the file holds several accounts: fill in the number "
    "on every line"
)
REPLACED = "the meter was replaced: one follows the other, without overlap"
_SERVICE_WORDS = {
    "usage", "use", "service", "consumption", "delivery", "meter", "account", "billing",
}  # fmt: skip

_TOTAL_WORDS = ("total", "totals", "subtotal", "sum", "average")
_TOTALS = {squeeze(word) for word in TOTALS}

Key = tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Group:
    """Lines of one account.

    names : what the columns of accounts and meters hold on its lines, as written.  fuel :
    canonical, "" where no column tells it.
    """

    names: tuple[str, ...]
    fuel: str
    rows: tuple[RawRow, ...]
    notes: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Groups:
    """accounts : in the file's order.  nobodys : lines of none, each with its reason."""

    accounts: tuple[Group, ...]
    nobodys: tuple[tuple[RawRow, str], ...] = ()


def cell(row: RawRow, column: int | None) -> Cell:
    """The cell of a column; None beyond the row's end."""
    if column is None or column >= len(row.cells):
        return None
    return row.cells[column]


def plain(value: Cell) -> str:
    """An account number as text, also where a spreadsheet made it a number."""
    if isinstance(value, float) and value.is_integer():
        return str(int(value))
    return as_text(value)


def masked(value: Cell) -> str:
    """An account or meter for a message: its last four characters.

    >>> masked("0012345678"), masked("Unit 12"), masked("Greenhouse")
    ('…5678', 'Unit 12', 'Greenhouse')
    """
    text = re.sub(r"^\.{3}", "…", plain(value))  # cells are normalised: … becomes ...
    if (text.startswith("…") or _OWN_NAME.fullmatch(text)) and len(text) <= MOST_LABEL:
        return text  # this program's own name for it
    digits = sum(c.isdigit() for c in text)
    if digits and len(text) > (SHOWN_END if digits > FEW_DIGITS else 20):
        return "…" + text[-SHOWN_END:]
    return text if len(text) <= 20 else "…" + text[-SHOWN_END:]


def fuel_named(text: str, *, where: str = "") -> str:
    """The fuel that a cell names, also as "Electric usage" or "Gas service".

    >>> fuel_named("Natural gas usage")
    'natural gas'
    """
    words = [w for w in text.split() if w.lower().strip(".,:") not in _SERVICE_WORDS]
    return canonical_fuel(" ".join(words) or text, where=where)


def group_lines(columns: Columns, body: Sequence[RawRow], *, fuel: str | None) -> Groups:
    """Lines of each account.  fuel : the user's; lines of others are then nobody's.

    An account is a value of every column of accounts and meters, and a fuel.
    """
    own, nobodys = _of_some_fuel(columns, body, fuel)
    telling = [k for k in columns.accounts if _tells(own, k)]
    several_fuels = len({f for _, f in own} - {""}) > 1
    whole: dict[Key, list[tuple[RawRow, str]]] = {}
    partial: list[tuple[Key, tuple[RawRow, str]]] = []
    for row, named in own:
        parts = [own_name(cell(row, k)) for k in telling]
        key = (*parts, named) if several_fuels else tuple(parts)
        if all(key):
            whole.setdefault(key, []).append((row, named))
        else:
            partial.append((key, (row, named)))
    nobodys += [(row, NO_NUMBER) for row in _placed(whole, partial)]
    notes: dict[Key, str] = {}
    for place, k in enumerate(telling):
        if "meter" in columns.headings[k].words:
            whole = _meters_joined(columns, whole, place, notes)
    groups = [
        Group(
            _names(columns, lines),
            fuel or next((f for _, f in lines if f), ""),
            tuple(row for row, _ in lines),
            (notes[key],) if key in notes else (),
        )
        for key, lines in whole.items()
    ]
    groups.sort(key=lambda g: g.rows[0].line)
    return Groups(tuple(groups), tuple(sorted(nobodys, key=lambda pair: pair[0].line)))


def _of_some_fuel(
    columns: Columns, body: Sequence[RawRow], fuel: str | None
) -> tuple[list[tuple[RawRow, str]], list[tuple[RawRow, str]]]:
    """Lines with the fuel that each names ("" if none); lines of water, demand, other fuels."""
    named, unit = columns.get("fuel"), columns.get("unit")
    fuels: dict[tuple[str, str], tuple[str, str]] = {}
    own, other = [], []
    for row in body:
        texts = as_text(cell(row, named)), as_text(cell(row, unit))
        if texts not in fuels:
            fuels[texts] = fuel_of_line(*texts, named is not None)
        found, problem = fuels[texts]
        if not problem and fuel is not None and found not in ("", fuel):
            problem = f"{found}, another fuel"
        if problem:
            other.append((row, problem))
        else:
            own.append((row, found))
    return own, other


def fuel_of_line(fuel: str, unit: str, has_fuels: bool) -> tuple[str, str]:
    """Canonical fuel ("" where not said), or why the line is of none."""
    found = ""
    if not is_blank(fuel):
        try:
            found = fuel_named(fuel)
        except BillError:
            return "", f"{fuel[:20]!r} is no fuel that can be read"
    if not is_blank(unit) and not has_fuels:
        try:
            found = fuel_of_unit(canonical_unit(unit, None))
        except UnknownUnit:
            found = ""
    return found, ""


def _tells(own: Sequence[tuple[RawRow, str]], k: int) -> bool:
    """Whether a column tells accounts apart: two values or more that are no dates."""
    values: dict[str, Cell] = {}
    for row, _ in own:
        text = own_name(cell(row, k))
        if text and text not in values:
            values[text] = cell(row, k)
    return len(values) > 1 and not all_dates(list(values.values()))


def all_dates(values: Sequence[Cell]) -> bool:
    """Whether a column's values are dates, for a "Meter" column of dates is none of meters.

    Digits alone are numbers of accounts, though eight of them can be read as a date.

    >>> all_dates(["11112222", "20230105"]), all_dates(["1/5/2023", "2023-02-06"])
    (False, True)
    """
    return all(_is_date(value) for value in values[:SAMPLE])


def _is_date(value: Cell) -> bool:
    if plain(value).isdecimal():
        return False
    written = read_written(value)
    return any(settle(written, order)[0] is not None for order in ORDERS[:2])


def _placed(
    whole: dict[Key, list[tuple[RawRow, str]]],
    partial: Sequence[tuple[Key, tuple[RawRow, str]]],
) -> list[RawRow]:
    """Put lines that say a part into the one account that agrees; returns those of none."""
    nobodys: list[RawRow] = []
    index: dict[tuple[bool, ...], dict[Key, list[Key]]] = {}
    complete = list(whole)
    for key, line in partial:
        said = tuple(bool(part) for part in key)
        if said not in index:
            found: dict[Key, list[Key]] = defaultdict(list)
            for other in complete:
                found[_some(other, said)].append(other)
            index[said] = found
        fits = index[said].get(_some(key, said), [])
        if len(fits) == 1:
            whole[fits[0]].append(line)
        elif fits or not any(said):
            nobodys.append(line[0])
        else:
            whole.setdefault(key, []).append(line)
    for lines in whole.values():
        lines.sort(key=lambda line: line[0].line)
    return nobodys


def _some(key: Key, said: tuple[bool, ...]) -> Key:
    return tuple(part for part, there in zip(key, said, strict=True) if there)


def _meters_joined(
    columns: Columns,
    whole: dict[Key, list[tuple[RawRow, str]]],
    place: int,
    notes: dict[Key, str],
) -> dict[Key, list[tuple[RawRow, str]]]:
    """Meters that follow each other in time, all else being equal, are one account's."""
    alike: dict[Key, list[Key]] = defaultdict(list)
    for key in whole:
        alike[key[:place] + key[place + 1 :]].append(key)
    when = next((c for r in ("end", "read", "start") if (c := columns.get(r)) is not None), None)
    out: dict[Key, list[tuple[RawRow, str]]] = {}
    for keys in alike.values():
        lines = [whole[key] for key in keys]
        if 2 <= len(keys) <= MOST_REPLACED and _succeed(when, lines):
            out[keys[0]] = sorted((x for each in lines for x in each), key=lambda x: x[0].line)
            notes[keys[0]] = REPLACED
        else:
            out.update(zip(keys, lines, strict=True))
    return out


def _succeed(when: int | None, meters: Sequence[Sequence[tuple[RawRow, str]]]) -> bool:
    """Whether meters follow each other in time, as when one is replaced by another."""
    if when is None:
        return False
    written = [[read_written(cell(row, when)) for row, _ in lines] for lines in meters]
    answers = []
    for order in ORDERS[:2]:
        days = [[d for w in each if (d := settle(w, order)[0]) is not None] for each in written]
        if all(len(d) >= SURE_METER_LINES for d in days):
            spans = sorted((min(d), max(d)) for d in days)
            answers.append(all(a[1] <= b[0] for a, b in pairwise(spans)))
    return bool(answers) and all(answers)


def _names(columns: Columns, lines: Sequence[tuple[RawRow, str]]) -> tuple[str, ...]:
    names = (plain(cell(row, k)) for k in columns.accounts for row, _ in lines)
    return tuple(dict.fromkeys(name for name in names if own_name(name)))


def own_name(value: Cell) -> str:
    """An account's name for comparing; "" where there is none, or the word "Total"."""
    text = squeeze(plain(value))
    first = plain(value).lower().split(" ", 1)[0]
    return "" if text in _TOTALS or first in _TOTAL_WORDS else text


def named(groups: Iterable[Group], rows: str) -> list[Group]:
    """Accounts that ``rows`` names: by a whole number or name, by its last characters, or by
    its place in the file ("account 2").

    >>> a, b = Group(("125678",), "", ()), Group(("5678",), "", ())
    >>> named([a, b], "5678") == [b], named([a], "…5678") == [a]
    (True, True)
    """
    wanted = squeeze(rows)
    every = list(groups)
    exact = [g for g in every if any(squeeze(name) == wanted for name in g.names)]
    if exact or len(wanted) < SHOWN_END:
        return exact
    place = wanted.removeprefix("account")
    if place != wanted and place.isdecimal() and len(place) < 8:
        return every[int(place) - 1 : int(place)] if int(place) else []
    return [g for g in every if any(squeeze(n).endswith(wanted) for n in g.names)]


def labels(groups: Sequence[Group]) -> list[str]:
    """A name for each account to be shown: no number in full, no two alike.

    >>> one, two = ("0012345678",), ("0012345678",)
    >>> labels([Group(one, "electricity", ()), Group(two, "natural gas", ())])
    ['…5678 electricity', '…5678 natural gas']
    """
    found = ["" for _ in groups]
    parts = [[*(masked(n) for n in g.names), g.fuel or "account"] for g in groups]
    for upto in (1, 2, 3):
        tried = [_label(p, upto) for p in parts]
        often = _counted(tried)
        for n, text in enumerate(tried):
            if not found[n] and often[text] == 1:
                found[n] = text
    taken = _counted(found)
    seen: dict[str, int] = defaultdict(int)
    for n, text in enumerate(found):
        if text:
            continue
        plain_label = _label(parts[n], 3)
        while not found[n]:
            seen[plain_label] += 1
            tried_label = f"{plain_label} ({seen[plain_label]})"
            found[n] = "" if taken[tried_label] else tried_label
    return found


def _label(parts: Sequence[str], upto: int) -> str:
    """1: the first name.  2: with the fuel.  3: with every name."""
    *names, fuel = parts
    chosen = names[:1] if upto < 3 else list(dict.fromkeys(names))
    return " ".join(chosen + ([fuel] if upto > 1 or not names else []))


def _counted(texts: Iterable[str]) -> dict[str, int]:
    counts: dict[str, int] = defaultdict(int)
    for text in texts:
        counts[text] += 1
    return counts


def answers_that_choose(groups: Sequence[Group]) -> list[dict[str, str]]:
    """For each account the answers (rows, fuel) that single it out, with few digits shown."""
    owners: dict[str, set[int]] = defaultdict(set)
    for n, group in enumerate(groups):
        for name in group.names:
            owners[squeeze(name)].add(n)
    ends: dict[str, set[str]] = defaultdict(set)
    for text in owners:
        for size in range(SHOWN_END, min(len(text), MOST_SHOWN) + 1):
            ends[text[-size:]].add(text)
    of_fuel = _counted(g.fuel for g in groups)
    places: dict[str, int] = defaultdict(int)
    chosen = []
    for n, group in enumerate(groups):
        places[group.fuel] += 1
        fuel = {"fuel": group.fuel} if group.fuel else {}
        if group.fuel and of_fuel[group.fuel] == 1:
            chosen.append(fuel)
            continue
        ends_of = {name: _shortest(name, ends) for name in group.names}
        shown = {name: end for name, end in ends_of.items() if end is not None}
        own = [name for name in shown if owners[squeeze(name)] == {n}]
        of_own_fuel = [
            name
            for name in shown
            if {m for m in owners[squeeze(name)] if groups[m].fuel == group.fuel} == {n}
        ]
        if own:
            chosen.append({"rows": shown[own[0]]})
        elif of_own_fuel:
            chosen.append({"rows": shown[of_own_fuel[0]], **fuel})
        else:  # places are counted within a fuel, for with a fuel only its accounts are looked at
            chosen.append({"rows": f"account {places[group.fuel]}", **fuel})
    return chosen


def _shortest(name: str, ends: dict[str, set[str]]) -> str | None:
    """A name without a number; of a number the fewest last characters that no other ends on.

    None where more would have to be shown than an account number should be.
    """
    if masked(name) == name:
        return name
    text = squeeze(name)
    for size in range(SHOWN_END, min(len(text), MOST_SHOWN + 1)):
        if ends[text[-size:]] == {text}:
            return text[-size:]
    return text if len(text) <= MOST_SHOWN else None
