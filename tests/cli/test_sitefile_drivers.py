"""[[driver]] and [day_types] of site.toml: strict, and asking where two things may be meant."""

from __future__ import annotations

from pathlib import Path

import pytest

from normalize.days import day_of_iso
from normalize.errors import MissingFile, NormalizeError, SiteError, UnknownKey
from normalize.sitefile import read_site_file, write_new_site
from normalize.sitefile.values import SiteFile

PLAIN = """\
[weather]
observed = "station.csv"
[[account]]
name = "gas"
fuel = "natural gas"
bills = "gas.csv"
[[account]]
name = "power"
fuel = "electricity"
bills = "power.csv"
"""


def read(tmp_path: Path, text: str) -> SiteFile:
    for name in ("station.csv", "days.csv"):
        (tmp_path / name).write_text("date,amount\n")
    (tmp_path / "site.toml").write_text(PLAIN + text, encoding="utf-8")
    return read_site_file(tmp_path)


def test_a_driver_of_each_kind(tmp_path: Path) -> None:
    units, tonnes = read(
        tmp_path,
        """
[[driver]]
name = "occupied units"
column = "occupied"
values = "level"
normal = 28
accounts = ["gas"]
[[driver]]
name = "tonnes"
file = "days.csv"
normal_per_year = 12000
dates = "day first"
""",
    ).drivers
    assert (units.file, units.normal, units.accounts) == (None, 28.0, ("gas",))
    assert units.reader == {"column": "occupied", "values": "level"}
    assert tonnes.file == tmp_path / "days.csv"
    assert (tonnes.normal, tonnes.normal_per_year) == (None, 12000.0)
    assert tonnes.reader == {"dates": "day first"}


def test_day_types(tmp_path: Path) -> None:
    found = read(
        tmp_path,
        """
[day_types]
holidays = [2023-07-04, "2023-12-25"]
school_terms = [{ start = 2023-08-28, end = 2023-12-20 }, { start = 2023-01-09, end = 2023-06-09 }]
school_days_per_year = 180
accounts = ["power"]
""",
    ).day_types
    assert found is not None
    assert found.weekend == (5, 6)  # Saturday and Sunday, Monday being 0
    assert found.holidays == (day_of_iso("2023-07-04"), day_of_iso("2023-12-25"))
    assert found.school_terms[0] == (day_of_iso("2023-01-09"), day_of_iso("2023-06-10"))
    assert (found.school_days_per_year, found.accounts) == (180.0, ("power",))
    assert read(tmp_path, "").day_types is None


def test_another_weekend_or_none(tmp_path: Path) -> None:
    friday = read(tmp_path, '[day_types]\nweekend = ["Friday", "saturday"]\n').day_types
    none = read(tmp_path, "[day_types]\nweekend = []\n").day_types
    assert friday is not None
    assert none is not None
    assert (friday.weekend, none.weekend) == ((4, 5), ())


@pytest.mark.parametrize(
    ("text", "kind", "says"),
    [
        ('[[driver]]\nname = "x"\nfile = "days.csv"\nvalue = "level"', UnknownKey, "'values'"),
        ('[[driver]]\nfile = "days.csv"', SiteError, "there is no name"),
        ('[[driver]]\nname = "x"', SiteError, "neither a file nor a column"),
        ('[[driver]]\nname = "x"\nfile = "dais.csv"', MissingFile, "'days.csv'"),
        ('[[driver]]\nname = "x"\nfile = "../days.csv"', SiteError, "out of the folder"),
        ('[[driver]]\nname = "x"\ncolumn = "y"\nvalues = "sum"', SiteError, "total, level"),
        (
            '[[driver]]\nname = "x"\ncolumn = "y"\nnormal = 1\nnormal_per_year = 2',
            SiteError, "one of the two",
        ),
        (
            '[[driver]]\nname = "x"\ncolumn = "y"\nvalues = "total"\nnormal = 18',
            SiteError, "normal_per_year",
        ),
        (
            '[[driver]]\nname = "x"\ncolumn = "y"\nvalues = "level"\nnormal_per_year = 18',
            SiteError, "wanted normal,",
        ),
        ('[[driver]]\nname = "x"\ncolumn = "y"\naccounts = ["gaz"]', SiteError, "'gas'"),
        ('[[driver]]\nname = "x"\ncolumn = "y"\nnormal = nan', SiteError, "nan"),
        (
            '[[driver]]\nname = "x"\ncolumn = "y"\n[[driver]]\nname = "X"\ncolumn = "z"',
            SiteError, "taken",
        ),
        (
            '[day_types]\n[[driver]]\nname = "school days"\ncolumn = "y"', SiteError, "taken",
        ),
        ('[driver]\nname = "x"', SiteError, "two brackets"),
        ("[day_types]\nholiday = [2023-07-04]", UnknownKey, "'holidays'"),
        ('[day_types]\nholidays = "none.csv"', MissingFile, "none.csv"),
        ("[day_types]\nholidays = [2023]", SiteError, "a list of dates"),
        ("[day_types]\nholidays = []", SiteError, "a list of dates"),
        ('[day_types]\nweekend = ["caturday"]', SiteError, "'saturday'"),
        ("[day_types]\nschool_terms = [{ start = 2023-08-28 }]", SiteError, "both days"),
        (
            "[day_types]\nschool_terms = [{ start = 2023-08-28, end = 2023-08-01 }]",
            SiteError, "later end",
        ),
        (
            "[day_types]\nschool_terms = [{ start = 2023-01-02, end = 2023-06-09 }, "
            "{ start = 2023-06-09, end = 2023-06-20 }]",
            SiteError, "2023-06-09",
        ),
        ("[day_types]\nschool_days_per_year = 180", SiteError, "the terms"),
        ("[day_types]\nholidays_per_year = 11", SiteError, "a list of holidays"),
    ],
)  # fmt: skip
def test_a_slip_is_told(tmp_path: Path, text: str, kind: type[NormalizeError], says: str) -> None:
    with pytest.raises(kind) as caught:
        read(tmp_path, text)
    assert says in str(caught.value)
    assert "site.toml" in str(caught.value)


def test_the_examples_of_a_new_site_are_true_when_uncommented(tmp_path: Path) -> None:
    folder = tmp_path / "new"
    write_new_site(folder)
    for name in ("station.csv", "occupied_units.csv"):
        (folder / name).write_text("date,mean_f\n")
    lines = (folder / "site.toml").read_text(encoding="utf-8").splitlines()
    first = lines.index("# [[driver]]")
    last = next(i for i in range(first, len(lines)) if not lines[i])
    block = [line.removeprefix("# ") for line in lines[first:last] if "=" in line or "[" in line]
    text = [*lines[:first], *block, *lines[last:]]
    (folder / "site.toml").write_text("\n".join(text), encoding="utf-8")
    found = read_site_file(folder)
    assert found.drivers[0].normal == 28.0
    assert found.day_types is not None
    assert len(found.day_types.holidays) == 2
    assert len(found.day_types.school_terms) == 1
