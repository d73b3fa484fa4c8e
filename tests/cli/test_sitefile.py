"""site.toml: what it may say, and that a slip is told with its line and its remedy."""

from __future__ import annotations

import contextlib
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from normalize.days import day_of_iso
from normalize.errors import MissingFile, NormalizeError, SiteError, UnknownKey
from normalize.savings.components import KINDS, kind_of
from normalize.sitefile import read_site_file, write_new_site

GOOD = """\
[site]
name = "Quince Street house"
floor_area_ft2 = 1840

[weather]
observed = "station.csv"
long_term = { years = 12 }
unit = "F"
time_zone_offset = -5

[[account]]
name = "gas"
fuel = "natural gas"
bills = "gas.csv"
unit = "therms"
price = 1.32
occupied_since = 2021-06-01
dates = "month first"
sheet = "2023"

[[account]]
fuel = "electricity"
bills = "electricity.csv"
space_heating = false
forms = ["flat", "heating and cooling"]

[[upgrade]]
name = "attic insulation"
start = 2023-09-11
end = 2023-09-22
cost = 4150
accounts = ["gas"]

[[change]]
what = "second adult works from home"
since = "2024-02"
until = "2024-03"
"""


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    site = tmp_path / "site"
    site.mkdir()
    (site / "station.csv").write_text("date,mean_f\n")
    return site


def put(folder: Path, text: str | bytes) -> Path:
    data = text if isinstance(text, bytes) else text.encode()
    (folder / "site.toml").write_bytes(data)
    return folder


def changed(old: str, new: str) -> str:
    assert GOOD.count(old) == 1
    return GOOD.replace(old, new)


def test_every_key_arrives(folder: Path) -> None:
    file = read_site_file(put(folder, GOOD))
    assert (file.name, file.floor_area_ft2, file.currency) == ("Quince Street house", 1840.0, "USD")
    assert file.weather.observed == folder / "station.csv"
    assert (file.weather.long_term_years, file.weather.long_term_file) == (12, None)
    assert file.weather.reader == {"unit": "F", "time_zone_offset": -5.0}
    gas, electricity = file.accounts
    assert (gas.name, gas.fuel, gas.unit, gas.price) == ("gas", "natural gas", "therm", 1.32)
    assert gas.occupied_since == day_of_iso("2021-06-01")
    assert gas.reader == {"dates": "month first", "sheet": "2023"}
    assert electricity.name == "electricity"
    assert not electricity.space_heating
    assert electricity.forms == ("flat", "heating and cooling")
    assert len(file.sha256) == 64


def test_work_days_are_written_as_people_do_and_kept_half_open(folder: Path) -> None:
    (upgrade,) = read_site_file(put(folder, GOOD)).upgrades
    assert (upgrade.start, upgrade.end) == (day_of_iso("2023-09-11"), day_of_iso("2023-09-23"))
    assert (upgrade.cost, upgrade.accounts) == (4150.0, ("gas",))


@pytest.mark.parametrize(
    ("start", "end", "first", "past"),
    [
        ("2023-09-11", None, "2023-09-11", "2023-09-12"),
        ('"2023-09"', None, "2023-09-01", "2023-10-01"),
        ('"2023-12"', '"2024-02"', "2023-12-01", "2024-03-01"),
        ('"2023-09-11"', "2023-09-11T17:30:00", "2023-09-11", "2023-09-12"),
    ],
)
def test_work_window(folder: Path, start: str, end: str | None, first: str, past: str) -> None:
    old = "start = 2023-09-11\nend = 2023-09-22"
    new = f"start = {start}" + (f"\nend = {end}" if end else "")
    (upgrade,) = read_site_file(put(folder, changed(old, new))).upgrades
    assert (upgrade.start, upgrade.end) == (day_of_iso(first), day_of_iso(past))


def test_a_change_spans_whole_months(folder: Path) -> None:
    (change,) = read_site_file(put(folder, GOOD)).changes
    assert (change.since, change.until) == (day_of_iso("2024-02-01"), day_of_iso("2024-04-01"))


def test_a_mark_at_the_start_of_the_file_is_no_harm(folder: Path) -> None:
    assert read_site_file(put(folder, b"\xef\xbb\xbf" + GOOD.encode())).name


@pytest.mark.parametrize(
    ("old", "new", "line", "nearest"),
    [
        ('fuel = "natural gas"', 'fule = "natural gas"', 13, "'fuel'"),
        ("floor_area_ft2 =", "floor_area =", 3, "'floor_area_ft2'"),
        ("long_term = { years", "long_term = { year", 7, "'years'"),
        ("cost = 4150", "costs = 4150", 31, "'cost'"),
        ('since = "2024-02"', 'sinse = "2024-02"', 36, "'since'"),
        ("observed =", "observe =", 6, "'observed'"),
        ("space_heating = false", "spaceheating = false", 24, "'space_heating'"),
    ],
)
def test_an_unknown_key_names_its_line_and_the_nearest(
    folder: Path, old: str, new: str, line: int, nearest: str
) -> None:
    with pytest.raises(UnknownKey) as error:
        read_site_file(put(folder, changed(old, new)))
    assert f"site.toml:{line}," in str(error.value)
    assert f"Did you mean {nearest}?" in str(error.value)


def test_an_unknown_table_names_the_nearest(folder: Path) -> None:
    with pytest.raises(UnknownKey, match=r"Did you mean \[upgrade\]"):
        read_site_file(put(folder, GOOD + '\n[[upgrades]]\nname = "x"\n'))


@pytest.mark.parametrize(
    ("old", "new", "says"),
    [
        ("price = 1.32", "price = -1.32", "price is -1.32"),
        ("price = 1.32", "price = inf", "price is inf"),
        ("price = 1.32", "price = nan", "price is nan"),
        ("price = 1.32", 'price = "1.32"', "without quotation marks"),
        ("price = 1.32", "price = true", "price is true"),
        ("price = 1.32", "price = 0x" + "f" * 6000, "thousands of digits"),
        ("price = 1.32", "price = " + "9" * 6000, "not TOML"),
        ("floor_area_ft2 = 1840", "floor_area_ft2 = 0", "from 1 to"),
        ("end = 2023-09-22", "end = 2023-09-01", "before start"),
        ("end = 2023-09-22", "end = 9999-12-31", "between 1900 and 2100"),
        ("start = 2023-09-11", "start = 0001-01-01", "between 1900 and 2100"),
        ("start = 2023-09-11\n", 'start = "next fall"\n', "a date such as"),
        ("start = 2023-09-11\n", 'start = "2023-13"\n', "a date such as"),
        ("start = 2023-09-11\n", "start = 2023\n", "a date such as"),
        ("start = 2023-09-11\n", "", "there is no start"),
        ('accounts = ["gas"]', 'accounts = ["gass"]', "Did you mean 'gas'"),
        ('accounts = ["gas"]', 'accounts = "gas"', "a list"),
        ('accounts = ["gas"]', "accounts = []", "a list"),
        ('fuel = "natural gas"', 'fuel = "plutonium"', "plutonium"),
        ('fuel = "natural gas"', "", "there is no fuel"),
        ('fuel = "electricity"', 'name = "gas"\nfuel = "electricity"', "two accounts"),
        ('unit = "therms"', 'unit = "MBtu"', "site.toml:15"),
        ('unit = "therms"', 'unit = "gal"', "site.toml:15"),
        ('"flat", "heating and cooling"', '"heatin"', "Did you mean 'heating'"),
        ('name = "Quince Street house"', 'name = ""', "name is empty"),
        ('name = "Quince Street house"', 'name = "a\\u0000b"', "plain characters"),
        ('name = "Quince Street house"', 'name = "a\\nb"', "plain characters"),
        ('name = "Quince Street house"', f'name = "{"x" * 300}"', "300 characters"),
        ('name = "Quince Street house"', 'currency = "dollars"', "three capital letters"),
        ("long_term = { years = 12 }", "long_term = 10", "{ years = 10 }"),
        ("long_term = { years = 12 }", "long_term = { years = 0 }", "from 1 to 100"),
        (
            "long_term = { years = 12 }",
            'long_term = { years = 12, file = "station.csv" }',
            "one of the two",
        ),
        ('observed = "station.csv"', "", "no weather is named"),
        ('observed = "station.csv"', 'observed = "statoin.csv"', "Did you mean 'station.csv'"),
        ("time_zone_offset = -5", "time_zone_offset = 99", "from -14 to 14"),
        ("space_heating = false", 'space_heating = "no"', "true or false"),
        ("[site]", "[site", "site.toml:1: this is not TOML"),
        ("price = 1.32", "price 1.32", "site.toml:16: this is not TOML"),
        ("price = 1.32", "price = " + "[" * 5000, "not TOML|nested too deeply"),
        ("[[upgrade]]", "[upgrade]", "two brackets"),
        ('until = "2024-03"', 'until = "2024-01"', "before since"),
    ],
)
def test_a_slip_is_told_clearly(folder: Path, old: str, new: str, says: str) -> None:
    with pytest.raises(NormalizeError, match=says.replace("[", r"\[").replace("{", r"\{")) as error:
        read_site_file(put(folder, changed(old, new)))
    assert len(str(error.value)) < 1000
    assert str(error.value).isprintable()


@pytest.mark.parametrize(
    "path",
    [
        "../gas.csv",
        "a/../../gas.csv",
        "/etc/passwd",
        "C:\\\\bills\\\\gas.csv",
        "\\\\\\\\server\\\\share\\\\gas.csv",
        "..\\\\gas.csv",
        "link.csv",
        "linked/gas.csv",
    ],
)
def test_a_path_stays_in_the_folder(folder: Path, path: str) -> None:
    outside = folder.parent / "outside"
    outside.mkdir()
    (outside / "gas.csv").write_text("secret")
    (folder / "link.csv").symlink_to(outside / "gas.csv")
    (folder / "linked").symlink_to(outside)
    for key, text in (
        ("bills", changed('bills = "gas.csv"', f'bills = "{path}"')),
        ("observed", changed('observed = "station.csv"', f'observed = "{path}"')),
        ("file", changed("{ years = 12 }", f'{{ file = "{path}" }}')),
    ):
        with pytest.raises(SiteError, match=f"{key} points out of the folder"):
            read_site_file(put(folder, text))


def test_a_file_in_a_folder_below_is_fine(folder: Path) -> None:
    text = changed('bills = "gas.csv"', 'bills = "bills/gas.csv"')
    assert read_site_file(put(folder, text)).accounts[0].bills == folder / "bills" / "gas.csv"


def test_site_toml_may_not_be_a_link_out(folder: Path) -> None:
    elsewhere = folder.parent / "site.toml"
    elsewhere.write_text(GOOD)
    (folder / "site.toml").symlink_to(elsewhere)
    with pytest.raises(SiteError, match="link to a file outside"):
        read_site_file(folder)


def test_a_missing_file_or_folder_says_how_to_start(folder: Path) -> None:
    with pytest.raises(MissingFile, match="normalize new"):
        read_site_file(folder)
    with pytest.raises(MissingFile, match="no such folder"):
        read_site_file(folder / "nowhere")
    with pytest.raises(SiteError, match="a file, not a folder"):
        read_site_file(put(folder, GOOD) / "site.toml")


@pytest.mark.parametrize(
    ("data", "says"),
    [
        (b"", "no weather is named|there is no account"),
        (b"[site]\nname = '\xff'\n", "site.toml:2.*UTF-8"),
        (b"\x00" * 100, "not TOML"),
        (b"#" * 1_000_001, "larger than 1000 kB"),
    ],
)
def test_rubbish_is_told_clearly(folder: Path, data: bytes, says: str) -> None:
    with pytest.raises(SiteError, match=says):
        read_site_file(put(folder, data))


@settings(
    max_examples=60, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture]
)
@given(st.data())
def test_any_damage_ends_in_a_message_or_an_answer(folder: Path, data: st.DataObject) -> None:
    """Cut, doubled or overwritten anywhere, the file raises NormalizeError or is read."""
    raw = bytearray(GOOD.encode())
    at = data.draw(st.integers(0, len(raw) - 1))
    length = data.draw(st.integers(0, 40))
    raw[at : at + length] = data.draw(st.binary(max_size=40))
    put(folder, bytes(raw))
    with contextlib.suppress(NormalizeError):
        assert read_site_file(folder).accounts


def test_a_new_site_can_be_read_once_its_weather_is_there(tmp_path: Path) -> None:
    folder = tmp_path / "new"
    files = write_new_site(folder)
    assert {file.name for file in files} == {"site.toml", "bills.csv", "bills.xlsx", "README.txt"}
    with pytest.raises(MissingFile, match=r"station\.csv"):
        read_site_file(folder)
    (folder / "station.csv").write_text("date,mean_f\n")
    site = read_site_file(folder)
    assert [account.fuel for account in site.accounts] == ["natural gas"]
    assert len(site.upgrades) == 1


def blocks_of(lines: list[str]) -> list[tuple[int, int]]:
    """Where each commented [[upgrade.component]] starts, and the line after its last."""
    starts = [i for i, line in enumerate(lines) if line == "# [[upgrade.component]]"]
    ends = [*starts[1:], next(i for i in range(starts[-1], len(lines)) if not lines[i])]
    return list(zip(starts, ends, strict=True))


def test_every_example_in_a_new_site_is_true_when_uncommented(tmp_path: Path) -> None:
    folder = tmp_path / "new"
    write_new_site(folder)
    (folder / "station.csv").write_text("date,mean_f\n")
    (folder / "second.csv").write_text("date,mean_f\n")
    lines = (folder / "site.toml").read_text(encoding="utf-8").splitlines()
    examples = [
        i for i, line in enumerate(lines) if line.split()[:1] + line.split()[2:3] == ["#", "="]
    ]
    assert len(examples) >= 8
    inside = blocks_of(lines)
    drivers = (
        lines.index("# [[driver]]"),
        next(i for i, line in enumerate(lines) if line.startswith("# What else changed?")),
    )
    for i in examples:
        if drivers[0] < i < drivers[1]:
            continue  # [[driver]] and [day_types] are read whole, below
        if any(start < i < end for start, end in inside):
            continue  # the lines of a component go together, below
        if lines[i].split()[1] in ("what", "since"):
            continue  # the two lines of [[change]] go together, below
        text = [*lines[:i], lines[i][2:], *lines[i + 1 :]]
        if "long_term" in lines[i]:
            text = [line for line in text if not line.startswith("long_term = { years")]
            (folder / "typical_year.epw").write_text("")
        (folder / "site.toml").write_text("\n".join(text), encoding="utf-8")
        read_site_file(folder)
    kinds = set()
    for first, end in inside:
        block = [line.removeprefix("# ") for line in lines[first:end]]
        text = [*lines[:first], *block, *lines[end:]]
        (folder / "site.toml").write_text("\n".join(text), encoding="utf-8")
        (component,) = read_site_file(folder).upgrades[0].components
        kinds.add(kind_of(component))
    assert kinds == set(KINDS)
    start = next(i for i, line in enumerate(lines) if line == "# [[change]]")
    text = [*lines[:start]] + [line.removeprefix("# ") for line in lines[start:]]
    (folder / "site.toml").write_text("\n".join(text), encoding="utf-8")
    assert read_site_file(folder).changes[0].since == day_of_iso("2024-02-01")


def test_nothing_is_written_over(tmp_path: Path) -> None:
    (tmp_path / "bills.csv").write_text("mine")
    with pytest.raises(SiteError, match=r"bills\.csv is there already"):
        write_new_site(tmp_path)
    assert [path.name for path in tmp_path.iterdir()] == ["bills.csv"]
    assert (tmp_path / "bills.csv").read_text() == "mine"
    with pytest.raises(SiteError, match="a file of that name"):
        write_new_site(tmp_path / "bills.csv")
