"""Which lines of an interval file are whose: the rules of groups.py, over arrays.

What belongs here: accounts, meters and fuels of a million lines told apart by the words in their
columns.  They are never added up, and a line that does not say whose it is is nobody's.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from normalize.bills.answers import Answers
from normalize.bills.columns import Columns
from normalize.bills.groups import (
    NO_NUMBER,
    Group,
    all_dates,
    fuel_of_line,
    masked,
    named,
    own_name,
)
from normalize.bills.interval_file import Taken
from normalize.bills.interval_kernel import FULL, MAX_WORDS
from normalize.bills.select import MOST_CHOICES, ask_which
from normalize.bills.sum_rows import several
from normalize.errors import UnreadableBills

if TYPE_CHECKING:
    from numpy.typing import NDArray

    Places = NDArray[np.intp]


@dataclass(frozen=True, slots=True)
class IntervalAccounts:
    """groups : accounts, in the file's order, without rows.  places : the lines of each.

    nobodys : (reason, lines) that are no account's.
    """

    groups: tuple[Group, ...]
    places: tuple[Places, ...]
    nobodys: tuple[tuple[str, Places], ...] = ()

    def chosen(self, answers: Answers, where: str) -> tuple[Places | None, tuple[str, ...]]:
        """Lines of the account that ``rows`` names; None where all are of one, and sentences.

        Raises AmbiguousBills where there are several, UnreadableBills where none is named so.
        """
        mine = list(self.groups)
        if answers.rows is not None and (len(mine) > 1 or any(g.names for g in mine)):
            fuel = fuel_of_line(answers.rows, "", True)[0]
            mine = named(mine, answers.rows) or [g for g in mine if fuel and g.fuel == fuel]
        if answers.rows is not None and not mine:
            shown = sorted({label for g in self.groups for label in map(masked, g.names)})
            raise UnreadableBills("no line belongs to what rows names", where=where,
                                  wanted="one of " + ", ".join(shown[:MOST_CHOICES]))  # fmt: skip
        if len(mine) > 1:
            raise ask_which(mine, where)
        if not mine:
            raise UnreadableBills(f"no line is of {answers.fuel or 'any fuel'}", where=where)
        notes = [f"{several(p.size, 'line')} left out: {why}" for why, p in self.nobodys]
        if len(self.groups) == 1 and not self.nobodys:
            return None, ()
        kept = self.places[self.groups.index(mine[0])]
        other = sum(p.size for p in self.places) - kept.size
        if other:
            notes.insert(0, f"{several(other, 'line')} of other accounts, meters or fuels")
        return kept, tuple(notes)


def accounts_of_intervals(
    taken: Taken, columns: Columns, answers: Answers, where: str
) -> IntervalAccounts:
    """Every account of an interval file.  Raises UnreadableBills where there are too many."""
    told_by: tuple[str | int, ...] = (*columns.accounts, "fuel", "unit")
    several_words = [k for k in told_by if len(taken.words(k)) > 1]
    if not several_words and answers.fuel is None:  # the usual file, of one account
        names = [w for k in columns.accounts for w in taken.words(k) if own_name(w)]
        return IntervalAccounts((Group(tuple(names), "", ()),), (np.empty(0, np.intp),))
    filled = taken.lines.state == FULL
    fuels, reasons, mark = _fuels(taken, columns, answers)
    nobodys = [(why, np.flatnonzero(filled & (mark == -2 - n))) for n, why in enumerate(reasons)]
    own = filled & (mark >= 0)
    keys = [mark] if len(np.unique(mark[own])) > 1 else []
    named_by: list[tuple[NDArray[np.int32], list[str]]] = []
    for k in columns.accounts:
        number, words = _of_column(taken, columns, k, where)
        there = np.unique(number[own & (number >= 0)])
        named_by.append((number, words))
        if there.size > 1:
            keys.append(number)
            unnamed = own & (number < 0) & _says_something(taken)
            nobodys.append((NO_NUMBER, np.flatnonzero(unnamed)))
            own &= number >= 0
    which = np.flatnonzero(own)
    places = _apart([key[which] for key in keys], which)
    groups = []
    for place in places:
        first = [
            words[int(number[place[0]])] for number, words in named_by if number[place[0]] >= 0
        ]
        group_fuel = fuels[int(mark[place[0]])] or next(
            (fuels[int(m)] for m in np.unique(mark[place]) if fuels[int(m)]), ""
        )
        groups.append(Group(tuple(dict.fromkeys(first)), group_fuel, ()))
    return IntervalAccounts(
        tuple(groups), tuple(places), tuple((why, p) for why, p in nobodys if p.size)
    )


def _says_something(taken: Taken) -> NDArray[np.bool_]:
    """Lines with a date and a number: repeated headers and remarks are nobody's loss."""
    known: NDArray[np.bool_] = (taken.lines.date >= 0) & ~np.all(
        np.isnan(taken.lines.value), axis=1
    )
    return known


def _of_column(
    taken: Taken, columns: Columns, k: int, where: str
) -> tuple[NDArray[np.int32], list[str]]:
    """For each line the number of its name in a column, -1 for none; and the names."""
    words = taken.words(k)
    if len(words) >= MAX_WORDS:
        raise UnreadableBills(
            f"column {columns.headings[k].text!r} holds more than {MAX_WORDS - 1:,} accounts",
            where=where,
            wanted="an interval file of fewer",
            next_step="Split the file by account.",
        )
    plain = ["" if w == columns.headings[k].text else own_name(w) for w in words]
    if any(plain) and all_dates([w for w, p in zip(words, plain, strict=True) if p]):
        plain = [""] * len(words)
    distinct = {name: n for n, name in enumerate(dict.fromkeys(p for p in plain if p))}
    shown = {distinct[p]: w for p, w in zip(reversed(plain), reversed(words), strict=True) if p}
    number = _numbered(taken, k, [distinct.get(p, -1) for p in plain])
    return number, [shown[n] for n in range(len(distinct))]


def _numbered(taken: Taken, kind: str | int, of_word: Sequence[int]) -> NDArray[np.int32]:
    """For each line the number of its word; -1 for none."""
    word = taken.lines.word[:, taken.kinds[kind]]
    return np.where(word >= 0, np.array([*of_word, -1], np.int32)[word], np.int32(-1))


def _fuels(
    taken: Taken, columns: Columns, answers: Answers
) -> tuple[list[str], list[str], NDArray[np.int32]]:
    """Fuels ("" first, where not said), reasons of lines of none, and which each line has.

    A line's mark is the number of its fuel, or -2 - the number of its reason.
    """
    fuels, reasons = [""], list[str]()
    kind = next((role for role in ("fuel", "unit") if role in taken.kinds), None)
    if kind is None:
        return fuels, reasons, np.zeros(taken.lines.state.shape, np.int32)
    marks = []
    for word in taken.words(kind):
        text = word.strip()
        if text == columns.heading(kind).text:
            text = ""
        pair = (text, "") if kind == "fuel" else ("", text)
        fuel, why = fuel_of_line(*pair, kind == "fuel")
        if not why and answers.fuel is not None and fuel not in ("", answers.fuel):
            why = f"{fuel}, another fuel"
        table, name = (reasons, why) if why else (fuels, fuel)
        if name not in table:
            table.append(name)
        marks.append(-2 - table.index(name) if why else table.index(name))
    return (
        fuels,
        reasons,
        np.where((number := _numbered(taken, kind, marks)) == -1, np.int32(0), number),
    )


def _apart(keys: Sequence[NDArray[np.int32]], which: Places) -> list[Places]:
    """Lines with equal keys, each in order; those first that come first in the file."""
    if not keys or which.size == 0:
        return [which] if which.size else []
    _, code = np.unique(np.stack(keys), axis=1, return_inverse=True)
    code = code.reshape(-1)
    order = np.argsort(code, kind="stable")
    pieces = np.split(which[order], np.flatnonzero(np.diff(code[order])) + 1)
    return sorted(pieces, key=lambda place: int(place[0]))
