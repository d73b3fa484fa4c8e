"""Numbers printed in docs/method.md are those of the code, and its arithmetic is right.

Ephrata's degree-days: Western Regional Climate Center, as published.  The fractional savings
uncertainty of 0.393: Guideline 14's formula worked by hand.
"""

from __future__ import annotations

import ast
import importlib
import math
import re
from pathlib import Path

import pytest

from normalize.units import canonical_fuel, co2_kg_per_unit, mmbtu_per_unit

ROOT = Path(__file__).parents[1]
TEXT = (ROOT / "docs" / "method.md").read_text(encoding="utf-8")


def rows_of(heading: str) -> list[list[str]]:
    """Cells of the tables between a heading and the next heading of its level."""
    level = heading.split(" ")[0]
    part = TEXT.split(f"\n{heading}", 1)[1].split(f"\n{level} ", 1)[0]
    lines = [line for line in part.splitlines() if line.startswith("| ")]
    return [[cell.strip() for cell in line.strip("|").split("|")] for line in lines]


DEFAULTS = [(r[0].strip("`"), r[1]) for r in rows_of("## 9.") if r[0].startswith("`")]


@pytest.mark.parametrize(("name", "value"), DEFAULTS, ids=[name for name, _ in DEFAULTS])
def test_a_default_is_the_one_in_the_code(name: str, value: str) -> None:
    module, _, constant = f"normalize.{name}".rpartition(".")
    assert getattr(importlib.import_module(module), constant) == ast.literal_eval(value)


def test_every_default_that_decides_a_number_is_in_the_table() -> None:
    from normalize import defaults

    names = {f"defaults.{name}" for name in vars(defaults) if name.isupper()}
    assert names == {name for name, _ in DEFAULTS if name.startswith("defaults.")}


def test_the_grid_of_correlations_is_the_one_described() -> None:
    import numpy as np

    from normalize.fitting import rho
    from normalize.fitting.rho import RHO, RHO_ZERO

    grid = np.linspace(rho.RHO_LOW, rho.RHO_HIGH, rho.RHO_POINTS)
    assert pytest.approx(grid, abs=1e-12) == RHO
    assert RHO[RHO_ZERO] == 0.0


FACTORS = [r for r in rows_of("## 8.") if len(r) == 5 and re.fullmatch(r"[\d.]+", r[2])]


@pytest.mark.parametrize("row", FACTORS, ids=[r[0] for r in FACTORS])
def test_a_factor_is_the_one_in_the_code(row: list[str]) -> None:
    fuel, unit, heat, carbon, source = row
    name = canonical_fuel(fuel)
    in_code = mmbtu_per_unit(name, unit), co2_kg_per_unit(name, unit)
    for printed, factor in zip((heat, carbon), in_code, strict=True):
        digits = len(printed.partition(".")[2])
        assert float(printed) == pytest.approx(factor.value, abs=0.5001 * 10.0**-digits)
    assert ("(memory)" in source) == any(factor.memory for factor in in_code)


def test_the_table_of_factors_has_every_fuel() -> None:
    from normalize.units import FUELS

    assert {canonical_fuel(row[0]) for row in FACTORS} == set(FUELS)


def test_ephrata_cannot_be_scaled() -> None:
    rows = [[float(x) for x in r] for r in rows_of("### 4.3 ") if r[0].isdigit()]
    assert [r[1] for r in rows] == [5859, 4606, 3925, 3500, 2540]
    for base, _, scaled in rows:
        assert scaled == pytest.approx(5859 * base / 65, abs=0.5)


def test_the_example_of_the_guideline_formula() -> None:
    from normalize.savings.checks import cv_limit, fractional_uncertainty

    value = fractional_uncertainty(n=12, m=12, rho=0.0, cv=0.1, fraction=0.1, t=1.0)
    assert f"{value:.3f} at t = 1" in TEXT
    assert value == pytest.approx(1.26 * math.sqrt((1 + 2 / 12) / 12), rel=1e-12)
    assert [cv_limit(d) for d in (300, 400, 1800, 1900)] == [0.20, 0.25, 0.25, 0.30]


def test_what_a_fuller_form_costs_with_twelve_bills() -> None:
    n = 12

    def aicc(k: int) -> float:
        return 2 * k + 2 * k * (k + 1) / (n - k - 1)

    assert f"costs {aicc(6) - aicc(4):.1f}\nby AICc and {2 * math.log(n):.1f} by BIC" in TEXT


def test_every_section_that_code_refers_to_exists() -> None:
    sections = set(re.findall(r"^##+ (\d+)", TEXT, re.M))
    cited = set()
    for folder in ("normalize", "tests"):
        for file in (ROOT / folder).rglob("*.py"):
            found = re.findall(r"method(?:\.md)? §(\d+)(?:-§(\d+))?", file.read_text("utf-8"))
            cited |= {number for pair in found for number in pair if number}
    assert cited
    assert cited <= sections


def test_links_within_the_page_lead_somewhere() -> None:
    def anchor(title: str) -> str:
        return re.sub(r"[^\w\- ]", "", title.lower()).replace(" ", "-")

    anchors = {anchor(title) for title in re.findall(r"^##+ (.+)$", TEXT, re.M)}
    links = set(re.findall(r"\]\(#([^)]+)\)", TEXT))
    assert links
    assert links <= anchors


def test_every_reference_is_cited_and_every_citation_listed() -> None:
    body, _, listed = TEXT.partition("## 12. References")
    for year in re.findall(r"\b(1[89]\d\d)\b", listed):
        assert year in body
    for name, year in re.findall(
        r"([A-Z][a-z]+)(?:,? &? ?[A-Z][a-z]+)* (19\d\d|2003|2000)\b", body
    ):
        assert f"{year}." in listed, (name, year)
