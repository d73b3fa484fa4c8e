"""Hourly tables: local days, clock changes, UTC, too few hours."""

from __future__ import annotations

from datetime import UTC, date, datetime, timedelta
from pathlib import Path
from zoneinfo import ZoneInfo

import numpy as np
import pytest

from normalize.days import day_of
from normalize.errors import AmbiguousWeather, UnreadableWeather
from normalize.weather.hours import means_of_days
from normalize.weather.read import read_weather
from tests.weather.makers import write

EASTERN = ZoneInfo("America/New_York")


def _local_hours(first: date, last: date) -> list[datetime]:
    """Every hour of the local days, in order; across clock changes as clocks show them."""
    start = datetime(first.year, first.month, first.day, tzinfo=EASTERN).astimezone(UTC)
    stop = datetime(last.year, last.month, last.day, tzinfo=EASTERN) + timedelta(days=1)
    n = round((stop.astimezone(UTC) - start).total_seconds() / 3600)
    return [(start + timedelta(hours=i)).astimezone(EASTERN) for i in range(n)]


@pytest.mark.parametrize("stated", [False, True])
def test_days_of_23_and_25_hours(tmp_path: Path, stated: bool) -> None:
    """US clocks of 2023: 12 March has 23 hours, 5 November 25; each hour counts once."""
    hours = [
        h
        for d in ((3, 11, 13), (11, 4, 6))
        for h in _local_hours(date(2023, d[0], d[1]), date(2023, d[0], d[2]))
    ]
    temps = np.random.default_rng(4).uniform(30, 60, len(hours)).round(1)
    text = [h.isoformat() if stated else h.replace(tzinfo=None).isoformat(" ") for h in hours]
    path = write(tmp_path, ["time,temp_f", *(f"{a},{b}" for a, b in zip(text, temps, strict=True))])
    w = read_weather(path)
    expected: dict[date, list[float]] = {}
    for h, t in zip(hours, temps, strict=True):
        expected.setdefault(h.date(), []).append(float(t))
    assert sorted(len(v) for v in expected.values()) == [23, 24, 24, 24, 24, 25]
    for day, values in expected.items():
        made = w.temp_f[day_of(day) - w.first_day]
        assert made == pytest.approx(sum(values) / len(values), abs=1e-9)
    assert w.method == "mean of hours"


def test_a_day_needs_20_hours(tmp_path: Path) -> None:
    rows = [f"2023-06-{d:02d}T{h:02d}:00,{60 + d}" for d in range(1, 12) for h in range(24)]
    rows = [r for r in rows if not ("06-03T" in r and int(r[11:13]) < 5)]  # 19 hours left
    rows = [r for r in rows if not ("06-05T" in r and int(r[11:13]) < 4)]  # 20 hours left
    w = read_weather(write(tmp_path, ["timestamp,temp (°F)", *rows]))
    assert np.flatnonzero(w.filled).tolist() == [2]
    assert w.temp_f[4] == 65.0
    assert any("1 day with fewer than 20 hours" in n for n in w.notes)


def test_readings_within_an_hour_count_as_one_hour() -> None:
    stamp = np.concatenate([np.arange(0, 1440, 60), np.full(5, 30) + np.arange(5)])
    temp = np.concatenate([np.full(24, 50.0), np.full(5, 80.0)])
    made = means_of_days(stamp, temp)
    assert made.mean.tolist() == pytest.approx([(23 * 50 + (50 + 5 * 80) / 6) / 24])
    assert made.hours.tolist() == [24]


def test_repeated_readings_outside_a_clock_change() -> None:
    stamp = np.concatenate([np.arange(0, 1440, 60), [600, 660]])  # 1 January 1970
    temp = np.concatenate([np.arange(24.0), [10.0, 99.0]])
    made = means_of_days(stamp, temp)
    assert (made.repeated, made.conflicting, made.hours.tolist()) == (2, 1, [23])
    assert made.mean[0] == pytest.approx((sum(range(24)) - 11) / 23)


def test_a_whole_day_given_twice_is_no_clock_change() -> None:
    day = day_of(date(2023, 11, 5)) * 1440
    stamp = np.tile(day + np.arange(0, 1440, 60), 2)
    made = means_of_days(stamp, np.tile(np.arange(24.0), 2))
    assert (made.hours.tolist(), made.mean.tolist()) == ([24], [11.5])


def test_utc_hours_are_asked_about_then_moved(tmp_path: Path) -> None:
    start = datetime(2023, 1, 2, 5, tzinfo=UTC)  # local midnight at -5
    stamps = [start + timedelta(hours=i) for i in range(48)]
    temps = [40.0] * 24 + [50.0] * 24
    named = [f"{s:%Y-%m-%d %H:%M},{t}" for s, t in zip(stamps, temps, strict=True)]
    marked = [f"{s:%Y-%m-%dT%H:%M}Z,{t}" for s, t in zip(stamps, temps, strict=True)]
    for lines in (["time (UTC),temp_f", *named], ["time,temp_f", *marked],
                  ["timezone,GMT", "", "time,temp_f", *named]):  # fmt: skip
        path = write(tmp_path, lines)
        with pytest.raises(AmbiguousWeather, match=r"time_zone_offset = -5"):
            read_weather(path)
        w = read_weather(path, time_zone_offset=-5)
        assert w.temp_f.tolist() == [40.0, 50.0]
        assert w.first_day == day_of(date(2023, 1, 2))


def test_hours_that_end_at_their_number(tmp_path: Path) -> None:
    rows = [f"2023-06-{d:02d},{h:02d}:00,{60 + d}" for d in (1, 2) for h in range(1, 25)]
    w = read_weather(write(tmp_path, ["date,time,temp_f", *rows]))
    assert w.temp_f.tolist() == [61.0, 62.0]
    assert any("24:00" in n for n in w.notes)


def test_twelve_hour_clock_and_columns_of_parts(tmp_path: Path) -> None:
    clock = [
        f"6/{d}/2023 {h % 12 or 12}:51 {'AM' if h < 12 else 'PM'},{60 + d}"
        for d in (13, 14)
        for h in range(24)
    ]
    assert read_weather(write(tmp_path, ["date,temp_f", *clock])).temp_f.tolist() == [73.0, 74.0]
    parts = [f"2023,6,{d},{h},{60 + d}" for d in (13, 14) for h in range(24)]
    made = read_weather(write(tmp_path, ["year,month,day,hour,temp_f", *parts]))
    assert made.temp_f.tolist() == [73.0, 74.0]


def test_three_hourly_readings_are_refused(tmp_path: Path) -> None:
    rows = [f"2023-06-{d:02d} {h:02d}:00,70" for d in (1, 2) for h in range(0, 24, 3)]
    with pytest.raises(UnreadableWeather, match="no day has 20 of its hours; the fullest has 8"):
        read_weather(write(tmp_path, ["time,temp_f", *rows]))


def test_times_of_two_minds(tmp_path: Path) -> None:
    rows = [f"2023-06-01 {h:02d}:00{'Z' if h % 2 else ''},70" for h in range(24)]
    with pytest.raises(AmbiguousWeather, match="12 of 24 times state a time zone"):
        read_weather(write(tmp_path, ["time,temp_f", *rows]))
