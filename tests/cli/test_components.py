"""[[upgrade.component]]: what it may say, and that a doubtful airflow is asked about."""

from __future__ import annotations

from pathlib import Path

import pytest

from normalize.errors import SiteError, UnknownKey
from normalize.savings.components import (
    AirSealing,
    Equipment,
    Insulation,
    Setback,
    Windows,
)
from normalize.sitefile import read_site_file

HEAD = """\
[site]
heating_setpoint_f = 69

[weather]
observed = "station.csv"

[[account]]
fuel = "natural gas"
bills = "gas.csv"
efficiency = 0.78
heating_share = 0.9

[[upgrade]]
name = "first"
start = 2023-09-11

[[upgrade.component]]
kind = "insulation"
name = "attic floor"
area_ft2 = 920
r_before = 11
r_after = 49

[[upgrade.component]]
kind = "air sealing"
natural_cfm_before = 130
natural_cfm_after = 100

[[upgrade]]
name = "second"
start = 2024-05-01

[[upgrade.component]]
"""


def read(folder: Path, component: str) -> tuple[object, ...]:
    (folder / "station.csv").write_text("date,mean_f\n")
    (folder / "site.toml").write_text(HEAD + component, encoding="utf-8")
    file = read_site_file(folder)
    assert file.heating_setpoint_f == 69.0
    assert (file.accounts[0].efficiency, file.accounts[0].heating_share) == (0.78, 0.9)
    assert file.upgrades[0].components == (
        Insulation("attic floor", 920.0, 11.0, 49.0),
        AirSealing("air sealing", 130.0, 100.0),
    )
    return file.upgrades[1].components


@pytest.mark.parametrize(
    ("text", "wanted"),
    [
        (
            'kind = "windows"\narea_ft2 = 150\nu_before = 0.9\nu_after = 0.3',
            Windows("windows", 150.0, 0.9, 0.3),
        ),
        (
            'kind = "air sealing"\nblower_door_cfm50_before = 2600\nblower_door_cfm50_after = 2000',
            AirSealing("air sealing", 130.0, 100.0, 20.0),
        ),
        (
            'kind = "air sealing"\nblower_door_cfm50_before = 2600\n'
            "blower_door_cfm50_after = 1300\nblower_door_divisor = 13",
            AirSealing("air sealing", 200.0, 100.0, 13.0),
        ),
        (
            'kind = "equipment"\nname = "furnace"\nefficiency_before = 0.8\n'
            "efficiency_after = 0.95",
            Equipment("furnace", 0.8, 0.95),
        ),
        (
            'kind = "setback"\ndegrees_f = 6\nhours_a_day = 8',
            Setback("setback", 6.0, 8.0),
        ),
    ],
)
def test_every_kind_arrives(tmp_path: Path, text: str, wanted: object) -> None:
    assert read(tmp_path, text) == (wanted,)


def problem(folder: Path, text: str, kind: type[SiteError] = SiteError) -> str:
    with pytest.raises(kind) as caught:
        read(folder, text)
    return str(caught.value)


@pytest.mark.parametrize(
    "key", ["cfm_before", "cfm", "airflow_before", "leakage_before", "blower_door_cfm_before"]
)
def test_a_doubtful_airflow_is_asked_about(tmp_path: Path, key: str) -> None:
    """The 50 Pa figure is about twenty times the natural flow (common practice, no source)."""
    told = problem(tmp_path, f'kind = "air sealing"\n{key} = 2600\n')
    assert key in told
    assert "leaves open which airflow is meant" in told
    assert "about twenty times" in told
    assert "blower_door_cfm50_before" in told
    assert "natural_cfm_before" in told
    assert "site.toml:35, [[upgrade.component]]" in told


def test_air_changes_need_a_volume(tmp_path: Path) -> None:
    told = problem(tmp_path, 'kind = "air sealing"\nach50_before = 9.5\n')
    assert "volume" in told
    assert "÷ 60" in told


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("area_ft2 = 900", ("there is no kind",)),
        ('kind = "insulatoin"', ("Did you mean 'insulation'?", "site.toml:34")),
        ('kind = "insulation"\narea_ft2 = 900\nr_before = 11', ("there is no r_after",)),
        (
            'kind = "insulation"\narea_ft2 = 900\nr_before = 38\nr_after = 11',
            ("Were they swapped?",),
        ),
        ('kind = "windows"\narea_ft2 = 90\nu_before = 0.3\nu_after = 0.9', ("swapped",)),
        (
            'kind = "equipment"\nefficiency_before = 80\nefficiency_after = 95',
            ("80 % is 0.80", "from 0.1 to 8"),
        ),
        ('kind = "insulation"\narea_ft2 = "big"\nr_before = 1\nr_after = 2', ("a number",)),
        ('kind = "insulation"\narea_ft2 = nan\nr_before = 1\nr_after = 2', ("a number from",)),
        (
            'kind = "air sealing"\nnatural_cfm_before = 130\nblower_door_cfm50_after = 2000',
            ("both given",),
        ),
        ('kind = "air sealing"', ("no airflow is given",)),
        (
            'kind = "air sealing"\nnatural_cfm_before = 130\nnatural_cfm_after = 100\n'
            "blower_door_divisor = 20",
            ("natural airflow without a divisor",),
        ),
        ('kind = "setback"\ndegrees_f = 6\nhours_a_day = 25', ("from 0.1 to 24",)),
    ],
)
def test_a_slip_is_told_with_its_remedy(tmp_path: Path, text: str, words: tuple[str, ...]) -> None:
    told = problem(tmp_path, text)
    for word in words:
        assert word in told


def test_a_key_of_another_kind_is_unknown(tmp_path: Path) -> None:
    told = problem(tmp_path, 'kind = "setback"\ndegrees_f = 6\nr_before = 3', UnknownKey)
    assert "degrees_f, hours_a_day" in told


def test_one_bracket_too_few_is_told(tmp_path: Path) -> None:
    (tmp_path / "station.csv").write_text("date,mean_f\n")
    text = HEAD.split("[[upgrade.component]]")[0] + '[upgrade.component]\nkind = "setback"\n'
    (tmp_path / "site.toml").write_text(text)
    with pytest.raises(SiteError, match=r"\[\[upgrade.component\]\] with two brackets"):
        read_site_file(tmp_path)
