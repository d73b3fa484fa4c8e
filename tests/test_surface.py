"""The public surface: a list that is looked at, and that costs nothing to import."""

from __future__ import annotations

import json
import subprocess
import sys
import tomllib
from pathlib import Path

import pytest

import normalize

ROOT = Path(__file__).parents[1]
SCIENCE = {"numpy", "pandas", "scipy", "numba", "matplotlib", "statsmodels", "openpyxl", "jinja2"}

SURFACE = [
    "Bills",
    "DailyTemperature",
    "Estimate",
    "FileAccounts",
    "Fit",
    "LongTermYear",
    "NormalizeError",
    "Savings",
    "Site",
    "SiteResult",
    "__version__",
    "assess",
    "fit",
    "long_term_year",
    "measure_savings",
    "read_accounts",
    "read_bills",
    "read_long_term_year",
    "read_site",
    "read_weather",
]


def loaded_by(code: str) -> set[str]:
    """Top-level modules in memory after running some code in a fresh Python."""
    script = f"{code}\nimport sys, json\nprint(json.dumps(sorted(sys.modules)), file=sys.stderr)"
    done = subprocess.run(
        [sys.executable, "-c", script], capture_output=True, text=True, check=True, cwd=ROOT
    )
    return {name.split(".")[0] for name in json.loads(done.stderr.splitlines()[-1])}


def test_the_surface_is_this_list() -> None:
    assert sorted(normalize.__all__) == SURFACE
    assert dir(normalize) == SURFACE


@pytest.mark.parametrize("name", SURFACE)
def test_every_name_is_there_and_documented(name: str) -> None:
    value = getattr(normalize, name)
    if name != "__version__":
        assert value.__doc__
        assert value.__name__ == name


def test_an_unknown_name_is_an_attribute_error() -> None:
    with pytest.raises(AttributeError, match="no attribute 'savins'"):
        _ = normalize.savins


def test_importing_costs_nothing() -> None:
    loaded = loaded_by("import normalize")
    assert not loaded & SCIENCE
    assert "click" not in loaded


@pytest.mark.parametrize(
    "args",
    [["--help"], ["--version"], ["savings", "--help"], ["bills", "--help"], ["degree-days", "-h"]],
)
def test_help_loads_no_science(args: list[str]) -> None:
    loaded = loaded_by(f"from normalize.cli.main import main\nassert main({args!r}) == 0")
    assert "click" in loaded
    assert not loaded & SCIENCE


def test_the_version_is_said_once() -> None:
    project = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["project"]
    assert project["version"] == normalize.__version__
    changes = (ROOT / "CHANGELOG.md").read_text(encoding="utf-8")
    assert f"## {normalize.__version__}" in changes
