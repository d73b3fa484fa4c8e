"""``normalize bills``: the picture, the expected total, and the answers it says how to keep."""

from __future__ import annotations

import json
import re
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

Run = Callable[..., Any]
TEXT = (
    "Read date,Therms,A/E\n2022-12-05,9,A\n2023-01-05,90,A\n2023-02-06,81,E\n2023-03-07,70.5,A\n"
    "2023-04-06,60,A\n2023-05-05,0,A\n2023-05-45,4,A\n"
)


@pytest.fixture
def bills(tmp_path: Path) -> Path:
    file = tmp_path / "gas.csv"
    file.write_text(TEXT)
    return file


def test_picture_shows_periods_readings_and_repairs(run: Run, bills: Path, tmp_path: Path) -> None:
    one, two = tmp_path / "one.svg", tmp_path / "two.svg"
    assert run("bills", bills, "--picture", one).code == 0
    assert run("bills", bills, "--picture", two).code == 0
    assert one.read_bytes() == two.read_bytes()
    text = one.read_text()
    assert "7 bills became 4 periods; 2 left out" in text
    assert "therms a day" in text
    assert run("bills", bills, "--picture", one).code == 1  # nothing is written over


def test_expected_total(run: Run, bills: Path) -> None:
    assert "as expected" in run("bills", bills, "--expect-total", "301.5").out
    ran = run("bills", bills, "--expect-total", "305.5")
    assert ran.code == 1
    assert "Line 8, which was left out, has just that use" in ran.err


def test_answers_are_told_as_lines_of_the_site_file(run: Run, tmp_path: Path) -> None:
    from normalize.sitefile import read_site_file

    file = tmp_path / "gas.csv"
    file.write_text("Month,Usage\nFeb-23,81\nMar-23,70.5\n")
    asked = run("bills", file, "--fuel", "natural gas", "--unit", "therm")
    assert asked.code == 1
    assert "read_day = 5" in asked.err
    ran = run("bills", file, "--fuel", "natural gas", "--unit", "therm", "--read-day", "5")
    assert ran.code == 0
    keep = ran.out.split("in site.toml:\n")[1]
    lines = re.findall(r"^  (\w+ = .+)$", keep, re.M)
    assert lines == ['fuel = "natural gas"', 'unit = "therm"', "read_day = 5"]
    site = '[weather]\nobserved = "w.csv"\n[[account]]\nbills = "gas.csv"\n' + "\n".join(lines)
    (tmp_path / "w.csv").write_text("")
    (tmp_path / "site.toml").write_text(site)
    (account,) = read_site_file(tmp_path).accounts
    assert account.reader == {"read_day": 5}


def test_flags_and_fitness_are_shown(run: Run, bills: Path, tmp_path: Path) -> None:
    whole = json.loads(run("bills", bills, "--json", "-").out)
    assert whole["flags"] == [{"period": 4, "what": "zero use", "note": "no use at all"}]
    assert whole["unfit"] is None
    assert "zero use?" in run("bills", bills).out
    solar = tmp_path / "power.csv"
    solar.write_text("Read date,kWh\n2023-01-05,9\n2023-02-06,81\n2023-03-07,-9\n")
    ran = run("bills", solar, "--net-metered")
    assert "Unfit for this method" in ran.out
    assert "net_metered = true" in ran.out


def test_account_numbers_are_masked_everywhere(run: Run, tmp_path: Path) -> None:
    file = tmp_path / "gas.csv"
    lines = [f"{number},{a},{b},81" for number in ("1234567890", "9876543210")
             for a, b in (("2023-01-05", "2023-02-06"), ("2023-02-06", "2023-03-07"))]  # fmt: skip
    file.write_text("\n".join(["Account,Start,End,Therms", *lines]))
    every = run("bills", file)
    assert every.code == 0
    assert "Account …7890" in every.out
    assert "1234567890" not in every.err + every.out
    assert "1234567890" not in run("bills", file, "--json", "-").out
    asked = run("bills", file, "--rows", "account 9")
    assert asked.code == 1
    assert "1234567890" not in asked.err
    ran = run("bills", file, "--rows", "7890", "--json", "-")
    assert "1234567890" not in ran.out + ran.err
