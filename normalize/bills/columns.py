"""Which column of a bill table is what.

What belongs here: finding the header, giving columns their roles, choosing between usage
columns, and asking when the file does not settle it.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass, field, replace

from normalize.bills.amounts import as_text, is_blank, split_amount
from normalize.bills.headings import Heading, header_score, squeeze, take_apart
from normalize.bills.table import HEADER_LINES, LIKELY_HEADER, RawRow, RawTable
from normalize.bills.vocabulary import ESTIMATED_NO, ESTIMATED_YES, ROLES
from normalize.errors import AmbiguousBills, BillError, UnknownUnit, UnreadableBills
from normalize.units import FUELS, canonical_unit

_DATE = re.compile(r"\d[-/. ]\d+[-/. ]\d|[a-z]{3}", re.IGNORECASE)
_DEMAND = re.compile(r"\bkw\b", re.IGNORECASE)
CLEAR_LEAD = 2.0  # a usage column is chosen unasked when it leads by this (our own, no source)


@dataclass(frozen=True, slots=True)
class Columns:
    """The header of a table and the column of each role (from 0), None where there is none."""

    line: int
    headings: tuple[Heading, ...]
    by_role: dict[str, int] = field(default_factory=dict)
    notes: tuple[int, ...] = ()
    accounts: tuple[int, ...] = ()
    usage: tuple[int, ...] = ()  # candidates, in order of columns
    differenced: bool = False  # the usage column holds readings of the meter

    def get(self, role: str) -> int | None:
        """Column of a role."""
        return self.by_role.get(role)

    def heading(self, role: str) -> Heading:
        """Heading of a role's column, which must be there."""
        return self.headings[self.by_role[role]]


def answer(key: str, *values: str) -> str:
    """The line of site.toml, and the option, that answers a question."""
    lines = " or ".join(f'{key} = "{v}"' for v in values)
    return f"Put {lines} under [[account]] in site.toml, or use --{key.replace('_', '-')}."


def find_columns(table: RawTable, named: dict[str, str]) -> tuple[Columns, tuple[RawRow, ...]]:
    """The header with its roles, and the lines beneath it.

    named : role → heading that the user gave for it.
    Raises UnreadableBills if no header is found or a named column is not there.
    """
    names = frozenset(squeeze(v) for v in named.values())
    head = table.rows[:HEADER_LINES]
    scores = [header_score(row.cells, names) for row in head]
    at = max(range(len(head)), key=lambda k: scores[k])
    if scores[at] < LIKELY_HEADER:
        if any(_DEMAND.search(as_text(c)) for row in head for c in row.cells):
            raise UnreadableBills(
                "the numbers are in kW, a rate of use (demand), and there are none in kWh",
                where=table.name,
                wanted="a column of use, such as 'Usage (kWh)'",
                next_step="Ask for kWh, or multiply each kW by the hours of its interval.",
            )
        raise UnreadableBills(
            "no line looks like the header of a table of bills",
            where=table.name,
            wanted="a line with headings such as 'Start', 'End', 'Usage (therms)', 'Cost'",
            next_step="Add one, or name the columns with end_column and usage_column.",
        )
    header = head[at]
    above = head[at - 1] if at else None
    headings = tuple(take_apart(text) for text in _heading_texts(header, above))
    body = table.rows[at + 1 :]
    columns = Columns(header.line, headings)
    columns = _assign(columns, body)
    return _apply_names(columns, named, table.name), body


def _heading_texts(header: RawRow, above: RawRow | None) -> list[str]:
    """Texts of a header; under merged cells ("Gas" over "Use" and "Cost") with what is above.

    A merged cell has its text in its first column only.
    """
    texts = [as_text(c) for c in header.cells]
    filled = [t for t in texts if t]
    if above is None or len(set(filled)) == len(filled):
        return texts
    over, last = [], ""
    for k in range(len(texts)):
        last = as_text(above.cells[k]) if k < len(above.cells) and above.cells[k] else last
        over.append(last)
    twice = {t for t in filled if filled.count(t) > 1}
    return [f"{o} {t}" if t in twice and o else t for o, t in zip(over, texts, strict=True)]


def _assign(columns: Columns, body: Sequence[RawRow]) -> Columns:
    """Each role's column: the best heading; the first of equals."""
    by_role: dict[str, int] = {}
    for k, heading in enumerate(columns.headings):
        role = _reading_role(heading, body, k)
        if not role or role in ("ignore", "private", "notes", "account", "usage"):
            continue
        if role not in by_role or heading.score > columns.headings[by_role[role]].score:
            by_role[role] = k
    role_of = [h.role for h in columns.headings]
    likely = [k for k, role in enumerate(role_of) if role == "usage"]
    # A usage column of words is still the usage column when there is no other: each of its
    # cells is then said to be no number.
    usage = tuple(k for k in likely if _holds_numbers(body, k)) or tuple(likely)
    return replace(
        columns,
        by_role=by_role,
        notes=tuple(k for k, role in enumerate(role_of) if role == "notes"),
        accounts=tuple(
            k
            for k, role in enumerate(role_of)
            if role == "account" and by_role.get("estimated") != k
        ),
        usage=usage,
    )


_READINGS = {"start": "register start", "end": "register", "read": "register"}
_READ_DATES = {"register start": "start", "register": "end"}


def _reading_role(heading: Heading, body: Sequence[RawRow], k: int) -> str:
    """A heading's role; where it speaks of a reading, the cells say if its date or its number."""
    role = heading.role
    if role in ("fuel", "account") and _holds_marks(body, k):
        return "estimated"
    about = {"read", "reading", "readings", "register", "index"} & set(heading.words)
    if role not in (*_READINGS, *_READ_DATES) or not about or "date" in heading.words:
        return role
    cells = [row.cells[k] for row in body[:500] if k < len(row.cells)]
    filled = [c for c in cells if not is_blank(c)]
    dates = sum(1 for c in filled if not isinstance(c, (int, float)) and _DATE.search(as_text(c)))
    if 2 * dates > len(filled):
        return _READ_DATES.get(role, role)
    return _READINGS.get(role, role) if _holds_numbers(body, k) and filled else role


def _holds_marks(body: Sequence[RawRow], k: int) -> bool:
    """Whether a column of "types" tells how each bill was read: Actual, Estimated, Cancelled."""
    cells = [as_text(row.cells[k]).strip().lower() for row in body[:500] if k < len(row.cells)]
    filled = [c for c in cells if c]
    marks = [c for c in filled if len(c) > 1 and c in (ESTIMATED_YES | ESTIMATED_NO)]
    known = [c for c in filled if c in (ESTIMATED_YES | ESTIMATED_NO) or c.startswith("cancel")]
    return bool(marks) and 10 * len(known) >= 9 * len(filled)


def _holds_numbers(body: Sequence[RawRow], k: int) -> bool:
    """Whether most filled cells of a column begin as numbers (or the column is empty)."""
    cells = [row.cells[k] for row in body[:500] if k < len(row.cells)]
    filled = [c for c in cells if not is_blank(c)]
    good = sum(1 for c in filled if not isinstance(c, str) or split_amount(c) is not None)
    return 2 * good >= len(filled)


def _apply_names(columns: Columns, named: dict[str, str], where: str) -> Columns:
    by_role = dict(columns.by_role)
    for role, name in named.items():
        hits = [k for k, h in enumerate(columns.headings) if squeeze(h.text) == squeeze(name)[:40]]
        if not hits:
            shown = ", ".join(repr(h.text) for h in columns.headings if h.text)
            raise UnreadableBills(
                f"no column is called {name[:40]!r} ({role}_column)",
                where=f"{where}:{columns.line}",
                wanted=f"one of {shown[:300]}",
            )
        for other in [r for r, k in by_role.items() if k == hits[0] and r != role]:
            del by_role[other]
        by_role[role] = hits[0]
    if "register" in named:
        by_role["usage"] = by_role["register"]
        columns = replace(columns, differenced=True)
    if "end" in named:  # a named end is the date of the reading, whatever else there is
        by_role.pop("read", None)
        by_role.pop("range", None)
    return replace(columns, by_role=by_role)


def choose_usage(
    columns: Columns, *, fuel: str | None, unit: str | None, where: str
) -> tuple[Columns, tuple[str, ...]]:
    """The usage column, with sentences about those passed over.

    Raises AmbiguousBills when several would do, UnreadableBills when none is there.
    """
    if "usage" in columns.by_role:
        return columns, ()
    if not columns.usage and "register" in columns.by_role:
        by_role = {**columns.by_role, "usage": columns.by_role["register"]}
        return replace(columns, by_role=by_role, differenced=True), ()
    if not columns.usage:
        raise _no_usage(columns, where)
    notes: list[str] = []
    left = list(columns.usage)
    left = _of_fuel(columns, left, fuel, where)
    if unit is not None:
        left = [k for k in left if _unit_of(columns.headings[k], fuel) == unit] or left
    left = [k for k in left if not columns.headings[k].per_day] or left
    if len(left) > 1:
        therms = [k for k in left if _unit_of(columns.headings[k], fuel) in ("therm", "Dth")]
        units = {_unit_of(columns.headings[k], fuel) for k in left}
        if len(therms) == 1 and units <= {"therm", "Dth", "cf", "ccf", "Mcf", "MMcf", "m3"}:
            left = therms
            notes.append("therms were taken rather than volume, for they count the heat itself")
    if len(left) > 1:
        ranked = sorted(left, key=lambda k: -columns.headings[k].score)
        first, second = (columns.headings[k] for k in ranked[:2])
        if first.score - second.score < CLEAR_LEAD:
            names = [columns.headings[k].text for k in left]
            raise AmbiguousBills(
                f"several columns could be the usage ({', '.join(map(repr, names[:6]))})",
                where=f"{where}:{columns.line}",
                next_step=answer("usage_column", *names[:2]),
            )
        left = ranked[:1]
    passed = [columns.headings[k].text for k in columns.usage if k != left[0]]
    if passed:
        notes.append(f"not used: {', '.join(map(repr, passed))}")
    return replace(columns, by_role={**columns.by_role, "usage": left[0]}), tuple(notes)


def _of_fuel(columns: Columns, left: list[int], fuel: str | None, where: str) -> list[int]:
    """Columns that can be of the fuel; asks for it if the file holds several."""
    if fuel is None:
        fuels = {f for k in left if (f := fuel_suggested(columns.headings[k]))}
        if len(fuels) > 1:
            raise AmbiguousBills(
                f"the file holds several fuels ({', '.join(sorted(fuels))})",
                where=f"{where}:{columns.line}",
                next_step=answer("fuel", *sorted(fuels)),
            )
        return left
    named = [k for k in left if columns.headings[k].fuel == fuel]
    fits = [
        k
        for k in left
        if columns.headings[k].fuel in ("", fuel) and _may_be_billed(columns.headings[k], fuel)
    ]
    # kWh fits gas in some countries: beside a column that only gas can have, it is not gas.
    likely = [k for k in fits if fuel_suggested(columns.headings[k]) in ("", fuel)]
    if not (named or fits):
        names = ", ".join(repr(columns.headings[k].text) for k in left[:6])
        raise UnreadableBills(
            f"no usage column is in a unit of {fuel} ({names})",
            where=f"{where}:{columns.line}",
            wanted="a column of that fuel",
            next_step="Check the fuel, or name the column with usage_column.",
        )
    return [k for k in named if k in fits] or likely or fits


_BESIDE_POWER = {"therm", "Dth", "cf", "ccf", "Mcf", "MMcf"}  # not m3: gas billed in kWh has it


def fuels_of_columns(columns: Columns) -> tuple[str, ...]:
    """The fuels that have usage columns of their own, where it is plain that they are several.

    Headings name them ("Gas", "Electric"), or one is in kWh and one in therms or cubic feet.  A
    column of m³ beside one of kWh can be the same gas twice.
    """
    if "usage" in columns.by_role:
        return ()
    found: dict[str, set[str]] = {}
    for k in columns.usage:
        heading = columns.headings[k]
        fuel = fuel_suggested(heading)
        if fuel:
            found.setdefault(fuel, set()).add("" if heading.fuel else _unit_of(heading, None))
    sure = all("" in how or how & _BESIDE_POWER or fuel == "electricity"
               for fuel, how in found.items())  # fmt: skip
    return tuple(found) if len(found) > 1 and sure else ()


def _unit_of(heading: Heading, fuel: str | None) -> str:
    """Canonical unit of a heading; "" if it has none or it does not fit the fuel."""
    if not heading.unit:
        return ""
    try:
        return canonical_unit(heading.unit, fuel)
    except (UnknownUnit, BillError):
        return ""


def _may_be_billed(heading: Heading, fuel: str) -> bool:
    """Whether a heading's unit fits the fuel, or is one that must be asked about (MBtu)."""
    return not heading.unit or bool(_unit_of(heading, fuel)) or not _unit_of(heading, None)


def fuel_suggested(heading: Heading) -> str:
    """The fuel that a heading's words or unit speak for; "" if they speak for none."""
    if heading.fuel:
        return heading.fuel
    return fuel_of_unit(_unit_of(heading, None))


def fuel_of_unit(unit: str) -> str:
    """The fuel that is usually billed in a unit; "" where several are (common practice)."""
    if unit in ("kWh", "MWh", "Wh", "GWh"):
        return "electricity"
    if unit in ("therm", "Dth", "cf", "ccf", "Mcf", "MMcf", "m3"):
        return "natural gas"
    return "wood" if unit == "cord" else ""


def choose_cost(columns: Columns, fuel: str) -> Columns:
    """The cost column of the fuel, where the file has one for each."""
    if "cost" not in columns.by_role or len(columns.usage) < 2:
        return columns
    own = [k for k, h in enumerate(columns.headings) if h.role == "cost" and h.fuel == fuel]
    others = [
        k for k, h in enumerate(columns.headings) if h.role == "cost" and h.fuel not in ("", fuel)
    ]
    by_role = dict(columns.by_role)
    if own:
        by_role["cost"] = own[0]
    elif by_role["cost"] in others:
        del by_role["cost"]
    return replace(columns, by_role=by_role)


def _no_usage(columns: Columns, where: str) -> UnreadableBills:
    names = ", ".join(repr(h.text) for h in columns.headings if h.text)
    return UnreadableBills(
        f"no column looks like usage (the headings are {names[:300]})",
        where=f"{where}:{columns.line}",
        wanted="a heading such as 'Usage (kWh)' or 'Therms'",
        next_step='Name it: usage_column = "…" under [[account]] in site.toml, or --usage-column.',
    )


def described(columns: Columns, roles: Sequence[str]) -> tuple[str, ...]:
    """One sentence per role that has a column: "usage from column 'kWh'"."""
    return tuple(
        f"{ROLES[role]} from column {columns.heading(role).text!r}"
        for role in roles
        if role in columns.by_role
    )


def is_delivered(fuel: str) -> bool:
    """Whether the fuel comes by truck."""
    return FUELS[fuel].delivered
