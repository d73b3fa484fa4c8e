"""How firm the answer is, in words and as a table: what other choices would have said."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final, NamedTuple

from normalize.days import date_of
from normalize.report import numbers as n
from normalize.report import words
from normalize.report.tables import Table

if TYPE_CHECKING:
    from collections.abc import Sequence

    from normalize.savings.results import Estimate
    from normalize.sensitivity import Moved
    from normalize.site import AccountResult, SiteResult

AS_CHOSEN: Final = "as chosen"
ONE_BILL: Final = "one bill left out"
WEATHER: Final = ("station", "long-term year")
MOST_NAMED: Final = 3  # choices that turn the answer, named in the sentence

VERDICTS: Final = {
    "reduction": "a reduction",
    "increase": "an increase",
    "cannot tell": "“could not be told from no change”",
}


class Told(NamedTuple):
    """A row with the estimate that speaks for it."""

    row: Moved
    estimate: Estimate


@dataclass(frozen=True, slots=True)
class Line:
    """One row of the table and of the picture.

    label : what is changed.  estimate : the answer then.  note : what a reader should know.
    far : shown, but no rival of the answer.  band : for the bills left out one at a time, the
    lowest and the highest answer; else None.  reach : of the band, lowest low and highest high.
    """

    label: str
    estimate: Estimate | None
    note: str = ""
    far: bool = False
    chosen: bool = False
    band: tuple[Told, Told] | None = None
    reach: tuple[float, float] | None = None


def rows_of(account: AccountResult, result: SiteResult) -> tuple[Moved, ...]:
    """The rows of an account, the answer as chosen first; empty where there is none."""
    return tuple(m for m in result.moved if m.account == account.account)


def answer_of(row: Moved, chosen: Moved) -> Estimate | None:
    """The estimate that speaks: normalized savings if the answer has them, else avoided use."""
    normal = chosen.normalized is not None and chosen.normalized.available
    estimate = row.normalized if normal else row.avoided
    return estimate if estimate is not None and n.known(estimate.value) else None


def what(row: Moved) -> str:
    """What is changed, as a label.

    >>> from normalize.sensitivity import Moved
    >>> what(Moved("gas", "without bill 7", "one bill left out", None, None, number=7,
    ...     start=19000, end=19030)).replace(n.NBSP, " ")
    'without the bill of January 2022'
    """
    if row.changes == AS_CHOSEN:
        return "as chosen"
    if row.changes == ONE_BILL and row.start is not None and row.end is not None:
        return f"without the bill of {month_of(row.start, row.end)}"
    if row.changes == "station":
        return f"weather of {n.clean(row.name)}"
    if row.changes == "long-term year":
        return f"normal year: {n.clean(row.name)}"
    return n.clean(row.name)


def month_of(start: int, end: int) -> str:
    """The month in which most of a bill lies, by its middle."""
    middle = date_of((start + end) // 2)
    return f"{n.MONTHS[middle.month - 1]}{n.NBSP}{middle.year}"


def sentences(account: AccountResult, result: SiteResult) -> tuple[str, ...]:
    """How far other choices would move the answer, and which would turn it; the plainest first."""
    rows = rows_of(account, result)
    if len(rows) < 2:
        return ()
    chosen = rows[0]
    own = answer_of(chosen, chosen)
    if own is None:
        return ()
    rivals = [(r, e) for r in rows[1:] if not r.far and (e := answer_of(r, chosen)) is not None]
    if not rivals:
        return ()
    turned = [(r, e) for r, e in rivals if e.verdict != own.verdict]
    within = _within(own, [e for _, e in rivals], account.unit)
    if not turned:
        return (_steady(own, within),)
    return (f"{_moves(own, within)} {_turned(turned, len(rivals))}",)


def _within(own: Estimate, others: Sequence[Estimate], unit: str) -> tuple[str, str]:
    """(values from … to …, ranges from … to …) of the answer and its rivals, in words."""
    every = [own, *others]
    share = all(n.known(e.fraction) and n.known(e.fraction_low) for e in every)
    form = words.percent_form() if share else words.unit_form(words.unit_word(unit))
    each = [words.in_percent(e) if share else words.in_units(e) for e in every]
    lows = [x.low for x in each if x.low is not None]
    highs = [x.high for x in each if x.high is not None]
    values = [x.value for x in each if x.value is not None]
    spread = words.Range(values[0], min(values), max(values))
    digits = words.digits_for(spread, form)
    return (
        _between(spread, form, digits, plainly=own.verdict == "cannot tell"),
        _between(words.Range(values[0], min(lows), max(highs)), form, 2, plainly=False),
    )


def _between(spread: words.Range, form: words.Form, digits: int, *, plainly: bool) -> str:
    """A stretch in words; plainly: with the direction at both ends."""
    if not plainly:
        return words.span_words(spread, form, digits)
    ends = (words.signed(x, form, digits) for x in (spread.low, spread.high))
    return "between " + " and ".join(ends)


def _steady(own: Estimate, within: tuple[str, str]) -> str:
    values, ranges = within
    if own.verdict == "cannot tell":
        return (
            f"Whatever is changed below, the change could not be told from none; it stays {values}."
        )
    thing = "saving" if own.verdict == "reduction" else "increase"
    return (
        f"Whatever is changed below, the {thing} stays {values} and can be told from no change "
        f"(the ranges lie {ranges})."
    )


def _moves(own: Estimate, within: tuple[str, str]) -> str:
    thing = {"reduction": "saving", "increase": "increase"}.get(own.verdict, "change")
    return f"With what is changed below, the {thing} lies {within[0]}."


def _turned(turned: Sequence[tuple[Moved, Estimate]], of: int) -> str:
    """Which changes turn the answer, by what they turn it into."""
    into: dict[str, list[Moved]] = {}
    for row, estimate in turned:
        into.setdefault(estimate.verdict, []).append(row)
    parts = []
    for verdict, rows in into.items():
        to = VERDICTS.get(verdict, verdict)
        if len(rows) == 1:
            parts.append(f"{words.upper(_doing(rows[0]))} alone would turn it into {to}.")
            continue
        some = "; ".join(_doing(r) for r in rows[:MOST_NAMED])
        more = f"; and {len(rows) - MOST_NAMED} more" if len(rows) > MOST_NAMED else ""
        parts.append(
            f"{len(rows)} of {of} changes, each alone, would turn it into {to}: {some}{more}."
        )
    return " ".join(parts)


def _doing(row: Moved) -> str:
    """A change as something that one does."""
    label = what(row)
    if row.changes == ONE_BILL:
        return label.replace("without", "leaving out", 1)
    if row.changes == "station":
        return f"the {label}"
    return f"“{label}”"


def lines(account: AccountResult, result: SiteResult) -> tuple[Line, ...]:
    """Rows for table and picture; the bills left out one at a time are one of them."""
    rows = rows_of(account, result)
    if not rows:
        return ()
    chosen = rows[0]
    own = answer_of(chosen, chosen)
    if own is None:
        return ()
    out: list[Line] = []
    singles = [r for r in rows if r.changes == ONE_BILL]
    for row in rows:
        if row.changes == ONE_BILL:
            if row is singles[0]:
                out += _bills(singles, chosen)
            continue
        estimate = answer_of(row, chosen)
        out.append(
            Line(what(row), estimate, _note(row, estimate, chosen, own), bool(row.far),
                 row is chosen)
        )  # fmt: skip
    return tuple(out)


def _bills(singles: Sequence[Moved], chosen: Moved) -> list[Line]:
    known = [Told(r, e) for r in singles if (e := answer_of(r, chosen)) is not None]
    if not known:
        return []
    low = min(known, key=lambda told: told.estimate.value or 0.0)
    high = max(known, key=lambda told: told.estimate.value or 0.0)
    lows = [e.low for _, e in known if e.low is not None]
    highs = [e.high for _, e in known if e.high is not None]
    reach = (min(lows), max(highs)) if lows and highs else None
    number = f"each of {len(known)} bills left out in turn"
    return [Line(number, None, "", band=(low, high), reach=reach)]


def _note(row: Moved, estimate: Estimate | None, chosen: Moved, own: Estimate) -> str:
    if row is chosen:
        return _forms(row)
    if estimate is None:
        told = row.unavailable
        for e in (row.normalized, row.avoided):
            told = told or (e.unavailable or "" if e is not None else "")
        return n.clean(told)
    parts = [row.far] if row.far else []
    if row.changes not in ("same form", "other forms") and _forms(row) not in ("", _forms(chosen)):
        parts.append(f"forms then: {_forms(row)}")
    if not row.far and estimate.value == own.value and estimate.low == own.low:
        parts.append("the same answer")
    if not row.far and estimate.verdict != own.verdict:
        parts.append(f"turns the answer into {VERDICTS.get(estimate.verdict, estimate.verdict)}")
    return "; ".join(parts)


def _forms(row: Moved) -> str:
    if not row.form_before:
        return ""
    if row.form_before == row.form_after or not row.form_after:
        return row.form_before
    return f"{row.form_before} before, {row.form_after} after"


def table_of(account: AccountResult, result: SiteResult) -> Table | None:
    """The answer under every change; of the bills left out in turn, the extremes."""
    rows = rows_of(account, result)
    if len(rows) < 2:
        return None
    chosen = rows[0]
    own = answer_of(chosen, chosen)
    if own is None:
        return None
    out: list[tuple[str, ...]] = []
    for line in lines(account, result):
        if line.band is None:
            out.append((line.label, *_numbers(line.estimate), line.note))
            continue
        for word, (row, e) in zip(("lowest", "highest"), line.band, strict=True):
            note = _joined(_note(row, e, chosen, own), n.span(row.start, row.end))
            out.append((f"{word} {what(row)}", *_numbers(e), note))
    normal = chosen.normalized is not None and chosen.normalized.available
    kind = "in a normal year" if normal else "since the work"
    caption = (
        f"The change {kind} with one thing changed at a time, "
        f"{words.unit_word(account.unit)}; less is positive. Forms that fit these bills far "
        "worse are shown and not counted in the sentence."
    )
    head = ("what is changed", "change", "low", "high", "share", "note")
    return Table(caption, head, tuple(out), frozenset((1, 2, 3, 4)))


def _joined(*parts: str) -> str:
    return "; ".join(p for p in parts if p)


def _numbers(estimate: Estimate | None) -> tuple[str, str, str, str]:
    if estimate is None:
        return (n.UNKNOWN,) * 4
    return (
        n.plain(estimate.value, 1),
        n.plain(estimate.low, 1),
        n.plain(estimate.high, 1),
        n.percent_plain(estimate.fraction),
    )


def bills_table(account: AccountResult, result: SiteResult) -> Table | None:
    """The answer without each bill, one row a bill."""
    rows = rows_of(account, result)
    singles = [r for r in rows if r.changes == ONE_BILL]
    if not singles:
        return None
    chosen = rows[0]
    own = answer_of(chosen, chosen)
    if own is None:
        return None
    out = [
        (
            f"{r.number}",
            n.short_date(r.start),
            n.short_date(r.end),
            r.side,
            *_numbers(answer_of(r, chosen)),
            _note(r, answer_of(r, chosen), chosen, own),
        )
        for r in singles
    ]
    head = ("period", "from", "until", "side", "change", "low", "high", "share", "note")
    caption = f"The change without each bill in turn, {words.unit_word(account.unit)}"
    return Table(caption, head, tuple(out), frozenset((0, 4, 5, 6, 7)))
