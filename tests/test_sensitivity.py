"""How far the answer moves with other choices, stations and normal years: the sample house."""

from __future__ import annotations

import shutil
from dataclasses import replace
from pathlib import Path

import pytest

from normalize.sensitivity import how_far, how_firm
from normalize.site import assess, read_site

pytestmark = pytest.mark.kernel
SAMPLES = Path(__file__).resolve().parent.parent / "sample_data"


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The sample house with a second station, and a typical year that is not one."""
    made = tmp_path_factory.mktemp("house") / "house"
    shutil.copytree(SAMPLES / "quince_street", made)
    shutil.copy(SAMPLES / "mill_library" / "station.csv", made / "coast.csv")
    (made / "typical.epw").write_text("not a typical year\n", encoding="utf-8")
    toml = (made / "site.toml").read_text(encoding="utf-8")
    toml = toml.replace(
        "[weather]\n", '[weather]\nalso = ["coast.csv"]\nlong_term_also = ["typical.epw"]\n'
    )
    (made / "site.toml").write_text(toml, encoding="utf-8")
    return made


def test_every_alternative_is_a_row_and_the_first_is_the_answer(folder: Path) -> None:
    site = read_site(folder)
    result = assess(site)
    moved = how_far(site, result)
    gas = [m for m in moved if m.account == "gas"]
    assert gas[0].changes == "as chosen"
    assert gas[0].normalized == result.accounts[0].savings.normalized
    assert {m.changes for m in gas} == {
        "as chosen", "same form", "weights", "criterion", "one bill left out", "window",
        "station", "long-term year",
    }  # fmt: skip
    assert {m.account for m in moved} == {"gas", "electricity"}
    coast = next(m for m in gas if m.changes == "station")
    assert coast.normalized is not None
    assert coast.normalized.value is not None
    assert coast.normalized.value != gas[0].normalized.value
    broken = [m for m in gas if m.unavailable]
    assert len(broken) == 1
    assert broken[0].normalized is None


def test_another_normal_year_leaves_avoided_use_alone(folder: Path) -> None:
    """Avoided use knows no normal year, so only a station may move it."""
    site = read_site(folder)
    result = assess(site)
    for m in how_far(site, result):
        if m.changes == "long-term year" and m.avoided is not None:
            same = next(a for a in result.accounts if a.account == m.account)
            assert m.avoided == same.savings.avoided


def test_quick_rows_come_with_every_result_and_change_nothing_in_it(folder: Path) -> None:
    site = read_site(folder)
    result = assess(site)
    quick = how_firm(site, result.accounts, result.confidence)
    assert result.moved == quick
    assert how_far(site, result)[: len([m for m in quick if m.account == "gas"])] == tuple(
        m for m in quick if m.account == "gas"
    )


def test_an_account_without_an_answer_has_no_rows(folder: Path) -> None:
    site = read_site(folder)
    nothing = replace(site, bills=(None, site.bills[1]), read_errors=(("gas", "unreadable"),))
    result = assess(nothing)
    assert {m.account for m in result.moved} == {"electricity"}
