"""Generation from a file of its own: gross use = net use + generation, days by days.

What belongs here: finding the column of generation, and adding what the panels made to the
periods of the bills.  A period whose every day is not covered is left out, with its reason.  A
column of generation beside the use is read in found.py.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from normalize.bills.amounts import as_text
from normalize.bills.answers import Answers, Understood
from normalize.bills.columns import answer
from normalize.bills.flag_words import flag_cautions, flags_of
from normalize.bills.headings import take_apart
from normalize.bills.periods import Bills, LedgerEntry, Periods
from normalize.bills.repair import repair
from normalize.bills.sum_rows import several
from normalize.bills.table import HEADER_LINES, BillFile, Cell, csv_head
from normalize.days import iso
from normalize.errors import AmbiguousBills, UnreadableBills
from normalize.units import mmbtu_per_unit

if TYPE_CHECKING:
    from numpy.typing import NDArray

Understand = Callable[[BillFile, Answers], Understood]


def generation_of(file: BillFile, answers: Answers, unit: str, understand: Understand) -> Periods:
    """What the panels made, by periods, in the unit of the net use.

    Raises as read_bills does; ``generation_column`` names the column where it is not clear.
    """
    name = answers.made_column or heading_of_generation(file)
    said = Answers(
        fuel="electricity", dates=answers.dates, end_dates=answers.end_dates,
        decimal=answers.decimal, read_day=answers.read_day, time_zone=answers.time_zone,
        interval_times=answers.interval_times, named={"usage": name} if name else {},
    )  # fmt: skip
    try:
        found = understand(file, said)
    except AmbiguousBills:
        if answers.unit is None:
            raise
        found = understand(file, replace(said, unit=answers.unit))
    periods, _ = repair(found.rows, net_metered=True)  # inverters draw a little at night
    factor = mmbtu_per_unit("electricity", found.unit).value
    factor /= mmbtu_per_unit("electricity", unit).value
    return replace(periods, use=periods.use * (1.0 if found.unit == unit else factor))


def heading_of_generation(file: BillFile) -> str:
    """The first heading that speaks of generation, "" if none does."""
    names: list[str] = []

    def look(cells: Sequence[Cell]) -> float:
        found = [t for c in cells if (t := as_text(c)) and take_apart(t).role == "generation"]
        names.extend(found[:1] if len(cells) > 1 else [])
        return 10.0 * len(found)

    if file.data.startswith(b"PK"):
        from normalize.bills.workbook import read_workbook

        table = read_workbook(file.data, name=file.name, sha256=file.sha256, score=look,
                              sheet=None, most=HEADER_LINES)  # fmt: skip
        for row in table.rows:
            look(row.cells)
    else:
        csv_head(file, look)
    return names[0] if names else ""


def made_gross(
    bills: Bills, made: Periods, file: BillFile, since: int | None, *, others: Sequence[str] = ()
) -> Bills:
    """Bills whose use is net use + generation. since : first day of the panels, where said.

    Raises UnreadableBills where no period is covered.
    """
    p = bills.periods
    start = np.maximum(p.start, since) if since is not None else p.start
    solar, known = _within(made, start, np.maximum(p.end, start))
    if not np.any(known & (p.end > start)):
        raise _no_days_in_common(bills, made, file.name)
    number = np.where(known, np.cumsum(known) - 1, -1)
    periods = replace(
        p, start=p.start[known], end=p.end[known], use=(p.use + solar)[known],
        cost=p.cost[known], estimated=p.estimated[known], joined=p.joined[known],
        mean_temp_f=None if p.mean_temp_f is None else p.mean_temp_f[known],
    )  # fmt: skip
    flags = flags_of(periods)
    net, gained = float(p.use[known].sum()), float(solar[known].sum())
    before = f"; before {iso(since)} there were no panels" if since is not None else ""
    return replace(
        bills, periods=periods, ledger=tuple(_fates(bills.ledger, number, file.name)), flags=flags,
        source=(*bills.source, (file.name, file.sha256)), unfit="", gross=True,
        reading=(
            *bills.reading,
            f"gross use is net use and what {file.name} says was generated: {net:,.1f} + "
            f"{gained:,.1f} = {net + gained:,.1f} {bills.unit}{before}",
        ),
        cautions=(*others, *flag_cautions(flags), *_uncovered(p, known, file.name, since)),
    )  # fmt: skip


def _within(
    made: Periods, start: NDArray[np.int32], end: NDArray[np.int32]
) -> tuple[NDArray[np.float64], NDArray[np.bool_]]:
    """Generation of each span of days, and whether its periods fill the span exactly."""
    total = np.concatenate([[0.0], np.cumsum(made.use)])
    days = np.concatenate([[0], np.cumsum(made.days)])
    a = np.searchsorted(made.start, start)
    b = np.searchsorted(made.end, end, side="right")
    b = np.maximum(a, b)
    return total[b] - total[a], days[b] - days[a] == end - start


def _fates(
    ledger: Sequence[LedgerEntry], number: NDArray[np.int64], name: str
) -> Sequence[LedgerEntry]:
    """The ledger with periods numbered anew, and those without generation left out."""
    out = []
    for entry in ledger:
        if entry.fate == "left out":
            out.append(entry)
            continue
        k = int(number[int(entry.fate.removeprefix("period ")) - 1])
        if k >= 0:
            out.append(replace(entry, fate=f"period {k + 1}"))
        else:
            why = f"{name} does not say what was generated on every day of it"
            out.append(replace(entry, fate="left out", note=f"{entry.note}; {why}".lstrip("; ")))
    return out


def _uncovered(
    p: Periods, known: NDArray[np.bool_], name: str, since: int | None
) -> tuple[str, ...]:
    lost = np.flatnonzero(~known)
    if lost.size == 0:
        return ()
    cure = "" if since is not None else (
        " If there were no panels yet, say since when: solar_since = 2021-05-01 under [[account]] "
        "in site.toml, or --solar-since."
    )  # fmt: skip
    return (
        f"{name} does not cover {lost.size} of {several(p.n, 'period')} day by day (first "
        f"{iso(int(p.start[lost[0]]))} to {iso(int(p.end[lost[0]]) - 1)}); they were left out."
        f"{cure}",
    )


def _no_days_in_common(bills: Bills, made: Periods, name: str) -> UnreadableBills:
    p = bills.periods
    mine = f"{iso(int(p.start[0]))} to {iso(int(p.end[-1]) - 1)}"
    if made.n == 0:
        return UnreadableBills("no line of it says what was generated", where=name)
    theirs = f"{iso(int(made.start[0]))} to {iso(int(made.end[-1]) - 1)}"
    overlap = made.start[0] < p.end[-1] and p.start[0] < made.end[-1]
    longer = np.median(made.days) > np.median(p.days)
    if overlap and longer:
        cure = f"Sum use to the periods of generation: {answer('periods_from', name)}"
    elif overlap:
        cure = "Ask for generation by days, or for the same dates as the bills."
    else:
        cure = "Check that both are of the same years."
    return UnreadableBills(
        f"not one period of use ({mine}) is covered day by day by generation ({theirs}, in "
        f"{several(made.n, 'period')} of {int(np.median(made.days))} days)",
        where=name,
        wanted="generation of the same days as the use",
        next_step=cure,
    )
