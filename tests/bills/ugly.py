"""A small ugly file: what is wrong with it, what must come out, and how that is checked.

The cases stand in test_ugly_*.py, one module a subject.  All are invented; the expected values
are read off the file by eye.  Formats of dates and numbers: general practice of the trade (common
practice, no source).
"""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import pytest

from normalize.bills.periods import Bills
from normalize.bills.read import read_bills
from normalize.bills.write import write_periods
from normalize.days import iso


@dataclass
class Ugly:
    """wrong : what is wrong with the file.  periods : (start, end, use) that must come out.
    left_out : line → words of the reason.  reading, cautions : words that must be said.
    """

    wrong: str
    text: str | bytes
    periods: list[tuple[str, str, float]]
    options: dict[str, Any] = field(default_factory=dict)
    left_out: dict[int, str] = field(default_factory=dict)
    reading: tuple[str, ...] = ()
    cautions: tuple[str, ...] = ()
    costs: list[float] | None = None
    unit: str | None = None
    fuel: str | None = None
    temps: list[float] | None = None


# The periods that most cases must come to.
JFM = [("2023-01-05", "2023-02-06", 81.0), ("2023-02-06", "2023-03-07", 70.5)]
GAS = {"fuel": "natural gas"}


def read(case: Ugly, folder: Path) -> Bills:
    file = folder / "bills.csv"
    file.write_bytes(case.text if isinstance(case.text, bytes) else case.text.encode())
    return read_bills(file, **case.options)


def periods_of(bills: Bills) -> list[tuple[str, str, float]]:
    p = bills.periods
    return [
        (iso(int(a)), iso(int(b)), round(float(u), 9))
        for a, b, u in zip(p.start, p.end, p.use, strict=True)
    ]


def check_words(case: Ugly, bills: Bills) -> None:
    """What else must come out beside the periods: fates, sentences, costs, units."""
    for line, words in case.left_out.items():
        entry = next(e for e in bills.ledger if e.line == line)
        assert entry.fate == "left out"
        assert words in entry.note
    for words in case.reading:
        assert any(words in sentence for sentence in bills.reading), bills.reading
    for words in case.cautions:
        assert any(words in sentence for sentence in bills.cautions), bills.cautions
    if case.costs is not None:
        assert bills.periods.cost.tolist() == pytest.approx(case.costs)
    if case.temps is not None:
        assert bills.periods.mean_temp_f is not None
        assert bills.periods.mean_temp_f.tolist() == pytest.approx(case.temps)
    assert bills.unit == (case.unit or bills.unit)
    assert bills.fuel == (case.fuel or bills.fuel)


def written_and_read(bills: Bills, tmp_path: Path) -> Bills:
    """read → write → read, with nothing lost on the way but what the periods check."""
    out = tmp_path / "clean.csv"
    write_periods(bills, out)
    again = read_bills(out, kind=bills.kind)
    assert again.periods.use.tolist() == bills.periods.use.tolist()
    assert (again.fuel, again.unit) == (bills.fuel, bills.unit)
    assert [round(c, 9) for c in again.periods.cost if c == c] == [
        round(c, 9) for c in bills.periods.cost if c == c
    ]
    return again
