"""Read a file of bills: the one entrance of this room.

What belongs here: which reader a file is for (tables, interval files, ESPI XML), and what is done
to its rows whatever they came from: repair, flags, and the check that nothing was lost.
"""

from __future__ import annotations

import os
from collections.abc import Sequence
from dataclasses import replace
from itertools import pairwise
from typing import TYPE_CHECKING

from normalize.bills.amounts import as_text
from normalize.bills.answers import ENOUGH_BILLS, ONE_BILL, Answers, Understood, answers_of
from normalize.bills.columns import find_columns
from normalize.bills.dates import read_written, settle
from normalize.bills.deliveries import fills_sentence
from normalize.bills.espi_xml import looks_like_xml
from normalize.bills.flag_words import flag_cautions, flags_of
from normalize.bills.groups import cell
from normalize.bills.headings import header_score, squeeze
from normalize.bills.period_sums import month_spans, spans_of_bills, summed
from normalize.bills.periods import Bills, Periods, Spans
from normalize.bills.repair import reconcile, repair
from normalize.bills.solar import solar_signature
from normalize.bills.table import (
    BillFile,
    Cell,
    RawRow,
    RawTable,
    Score,
    open_file,
    read_table,
)
from normalize.errors import AmbiguousBills, NoBills, NormalizeError

if TYPE_CHECKING:
    from normalize.bills.interval_head import IntervalHead

PACED_ACCOUNTS = 200  # looked at to tell bills from days
DAYS_APART = 5  # so much or less is the pace of days, not of bills (our own, no source)


def read_bills(
    path: str | os.PathLike[str],
    *,
    fuel: str | None = None,
    unit: str | None = None,
    account: str = "",
    dates: str | None = None,
    end_dates: str | None = None,
    usage_column: str | None = None,
    start_column: str | None = None,
    end_column: str | None = None,
    days_column: str | None = None,
    cost_column: str | None = None,
    estimated_column: str | None = None,
    temperature_column: str | None = None,
    register_column: str | None = None,
    generation_column: str | None = None,
    temperature_unit: str | None = None,
    sheet: str | None = None,
    kind: str | None = None,
    net_metered: bool = False,
    rows: str | None = None,
    decimal: str | None = None,
    read_day: int | str | None = None,
    time_zone: str | None = None,
    sum_to: str | None = None,
    periods_from: str | os.PathLike[str] | None = None,
    generation: str | os.PathLike[str] | None = None,
    solar_since: int | str | None = None,
    interval_times: str | None = None,
    multiplier: float | None = None,
    tank_size: float | None = None,
    tank_percent: str | None = None,
    currency: str = "USD",
) -> Bills:
    """Read one account's bills from CSV, XLSX or ESPI XML, and repair them.

    fuel, unit : only where the file does not say.  dates : "month first", "day first" or
    "year first".  end_dates : "exclusive" (the day of the reading) or "inclusive" (the last
    day of the bill).  ..._column : headings, where the reader's own choice is wrong.  sheet :
    of a workbook.  kind : "meter" or "delivery".  rows : which account, meter or fuel of a
    file that holds several.  decimal : "point" or "comma".
    read_day : for bills that name only a month, the day of that month on which the meter is
    read, or "calendar"; also where months begin when intervals are summed.
    time_zone : "America/New_York" or "-05:00", where readings carry none.  sum_to : "day",
    "month" or "bill" (the file's own bills), for interval data; periods_from : another file
    whose bills say the periods.  generation : a file of what solar panels made, to be added to
    net use; solar_since : the panels' first day.  interval_times : "start" or "end" of an interval.
    multiplier : of a meter whose readings are given.  tank_size, tank_percent : the tank's
    content when full, and whether percentages are "before" or "after" the delivery.
    Raises MissingFile, UnreadableBills, AmbiguousBills (asks one question), UnknownUnit, NoBills.
    """
    given = dict(locals())
    file = open_file(path)
    answers = answers_of(file.name, given)
    found = understand_file(file, answers, sheet)
    return bills_of(file, found, answers, account, net_metered=net_metered, currency=currency)


def understand_file(file: BillFile, answers: Answers, sheet: str | None) -> Understood:
    """The rows of one account of a file, by the reader that it is for."""
    if looks_like_xml(file.data):
        from normalize.bills.espi import read_espi

        return read_espi(file.data, file.name, answers)
    head = interval_head(file, answers, sheet)
    if head is not None:
        from normalize.bills.intervals import read_intervals

        return read_intervals(file, head, answers)
    from normalize.bills.table_bills import understand_table

    return understand_table(read_table(file, score=table_score(answers), sheet=sheet), answers)


def table_score(answers: Answers) -> Score:
    """How much a line looks like the header of a table, the named columns counted in."""
    names = frozenset(squeeze(v) for v in answers.named.values())

    def score(cells: Sequence[Cell]) -> float:
        return header_score(cells, names)

    return score


def interval_head(
    file: BillFile, answers: Answers, sheet: str | None = None
) -> IntervalHead | None:
    """The head of an interval file; None for a table of bills.

    The monthly bills of thousands of accounts, in order of their dates, look like days.
    """
    from normalize.bills.interval_head import is_interval_file

    score = table_score(answers)
    head = is_interval_file(file, answers, score, sheet)
    if head is None:
        return None
    columns, body = find_columns(RawTable(file.name, "", head.rows, head.delimiter), answers.named)
    when = next((k for r in ("read", "end", "start") if (k := columns.get(r)) is not None), None)
    timed = bool(head.wide or head.sheet) or columns.get("time") is not None
    timed = timed or any(":" in as_text(cell(r, when)) for r in body[:9])
    if timed or not columns.accounts or when is None:
        return head
    try:
        rows = read_table(file, score=score).rows
    except NormalizeError:
        return head
    return None if _paces_of_bills(rows, columns.accounts[0], when) else head


def _paces_of_bills(rows: Sequence[RawRow], k: int, when: int) -> bool:
    """Whether most of the first accounts' lines lie more than some days apart."""
    days: dict[str, list[int]] = {}
    for row in rows:
        name = squeeze(as_text(cell(row, k)))
        if name in days or len(days) < PACED_ACCOUNTS:
            written = read_written(cell(row, when))
            day = settle(written, "month first")[0] or settle(written, "day first")[0]
            if name and day is not None:
                days.setdefault(name, []).append(day)
    steps = [abs(b - a) for each in days.values() for a, b in pairwise(sorted(set(each)))]
    return bool(steps) and sorted(steps)[len(steps) // 2] > DAYS_APART


def bills_of(
    file: BillFile,
    found: Understood,
    answers: Answers,
    account: str,
    *,
    net_metered: bool,
    currency: str,
) -> Bills:
    """Rows of one account, repaired and reconciled.  Raises NoBills."""
    spans = _spans(found, answers)
    if spans is not None:
        found = summed(found, spans)
    solar = answers.generation is not None
    bills = _repaired(file, found, account, net_metered=net_metered or solar, currency=currency)
    reconcile(bills)
    if spans is not None and spans.files:
        bills = replace(bills, source=(*bills.source, *spans.files))
    return _with_generation(bills, found, answers) if solar else bills


def _spans(found: Understood, answers: Answers) -> Spans | None:
    """The periods to which days are to be summed; None to leave them days."""
    if answers.periods_from is not None:
        return _spans_of_file(answers.periods_from, found, answers)
    if answers.sum_to == "month":
        return month_spans(found.rows, answers.read_day or 1)
    if answers.sum_to != "bill":
        return None
    if found.spans is None:
        raise AmbiguousBills(
            'sum_to is "bill", but the file itself tells of no bills',
            where=found.rows[0].file if found.rows else "",
            next_step='Name the file that does: periods_from = "bills.csv" under [[account]] in '
            "site.toml, or --periods-from.",
        )
    return found.spans


def _spans_of_file(path: str, found: Understood, answers: Answers) -> Spans:
    """The periods of the bills in another file, read with the same answers about dates."""
    file = open_file(path)
    said = Answers(
        fuel=found.fuel, dates=answers.dates, end_dates=answers.end_dates,
        read_day=answers.read_day, decimal=answers.decimal, time_zone=answers.time_zone,
        named=_named(file, path, answers),
    )  # fmt: skip
    other = understand_file(file, said, None)
    # An estimated reading is none of the days' business: its date is a date like any other.
    rows = [replace(row, estimated=False) for row in other.rows]
    periods, _ = repair(rows, kind=other.kind, net_metered=True)
    if periods.n == 0:
        raise NoBills("it holds no bill whose dates can be used", where=file.name)
    spans = spans_of_bills(periods, f"the bills of {file.name}", known=other.unit == found.unit)
    return replace(spans, files=((file.name, file.sha256),))


def _named(file: BillFile, path: str, answers: Answers) -> dict[str, str]:
    """The column of use of a file of periods, where it is the one of generation."""
    if path != answers.generation:
        return {}
    from normalize.bills.generation import heading_of_generation

    name = answers.made_column or heading_of_generation(file)
    return {"usage": name} if name else {}


def _with_generation(bills: Bills, found: Understood, answers: Answers) -> Bills:
    """Net use made gross by a file of what solar panels made."""
    from normalize.bills.generation import generation_of, made_gross

    def understand(file: BillFile, said: Answers) -> Understood:
        return understand_file(file, said, None)

    file = open_file(answers.generation or "")
    made = generation_of(file, answers, bills.unit, understand)
    return made_gross(bills, made, file, answers.solar_since, others=found.cautions)


def _repaired(
    file: BillFile, found: Understood, account: str, *, net_metered: bool, currency: str
) -> Bills:
    net = net_metered or (found.sent and not found.generation)
    periods, ledger = repair(found.rows, kind=found.kind, net_metered=net)
    flags = () if found.kind == "delivery" else flags_of(periods)
    bills = Bills(
        account=account, fuel=found.fuel, unit=found.unit, rows=found.rows, periods=periods,
        ledger=ledger, source=((file.name, file.sha256),), reading=found.reading,
        kind=found.kind, currency=found.currency or currency, flags=flags,
        cautions=(*found.cautions, *flag_cautions(flags), *_lone(periods)),
        unfit=solar_signature(found, periods, net_metered=net_metered), gross=found.generation,
    )  # fmt: skip
    if periods.n == 0:
        raise _no_bills(bills, file.name)
    return bills


def _lone(periods: Periods) -> tuple[str, ...]:
    if periods.n != 1:
        return ()
    return (f"{ONE_BILL[0].upper()}{ONE_BILL[1:]}. {ENOUGH_BILLS}",)


def _no_bills(bills: Bills, where: str) -> NoBills:
    """Not one usable bill: the commonest reason is the message."""
    reasons = [entry.note for entry in bills.ledger]
    top = max(dict.fromkeys(reasons), key=reasons.count)
    first = bills.ledger[reasons.index(top)]
    hints = [c for c in bills.cautions if "formula" in c]
    if bills.kind == "delivery":
        hints.append(f"For a fit, {fills_sentence(0)} after the first.")
    return NoBills(
        f"none of {len(reasons)} bills can be used"
        if len(reasons) > 1
        else "the one bill there is cannot be used",
        where=where,
        next_step=" ".join(
            [f"{reasons.count(top)} because: {top} (first on line {first.line}).", *hints]
        ),
    )
