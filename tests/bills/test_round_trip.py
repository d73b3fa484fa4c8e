"""Properties: what is written reads back; readings of a register give back the use they counted."""

from __future__ import annotations

from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from normalize.bills.layouts import Record
from normalize.bills.periods import Bills
from normalize.bills.read import read_bills
from normalize.bills.registers import Register, difference
from normalize.bills.write import write_periods
from tests.bills.test_read_espi import GOOD


def same(bills: Bills, again: Bills) -> bool:
    a, b = bills.periods, again.periods
    return (
        a.start.tolist() == b.start.tolist()
        and a.end.tolist() == b.end.tolist()
        and a.use.tolist() == b.use.tolist()
        and [c for c in a.cost.tolist() if c == c] == [c for c in b.cost.tolist() if c == c]
        and (bills.fuel, bills.unit) == (again.fuel, again.unit)
    )


@pytest.mark.parametrize("name", GOOD)
def test_espi_survives(name: str, tmp_path: Path) -> None:
    text = GOOD[name]
    file, out = tmp_path / "usage.xml", tmp_path / "clean.csv"
    file.write_bytes(text if isinstance(text, bytes) else text.encode())
    bills = read_bills(file)
    write_periods(bills, out)
    assert same(bills, read_bills(out))


@pytest.mark.parametrize(("days", "hours"), [(40, 24), (40, 1), (5200, 1)])
def test_interval_days_survive(days: int, hours: int, tmp_path: Path) -> None:
    from datetime import datetime, timedelta

    begin = datetime(2005, 1, 1)  # noqa: DTZ001 (the file's own clock)
    step = timedelta(hours=24 // hours)
    lines = [f"{begin + k * step:%Y-%m-%d %H:%M},{k % 7 + 0.125}" for k in range(days * hours)]
    del lines[30]
    file, out = tmp_path / "hours.csv", tmp_path / "clean.csv"
    file.write_text("Timestamp,kWh\n" + "\n".join(lines) + "\n")
    bills = read_bills(file)
    assert bills.periods.n == days - 1
    write_periods(bills, out)
    assert same(bills, read_bills(out))


@given(
    start=st.integers(0, 9_999),
    uses=st.lists(st.integers(0, 300), min_size=2, max_size=20),
    times=st.sampled_from([1.0, 10.0, 0.5]),
)
@settings(max_examples=200, deadline=None, suppress_health_check=[HealthCheck.too_slow])
def test_a_register_gives_back_what_it_counted(start: int, uses: list[int], times: float) -> None:
    """Through any number of passings of 9999, as long as an ordinary rise is known."""
    at, registers = start, [Register(Record(2, end=0), float(start), None, "", times)]
    for k, use in enumerate(uses):
        at = (at + use) % 10_000
        record = Record(k + 3, start=30 * k, end=30 * (k + 1))
        registers.append(Register(record, float(at), None, "", times))
    difference(registers)
    highest = max(r.now or 0 for r in registers)
    ordinary = [u for k, u in enumerate(uses)
                if (registers[k + 1].now or 0) >= (registers[k].now or 0)]  # fmt: skip
    for register, use in zip(registers[1:], uses, strict=True):
        record = register.record
        if record.use is not None and highest >= 1000:
            assert record.use == use * times
        elif highest >= 1000 and use <= 3 * max(ordinary, default=0):
            raise AssertionError(f"{use} was not found")
        else:
            assert record.use is None or record.use >= 0
