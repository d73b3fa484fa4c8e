"""Interval files of several accounts, meters or fuels: split, never added up.

Invented files; expected sums are counted by hand (24 readings a day).  Where an account is also
read from a file of its own, the two must agree to the letter.
"""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from normalize.bills.accounts import FileAccounts, read_accounts
from normalize.bills.periods import Bills
from normalize.bills.read import read_bills
from normalize.errors import AmbiguousBills, NormalizeError, UnreadableBills

pytestmark = pytest.mark.kernel

STAMPS = [f"2023-01-{d} {h:02}:00" for d in (13, 14) for h in range(24)]
ONE, TWO = "7000112233", "7000445566"


def written(folder: Path, lines: Sequence[str]) -> Path:
    file = folder / "intervals.csv"
    file.write_text("\n".join(lines) + "\n")
    return file


def uses(found: FileAccounts) -> dict[str, list[float]]:
    return {a.label: a.bills.periods.use.tolist() if a.bills else [] for a in found.accounts}


def interleaved(head: str = "Account,Timestamp,kWh") -> list[str]:
    return [head, *(f"{a},{t},{u}" for t in STAMPS for a, u in ((ONE, 0.5), (TWO, 2)))]


def test_accounts_on_lines_in_turn(tmp_path: Path) -> None:
    file = written(tmp_path, interleaved())
    found = read_accounts(file)
    assert uses(found) == {"…2233": [12.0, 12.0], "…5566": [48.0, 48.0]}
    assert [a.choice for a in found.accounts] == [{"rows": "2233"}, {"rows": "5566"}]
    assert [a.lines for a in found.accounts] == [48, 48]
    assert [[r.line for r in b.rows] for b in found.bills] == [[2, 50], [3, 51]]
    for choice, bills in zip(("2233", "5566"), found.bills, strict=True):
        alone = read_bills(file, rows=choice)
        assert alone.periods.use.tolist() == bills.periods.use.tolist()
        assert alone.ledger == bills.ledger
    assert ONE not in repr(found) + " ".join(t for b in found.bills for t in b.reading)


def test_the_question_lists_every_account(tmp_path: Path) -> None:
    file = written(tmp_path, interleaved())
    with pytest.raises(AmbiguousBills, match='rows = "2233" or rows = "5566"') as asked:
        read_bills(file)
    assert ONE not in str(asked.value)
    with pytest.raises(UnreadableBills, match="no line belongs"):
        read_bills(file, rows="9999")


def test_a_wide_file_of_two_meters(tmp_path: Path) -> None:
    head = ",".join(["Meter", "Date", *(f"{h:02}:00 kWh" for h in range(24))])
    lines = [",".join([m, f"2023-01-{d}", *[u] * 24]) for d in (13, 14) for m, u in
             (("M1", "0.5"), ("M2", "2"))]  # fmt: skip
    found = read_accounts(written(tmp_path, [head, *lines]))
    assert uses(found) == {"M1": [12.0, 12.0], "M2": [48.0, 48.0]}
    assert [[r.line for r in b.rows] for b in found.bills] == [[2, 4], [3, 5]]


def test_fuels_of_one_account(tmp_path: Path) -> None:
    lines = ["Type,Timestamp,Usage,Unit"]
    for t in STAMPS:
        lines += [f"Electric usage,{t},0.5,kWh", f"Natural gas usage,{t},0.25,therms",
                  f"Water usage,{t},7,gal"]  # fmt: skip
    file = written(tmp_path, lines)
    found = read_accounts(file)
    assert uses(found) == {"electricity": [12.0, 12.0], "natural gas": [6.0, 6.0]}
    assert [(b.fuel, b.unit) for b in found.bills] == [
        ("electricity", "kWh"),
        ("natural gas", "therm"),
    ]
    (water,) = found.nobodys
    assert water.line == 4
    assert "'Water usage' is no fuel" in water.note
    assert "48 such lines" in water.note
    assert read_bills(file, fuel="natural gas").periods.use.tolist() == [6.0, 6.0]
    with pytest.raises(AmbiguousBills, match='fuel = "electricity" or fuel = "natural gas"'):
        read_bills(file)


def test_each_account_has_its_own_interval_and_unit(tmp_path: Path) -> None:
    quarters = [f"{t[:-2]}{m:02}" for t in STAMPS for m in (0, 15, 30, 45)]
    lines = ["Account,Timestamp,Usage,Unit", *(f"A1,{t},0.5,kWh" for t in STAMPS),
             *(f"B2,{t},250,Wh" for t in quarters)]  # fmt: skip
    found = read_accounts(written(tmp_path, lines))
    assert [(b.unit, b.periods.use.tolist()) for b in found.bills] == [
        ("kWh", [12.0, 12.0]), ("Wh", [24_000.0, 24_000.0]),
    ]  # fmt: skip
    assert all(not b.cautions for b in found.bills)


def test_an_account_that_cannot_be_read_ends_nothing(tmp_path: Path) -> None:
    lines = [*interleaved(), *(f"B9,{t},much" for t in STAMPS), f",{STAMPS[0]},9"]
    found = read_accounts(written(tmp_path, lines))
    assert uses(found) == {"…2233": [12.0, 12.0], "…5566": [48.0, 48.0], "B9": []}
    assert found.accounts[2].problem
    assert [(e.line, e.fate) for e in found.nobodys] == [(146, "left out")]
    assert "does not say whose" in found.nobodys[0].note


def test_the_order_of_dates_is_settled_by_the_whole_file(tmp_path: Path) -> None:
    """B2 has readings of early days only, which alone could be read both ways."""
    lines = ["Account,Timestamp,kWh"]
    lines += [f"A1,1/{d}/2023 {h}:00,0.5" for d in range(1, 28) for h in range(24)]
    lines += [f"B2,1/{d}/2023 {h}:00,2" for d in (3, 4) for h in range(24)]
    found = read_accounts(written(tmp_path, lines))
    assert uses(found)["B2"] == [48.0, 48.0]


def test_one_account_in_a_column_is_no_question(tmp_path: Path) -> None:
    file = written(tmp_path, [interleaved()[0], *(f"{ONE},{t},0.5" for t in STAMPS), "Total,,24"])
    assert read_bills(file).periods.use.tolist() == [12.0, 12.0]
    found = read_accounts(file)
    assert found.bills[0].periods.use.tolist() == [12.0, 12.0]
    assert read_bills(file, rows="2233").periods.use.tolist() == [12.0, 12.0]


SHARED = [HealthCheck.function_scoped_fixture]


@settings(max_examples=25, deadline=None, suppress_health_check=SHARED)
@given(
    st.lists(
        st.tuples(
            st.sampled_from(["A1", "B2", "C3", ""]), st.integers(0, 47), st.integers(0, 999)
        ),
        min_size=60, max_size=160,
    )
)  # fmt: skip
def test_each_account_is_as_in_a_file_of_its_own(
    tmp_path: Path, lines: list[tuple[str, int, int]]
) -> None:
    """Whatever the lines, in whatever order: nothing of one account reaches another."""

    def read(some: list[tuple[str, int, int]]) -> dict[str, list[tuple[int, float]] | str]:
        body = [f"{a},{STAMPS[t]},{u}" for a, t, u in some]
        file = written(tmp_path, ["Account,Timestamp,kWh", *body])
        try:
            found = read_accounts(file, interval_times="start")
        except NormalizeError as err:
            return {"": type(err).__name__}
        return {a.full_name: _rows(a.bills) if a.bills else "" for a in found.accounts}

    whole = read(lines)
    for name in {a for a, _, _ in lines} - {""}:
        if name in whole:
            (alone,) = read([line for line in lines if line[0] == name]).values()
            refused = isinstance(alone, str) and isinstance(whole[name], str)
            assert refused or alone == whole[name]


def _rows(bills: Bills) -> list[tuple[int, float]]:
    return [(int(r.start or 0), round(float(r.use or 0), 9)) for r in bills.rows]
