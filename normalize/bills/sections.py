"""Files that name the account in a line of its own, above the bills of each.

What belongs here: finding such lines, and giving every bill beneath one its account, as a column
would.  Without that the bills of one account would pass for later versions of another's.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import replace

from normalize.bills.amounts import as_text, is_blank
from normalize.bills.columns import Columns
from normalize.bills.headings import squeeze, take_apart
from normalize.bills.table import Cell, RawRow, RawTable

_NAMES_ONE = re.compile(
    r"^(?:account|acct|meter|premise|service (?:id|point|agreement)|customer (?:no|number|id))\b"
    r"[\s.:#-]*(?:(?:number|no|nr|id)\b)?[\s.:#-]*(?P<value>\S*\d\S*)?$",
    re.IGNORECASE,
)
MOST_CELLS = 3  # filled, of a line that names an account and says nothing else


def with_sections(
    table: RawTable, columns: Columns, body: Sequence[RawRow]
) -> tuple[Columns, tuple[RawRow, ...], tuple[str, ...]]:
    """Columns and lines with the account of each section in a column of its own, and a sentence.

    Unchanged where a column names accounts, or fewer than two are named in lines.
    """
    if columns.accounts:
        return columns, tuple(body), ()
    named = {row.line: name for row in table.rows if (name := _account_named(row))}
    if len({squeeze(name) for name in named.values()}) < 2:
        return columns, tuple(body), ()
    width = max([len(columns.headings), *(len(row.cells) for row in body)])
    headings = (*columns.headings, *[take_apart("")] * (width - len(columns.headings)))
    lines, current = [], _last_above(named, columns.line)
    for row in body:
        if row.line in named:
            current = named[row.line]
            continue
        blank: tuple[Cell, ...] = (None,) * (width - len(row.cells))
        lines.append(RawRow(row.line, (*row.cells, *blank, current)))
    said = f"accounts are named in lines of their own above their bills ({len(named)} such lines)"
    columns = replace(columns, headings=(*headings, take_apart("Account")), accounts=(width,))
    return columns, tuple(lines), (said,)


def _last_above(named: dict[int, str], line: int) -> str:
    """The account named last before the header; "" if none is."""
    above = [n for n in named if n < line]
    return named[max(above)] if above else ""


def _account_named(row: RawRow) -> str:
    """The account that a line names, in one cell or in two beside each other; "" if none."""
    filled = [as_text(c) for c in row.cells if not is_blank(c)]
    if not 1 <= len(filled) <= MOST_CELLS:
        return ""
    found = _NAMES_ONE.match(filled[0])
    if found is None:
        return ""
    if found["value"]:
        return found["value"]
    beside = filled[1] if len(filled) > 1 else ""
    return beside if any(c.isdigit() for c in beside) and " " not in beside else ""
