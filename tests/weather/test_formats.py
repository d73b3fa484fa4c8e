"""The table of formats: complete, in order, and told apart by content alone."""

from __future__ import annotations

from importlib import import_module
from pathlib import Path

import pytest

from normalize.weather import formats
from normalize.weather.formats import MODULES, Format, format_of

TMY3 = b'1,"X",ZZ,-5,44,-72,200\nDate (MM/DD/YYYY),Time (HH:MM),GHI (W/m^2),Dry-bulb (C)\n'
EPW = b"LOCATION,X,Y,Z,a,1,44,-72,-5,200\nDATA PERIODS,1,1,Data,Sunday,1/1,12/31\n"


def test_every_module_with_a_format_is_in_the_table() -> None:
    folder = Path(str(formats.__file__)).parent
    names = {p.stem for p in folder.glob("*.py")} - {"__init__"}
    with_format = {
        name
        for name in names
        if hasattr(import_module(f"normalize.weather.formats.{name}"), "FORMAT")
    }
    assert with_format == set(MODULES)
    assert MODULES[-1] == "generic_csv"  # takes whatever is left


def test_every_format_reads_something() -> None:
    for module in MODULES:
        found = import_module(f"normalize.weather.formats.{module}").FORMAT
        assert isinstance(found, Format)
        assert found.read_days or found.read_year


@pytest.mark.parametrize(
    ("head", "name"),
    [
        (TMY3, "TMY3 file"),
        (EPW, "EPW file"),
        (b"\xef\xbb\xbf" + EPW, "EPW file"),
        (b"date,mean_f\n2023-01-01,30\n", "table of temperatures"),
        (b"location,date,mean_f\n", "table of temperatures"),
    ],
)
def test_told_apart_by_content(head: bytes, name: str) -> None:
    found = format_of(head)
    assert found is not None
    assert found.name == name
