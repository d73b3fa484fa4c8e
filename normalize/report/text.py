"""Results for the terminal: the plain answer first, the statistics after it."""

from __future__ import annotations

import textwrap
import unicodedata
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

from normalize.report import (
    breaks,
    checks_words,
    drivers,
    parts,
    placebo_words,
    site_words,
    spread,
    tables,
    words,
)
from normalize.report import numbers as n

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from normalize.report.tables import Table
    from normalize.site import AccountResult, SiteResult

MIN_WIDTH: Final = 40  # narrower terminals get lines of this width
MOST_LEDGER_LINES: Final = 12  # more are in the report
MIN_HEAD: Final = 8  # a column's head is not broken narrower than this


def to_text(
    result: SiteResult,
    *,
    statistics: bool = True,
    width: int = 80,
    ascii: bool = False,  # noqa: A002  the word that says it; nothing here needs the builtin
    show_accounts: bool = False,
    subject: str = "This site",
) -> str:
    """The answer in sentences, then, unless unwanted, what stands behind it.

    width : characters a line.  ascii : for a terminal that cannot show more.
    show_accounts : account numbers in full.  subject : who used less, e.g. "Your house".
    """
    sheet = _Sheet(max(width, MIN_WIDTH), ascii, show_accounts)
    lines = [
        *_answer(result, sheet, subject),
        *_cautions(result, sheet),
        *_firm(result, sheet, statistics=statistics),
    ]
    if statistics:
        for account in result.accounts:
            lines += _statistics(account, result, sheet)
        lines += _site_statistics(result, sheet)
    return "\n".join(line.rstrip() for line in lines).rstrip() + "\n"


@dataclass(frozen=True, slots=True)
class _Sheet:
    """What a line may be: how wide, in which characters, with which names."""

    width: int
    ascii: bool
    show_accounts: bool

    def say(self, text: str) -> str:
        """Text as this terminal shows it, account numbers masked."""
        text = tables.hide_accounts(text, show_accounts=self.show_accounts)
        return n.to_ascii(text) if self.ascii else text

    def wrap(self, text: str, first: str = "", rest: str = "") -> list[str]:
        """Lines of the sheet's width; a number stays with its sign."""
        kept = self.say(text.replace(n.NBSP, "\0")).replace("\\x00", "\0")
        lines = textwrap.wrap(
            kept,
            self.width,
            initial_indent=first,
            subsequent_indent=rest,
            break_on_hyphens=False,
        )
        return [line.replace("\0", " ") for line in lines]

    def item(self, text: str) -> list[str]:
        """One entry of a list."""
        return self.wrap(text, "  - ", "    ")

    def heading(self, text: str, rule: str) -> list[str]:
        """A heading with a rule beneath."""
        lines = self.wrap(text) or [""]
        return [*lines, rule * max(columns(line) for line in lines)]

    def table(self, table: Table, keep: Sequence[int] | None = None) -> list[str]:
        """Columns side by side when they fit, else each row as one entry of a list."""
        kept = tuple(keep) if keep is not None else tuple(range(len(table.header)))
        rows = [tuple(self.cell(row[i]) for i in kept) for row in table.rows]
        header = [self.cell(table.header[i]) for i in kept]
        wide = [max([columns(row[i]) for row in rows], default=0) for i in range(len(kept))]
        heads = [
            textwrap.wrap(head, max(w, MIN_HEAD), break_long_words=False) or [""]
            for head, w in zip(header, wide, strict=True)
        ]
        wide = [max(w, *(columns(x) for x in head)) for w, head in zip(wide, heads, strict=True)]
        lines = self.wrap(table.caption)
        if sum(wide) + 2 * len(wide) > self.width:
            return lines + [line for row in rows for line in self.item(_told(header, row))]
        right = [i in table.figures for i in kept]
        depth = max(len(head) for head in heads)
        padded = [[""] * (depth - len(head)) + head for head in heads]
        lines += [_line([head[level] for head in padded], wide, right) for level in range(depth)]
        return lines + [_line(row, wide, right) for row in rows]

    def cell(self, text: str) -> str:
        """One cell of a table."""
        return self.say(text).replace(n.NBSP, " ")


def _told(header: Sequence[str], row: Sequence[str]) -> str:
    """A row that does not fit its columns: its name, then what is known."""
    empty = ("", n.UNKNOWN, n.to_ascii(n.UNKNOWN))
    parts = [f"{h} {v}" for h, v in zip(header[1:], row[1:], strict=True) if v not in empty]
    return f"{row[0]}: {', '.join(parts)}" if parts else row[0]


def _line(cells: Sequence[str], wide: Sequence[int], right: Sequence[bool]) -> str:
    parts = []
    for cell, w, figure in zip(cells, wide, right, strict=True):
        room = " " * (w - columns(cell))
        parts.append(room + cell if figure else cell + room)
    return "  " + "  ".join(parts)


def columns(text: str) -> int:
    """How many terminal columns a text takes; wide and combining characters counted.

    >>> columns("gas"), columns("ガス"), columns("e\\u0301")
    (3, 4, 1)
    """
    return sum(
        0 if unicodedata.combining(c) else 2 if unicodedata.east_asian_width(c) in "WF" else 1
        for c in text
    )


def _answer(result: SiteResult, sheet: _Sheet, subject: str) -> Iterator[str]:
    yield from sheet.heading(n.name(result.site.name), "=")
    for account in result.accounts:
        which = words.which_of(account, result, show_accounts=sheet.show_accounts)
        yield ""
        for sentence in (
            *words.answer(account, subject=subject, which=which),
            *words.worth(account, result.site.currency),
        ):
            yield from sheet.wrap(sentence)
    for sentence in site_words.totals_of(result):
        yield from ["", *sheet.wrap(sentence)]
    if any(a.has_answer for a in result.accounts):
        yield from ["", *sheet.wrap(site_words.range_note(result.confidence))]
        yield from ["", *sheet.wrap(site_words.CAUSE)]


def _cautions(result: SiteResult, sheet: _Sheet) -> Iterator[str]:
    yield from ["", "Cautions"]
    for account in result.accounts:
        for caution in account.cautions:
            yield from sheet.item(f"{n.name(account.account)}: {n.clean(caution)}")
    for caution in site_words.cautions_of(result):
        yield from sheet.item(caution)


def _statistics(account: AccountResult, result: SiteResult, sheet: _Sheet) -> Iterator[str]:
    save = account.savings
    title = f"{words.account_title(account)}, {words.unit_word(account.unit)}"
    yield from ["", *sheet.heading(title, "-")]
    if account.bills is None:
        yield from sheet.wrap(n.clean(account.unavailable))
        return
    years = tables.years_table(account)
    yield from sheet.table(years, keep=range(6))
    for row in years.rows:
        if row[-1]:
            yield from sheet.item(f"{row[0]}: not known, {row[-1]}")
    sides = (
        ("before", save.before, save.before_unavailable, account.tried_before),
        ("after", save.after, save.after_unavailable, account.tried_after),
    )
    for side, fit, why, tried in sides:
        yield ""
        if fit is None:
            reason = n.clean(why) or "no reason given"
            yield from sheet.wrap(f"No fit {side} the work: {reason}.")
        else:
            unit = words.unit_word(account.unit)
            yield from sheet.table(tables.coefficients_table(fit, unit, side))
        if tried:
            yield from ["", f"Forms tried, {side} the work"]
            for row in tables.forms_table(tried, side).rows:
                numbers = f"CV(RMSE) {row[3]}, AICc {row[4]}; " if row[3] != n.UNKNOWN else ""
                yield from sheet.item(f"{row[0]}: {numbers}{row[6]}")
    yield from _behind(account, result, sheet)


def _close(account: AccountResult, sheet: _Sheet) -> Iterator[str]:
    """What the change is made of, the heat loss, and what the work should have saved."""
    told = parts.close_reading(account)
    if told.parts_table is not None:
        yield from ["", *sheet.table(told.parts_table)]
    elif told.parts or told.heat_loss:
        yield ""
    for sentence in (*told.parts, *told.heat_loss):
        yield from sheet.wrap(sentence)
    if told.expectation:
        yield from ["", "What the work should have saved"]
        for sentence in told.expectation:
            yield from sheet.wrap(sentence)
        if told.expectation_table is not None:
            yield from ["", *sheet.table(told.expectation_table)]
        for caution in told.cautions:
            yield from sheet.item(caution)


def _drivers(account: AccountResult, sheet: _Sheet) -> Iterator[str]:
    """What drives use beside the weather, and the answer with and without."""
    told = drivers.reading_of(account)
    if told is None:
        return
    yield from ["", "What drives use beside the weather"]
    for sentence in told.sentences:
        yield from sheet.wrap(sentence)
    yield from ["", *sheet.table(told.answers, keep=range(4))]


def _breaks(account: AccountResult, sheet: _Sheet) -> Iterator[str]:
    """When use changed."""
    told = breaks.sentences(account)
    if told:
        yield from ["", "When did it change?"]
    for sentence in told:
        yield from sheet.wrap(n.clean(sentence))
    table = breaks.table_of(account)
    if table is not None:
        yield from ["", *sheet.table(table)]


def _behind(account: AccountResult, result: SiteResult, sheet: _Sheet) -> Iterator[str]:
    """Statistics, checks, factors and the ledger of one account."""
    save = account.savings
    yield from _drivers(account, sheet)
    yield from _breaks(account, sheet)
    yield from _close(account, sheet)
    if save.before is not None or save.after is not None:
        yield from ["", *sheet.table(tables.statistics_table(account))]
    if save.same_form:
        yield from ["", *sheet.table(tables.same_form_table(account))]
    if account.checks:
        yield from ["", "Checks"]
        for line in checks_words.lines(account.checks):
            yield from sheet.item(line)
    invented = placebo_words.sentences(account)
    if invented:
        yield from ["", "Invented work dates"]
        for sentence in invented:
            yield from sheet.wrap(sentence)
    yield from ["", "Price and factors"]
    for what, value, source in tables.factors_table(account, result.site.currency).rows:
        yield from sheet.item(f"{what}: {value} ({source})")
    yield from ["", *sheet.wrap(f"Ledger. {tables.ledger_summary(account)}")]
    noted = [row for row in tables.ledger_table(account).rows if row[3]]
    for file, line, fate, note in noted[:MOST_LEDGER_LINES]:
        yield from sheet.item(f"{file}:{line}: {fate}: {note}")
    if len(noted) > MOST_LEDGER_LINES:
        yield from sheet.item(f"and {len(noted) - MOST_LEDGER_LINES} more, in the report")


def _firm(result: SiteResult, sheet: _Sheet, *, statistics: bool) -> Iterator[str]:
    """How firm each answer is: a sentence, and behind it the answer under every change."""
    told = [(a, spread.sentences(a, result)) for a in result.accounts]
    if not any(sentences for _, sentences in told):
        return
    yield from ["", "How firm the answer is"]
    for account, sentences in told:
        for sentence in sentences:
            yield from sheet.item(f"{n.name(account.account)}: {sentence}")
        table = spread.table_of(account, result) if statistics else None
        if sentences and table is not None:
            yield ""
            yield from sheet.table(table, keep=range(4))
            for row in table.rows:
                if row[-1]:
                    yield from sheet.item(f"{row[0]}: {row[-1]}")
            yield ""


def _site_statistics(result: SiteResult, sheet: _Sheet) -> Iterator[str]:
    yield from ["", *sheet.heading("Weather and settings", "-")]
    for sentence in site_words.weather_sentences(result):
        yield from sheet.wrap(sentence)
    for name, value in result.settings:
        yield from sheet.item(f"{n.clean(name)}: {n.clean(value)}")
    told = ", ".join(f"{n.clean(name)} {n.clean(version)}" for name, version in result.versions)
    yield from sheet.wrap(f"Versions: {told}.")
