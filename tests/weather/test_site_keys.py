"""The keys of [weather] that name further files, from site.toml to the reader."""

from __future__ import annotations

from datetime import date
from pathlib import Path

import pytest

from normalize.errors import MissingFile, SiteError, UnknownKey
from normalize.sitefile import read_site_file
from normalize.weather.read import read_weather
from normalize.weather.year import read_long_term_year
from tests.weather.makers import daily_lines, seasons, write
from tests.weather.test_stations import normals_file

FIRST = date(2022, 1, 1)


def folder(tmp_path: Path, weather: str) -> Path:
    temps = seasons(FIRST, date(2023, 12, 31))
    write(tmp_path, ["date,mean_f", *daily_lines(FIRST, temps + 2)], "second.csv")
    temps[300:310] = float("nan")
    rows = [line.replace("nan", "") for line in daily_lines(FIRST, temps)]
    write(tmp_path, ["date,mean_f", *rows], "station.csv")
    (tmp_path / "normals.csv").write_bytes(normals_file())
    (tmp_path / "site.toml").write_text(
        f'[weather]\nobserved = "station.csv"\n{weather}\n'
        '[[account]]\nfuel = "electricity"\nbills = "b.csv"\n'
    )
    return tmp_path


def test_a_neighbour_reaches_the_reader(tmp_path: Path) -> None:
    plan = read_site_file(folder(tmp_path, 'neighbour = "second.csv"')).weather
    assert plan.observed is not None
    w = read_weather(plan.observed, **plan.reader)  # type: ignore[arg-type]
    assert int(w.filled.sum()) == 10
    assert [name for name, _ in w.source] == ["station.csv", "second.csv"]


def test_normals_as_the_long_term_year_and_others_to_try(tmp_path: Path) -> None:
    text = (
        'long_term = { file = "normals.csv" }\nalso = ["second.csv"]\n'
        'long_term_also = ["normals.csv"]'
    )
    plan = read_site_file(folder(tmp_path, text)).weather
    assert plan.long_term_file is not None
    assert read_long_term_year(plan.long_term_file).heating(65) == pytest.approx(7333.4, abs=0.05)
    assert [p.name for p in plan.also] == ["second.csv"]
    assert [p.name for p in plan.long_term_also] == ["normals.csv"]


@pytest.mark.parametrize(
    ("text", "error"),
    [
        ('neighbour = "none.csv"', MissingFile),
        ('neighbour = "../second.csv"', SiteError),
        ('also = ["none.csv"]', MissingFile),
        ('also = ["/etc/passwd"]', SiteError),
        ('also = "second.csv"', SiteError),
        ("also = [" + '"second.csv", ' * 21 + "]", SiteError),
        ('neighbor = "second.csv"', UnknownKey),
    ],
)
def test_slips_are_messages(tmp_path: Path, text: str, error: type[Exception]) -> None:
    with pytest.raises(error, match=r"site\.toml"):
        read_site_file(folder(tmp_path, text))
