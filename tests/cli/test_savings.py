"""``normalize savings`` and ``normalize fit`` on sites of one account, and on a sample site."""

from __future__ import annotations

import json
import math
from collections.abc import Callable
from datetime import date, timedelta
from pathlib import Path

import pytest

from tests.cli.conftest import Ran

Run = Callable[..., Ran]

FIRST = date(2015, 1, 1)
N_DAYS = 10 * 365
BALANCE_F, BASE_LOAD = 60.0, 0.5
SLOPE_BEFORE, SLOPE_AFTER = 0.125, 0.100  # a fifth less
WORK = date(2022, 6, 10)


def temperature(day: int) -> float:
    """A smooth year with a ripple, so that a month's days differ. °F"""
    return round(50 - 25 * math.cos(2 * math.pi * day / 365.25) + 8 * math.sin(day * 0.9), 1)


@pytest.fixture
def site(tmp_path: Path) -> Path:
    """A house without noise, whose heating slope falls by a fifth with the work."""
    folder = tmp_path / "site"
    folder.mkdir()
    days = [f"{FIRST + timedelta(days=i)},{temperature(i)}" for i in range(N_DAYS)]
    (folder / "station.csv").write_text("date,mean_f\n" + "\n".join(days) + "\n")
    lines = []
    start = (date(2020, 6, 10) - FIRST).days
    while start + 30 <= N_DAYS:
        slope = SLOPE_BEFORE if FIRST + timedelta(days=start) < WORK else SLOPE_AFTER
        heat = sum(max(BALANCE_F - temperature(i), 0.0) for i in range(start, start + 30))
        use = 30 * BASE_LOAD + slope * heat
        ends = [FIRST + timedelta(days=start), FIRST + timedelta(days=start + 30)]
        lines.append(f"{ends[0]},{ends[1]},{use!r},{20 + 1.5 * use:.2f}")
        start += 30
    (folder / "gas.csv").write_text("start,end,therms,cost\n" + "\n".join(lines) + "\n")
    (folder / "site.toml").write_text(
        '[site]\nname = "Test house"\n'
        '[weather]\nobserved = "station.csv"\nlong_term = { years = 5 }\n'
        '[[account]]\nname = "gas"\nfuel = "natural gas"\nbills = "gas.csv"\n'
        '[[upgrade]]\nname = "insulation"\nstart = 2022-06-10\nend = 2022-06-12\n'
    )
    return folder


def test_noise_free_bills_give_back_what_made_them(run: Run, site: Path) -> None:
    """The house was made with τ 60 °F, base load 0.5 and a slope that falls by a fifth."""
    ran = run("savings", site, "--json", "-")
    assert ran.code == 0
    whole = json.loads(ran.out)
    (account,) = whole["accounts"]
    for side, slope in (("before", SLOPE_BEFORE), ("after", SLOPE_AFTER)):
        fit = account[side]
        assert fit["form"] == "heating"
        assert fit["balance_heating_f"] == pytest.approx(BALANCE_F, abs=1e-6)
        assert fit["base_load"] == pytest.approx(BASE_LOAD, abs=1e-6)
        assert fit["heating_slope"] == pytest.approx(slope, abs=1e-6)
    heating = account["before"]["nac"] - 365 * BASE_LOAD
    assert account["normalized"]["value"] == pytest.approx(heating / 5, rel=1e-6)
    assert account["price"]["per_unit"] == pytest.approx(1.5, abs=1e-3)


def test_the_json_has_the_keys_that_other_programs_rely_on(run: Run, site: Path) -> None:
    """The keys are those of the documented schema 1."""
    whole = json.loads(run("savings", site, "--json", "-", "--confidence", "80%").out)
    assert whole["schema"] == 1
    assert whole["site"] == "Test house"
    assert whole["confidence"] == 0.8
    assert whole["currency"] == "USD"
    assert {"station", "observed", "long_term", "days_filled"} <= whole["weather"].keys()
    (account,) = whole["accounts"]
    assert {
        "account", "fuel", "unit", "before", "after", "normalized", "avoided", "price", "co2",
        "ledger", "checks",
    } <= account.keys()  # fmt: skip
    assert {
        "form", "balance_heating_f", "balance_cooling_f", "base_load", "heating_slope",
        "cooling_slope", "line_slope", "n_periods", "r2", "cv_rmse", "nac", "nac_low", "nac_high",
    } <= account["before"].keys()  # fmt: skip
    for kind in ("normalized", "avoided"):
        assert {
            "value", "low", "high", "fraction", "fraction_low", "fraction_high", "plain_low",
            "plain_high", "method", "unavailable",
        } <= account[kind].keys()  # fmt: skip
        assert {"energy_mmbtu", "cost", "co2_kg"} <= whole["total"][kind].keys()
    assert {"file", "line", "fate", "note"} <= account["ledger"][0].keys()
    assert {"name", "value", "limit", "meets", "source"} <= account["checks"][0].keys()


def test_the_plain_answer_comes_first(run: Run, site: Path) -> None:
    out = run("savings", site).out
    short = run("savings", site, "--short").out
    assert out.startswith(short.rstrip("\n"))
    answer = " ".join(short.split())
    assert "less gas in a normal year" in answer
    assert "CV(RMSE)" in out
    assert "CV(RMSE)" not in short


def test_the_same_input_gives_the_same_bytes(run: Run, site: Path, tmp_path: Path) -> None:
    kept = []
    for name in ("one", "two"):
        ran = run("savings", site, "--report", tmp_path / name, "--json", tmp_path / f"{name}.json")
        assert ran.code == 0
        page = (tmp_path / name / "report.html").read_bytes()
        kept.append((ran.out, page, (tmp_path / f"{name}.json").read_bytes()))
    assert kept[0] == kept[1]
    assert b"<svg" in kept[0][1]


def test_fit_lists_every_form_and_marks_the_chosen(run: Run, site: Path) -> None:
    ran = run("fit", site)
    assert ran.code == 0
    rows = [line.split() for line in ran.out.splitlines() if line.startswith("  heating * ")]
    assert [row[:2] for row in rows] == [["heating", "*"], ["heating", "*"]]
    assert [row[4] for row in rows] == ["60.0", "60.0"]
    assert max(map(len, ran.out.splitlines())) <= 110
    whole = json.loads(run("fit", site, "--json", "-").out)
    chosen = [f["form"] for f in whole["accounts"][0]["before"] if f["chosen"]]
    assert chosen == ["heating"]


def test_one_bill_is_no_answer_and_exit_code_1(run: Run, site: Path) -> None:
    bills = (site / "gas.csv").read_text().splitlines()
    (site / "gas.csv").write_text("\n".join(bills[:2]) + "\n")
    for command in ("savings", "fit"):
        ran = run(command, site)
        assert ran.code == 1
        assert ran.err.startswith("normalize: no account ")
        assert "gas" in ran.out
        assert "fault" not in ran.err
    whole = json.loads(run("savings", site, "--json", "-").out)
    assert whole["accounts"][0]["normalized"]["unavailable"]
    assert whole["accounts"][0]["normalized"]["value"] is None


@pytest.mark.parametrize(
    "text",
    ["", "start,end,therms\n", "\x00\x00", "start,end,therms\n2022-01-01,2022-02-01,lots\n"],
    ids=["empty", "header alone", "noise", "words for use"],
)
def test_unreadable_bills_are_a_reason_not_an_exception(run: Run, site: Path, text: str) -> None:
    (site / "gas.csv").write_text(text)
    ran = run("savings", site)
    assert ran.code == 1
    assert "gas.csv" in ran.out + ran.err
    assert "fault of the program" not in ran.err


def test_a_missing_bill_file_is_named(run: Run, site: Path) -> None:
    (site / "gas.csv").unlink()
    ran = run("savings", site)
    assert ran.code == 1
    assert "gas.csv" in ran.out + ran.err


@pytest.mark.parametrize(
    "text",
    ["", "date,mean_f\n", "date,mean_f\n2022-01-01,nan\n", "date,mean_f\n9999-12-31,50\n"],
    ids=["empty", "header alone", "nan", "year 9999"],
)
def test_unusable_weather_is_one_message(run: Run, site: Path, text: str) -> None:
    (site / "station.csv").write_text(text)
    ran = run("savings", site)
    assert ran.code == 1
    assert "station.csv" in ran.err
    assert "fault of the program" not in ran.err


def test_one_bad_account_does_not_end_the_others(run: Run, site: Path) -> None:
    with (site / "site.toml").open("a") as file:
        file.write('[[account]]\nfuel = "electricity"\nbills = "none.csv"\n')
    ran = run("savings", site, "--json", "-")
    assert ran.code == 0
    gas, electricity = json.loads(ran.out)["accounts"]
    assert gas["normalized"]["value"] > 0
    assert "none.csv" in electricity["normalized"]["unavailable"]


def test_an_input_is_never_written_over(run: Run, site: Path) -> None:
    for name in ("site.toml", "gas.csv", "station.csv"):
        before = (site / name).read_bytes()
        ran = run("savings", site, "--json", site / name)
        assert ran.code == 1, name
        assert "one of the inputs" in ran.err
        assert (site / name).read_bytes() == before


def test_names_from_the_site_file_cannot_break_a_console_or_a_page(
    run: Run, site: Path, tmp_path: Path
) -> None:
    toml = (site / "site.toml").read_text()
    hostile = "<script>alert(1)</script> \\u202e 12345678901"
    (site / "site.toml").write_text(toml.replace("Test house", hostile))
    ran = run("savings", site, "--report", tmp_path / "r")
    # A direction override is no printable character, so the site file itself is refused.
    assert ran.code == 1
    (site / "site.toml").write_text(toml.replace("Test house", hostile.replace("\\u202e", "")))
    ran = run("savings", site, "--report", tmp_path / "r")
    assert ran.code == 0
    assert "12345678901" not in ran.out
    page = (tmp_path / "r" / "report.html").read_text(encoding="utf-8")
    assert "<script>" not in page
    assert "12345678901" not in page
    assert "12345678901" in run("savings", site, "--show-accounts").out


def test_a_report_that_cannot_be_written_is_a_message(run: Run, site: Path) -> None:
    ran = run("savings", site, "--report", site / "gas.csv")
    assert ran.code == 1
    assert "fault of the program" not in ran.err


def test_the_savings_path_loads_no_tables_and_no_statistics(site: Path) -> None:
    from tests.test_surface import loaded_by

    code = (
        "import io, contextlib\n"
        "from normalize.cli.main import main\n"
        f"with contextlib.redirect_stdout(io.StringIO()):\n    main(['savings', {str(site)!r}])"
    )
    assert not loaded_by(code) & {"pandas", "statsmodels", "matplotlib", "openpyxl"}


def test_every_sample_site_has_an_answer_for_every_account(run: Run, samples: Path) -> None:
    folders = sorted(file.parent for file in samples.glob("*/site.toml"))
    assert len(folders) >= 3
    for folder in folders:
        ran = run("savings", folder, "--json", "-")
        assert ran.code == 0
        for account in json.loads(ran.out)["accounts"]:
            assert account["normalized"]["unavailable"] is None, (folder.name, account["account"])
            assert account["avoided"]["unavailable"] is None, (folder.name, account["account"])
