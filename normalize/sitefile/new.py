"""A new site folder: a commented site.toml, and a template for bills as CSV and as XLSX."""

from __future__ import annotations

import os
from collections.abc import Callable
from pathlib import Path
from typing import Final

from normalize.bills.write import write_template, write_template_workbook
from normalize.errors import SiteError, UnwritableReport

SITE_TEXT: Final = """\
# What normalize needs to know about one building. Lines that start with # are notes or
# examples: take the # away to use one. Days are written 2023-09-11.

[site]
name = "My house"
# floor_area_ft2 = 1840            # heated floor area, if you know it
# heating_setpoint_f = 68          # mean indoor temperature in winter, for the expectation below

[weather]
observed = "station.csv"           # daily or hourly temperatures of the nearest good station
long_term = { years = 10 }         # a normal year is the mean of so many whole years
# long_term = { file = "typical_year.epw" }    # or a typical-year file, or published normals
# neighbour = "second.csv"         # a station near by, to fill gaps from
# also = ["second.csv"]            # for --sensitivity: other stations to try
# unit = "F"                       # only if the file does not say it

# One [[account]] for each fuel. Bills need the day on which the meter was read (or the first
# and last day), the use, and if possible the cost. Fill in bills.csv or bills.xlsx, or name
# the file that your supplier gave you.
[[account]]
name = "gas"
fuel = "natural gas"               # or "electricity", "heating oil", "propane"
bills = "bills.csv"
# unit = "therm"                   # only if the file does not say it
# price = 1.32                     # what one more unit costs, without the fixed charge
# occupied_since = 2021-06-01      # leave out the bills of whoever lived there before
# space_heating = false            # for an account that heats only water
# efficiency = 0.80                # of the heating before the work; a heat pump's may be 2.5
# heating_share = 0.7              # of the house's heat, where another fuel heats it too
# net_metered = true               # for solar panels whose surplus goes to the grid
# Where the bills leave something open, `normalize bills FILE` asks, and names the line to put
# here: dates = "day first", read_day = 5, time_zone = "America/New_York", tank_size = 275 …

# The work: first and last day, or only the month, start = "2023-09".
[[upgrade]]
name = "attic insulation"
start = 2023-09-11
end = 2023-09-22
# cost = 4150
# accounts = ["gas"]               # which accounts it touches; without it, all

# What the work consists of, to set an engineer's expectation beside what the bills show. As
# many as there are, each of one kind: insulation, windows, air sealing, equipment, setback.
# [[upgrade.component]]
# kind = "insulation"
# name = "attic floor"
# area_ft2 = 920
# r_before = 13                    # of the whole assembly, ft²·°F·h/Btu
# r_after = 49
# [[upgrade.component]]
# kind = "windows"
# area_ft2 = 150
# u_before = 0.9                   # Btu/h·ft²·°F, frame included
# u_after = 0.3
# [[upgrade.component]]
# kind = "air sealing"
# blower_door_cfm50_before = 2600  # from a blower-door test at 50 Pa; divided by 20, or by
# blower_door_cfm50_after = 2050   # blower_door_divisor. Else natural_cfm_before and _after.
# [[upgrade.component]]
# kind = "equipment"               # of the same fuel
# efficiency_before = 0.80
# efficiency_after = 0.95
# share = 1.0                      # of the account's heating that it carries
# [[upgrade.component]]
# kind = "setback"
# degrees_f = 6
# hours_a_day = 8

# Does use answer to more than the weather? Each must earn its place, and the answer is shown
# with and without it.
# [[driver]]
# name = "occupied units"
# file = "occupied_units.csv"      # columns Month (or Date, or Start and End) and the amount
# column = "occupied units"        # or, without a file, a column of the bill file itself
# values = "level"                 # "level" of a typical day, or "total" of all the row's days
# normal = 28                      # in a normal year; of totals: normal_per_year = 180
#
# For readings a day, and school days for bills too:
# [day_types]
# weekend = ["saturday", "sunday"]
# holidays = [2023-07-04, 2023-12-25]              # or a file of dates, "holidays.csv"
# school_terms = [{ start = 2022-08-29, end = 2023-06-16 }]

# What else changed? It is shown beside the answer, because bills cannot tell causes apart.
# [[change]]
# what = "second adult works from home"
# since = "2024-02"
"""

README_TEXT: Final = """\
1. Open site.toml in any text editor and write down the building, the fuels and the work.
2. Put your bills into bills.csv (or bills.xlsx), one line for each bill, at least nine months
   before the work and nine after it; twelve or more are better.
   start, end   the days on which the meter was read, at the start and at the end of the bill;
                a bill starts on the day on which the one before it ended
   usage, unit  what was used, and in what: therm, kWh, gallon …
   cost         what it cost, if you have it
   estimated    yes when the meter was not read but guessed
3. Save the temperatures of a weather station near you as station.csv: a column date and a
   column temperature_f or temperature_c, one line a day, from before the first bill on.
   Ten whole years or more make a normal year.
4. Type: normalize savings THIS-FOLDER
"""


def write_new_site(folder: str | os.PathLike[str]) -> tuple[Path, ...]:
    """Write a new site folder; returns its files.

    Raises SiteError if one of the files is there already (nothing is overwritten then), and
    UnwritableReport if the place cannot be written.
    """
    folder = Path(folder)
    writers: dict[str, Callable[[Path], None]] = {
        "site.toml": lambda path: _write_text(path, SITE_TEXT),
        "bills.csv": write_template,
        "bills.xlsx": write_template_workbook,
        "README.txt": lambda path: _write_text(path, README_TEXT),
    }
    if folder.exists() and not folder.is_dir():
        raise SiteError("there is a file of that name", where=str(folder), wanted="a new folder")
    for name in writers:
        if (folder / name).exists() or (folder / name).is_symlink():
            raise SiteError(
                f"{name} is there already; nothing was written",
                where=str(folder),
                next_step="Choose another folder, or remove the file.",
            )
    try:
        folder.mkdir(parents=True, exist_ok=True)
        for name, write in writers.items():
            write(folder / name)
    except OSError as error:
        raise UnwritableReport(
            f"the folder cannot be written ({error.strerror})", where=str(folder)
        ) from None
    return tuple(folder / name for name in writers)


def _write_text(path: Path, text: str) -> None:
    with path.open("x", encoding="utf-8", newline="") as file:
        file.write(text)
