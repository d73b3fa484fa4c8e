"""Varrowmere County, which does not exist: its two stations and their files."""

from __future__ import annotations

from datetime import date, timedelta
from typing import TYPE_CHECKING

from maker.files import write_csv
from maker.station import FIRST, N_DAYS, Station, anomalies, make_station, mixed

if TYPE_CHECKING:
    from pathlib import Path


def stations() -> tuple[Station, Station]:
    """An airfield in the valley, and a cape: most of their weather in common."""
    common = anomalies("Varrow Mills 1")
    valley = make_station(
        "Varrow Mills Airfield",
        common,
        mean_f=46.6,
        swing_f=23.5,
        daily_swing_f=10.0,
        gaps={
            date(2013, 9, 2): 2,
            date(2015, 3, 9): 3,
            date(2018, 11, 21): 1,
            date(2019, 6, 3): 11,
            date(2021, 12, 18): 2,
            date(2022, 7, 4): 1,
            date(2024, 1, 15): 3,
            date(2025, 2, 2): 1,
        },
    )
    cape = make_station(
        "Corrow Point",
        mixed(common, anomalies("Corrow Point 2"), 0.85),
        mean_f=47.4,
        swing_f=20.0,
        daily_swing_f=6.5,
        gaps={
            date(2014, 5, 27): 2,
            date(2017, 10, 30): 3,
            date(2020, 2, 11): 1,
            date(2022, 12, 24): 2,
            date(2024, 10, 9): 7,
            date(2025, 8, 16): 1,
        },
    )
    return valley, cape


def write_valley_station(path: Path, station: Station) -> None:
    """Short gaps as empty cells; the days of a long one are not in the file at all."""
    rows: list[list[object]] = [["Station", "Date", "Max Temp (°F)", "Min Temp (°F)"]]
    blank, absent = station.missing(1, 5), station.missing(6, 99)
    for i in range(N_DAYS):
        day = FIRST + timedelta(i)
        if day in blank:
            rows.append([station.name, day.isoformat(), "", ""])
        elif day not in absent:
            rows.append([station.name, day.isoformat(), station.high_f[i], station.low_f[i]])
    write_csv(path, rows)


def write_cape_station(path: Path, station: Station) -> None:
    """The file an observer keeps: no station column, and now and then only one thermometer."""
    rows: list[list[object]] = [["date", "tmax_f", "tmin_f"]]
    for i in range(N_DAYS):
        day = FIRST + timedelta(i)
        gone = day in station.missing(1, 99)
        high = "" if gone else station.high_f[i]
        low = "" if gone and day.day % 2 else station.low_f[i]
        rows.append([day.isoformat(), high, low])
    write_csv(path, rows)
