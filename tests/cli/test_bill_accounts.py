"""``normalize bills`` on a file of several accounts: shown apart, written apart, checked apart."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from normalize.bills.accounts import read_accounts
from normalize.bills.read import read_bills

Run = Callable[..., Any]
SPANS = [("2023-01-05", "2023-02-06"), ("2023-02-06", "2023-03-07"), ("2023-03-07", "2023-04-06")]
HOUSE, SHOP = "00119955678", "00229951234"


@pytest.fixture
def bills(tmp_path: Path) -> Path:
    """Two numbers, one of them with two fuels; one account of words; lines of nobody."""
    lines = ["Account,Service,Start,End,Usage,Unit,Cost"]
    for k, (a, b) in enumerate(SPANS):
        lines += [
            f"{HOUSE},Electric,{a},{b},{100 + k},kWh,20",
            f"{HOUSE},Gas,{a},{b},{10 + k},therms,9",
            f"{SHOP},Electric,{a},{b},{200.25 + k},kWh,30",
            f"00331,Gas,{a},{b},many,therms,9",
            f",Electric,{a},{b},5,kWh,1",
        ]
    file = tmp_path / "all.csv"
    file.write_text("\n".join(lines))
    return file


def test_each_account_in_turn_with_a_table_first(run: Run, bills: Path) -> None:
    ran = run("bills", bills)
    assert ran.code == 0
    out = ran.out
    assert "4 accounts, read apart and never added up; 1 could not be read; 3 lines belong" in out
    table = out.split("How the file")[0]
    assert [line.split("  ")[0] for line in table.splitlines()[5:9]] == [
        "…5678 electricity", "…5678 natural gas", "…1234", "…0331",
    ]  # fmt: skip
    assert out.index("Account …5678 electricity") < out.index("Account …1234")
    assert "3 periods, 91 days, 303.0 kWh" in out
    assert "3 periods, 91 days, 603.8 kWh" in out
    assert "…0331: " in out
    assert "'many' is not a number" in out
    assert "all.csv:6: left out: the line does not say whose it is" in out
    assert "906" not in out  # the sum of all electricity
    assert HOUSE not in out + ran.err
    assert SHOP not in out + ran.err


def test_the_lines_it_says_choose_one_account(run: Run, bills: Path) -> None:
    for account in read_accounts(bills).accounts:
        if account.bills is None:
            continue
        again = read_bills(bills, **account.choice)  # type: ignore[arg-type]
        assert again.periods.use.tolist() == account.bills.periods.use.tolist()
        assert again.fuel == account.fuel
    out = run("bills", bills).out
    assert '…5678 electricity: rows = "5678", fuel = "electricity"' in out
    assert '…1234: rows = "1234"' in out


@pytest.mark.parametrize("full", [False, True])
def test_written_periods_read_back(full: bool, run: Run, bills: Path, tmp_path: Path) -> None:
    out = tmp_path / "clean.csv"
    options = ["--full-numbers"] if full else []
    assert run("bills", bills, "--write", out, *options).code == 0
    assert (HOUSE in out.read_text()) is full
    before, after = read_accounts(bills), read_accounts(out)
    assert after.nobodys == ()
    assert [(b.fuel, b.unit) for b in after.bills] == [(b.fuel, b.unit) for b in before.bills]
    for a, b in zip(before.bills, after.bills, strict=True):
        assert a.periods.start.tolist() == b.periods.start.tolist()
        assert a.periods.end.tolist() == b.periods.end.tolist()
        assert a.periods.use.tolist() == b.periods.use.tolist()
        assert a.periods.cost.tolist() == b.periods.cost.tolist()
    again = tmp_path / "again.csv"
    assert run("bills", out, "--write", again, *options).code == 0
    assert again.read_bytes() == out.read_bytes()  # a repaired file is left as it is
    assert run("bills", bills, "--write", out).code == 1  # nothing is written over


def test_json_holds_every_account_and_line(run: Run, bills: Path) -> None:
    whole = json.loads(run("bills", bills, "--json", "-").out)
    assert [a["account"] for a in whole["accounts"]] == [
        "…5678 electricity", "…5678 natural gas", "…1234",
    ]  # fmt: skip
    assert [u["account"] for u in whole["unread"]] == ["…0331"]
    lines = sum(len(a["ledger"]) for a in whole["accounts"])
    lines += sum(u["lines"] for u in whole["unread"]) + len(whole["nobodys"])
    assert lines == 15
    full = json.loads(run("bills", bills, "--json", "-", "--full-numbers").out)
    assert full["accounts"][2]["account"] == SHOP


def test_expected_totals_are_of_one_account_each(run: Run, bills: Path) -> None:
    good = run("bills", bills, "--expect-total", "1234=603.75")
    assert good.code == 0
    assert "…1234: The bills add up to 603.75 kWh, as expected." in good.out
    bad = run("bills", bills, "--expect-total", "1234=603")
    assert bad.code == 1
    assert "0.75 more than the 603 expected" in bad.err
    for text in ("906.75", "5678=303", "9999=3"):
        asked = run("bills", bills, "--expect-total", text)
        assert asked.code == 1
        assert "does not say of which account it is" in asked.err
    named = run("bills", bills, "--expect-total", "…5678 natural gas=33", "--expect-total",
                "1234=603.75")  # fmt: skip
    assert named.code == 0


def test_a_picture_of_each_account(run: Run, bills: Path, tmp_path: Path) -> None:
    ran = run("bills", bills, "--picture", tmp_path / "p.svg")
    assert ran.code == 0
    assert "Pictures: p-1.svg to p-3.svg" in ran.out
    text = (tmp_path / "p-3.svg").read_text()
    assert "…1234: 3 bills became 3 periods" in text
    assert not any(SHOP in f.read_text() for f in tmp_path.glob("*.svg"))
    again = run("bills", bills, "--picture", tmp_path / "p.svg")
    assert again.code == 1
    assert "p-1.svg" in again.err


def test_a_file_in_which_no_account_can_be_read(run: Run, tmp_path: Path) -> None:
    file = tmp_path / "all.csv"
    file.write_text(
        "Account,Start,End,Therms\nA1,2023-01-05,2023-02-06,many\nA1,2023-02-06,2023-03-07,lots\n"
        "B2,2023-01-05,2023-02-06,few\n"
    )
    ran = run("bills", file)
    assert ran.code == 1
    assert "A1: " in ran.out
    assert "not one of 2 accounts can be read" in ran.err


def test_hundreds_of_accounts_stay_readable(run: Run, tmp_path: Path) -> None:
    file = tmp_path / "all.csv"
    lines = [f"{7_000_000 + k * 7919},{a},{b},{k + 1}" for k in range(300) for a, b in SPANS]
    file.write_text("\n".join(["Account,Start,End,Therms", *lines]))
    out = run("bills", file).out
    assert "300 accounts" in out
    assert "… 100 more" in out
    assert "and 280 more accounts" in out
    assert len(out.splitlines()) < 900
