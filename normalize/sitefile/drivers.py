"""What drives use beside the weather, read from [[driver]] and [day_types].

Strict as the rest of site.toml: an amount that may be meant in two ways is asked about.
"""

from __future__ import annotations

from collections.abc import Sequence
from datetime import date, datetime
from itertools import pairwise
from pathlib import Path
from typing import Final

from normalize.days import FIRST_SANE_DAY, LAST_SANE_DAY, day_of, iso
from normalize.errors import SiteError
from normalize.sitefile.table import Table, must_exist, nearest, shown
from normalize.sitefile.values import AccountPlan, DayTypesPlan, DriverPlan

DRIVER_KEYS: Final = (
    "name",
    "file",
    "column",
    "accounts",
    "values",
    "normal",
    "normal_per_year",
    "dates",
    "end_dates",
    "decimal",
    "sheet",
)
DAY_TYPE_KEYS: Final = (
    "weekend",
    "holidays",
    "school_terms",
    "accounts",
    "holidays_per_year",
    "school_days_per_year",
)
TERM_KEYS: Final = ("start", "end")
MOST_DRIVERS: Final = 8  # more than bills can tell apart
MOST_DAYS: Final = 3_000  # of a list of holidays
MOST_TERMS: Final = 200
LARGEST: Final = 1e12
_CHOICES: Final = {
    "values": ("total", "level"),
    "dates": ("month first", "day first", "year first"),
    "end_dates": ("inclusive", "exclusive"),
    "decimal": ("point", "comma"),
}
DAYS_OF_WEEK: Final = (
    "monday", "tuesday", "wednesday", "thursday", "friday", "saturday", "sunday",
)  # fmt: skip
USUAL_WEEKEND: Final = (5, 6)
RESERVED: Final = ("weekend days", "holidays", "school days")  # what [day_types] makes


def read_drivers(
    tables: Sequence[Table],
    folder: Path,
    accounts: Sequence[AccountPlan],
    day_types: DayTypesPlan | None = None,
) -> tuple[DriverPlan, ...]:
    """Every [[driver]].  Raises SiteError, UnknownKey or MissingFile."""
    if len(tables) > MOST_DRIVERS:
        raise SiteError(
            f"there are {len(tables)} drivers",
            where=tables[0].where(),
            wanted=f"at most {MOST_DRIVERS}: bills cannot tell more of them apart",
        )
    plans: list[DriverPlan] = []
    for table in tables:
        plan = _driver(table, folder, accounts)
        taken = [p.name.lower() for p in plans] + list(RESERVED) * (day_types is not None)
        if plan.name.lower() in taken:
            raise table.bad("name", f"{shown(plan.name)}, which is taken", "a name of its own")
        plans.append(plan)
    return tuple(plans)


def _driver(table: Table, folder: Path, accounts: Sequence[AccountPlan]) -> DriverPlan:
    table.check_keys(DRIVER_KEYS)
    chosen = {key: _choice(table, key, words) for key, words in _CHOICES.items()}
    file = table.path("file", folder)
    column = table.text("column")
    if file is None and column is None:
        raise SiteError(
            "the driver names neither a file nor a column",
            where=table.where(),
            next_step='Add file = "school_days.csv", or column = "…" for a column of the bill '
            "file itself.",
        )
    if file is not None:
        must_exist(file, table.where("file"))
    normal, per_year = _normal(table, chosen["values"])
    return DriverPlan(
        name=table.required_text("name"),
        file=file,
        accounts=_accounts(table, accounts),
        normal=normal,
        normal_per_year=per_year,
        reader={
            key: value
            for key, value in {**chosen, "column": column, "sheet": table.text("sheet")}.items()
            if value is not None
        },
    )


def _choice(table: Table, key: str, words: tuple[str, ...]) -> str | None:
    text = table.text(key)
    if text is not None and text not in words:
        guess = nearest(text, words)
        raise table.bad(
            key, shown(text), "one of " + ", ".join(words), f"Did you mean {guess!r}?" * bool(guess)
        )
    return text


def _normal(table: Table, values: str | None) -> tuple[float | None, float | None]:
    """The driver in a normal year: its level on a day, or its sum over the year; not both."""
    level = table.number("normal", low=-LARGEST, high=LARGEST, unit="the driver's own unit")
    year = table.number(
        "normal_per_year", low=-LARGEST, high=LARGEST, unit="the driver's own unit a year"
    )
    if level is not None and year is not None:
        raise SiteError(
            "normal and normal_per_year are both given", where=table.where("normal"),
            wanted="one of the two",
        )  # fmt: skip
    if level is not None and values == "total":
        raise table.bad(
            "normal", f"{level:g}, and values are totals", "normal_per_year, the sum over a "
            "normal year (180 school days, 12000 tonnes)",
        )  # fmt: skip
    if year is not None and values == "level":
        raise table.bad(
            "normal_per_year", f"{year:g}, and values are levels", "normal, the level on a "
            "normal day (28 occupied units)",
        )  # fmt: skip
    return level, year


def _accounts(table: Table, accounts: Sequence[AccountPlan]) -> tuple[str, ...]:
    names = [account.name for account in accounts]
    named = table.texts("accounts") or ()
    for name in named:
        if name not in names:
            guess = nearest(name, names)
            raise table.bad(
                "accounts", f"{shown(name)}, which is no account of this site",
                "the names of accounts", f"Did you mean {guess!r}?" if guess else "",
            )  # fmt: skip
    return named


def read_day_types(table: Table, folder: Path, accounts: Sequence[AccountPlan]) -> DayTypesPlan:
    """[day_types]; an empty one asks for weekends.  Raises SiteError, UnknownKey, MissingFile."""
    table.check_keys(DAY_TYPE_KEYS)
    file, holidays = _holidays(table, folder)
    terms = _terms(table)
    a_year = table.number("holidays_per_year", low=0.0, high=365.0, unit="days a year")
    school = table.number("school_days_per_year", low=0.0, high=365.0, unit="days a year")
    if a_year is not None and file is None and not holidays:
        raise table.bad("holidays_per_year", f"{a_year:g} without holidays", "a list of holidays")
    if school is not None and not terms:
        raise table.bad("school_days_per_year", f"{school:g} without school_terms", "the terms")
    return DayTypesPlan(
        weekend=_weekend(table),
        holidays=holidays,
        holidays_file=file,
        school_terms=terms,
        accounts=_accounts(table, accounts),
        holidays_per_year=a_year,
        school_days_per_year=school,
    )


def _weekend(table: Table) -> tuple[int, ...]:
    value = table.values.get("weekend")
    if value is None:
        return USUAL_WEEKEND
    if value == []:
        return ()
    days = []
    for name in table.texts("weekend") or ():
        if name.lower() not in DAYS_OF_WEEK:
            guess = nearest(name, DAYS_OF_WEEK)
            raise table.bad(
                "weekend", shown(name), 'days of the week, weekend = ["friday", "saturday"]',
                f"Did you mean {guess!r}?" if guess else "",
            )  # fmt: skip
        days.append(DAYS_OF_WEEK.index(name.lower()))
    if len(set(days)) == 7:
        raise table.bad("weekend", "every day of the week", "at most six days")
    return tuple(sorted(set(days)))


def _holidays(table: Table, folder: Path) -> tuple[Path | None, tuple[int, ...]]:
    """A file of dates, or the dates themselves."""
    value = table.values.get("holidays")
    if value is None:
        return None, ()
    if isinstance(value, str):
        file = table.required_path("holidays", folder)
        must_exist(file, table.where("holidays"))
        return file, ()
    wanted = 'a list of dates, [2023-07-04, 2023-12-25], or a file of them, "holidays.csv"'
    if not isinstance(value, list) or not value:
        raise table.bad("holidays", shown(value), wanted)
    if len(value) > MOST_DAYS:
        raise table.bad("holidays", f"a list of {len(value)}", f"at most {MOST_DAYS} days")
    return None, tuple(sorted({_day(table, "holidays", item, wanted) for item in value}))


def _day(table: Table, key: str, value: object, wanted: str) -> int:
    when: date | None = None
    if isinstance(value, datetime):
        when = value.date()
    elif isinstance(value, date):
        when = value
    elif isinstance(value, str) and len(value.strip()) == len("2023-07-04"):
        try:
            when = date.fromisoformat(value.strip())
        except ValueError:
            when = None
    if when is None or not FIRST_SANE_DAY <= day_of(when) < LAST_SANE_DAY:
        raise table.bad(key, f"{shown(value)} in its list", wanted)
    return day_of(when)


def _terms(table: Table) -> tuple[tuple[int, int], ...]:
    """School terms as ``[first day, day after the last)``, in order of time."""
    value = table.values.get("school_terms")
    if value is None:
        return ()
    wanted = "a list such as [{ start = 2022-08-29, end = 2022-12-21 }], both days in the term"
    if not isinstance(value, list) or not value or not all(isinstance(v, dict) for v in value):
        raise table.bad("school_terms", shown(value), wanted)
    if len(value) > MOST_TERMS:
        raise table.bad("school_terms", f"a list of {len(value)}", f"at most {MOST_TERMS} terms")
    terms = []
    for item in value:
        if set(item) != set(TERM_KEYS):
            raise table.bad("school_terms", f"with the keys {', '.join(sorted(item))}", wanted)
        start, end = (_day(table, "school_terms", item[key], wanted) for key in TERM_KEYS)
        if end < start:
            raise table.bad("school_terms", f"with a term that ends on {iso(end)}, before it "
                            f"starts, {iso(start)}", "a later end")  # fmt: skip
        terms.append((start, end + 1))
    terms.sort()
    for (_, end), (start, _) in pairwise(terms):
        if start < end:
            raise table.bad("school_terms", f"with two terms that both hold {iso(start)}", wanted)
    return tuple(terms)
