"""Cells that should be temperatures: numbers, missing codes, °F or °C, and what is absurd."""

from __future__ import annotations

import math
import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np

from normalize.errors import UnreadableWeather
from normalize.weather.options import ask

if TYPE_CHECKING:
    from numpy.typing import NDArray

COLDEST_C: Final = -90.0  # air temperature at a station outside these is an error of the file
HOTTEST_C: Final = 60.0  # (the records are -89.2 and 56.7 °C: World Meteorological Organization)
COLDEST_F: Final = COLDEST_C * 9 / 5 + 32
HOTTEST_F: Final = HOTTEST_C * 9 / 5 + 32
MAX_ABSURD_SHARE: Final = 0.05  # of the values; above it the unit or the column is wrong

MISSING_CODES: Final = (
    -99.0, -99.9, -99.99, -999.0, -999.9, -999.99, -9999.0, -9999.9, -99999.0,
    999.0, 999.9, 9999.0, 9999.9, 99999.0, 99999.9,
)  # fmt: skip
_MISSING_TEXT: Final = frozenset(
    [
        "",
        "-",
        "--",
        "---",
        "m",
        "na",
        "n/a",
        "nan",
        "nil",
        "none",
        "null",
        "missing",
        "#n/a",
        ".",
        "?",
    ]
)
_NUMBER: Final = re.compile(
    r"([-+\u2212\u2013]?)\s*(\d{1,6}(?:[.,]\d*)?|[.,]\d+)\s*(?:°|º|deg)?\s*([FfCc])?$"
)

# What settles the unit by values alone; see ``unit_by_values``.
HOT_FOR_C: Final = 60.0  # no place on Earth has a daily mean or maximum above it in °C
HOT_DAYS: Final = 10  # and at least so many, so that typing errors cannot decide
FULL_YEAR_DAYS: Final = 330
COLD_FOR_C: Final = -45.0  # colder, and the file may be an ice cap's in °F or Siberia's in °C
COOL_FOR_F: Final = 45.0  # no day of a whole year above it in °F: ice caps only
WARM_FOR_C: Final = 10.0  # the hottest day of a year in any place with buildings, in °C


@dataclass(frozen=True, slots=True)
class Numbers:
    """A column of numbers. value : (n,) float64, NaN where missing.

    odd : rows whose text is no number and no mark of absence.  unit : stated in the cells.
    """

    value: NDArray[np.float64]
    odd: tuple[int, ...]
    unit: str | None


def read_numbers(cells: Sequence[str]) -> Numbers:
    """Numbers of a column: decimal points or commas, minus signs of all kinds, "71.2 °F".

    >>> read_numbers(["1.5", "-2,25", "M", "oops", "−3 °C"]).value.tolist()
    [1.5, -2.25, nan, nan, -3.0]
    """
    odd: list[int] = []
    units: set[str] = set()
    value = _plain_numbers(cells)
    if value is None:
        value = _one_by_one(cells, odd, units)
    array = np.array(value, dtype=np.float64)
    array[~np.isfinite(array)] = np.nan
    array[np.isin(array, MISSING_CODES)] = np.nan
    return Numbers(value=array, odd=tuple(odd), unit=units.pop() if len(units) == 1 else None)


def _plain_numbers(cells: Sequence[str]) -> list[float] | None:
    """The quick way, for a column of nothing but numbers with decimal points."""
    try:
        return list(map(float, cells))
    except ValueError:
        return None


def _one_by_one(cells: Sequence[str], odd: list[int], units: set[str]) -> list[float]:
    """Each cell by itself; adds to the rows that are odd and the units that are stated."""
    value = [math.nan] * len(cells)
    for i, cell in enumerate(cells):
        try:
            value[i] = float(cell)
        except ValueError:
            text = cell.strip()
            match = _NUMBER.match(text)
            if match:
                size = float(match[2].replace(",", "."))
                value[i] = size if match[1] in ("", "+") else -size
                if match[3]:
                    units.add(match[3].upper())
            elif text.lower() not in _MISSING_TEXT:
                odd.append(i)
    return value


def unit_by_values(highest: NDArray[np.float64], day: NDArray[np.int64]) -> tuple[str, str] | None:
    """The unit that the values alone leave no doubt about, with the reason; else None.

    highest : (n,) each row's highest temperature, unit unknown; day : (n,) day numbers.

    °F when at least 10 rows, and 1 in 200, are above 60: nothing on Earth is in °C.
    °C when a whole year (330 days or more, in all twelve months) has no row above 45, some
    above 10 and none below -45: in °F such a place barely thaws all year, and only the
    coasts of Antarctica are like that (their few stations must say "F").
    Everything else (a winter alone, a few days) is in doubt, and the user is asked.
    """
    ok = np.isfinite(highest) & (highest <= HOTTEST_F)
    values, days = highest[ok], day[ok]
    if values.size == 0:
        return None
    hot = int((values > HOT_FOR_C).sum())
    if hot >= max(HOT_DAYS, values.size / 200):
        return "F", f"values rise above {HOT_FOR_C:.0f}, which °C never do"
    months = days.astype("datetime64[D]").astype("datetime64[M]").astype(np.int64) % 12
    n_days, n_months = len(set(days.tolist())), len(set(months.tolist()))
    whole = n_days >= FULL_YEAR_DAYS and n_months == 12
    warmest, coldest = float(values.max()), float(values.min())
    if whole and WARM_FOR_C < warmest <= COOL_FOR_F and coldest >= COLD_FOR_C:
        return "C", f"no value of a whole year is above {COOL_FOR_F:.0f}, which °F would be"
    return None


def settle_unit(
    *,
    option: str | None,
    stated: str | None,
    highest: NDArray[np.float64],
    day: NDArray[np.int64],
    where: str,
) -> tuple[str, str]:
    """The unit and a sentence about how it is known; asks when it is not."""
    if option is not None:
        if stated is not None and stated != option:
            return (
                option,
                f"Temperatures are read as °{option} as asked, though the file says °{stated}.",
            )
        return option, ""
    if stated is not None:
        return stated, ""
    guess = unit_by_values(highest, day)
    if guess is not None:
        return guess[0], f"Temperatures are read as °{guess[0]}: {guess[1]}."
    raise ask(
        "nothing in the file says whether temperatures are °F or °C, and the values fit both",
        where=where,
        key="unit",
        choices='"F" or "C"',
    )


def to_fahrenheit(value: NDArray[np.float64], unit: str) -> NDArray[np.float64]:
    """Degrees Fahrenheit of an array in "F" or "C".

    >>> to_fahrenheit(np.array([-40.0, 0.0, 100.0]), "C").tolist()
    [-40.0, 32.0, 212.0]
    """
    return value * 9 / 5 + 32 if unit == "C" else value


def drop_absurd(temp_f: NDArray[np.float64], where: str, unit: str) -> int:
    """Make temperatures that cannot be missing, in place; how many there were.

    Raises UnreadableWeather where they are so many that the unit or column must be wrong.
    """
    absurd = (temp_f < COLDEST_F) | (temp_f > HOTTEST_F)
    n = int(absurd.sum())
    measured = int(np.isfinite(temp_f).sum())
    if n > max(3, MAX_ABSURD_SHARE * measured) or (n and n == measured):
        raise UnreadableWeather(
            f"{n} of {measured} temperatures read as °{unit} are outside "
            f"{COLDEST_C:.0f} to {HOTTEST_C:.0f} °C ({COLDEST_F:.0f} to {HOTTEST_F:.0f} °F)",
            where=where,
            wanted="air temperatures in whole °F or °C (not tenths of a degree)",
            next_step="Check the unit and the column: unit, temperature_column under [weather].",
        )
    temp_f[absurd] = np.nan
    return n
