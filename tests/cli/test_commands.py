"""Commands: what they print, their exit codes, and that no input brings up a traceback."""

from __future__ import annotations

import json
import os
import shutil
import signal
import subprocess
import sys
from collections.abc import Callable
from datetime import date, timedelta
from pathlib import Path

import pytest

from normalize.cli.main import COMMANDS
from tests.cli.conftest import ROOT, Ran

Run = Callable[..., Ran]


@pytest.fixture
def station(tmp_path: Path) -> Path:
    """Two years of 55 °F, so that base 65 °F gives 10 degree-days a day."""
    path = tmp_path / "station.csv"
    first = date(2022, 1, 1)
    days = [f"{first + timedelta(days=i)},55" for i in range(730)]
    path.write_text("date,mean_f\n" + "\n".join(days) + "\n")
    return path


@pytest.fixture
def bills(tmp_path: Path) -> Path:
    path = tmp_path / "gas_0012345678.csv"
    path.write_text(
        "start,end,therms,cost,estimated\n"
        "2022-01-05,2022-02-04,80,90.5,no\n"
        "2022-02-04,2022-03-07,70,80.5,yes\n"
        "2022-03-07,2022-04-05,40,50.5,no\n"
        "2022-04-05,2022-05-05,oops,30,no\n"
    )
    return path


def test_degree_days_of_a_steady_year(run: Run, station: Path) -> None:
    """365 days ten degrees below the base are 3650 (the definition)."""
    ran = run("degree-days", station, "--base", "65F", "--by", "year", "--json", "-")
    (table,) = json.loads(ran.out)["tables"]
    assert (ran.code, ran.err) == (0, "")
    assert [row["heating"] for row in table["rows"]] == [3650.0, 3650.0]
    assert [row["cooling"] for row in table["rows"]] == [0.0, 0.0]
    text = run("degree-days", station, "--base", "65F", "--base", "50F").out
    assert text.count("by month") == 2
    assert "3,650.0" in text
    assert "1,825.0" in text  # five degrees above the other base, for 365 days


def test_bills_shows_periods_and_every_fate(run: Run, bills: Path) -> None:
    ran = run("bills", bills)
    assert ran.code == 0
    assert "2 periods" in ran.out
    assert "2 bills joined" in ran.out
    assert "4 rows, 1 of them left out" in ran.out
    assert "12345678" not in ran.out  # an account number in a file's name is private
    whole = json.loads(run("bills", bills, "--json", "-").out)
    assert whole["schema"] == 1
    assert [p["use"] for p in whole["periods"]] == [80.0, 110.0]
    assert {entry["line"] for entry in whole["ledger"]} == {2, 3, 4, 5}


def test_json_goes_to_a_file_and_never_over_an_input(run: Run, bills: Path, tmp_path: Path) -> None:
    out = tmp_path / "out.json"
    ran = run("bills", bills, "--json", out)
    assert ran.code == 0
    assert "2 periods" in ran.out
    assert json.loads(out.read_text(encoding="utf-8"))["fuel"] == "natural gas"
    before = bills.read_bytes()
    ran = run("bills", bills, "--json", bills)
    assert ran.code == 1
    assert "one of the inputs" in ran.err
    assert bills.read_bytes() == before
    ran = run("bills", bills, "--json", tmp_path / "no" / "such" / "folder.json")
    assert ran.code == 1
    assert "cannot be written" in ran.err
    assert sorted(p.name for p in tmp_path.iterdir()) == [bills.name, "out.json"]


def test_cleaned_periods_can_be_written_and_read_again(
    run: Run, bills: Path, tmp_path: Path
) -> None:
    out = tmp_path / "clean.csv"
    assert run("bills", bills, "--write", out).code == 0
    again = json.loads(run("bills", out, "--json", "-").out)
    first = json.loads(run("bills", bills, "--json", "-").out)
    kept = ("start", "end", "use", "cost")
    assert [[p[k] for k in kept] for p in again["periods"]] == [
        [p[k] for k in kept] for p in first["periods"]
    ]
    assert run("bills", bills, "--write", out).code == 1  # nothing is written over


def test_new_then_savings_says_what_is_missing(run: Run, tmp_path: Path) -> None:
    folder = tmp_path / "my-house"
    ran = run("new", folder)
    assert ran.code == 0
    assert "site.toml" in ran.out
    assert run("new", folder).code == 1
    ran = run("savings", folder)
    assert ran.code == 1
    assert "station.csv" in ran.err


@pytest.mark.parametrize("template", ["bills.csv", "bills.xlsx"])
def test_the_template_for_bills_can_be_read_once_filled_in(
    run: Run, tmp_path: Path, template: str
) -> None:
    run("new", tmp_path / "site")
    path = tmp_path / "site" / template
    rows = [
        [date(2022, 1, 5), date(2022, 2, 4), 80, "therm", 90.5, "no"],
        [date(2022, 2, 4), date(2022, 3, 7), 70, "therm", 80.5, "yes"],
        [date(2022, 3, 7), date(2022, 4, 5), 40, "therm", 50.5, "no"],
    ]
    if template.endswith("csv"):
        with path.open("a", encoding="utf-8") as file:
            file.writelines(",".join(map(str, row)) + "\r\n" for row in rows)
    else:
        from openpyxl import load_workbook

        book = load_workbook(path)
        for row in rows:
            book.active.append(row)
        book.save(path)
    whole = json.loads(run("bills", path, "--fuel", "natural gas", "--json", "-").out)
    assert [p["use"] for p in whole["periods"]] == [80.0, 110.0]
    assert whole["unit"] == "therm"


@pytest.mark.parametrize(
    "args",
    [
        ["nonsense"],
        ["savings"],
        ["savings", "x", "--confidence", "90"],
        ["savings", "x", "--confidence", "sure"],
        ["savings", "x", "--confidence", "nan"],
        ["degree-days", "x", "--base", "65"],
        ["degree-days", "x", "--by", "week"],
        ["bills", "x", "--usage", "y"],
        ["bills", "x", "--dates", "American"],
        ["--nonsense"],
    ],
)
def test_wrong_usage_is_2_and_says_so(run: Run, args: list[str]) -> None:
    ran = run(*args)
    assert ran.code == 2
    assert ran.err
    assert ran.out == ""


def test_an_unknown_command_names_the_nearest(run: Run) -> None:
    assert "Did you mean 'savings'" in run("saving").err


@pytest.mark.parametrize("name", COMMANDS)
def test_every_command_has_help_with_an_example_and_is_documented(run: Run, name: str) -> None:
    ran = run(name, "--help")
    assert ran.code == 0
    assert f"Example: normalize {name} " in ran.out
    assert f"## normalize {name}\n" in (ROOT / "docs" / "cli.md").read_text(encoding="utf-8")


HOSTILE = {
    "empty": b"",
    "no header": b"1,2,3\n4,5,6\n",
    "header alone": b"start,end,therms\n",
    "nul": b"\x00" * 1000,
    "noise": bytes(range(256)) * 20,
    "one long line": b"a" * 300_000,
    "year 9999": b"start,end,therms\n9999-01-01,9999-12-31,5\n",
    "words for use": b"start,end,therms\n2022-01-01,2022-02-01,lots\n",
    "absurd": b"start,end,therms\n2022-01-01,2022-02-01,1e308\n2022-02-01,2022-03-01,nan\n",
    "html": b"<html><script>alert(1)</script></html>",
    "not a zip": b"PK\x03\x04 but not really",
    "escape": b"\x1b[2Jstart,end,therms\x1b[31m\n",
    "quotes": b'start,end,"therms\n' * 50,
}


@pytest.mark.parametrize("command", ["bills", "degree-days"])
@pytest.mark.parametrize("kind", HOSTILE)
@pytest.mark.parametrize("suffix", ["csv", "xlsx"])
def test_nonsense_gets_one_clear_message(
    run: Run, tmp_path: Path, command: str, kind: str, suffix: str
) -> None:
    path = tmp_path / f"file.{suffix}"
    path.write_bytes(HOSTILE[kind])
    ran = run(command, path)
    assert ran.code == 1
    assert ran.err.startswith("normalize: ")
    assert "fault of the program" not in ran.err
    assert len(ran.err.splitlines()) == 1
    assert ran.err.rstrip("\n").isprintable()


@pytest.mark.parametrize("command", ["savings", "fit", "bills", "degree-days"])
def test_a_missing_file_or_folder_is_a_message(run: Run, tmp_path: Path, command: str) -> None:
    ran = run(command, tmp_path / "nowhere")
    assert ran.code == 1
    assert "nowhere" in ran.err


@pytest.mark.parametrize("command", ["bills", "degree-days"])
def test_a_folder_for_a_file_is_a_message(run: Run, tmp_path: Path, command: str) -> None:
    ran = run(command, tmp_path)
    assert ran.code == 1
    assert "fault of the program" not in ran.err


def test_account_numbers_are_masked_in_errors_but_not_what_was_typed(
    run: Run, tmp_path: Path
) -> None:
    path = tmp_path / "account 00998877665.csv"
    path.write_text("start,end,therms\n2022-01-01,2022-02-01,987654321x\n")
    ran = run("bills", path, "--rows", "1234567890")
    assert ran.code == 1
    assert "987654321" not in ran.err


def test_a_fault_of_the_program_is_one_line_and_debug_shows_it(
    run: Run, monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    def broken(_folder: Path) -> None:
        raise ZeroDivisionError("secret 123456789")

    monkeypatch.setattr("normalize.sitefile.write_new_site", broken)
    ran = run("new", tmp_path / "x")
    assert ran.code == 1
    assert len(ran.err.splitlines()) == 1
    assert "fault of the program" in ran.err
    assert "NORMALIZE_DEBUG=1" in ran.err
    assert "secret" not in ran.err
    monkeypatch.setenv("NORMALIZE_DEBUG", "1")
    with pytest.raises(ZeroDivisionError):
        run("new", tmp_path / "x")


def test_a_console_of_plain_letters_is_enough(process: Run, station: Path) -> None:
    ran = process("degree-days", station, "--by", "year", env={"PYTHONIOENCODING": "ascii"})
    assert ran.code == 0
    assert ran.out.isascii()
    assert "deg F.day" in ran.out
    ran = process("degree-days", "nowhere – °.csv", env={"PYTHONIOENCODING": "ascii"})
    assert ran.code == 1
    assert "Traceback" not in ran.err
    assert ran.err.isascii()


def test_a_reader_that_leaves_is_no_fault(station: Path) -> None:
    """As in ``normalize degree-days FILE | head -1``."""
    code = (
        "import subprocess, sys\n"
        "p = subprocess.Popen([sys.executable, '-m', 'normalize', 'degree-days', sys.argv[1]],\n"
        "    stdout=subprocess.PIPE, stderr=subprocess.PIPE)\n"
        "p.stdout.close()\n"
        "sys.stderr.buffer.write(p.stderr.read())\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", code, str(station)], capture_output=True, text=True, cwd=ROOT
    )
    assert done.stderr == ""


@pytest.mark.skipif(os.name == "nt", reason="signals of Unix")
def test_an_interrupt_ends_quietly_with_130(tmp_path: Path) -> None:
    """The weather file is a pipe that says nothing, so that the command waits."""
    pipe = tmp_path / "pipe.csv"
    os.mkfifo(pipe)
    code = (
        "import os, signal, sys, threading\n"
        "from normalize.cli.main import main\n"
        "import normalize.cli.degree_days as d\n"
        "import normalize.weather.read as r\n"
        "import time\n"
        "r.read_weather = lambda *a, **k: time.sleep(30)\n"
        "threading.Timer(0.2, lambda: os.kill(os.getpid(), signal.SIGINT)).start()\n"
        "sys.exit(main(['degree-days', sys.argv[1]]))\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", code, str(pipe)],
        capture_output=True,
        text=True,
        cwd=ROOT,
        timeout=25,
        preexec_fn=lambda: signal.signal(signal.SIGINT, signal.default_int_handler),
    )
    assert done.returncode == 130
    assert "Traceback" not in done.stderr


def test_the_version_is_shown(run: Run) -> None:
    import normalize

    assert run("--version").out == f"normalize {normalize.__version__}\n"


def test_fit_needs_no_upgrade(run: Run, samples: Path, tmp_path: Path) -> None:
    """The fits alone are of use before any work is done."""
    site = tmp_path / "house"
    shutil.copytree(samples / "quince_street", site)
    toml = (site / "site.toml").read_text(encoding="utf-8")
    (site / "site.toml").write_text(toml[: toml.index("[[upgrade]]")], encoding="utf-8")
    ran = run("fit", site)
    assert ran.code == 0
    assert "the last 24 months" in ran.out
    assert "after the work" not in ran.out
    assert run("savings", site).code == 1
