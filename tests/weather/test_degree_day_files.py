"""Degree-day tables written to files: numbers as numbers, no formulas, the same bytes twice."""

from __future__ import annotations

import csv
from datetime import date
from pathlib import Path
from xml.etree import ElementTree as ET

import pytest

from normalize.cli.main import main
from tests.weather.makers import daily_lines, seasons, write

FIRST = date(2022, 1, 1)


def station(folder: Path) -> Path:
    temps = seasons(FIRST, date(2023, 12, 31))
    temps[700:710] = float("nan")
    rows = [line.replace("nan", "") for line in daily_lines(FIRST, temps)]
    return write(folder, ["date,mean_f", *rows], "s.csv")


EVIL = '=HYPERLINK("http://x","y")'


def test_csv_and_workbook(tmp_path: Path) -> None:
    from openpyxl import load_workbook

    path = station(tmp_path)
    for k in (1, 2):
        assert main(
            ["degree-days", str(path), "--by", "month", "--station", EVIL,
             "--csv", str(tmp_path / f"{k}.csv"), "--xlsx", str(tmp_path / f"{k}.xlsx")]
        ) == 0  # fmt: skip
    assert (tmp_path / "1.csv").read_bytes() == (tmp_path / "2.csv").read_bytes()
    assert (tmp_path / "1.xlsx").read_bytes() == (tmp_path / "2.xlsx").read_bytes()
    with (tmp_path / "1.csv").open(encoding="utf-8-sig", newline="") as file:
        rows = list(csv.DictReader(file))
    assert len(rows) == 24
    assert rows[0]["station"].startswith("'=")
    assert float(rows[0]["heating"]) > 800
    assert (rows[23]["heating"], rows[23]["days missing"]) == ("", "10")
    sheet = load_workbook(tmp_path / "1.xlsx")["degree-days"]
    assert sheet["A2"].data_type == "s"
    assert str(sheet["A2"].value).startswith("'=")
    assert sheet["G2"].value == pytest.approx(float(rows[0]["heating"]))
    assert sheet["G25"].value is None


def test_pictures(tmp_path: Path) -> None:
    path = station(tmp_path)
    svg, png = tmp_path / "a.svg", tmp_path / "a.png"
    for target in (svg, png):
        assert main(
            ["degree-days", str(path), "--by", "month", "--station", "<b>&",
             "--picture", str(target)]
        ) == 0  # fmt: skip
    root = ET.parse(svg).getroot()
    words = " ".join("".join(node.itertext()) for node in root.iter() if "text" in node.tag)
    assert "degree-days over 23 months" in words
    assert "<b>" in words  # as text, not as markup
    assert png.read_bytes().startswith(b"\x89PNG")
    before = svg.read_bytes()
    main(["degree-days", str(path), "--by", "month", "--station", "<b>&", "--picture", str(svg)])
    assert svg.read_bytes() == before


def test_places_that_cannot_be_written(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = station(tmp_path)
    before = path.read_bytes()
    assert main(["degree-days", str(path), "--csv", str(path)]) == 1
    assert main(["degree-days", str(path), "--xlsx", str(tmp_path / "no" / "a.xlsx")]) == 1
    assert main(["degree-days", str(path), "--picture", str(tmp_path / "a.pdf")]) == 1
    assert path.read_bytes() == before
    assert "ends in .svg or .png" in capsys.readouterr().err


def test_by_bill(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = station(tmp_path)
    bills = write(
        tmp_path,
        ["start,end,therms", "2022-01-05,2022-02-04,120", "2022-02-04,2022-03-07,110",
         "2022-03-07,2022-04-06,80"],
        "gas.csv",
    )  # fmt: skip
    assert main(
        ["degree-days", str(path), "--by", "bill", "--bills", str(bills), "--growing"]
    ) == 0  # fmt: skip
    out = capsys.readouterr().out
    assert "2022-01-05 to 2022-02-03" in out
    assert "growing" in out
    assert main(["degree-days", str(path), "--by", "bill"]) == 2
    assert main(["degree-days", str(path), "--bills", str(bills)]) == 2
