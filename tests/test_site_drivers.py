"""Drivers of a site folder: from its own files, from bills, from the calendar; and questions."""

from __future__ import annotations

import shutil
from pathlib import Path

import numpy as np
import pytest

from normalize.days import day_of_iso
from normalize.errors import AmbiguousBills, BillError, UnreadableBills
from normalize.site import Site, assess, read_site

SAMPLES = Path(__file__).resolve().parent.parent / "sample_data"
MONTHS = [f"{y}-{m:02d}" for y in range(2020, 2027) for m in range(1, 13)]


def site_with(tmp_path: Path, text: str, **files: str) -> Site:
    folder = tmp_path / "site"
    if not folder.exists():
        shutil.copytree(SAMPLES / "quince_street", folder)
    for name, content in files.items():
        (folder / f"{name}.csv").write_text(content, encoding="utf-8")
    plain = (SAMPLES / "quince_street" / "site.toml").read_text(encoding="utf-8")
    (folder / "site.toml").write_text(plain + text, encoding="utf-8")
    return read_site(folder)


def months(values: str) -> str:
    return "Month,People\n" + "".join(
        f"{m},{v}\n" for m, v in zip(MONTHS, values * len(MONTHS), strict=False)
    )


def test_a_file_reaches_the_accounts_it_is_for(tmp_path: Path) -> None:
    site = site_with(
        tmp_path,
        '\n[[driver]]\nname = "people"\nfile = "people.csv"\nvalues = "level"\n'
        'accounts = ["electricity"]\n',
        people=months("23"),
    )
    gas, electricity = site.drivers
    assert gas == ()
    assert electricity[0].name == "people"
    january = electricity[0].between(day_of_iso("2020-01-01"), day_of_iso("2020-02-01"))
    assert (january == 2.0).all()
    assert "people.csv" in [name for name, _ in site.inputs]


def test_day_types_cover_the_bills_of_each_account(tmp_path: Path) -> None:
    site = site_with(
        tmp_path,
        '\n[day_types]\nholidays = "days.csv"\n'
        "school_terms = [{ start = 2021-01-04, end = 2021-06-11 }]\nschool_days_per_year = 180\n",
        days="Date,Name\n2021-07-05,Midsummer\n",
    )
    for drivers, bills in zip(site.drivers, site.bills, strict=True):
        assert [d.name for d in drivers] == ["weekend days", "holidays", "school days"]
        assert bills is not None
        assert drivers[0].first_day == int(bills.periods.start.min())
        assert drivers[2].normal == pytest.approx(180 / 365)
        assert np.nansum(drivers[1].amount) == 1.0
    assert "days.csv" in [name for name, _ in site.inputs]


def test_an_irrelevant_driver_is_told_and_changes_nothing(tmp_path: Path) -> None:
    text = '\n[[driver]]\nname = "people"\nfile = "people.csv"\nvalues = "level"\n'
    rng = np.random.default_rng(1)
    people = "".join(str(k) for k in rng.integers(1, 6, len(MONTHS)))
    plain = assess(read_site(SAMPLES / "quince_street"))
    found = assess(site_with(tmp_path, text, people=months(people)))
    for own, other in zip(found.accounts, plain.accounts, strict=True):
        assert own.drivers is not None
        assert own.drivers.kept == ()
        assert own.savings == other.savings
        assert own.drivers.answers[0].normalized == other.savings.normalized


@pytest.mark.parametrize(
    ("text", "content", "kind", "says"),
    [
        ('file = "people.csv"', "Month,People\n2023-01,3\n", AmbiguousBills, "'people'"),
        ('file = "people.csv"', "Month,People\n2023-01,3\n", AmbiguousBills, "values"),
        ('file = "people.csv"\ncolumn = "Cats"', "Month,People\n2023-01,3\n", UnreadableBills,
         "'Cats'"),
        ('column = "Cats"', "", UnreadableBills, "'Cats'"),
        ('file = "people.csv"', "no table at all", BillError, "people.csv"),
    ],
)  # fmt: skip
def test_a_driver_that_cannot_be_read_is_an_error_that_names_it(
    tmp_path: Path, text: str, content: str, kind: type[BillError], says: str
) -> None:
    with pytest.raises(kind) as caught:
        site_with(tmp_path, f'\n[[driver]]\nname = "people"\n{text}\n', people=content)
    assert says in str(caught.value)
    assert "people" in str(caught.value)
