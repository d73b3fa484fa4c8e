"""Columns beside use that change what it means: solar generation, export, levels of a tank.

What belongs here: reading those columns, and the questions they raise.  The arithmetic of tanks
is in deliveries.py.
"""

from __future__ import annotations

from collections.abc import Collection, Sequence
from dataclasses import dataclass

from normalize.bills.amounts import Decimal, number_of
from normalize.bills.answers import NO_COLUMN, Answers
from normalize.bills.columns import Columns, answer
from normalize.bills.deliveries import Tank
from normalize.bills.groups import cell
from normalize.bills.layout_choice import Layout
from normalize.bills.layouts import Record
from normalize.bills.records import how_numbers_are_written
from normalize.bills.repair import Kind
from normalize.bills.table import RawRow, RawTable
from normalize.errors import AmbiguousBills


@dataclass(frozen=True, slots=True)
class Found:
    """What is known of a table once its layout is settled."""

    table: RawTable
    columns: Columns
    body: Sequence[RawRow]
    totals: Collection[int]
    layout: Layout
    kind: Kind
    where: str

    def numbers(self, role: str, answers: Answers) -> list[float | None]:
        """A column of numbers, None where a cell holds none."""
        k = self.columns.get(role)
        if k is None:
            return [None] * len(self.body)
        decimal: Decimal = how_numbers_are_written(
            self.table, self.body, [k, self.columns.get("usage")], answers.decimal
        ).decimal
        return [number_of(cell(row, k), decimal) for row in self.body]


@dataclass(frozen=True, slots=True)
class Solar:
    """sent : energy went to the grid.  generation : added back, so that use is gross."""

    sent: bool = False
    generation: bool = False
    notes: tuple[str, ...] = ()


def add_generation(records: Sequence[Record], found: Found, answers: Answers) -> Solar:
    """Net use from what came in and went out; gross use where generation is given; in place.

    gross = net + generation.  Raises AmbiguousBills where the file does not say whether its
    use is net.
    """
    columns = found.columns
    has_out, has_made = columns.get("export") is not None, columns.get("generation") is not None
    heading = columns.heading("usage")
    below = any((r.use or 0.0) < 0 for r in records)
    if answers.gross or not (has_out or has_made):
        return Solar(sent="net" in heading.words and below, generation=answers.gross)
    net = "net" in heading.words or below
    notes = []
    sent = net
    if has_out and not net:
        for record, out in zip(records, found.numbers("export", answers), strict=True):
            if record.use is not None and out is not None:
                record.use -= abs(out)
                sent = sent or out != 0
        notes.append(f"net use is use less column {columns.heading('export').text!r}")
        net = True
    if not has_made:
        return Solar(sent, False, tuple(notes))
    name = columns.heading("generation").text
    if not net and "generation" not in answers.named:
        raise AmbiguousBills(
            f"column {name!r} holds generation, and it is not clear whether use is what the "
            "house used or what the meter counted after it",
            where=found.where,
            next_step=f"If generation must be added: {answer('generation_column', name)} If use is "
            f'what the house used: generation_column = "{NO_COLUMN}".',
        )
    for record, made in zip(records, found.numbers("generation", answers), strict=True):
        if made is None:
            record.blame("no generation given")
        elif record.use is not None:
            record.use += abs(made)
    notes.append(f"gross use is net use and column {name!r}")
    return Solar(sent, True, tuple(notes))


def tanks_of(records: Sequence[Record], found: Found, answers: Answers) -> list[Tank]:
    """Tank levels, where the file has them and they add something.  Raises AmbiguousBills."""
    columns = found.columns
    k = columns.get("tank")
    percents = found.numbers("tank", answers)
    marked = columns.get("fill") is not None
    if k is None or not any(p is not None for p in percents):
        return []
    if marked and not any(r.estimated for r in records):
        return []  # every fill is full: levels add nothing
    sizes = found.numbers("tank size", answers)
    if answers.tank_size is None and not any(sizes):
        raise AmbiguousBills(
            f"column {columns.headings[k].text!r} gives the level of the tank, but not how much "
            "the full tank holds",
            where=found.where,
            next_step="Put tank_size = 275 (yours, in the unit of the deliveries) under "
            "[[account]] in site.toml, or use --tank-size.",
        )
    words = set(columns.headings[k].words)
    said = answers.tank_percent
    if said is None:
        said = "before" if "before" in words else "after" if "after" in words else None
    if said is None:
        raise AmbiguousBills(
            f"column {columns.headings[k].text!r} gives the level of the tank, before or after "
            "the delivery",
            where=found.where,
            next_step=answer("tank_percent", "before", "after"),
        )
    known = [s for s in sizes if s]
    usual = answers.tank_size or known[0]
    return [
        Tank(record, percent, said == "after", answers.tank_size or size or usual)
        for record, percent, size in zip(records, percents, sizes, strict=True)
    ]
