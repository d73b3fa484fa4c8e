"""normalize plan: what it says, asks and refuses; on the sample sites and small ones."""

from __future__ import annotations

import json
import shutil
import xml.etree.ElementTree as ET
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import pytest

from normalize.plan import outlook
from normalize.site import read_site
from tests.cli.conftest import ROOT, Ran

Run = Callable[..., Ran]
pytestmark = pytest.mark.kernel
QUINCE = ROOT / "sample_data" / "quince_street"


@pytest.fixture(scope="module")
def house(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The sample house with its work struck out."""
    made = tmp_path_factory.mktemp("plan") / "house"
    shutil.copytree(QUINCE, made)
    toml = made / "site.toml"
    text = toml.read_text(encoding="utf-8")
    head, _, rest = text.partition("[[upgrade]]")
    after = rest.find("[[change]]")
    toml.write_text(head + (rest[after:] if after >= 0 else ""), encoding="utf-8")
    return made


def test_it_says_how_small_and_how_long(run: Run) -> None:
    ran = run("plan", QUINCE, "--saving", "12%", "--account", "gas")
    text = " ".join(ran.out.replace("\u00a0", " ").split())
    assert ran.code == 0
    assert "With 12 more monthly bills a saving of" in text
    assert "of gas in a normal year, or more, would show four times in five" in text
    assert "The 12 % of gas hoped for needs at most 3 more monthly bills, about until" in text
    assert "2016–2025" in text  # the years whose weather stands for the months to come
    assert "electricity" not in text


def test_only_bills_before_the_work_count() -> None:
    """The plan is the same when every bill after the work's first day is gone."""
    site = read_site(QUINCE)
    cut = []
    for bills in site.bills:
        assert bills is not None
        p = bills.periods
        keep = p.end <= site.upgrades[0].start
        periods = replace(
            p, start=p.start[keep], end=p.end[keep], use=p.use[keep], cost=p.cost[keep],
            estimated=p.estimated[keep], joined=p.joined[keep],
        )  # fmt: skip
        cut.append(replace(bills, periods=periods))
    whole, alone = outlook(site), outlook(replace(site, bills=tuple(cut)))
    assert [a.prospects for a in whole.accounts] == [a.prospects for a in alone.accounts]
    gas = whole.accounts[0]
    assert gas.starts == site.upgrades[0].end
    assert gas.last is not None
    assert gas.last <= site.upgrades[0].start


def test_no_work_need_be_named(run: Run, house: Path) -> None:
    ran = run("plan", house, "--json", "-")
    assert ran.code == 0
    whole = json.loads(ran.out)
    assert whole["schema"] == 1
    assert whole["saving_hoped_for"] is None
    for account in whole["accounts"]:
        assert [p["bills"] for p in account["prospects"]] == list(range(3, 37))
        assert account["needed"] is None
    gas = next(a for a in whole["accounts"] if a["account"] == "gas")
    early, late = gas["prospects"][0], gas["prospects"][-1]
    assert early["normalized"] is None
    assert "6 bills" in early["normalized_unavailable"]
    assert 0 < late["normalized"]["even_odds"] < late["normalized"]["four_in_five"]
    share = late["normalized"]["four_in_five_fraction"]
    assert share == pytest.approx(late["normalized"]["four_in_five"] / gas["nac"])
    assert run("plan", house, "--json", "-").out == ran.out  # same input, same bytes


def test_needed_agrees_with_the_prospects(run: Run, house: Path) -> None:
    whole = json.loads(run("plan", house, "--saving", "0.05", "--json", "-").out)
    for account in whole["accounts"]:
        wanted = account["needed"]["avoided_four_in_five"]
        enough = [
            p["bills"]
            for p in account["prospects"]
            if p["avoided"]["four_in_five_fraction"] <= 0.05
        ]
        assert wanted == (enough[0] if enough else None)


@pytest.mark.parametrize(
    ("saving", "told"),
    [
        ("12", "write 12% if it is per cent"),
        ("1", "write 1% if it is per cent"),
        ("120%", "out of range"),
        ("0.1%", "out of range"),
        ("-5%", "out of range"),
        ("nan", "out of range"),
        ("a lot", "is no share"),
    ],
)
def test_a_share_that_is_none_is_asked_about(run: Run, saving: str, told: str) -> None:
    ran = run("plan", QUINCE, f"--saving={saving}")
    assert ran.code == 2
    assert told in ran.err


def test_an_account_that_is_not_there_is_told_with_those_that_are(run: Run) -> None:
    ran = run("plan", QUINCE, "--account", "gass")
    assert ran.code == 1
    assert "gas, electricity" in ran.err


def test_too_few_bills_are_a_reason_and_not_a_plan(run: Run, tmp_path: Path, house: Path) -> None:
    made = tmp_path / "few"
    shutil.copytree(house, made)
    (made / "bills.csv").write_text(
        "start,end,therms\n2022-01-05,2022-02-04,80\n2022-02-04,2022-03-07,70\n"
        "2022-03-07,2022-04-05,40\n",
        encoding="utf-8",
    )
    (made / "site.toml").write_text(
        '[site]\nname = "few"\n[weather]\nobserved = "station.csv"\n[[account]]\nname = "gas"\n'
        'fuel = "natural gas"\nbills = "bills.csv"\nunit = "therm"\n',
        encoding="utf-8",
    )
    ran = run("plan", made, "--saving", "12%")
    assert ran.code == 1
    assert "For gas nothing can be foretold" in ran.out
    assert "270" in ran.out
    picture = run("plan", made, "--picture", tmp_path / "x.svg")
    assert picture.code == 1
    assert "nothing to draw" in picture.err


def test_the_picture_has_its_lines_named(run: Run, tmp_path: Path) -> None:
    path = tmp_path / "plan.svg"
    ran = run("plan", QUINCE, "--account", "gas", "--saving", "12%", "--picture", path)
    assert ran.code == 0
    root = ET.fromstring(path.read_text(encoding="utf-8"))
    told = ["".join(t.itertext()) for t in root.iter("{http://www.w3.org/2000/svg}text")]
    for name in (
        "hoped for: 12\u00a0%",
        "avoided use, 4 times in 5",
        "avoided use, even odds",
        "normal year, 4 times in 5",
        "normal year, even odds",
        "monthly bills after the work",
    ):
        assert name in told


def test_pictures_are_refused_with_a_way_out(run: Run, tmp_path: Path) -> None:
    two = run("plan", QUINCE, "--picture", tmp_path / "x.svg")
    assert two.code == 1
    assert "Name one with --account: gas, electricity" in two.err
    png = run("plan", QUINCE, "--account", "gas", "--picture", tmp_path / "x.png")
    assert png.code == 1
    assert ".svg" in png.err
    assert not list(tmp_path.iterdir())


def test_nothing_is_written_over_an_input(run: Run, house: Path) -> None:
    for name in ("gas.csv", "site.toml"):
        before = (house / name).read_bytes()
        ran = run("plan", house, "--json", house / name)
        assert ran.code == 1
        assert "one of the inputs" in ran.err
        assert (house / name).read_bytes() == before


def test_deliveries_are_called_fills(run: Run) -> None:
    ran = run("plan", ROOT / "sample_data" / "harrow_farm", "--saving", "12%", "--account", "oil")
    assert ran.code == 0
    assert "full fills" in ran.out
    assert "monthly bill" not in ran.out
