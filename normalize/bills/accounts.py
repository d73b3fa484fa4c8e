"""Every account of one file, each read on its own: split, never added up.

What belongs here: the order of work over a file of several accounts, fuels, sheets or meters;
what the whole file settles for all of them; what is nobody's.  Which lines are whose is decided
in groups.py; one account is understood by the same code as a file of its own (read.py).
"""

from __future__ import annotations

import inspect
import os
from collections import Counter, defaultdict
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, field, replace
from itertools import pairwise
from typing import TYPE_CHECKING, Any, cast

from normalize.bills.answers import Answers, Understood, answers_of
from normalize.bills.columns import answer, find_columns, fuels_of_columns
from normalize.bills.espi_xml import looks_like_xml
from normalize.bills.groups import (
    Group,
    Groups,
    answers_that_choose,
    group_lines,
    labels,
    masked,
)
from normalize.bills.periods import Bills, LedgerEntry
from normalize.bills.read import bills_of, interval_head, read_bills, table_score
from normalize.bills.records import Proven, settled_by_all
from normalize.bills.select import lines_of_unit
from normalize.bills.table import BillFile, RawTable, open_file, read_tables
from normalize.bills.table_bills import AS_YOU_SAID, Head, head_of, understand_lines
from normalize.errors import AmbiguousBills, NoBills, NormalizeError

if TYPE_CHECKING:
    from normalize.bills.dates import Order
    from normalize.bills.interval_head import IntervalHead

LEAD = 0.8  # of the accounts that settle how ends are meant: the rest follow (our own, no source)
LEFT_OUT = "left out"
BY_OTHERS = ", as the other accounts of the file show"


@dataclass(frozen=True, slots=True)
class FileAccount:
    """One account of a file.

    label : a name to show, numbers masked, no two alike.  names : account and meter numbers as
    the file has them, in full (never printed).  bills : None where they cannot be read;
    ``problem`` then says why.
    """

    label: str
    names: tuple[str, ...] = field(repr=False)
    fuel: str = ""
    lines: int = 0
    bills: Bills | None = None
    problem: str = ""
    choice: dict[str, str] = field(default_factory=dict)

    @property
    def full_name(self) -> str:
        """Every name and number of the account, in full; its label where it has none."""
        return " ".join(dict.fromkeys(self.names)) or self.label


@dataclass(frozen=True, slots=True)
class FileAccounts:
    """A file's accounts, in its order, and the lines that are of none.

    nobodys : lines that do not say whose they are, or are of no fuel; always "left out".
    notes : sentences about the file as a whole.
    """

    name: str
    accounts: tuple[FileAccount, ...]
    nobodys: tuple[LedgerEntry, ...] = ()
    notes: tuple[str, ...] = ()

    @property
    def alone(self) -> Bills | None:
        """The bills of the only account, where every line is its own."""
        return self.accounts[0].bills if len(self.accounts) == 1 and not self.nobodys else None

    @property
    def bills(self) -> tuple[Bills, ...]:
        """The bills of every account that could be read."""
        return tuple(bills for _, bills in self.readable)

    @property
    def readable(self) -> tuple[tuple[FileAccount, Bills], ...]:
        """The accounts that could be read, with their bills."""
        return tuple((a, a.bills) for a in self.accounts if a.bills is not None)


@dataclass(frozen=True, slots=True)
class _Part:
    """One account before it is understood.

    understand : with answers, as often as needed.  choice : the answers that single it out.
    """

    group: Group
    sheet: str
    lines: int
    understand: Callable[[Answers], Understood]
    choice: dict[str, str] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class _Result:
    """Bills with what their lines settled, and took from others; or why there are none."""

    bills: Bills | None = None
    settled: dict[str, str] = field(default_factory=dict)
    error: NormalizeError | None = None
    taken: dict[str, str] = field(default_factory=dict)


@dataclass(slots=True)
class _Found:
    """A file taken apart."""

    parts: list[_Part] = field(default_factory=list)
    nobodys: list[LedgerEntry] = field(default_factory=list)
    notes: list[str] = field(default_factory=list)


def read_accounts(path: str | os.PathLike[str], **answers: Any) -> FileAccounts:
    """Read every account, meter and fuel of a file, each on its own: split, never added up.

    answers : keywords of ``read_bills`` (``fuel`` and ``rows`` choose among the accounts).
    What one account's dates leave open and the others' settle alike is taken from them.  An
    account that cannot be read carries its problem and ends nothing.
    Raises as ``read_bills`` does where the file holds one account only, or no account can be
    read for one and the same reason.
    """
    given = _given(answers)
    net, currency = bool(given["net_metered"]), str(given["currency"])
    file = open_file(path)
    said = answers_of(file.name, given)
    found = _taken_apart(file, said, given["sheet"]) if given["rows"] is None else _Found()
    if len(found.parts) < 2 and not found.nobodys:
        name = str(given["account"])
        if found.parts:
            understood = found.parts[0].understand(said)
            bills = bills_of(file, understood, said, name, net_metered=net, currency=currency)
        else:
            bills = read_bills(path, **answers)
        label = name or (masked(said.rows) if said.rows else "account")
        return FileAccounts(
            file.name, (FileAccount(label, (), bills.fuel, len(bills.rows), bills),)
        )

    def read(part: _Part, label: str, mine: Answers) -> _Result:
        try:
            understood = part.understand(mine)
            bills = bills_of(file, understood, mine, label, net_metered=net, currency=currency)
        except NormalizeError as err:
            return _Result(error=err)
        return _Result(bills, understood.settled)

    names = _labels(found.parts)
    if said.generation is not None:
        raise AmbiguousBills(
            f"the file holds {len(names)} accounts, and generation belongs to one of them",
            where=file.name,
            next_step=answer("rows", *names[:3]),
        )
    results = [read(part, name, said) for part, name in zip(found.parts, names, strict=True)]
    others = _settled_by_most(results, said)
    for k, result in enumerate(results):
        if others != said and isinstance(result.error, AmbiguousBills | NoBills):
            again = read(found.parts[k], names[k], others)
            if again.bills is not None:
                taken = {"dates": others.dates, "end_dates": others.end_dates}
                results[k] = _Result(
                    _by_others(again.bills, said),
                    taken={key: v for key, v in taken.items() if v and v != getattr(said, key)},
                )
    _raise_if_none(results)
    return FileAccounts(
        file.name,
        tuple(map(_account, found.parts, names, results)),
        tuple(found.nobodys),
        (*found.notes, *_years_on_sheets(found.parts, results)),
    )


def _given(answers: dict[str, Any]) -> dict[str, Any]:
    """Every keyword of read_bills, with the caller's values."""
    known = inspect.signature(read_bills).parameters
    unknown = [key for key in answers if key not in known or key == "path"]
    if unknown:
        raise TypeError(f"read_accounts() has no keyword {unknown[0]!r}")
    return {k: answers.get(k, p.default) for k, p in known.items() if k != "path"}


def _account(part: _Part, label: str, result: _Result) -> FileAccount:
    fuel = result.bills.fuel if result.bills is not None else part.group.fuel
    problem = str(result.error) if result.error is not None else ""
    choice = {**part.choice, **result.taken}
    return FileAccount(label, part.group.names, fuel, part.lines, result.bills, problem, choice)


def _labels(parts: Sequence[_Part]) -> list[str]:
    """Names to show; on several sheets, with the sheet's."""
    sheets = {part.sheet for part in parts}
    if len(sheets) < 2:
        return labels([part.group for part in parts])
    # A sheet of one account is its name; elsewhere accounts are told apart within it.
    often = Counter(part.sheet for part in parts)
    groups = [
        replace(p.group, names=(p.sheet, *(p.group.names if often[p.sheet] > 1 else ())))
        for p in parts
    ]
    return labels(groups)


def _settled_by_most(results: Sequence[_Result], said: Answers) -> Answers:
    """Answers with what the accounts that settle it settle alike: order of dates, ends."""
    votes: dict[str, Counter[str]] = defaultdict(Counter)
    for result in results:
        for key, value in result.settled.items():
            votes[key][value] += 1
    dates, ends = said.dates, said.end_dates
    if dates is None and len(votes["dates"]) == 1:
        dates = cast("Order", next(iter(votes["dates"])))
    if ends is None and votes["end_dates"]:
        value, count = votes["end_dates"].most_common(1)[0]
        ends = value if count >= LEAD * votes["end_dates"].total() else None
    return replace(said, dates=dates, end_dates=ends)


def _by_others(bills: Bills, said: Answers) -> Bills:
    reading = [
        text.replace(AS_YOU_SAID, BY_OTHERS)
        if (text.startswith("dates are") and said.dates is None)
        or (text.startswith("an end date is") and said.end_dates is None)
        else text
        for text in bills.reading
    ]
    return replace(bills, reading=tuple(reading))


def _raise_if_none(results: Sequence[_Result]) -> None:
    """Where no account can be read: the question whose answer helps most, or the one reason."""
    errors = [r.error for r in results if r.error is not None]
    if not errors or len(errors) < len(results):
        return
    asked = [e for e in errors if isinstance(e, AmbiguousBills)]
    often = Counter(e.found for e in asked or errors)
    if asked or len(often) == 1:
        top = often.most_common(1)[0][0]
        raise next(e for e in asked or errors if e.found == top)


def _years_on_sheets(parts: Sequence[_Part], results: Sequence[_Result]) -> list[str]:
    """A word where sheets may hold the years of one account, for they are not joined unasked."""
    sheets = [p.sheet for p in parts]
    if len(set(sheets)) < 2 or len(set(sheets)) < len(sheets):
        return []
    bills = [r.bills for r in results if r.bills is not None]
    numbers = {name for p in parts for name in p.group.names}
    if len(bills) < 2 or len({(b.fuel, b.unit) for b in bills}) > 1 or len(numbers) > 1:
        return []
    spans = sorted((int(b.periods.start[0]), int(b.periods.end[-1])) for b in bills)
    if any(a[1] > b[0] for a, b in pairwise(spans)):
        return []
    return [
        "The sheets follow each other in time, as the years of one account would. They were read "
        "as accounts of their own; if they are one, put them below each other on one sheet."
    ]


def _taken_apart(file: BillFile, said: Answers, sheet: str | None) -> _Found:
    if looks_like_xml(file.data):
        return _meters(file, said)
    if (head := interval_head(file, said, sheet)) is not None:
        return _intervals(file, head, said)
    found = _Found()
    tables = read_tables(file, score=table_score(said), sheet=sheet)
    for table in tables:
        title = table.sheet if len(tables) > 1 else ""
        try:
            _add_table(found, table, said, title)
        except NormalizeError as err:
            if len(tables) == 1:
                raise
            # A sheet that cannot be taken apart is an account that cannot be read.
            found.parts.append(_Part(Group((), "", ()), title, len(table.rows), _raiser(err)))
    return found


def _raiser(err: NormalizeError) -> Callable[[Answers], Understood]:
    def understand(_: Answers) -> Understood:
        raise err

    return understand


def _intervals(file: BillFile, head: IntervalHead, said: Answers) -> _Found:
    """The accounts, meters and fuels of an interval file."""
    from normalize.bills.intervals import open_intervals, understand_account

    opened = open_intervals(file, head, said)
    groups, places = opened.accounts.groups, opened.accounts.places
    if len(groups) < 2:
        which, notes = opened.accounts.chosen(said, opened.where)
        alone = _Part(
            Group((), "", ()), "", 0, lambda a: understand_account(opened, which, a, notes)
        )
        return _Found([alone])

    def understood(n: int) -> Callable[[Answers], Understood]:
        fuel = groups[n].fuel or None
        return lambda a: understand_account(opened, places[n], replace(a, fuel=a.fuel or fuel))

    parts = [
        _Part(group, "", places[n].size, understood(n), choice)
        for n, (group, choice) in enumerate(zip(groups, answers_that_choose(groups), strict=True))
    ]
    nobodys = []
    for why, lines in opened.accounts.nobodys:
        more = f" (the first of {lines.size:,} such lines)" if lines.size > 1 else ""
        line = opened.taken.line(int(lines[0]))
        nobodys.append(LedgerEntry(file.name, line, LEFT_OUT, why + more))
    return _Found(parts, nobodys)


def _meters(file: BillFile, said: Answers) -> _Found:
    """The meters and fuels of an ESPI file."""
    from normalize.bills.espi import meters_of, open_espi, understand_meter

    def understood(own: Any, fuel: str) -> Callable[[Answers], Understood]:
        return lambda a: understand_meter(own, replace(a, fuel=a.fuel or fuel or None))

    meters = meters_of(open_espi(file.data, file.name), said)
    often = Counter(name for name, _, _ in meters)
    parts = []
    for name, fuel, own in meters:
        lines = sum(len(series.readings) for series in own.series)
        choice = {"rows": name, **({"fuel": fuel} if fuel and often[name] > 1 else {})}
        group = Group((name,), fuel, ())
        parts.append(_Part(group, "", lines, understood(own, fuel), choice))
    return _Found(parts)


def _add_table(found: _Found, table: RawTable, said: Answers, title: str) -> None:
    """The accounts of a table, and the lines that are of none of them."""
    columns, _ = find_columns(table, said.named)
    fuels: Iterable[str | None] = (said.fuel,)
    if said.fuel is None and len(several := fuels_of_columns(columns)) > 1:
        fuels = several
    unclaimed: list[dict[int, str]] = []
    every: list[tuple[Head, Group, Proven]] = []
    for fuel in fuels:
        head = head_of(table, replace(said, fuel=fuel))
        groups = group_lines(head.columns, head.body, fuel=fuel)
        proven = settled_by_all(table, head.columns, head.body)
        every += [(own, group, proven) for own, group in _heads(head, groups)]
        unclaimed.append({row.line: why for row, why in groups.nobodys})
    choices = answers_that_choose([group for _, group, _ in every])
    on_sheet = {"sheet": title} if title else {}
    for (own, group, proven), choice in zip(every, choices, strict=True):
        chosen = {**on_sheet, **(choice if len(every) > 1 else {})}
        found.parts.append(_part(own, group, chosen, title, proven))
    claimed = {row.line for _, group, _ in every for row in group.rows}
    for line, why in unclaimed[0].items():
        if line not in claimed and all(line in each for each in unclaimed):
            why = "a total, not a bill" if line in head.totals else why
            found.nobodys.append(LedgerEntry(_place(table, title), line, LEFT_OUT, why))


def _place(table: RawTable, title: str) -> str:
    return f"{table.name}, sheet {title[:40]!r}" if title else table.name


def _heads(head: Head, groups: Groups) -> list[tuple[Head, Group]]:
    """The table's head with what concerns each account only."""
    hidden: dict[int, list[int]] = defaultdict(list)
    if head.table.hidden:
        owner = {row.line: n for n, g in enumerate(groups.accounts) for row in g.rows}
        for line in head.table.hidden:
            if line in owner:
                hidden[owner[line]].append(line)
    bare = replace(head.table, rows=())
    return [
        (replace(head, table=replace(bare, hidden=tuple(hidden[n])), body=[]), group)
        for n, group in enumerate(groups.accounts)
    ]


def _part(head: Head, group: Group, choice: dict[str, str], title: str, proven: Proven) -> _Part:
    def understand(answers: Answers) -> Understood:
        mine = replace(answers, fuel=answers.fuel or group.fuel or None)
        lines = lines_of_unit(head.columns, group, fuel=mine.fuel, unit=mine.unit)
        return understand_lines(head, lines, group.notes, mine, proven)

    return _Part(group, title, len(group.rows), understand, choice)
