"""The public archives' formats, in small invented files laid out as the archives lay them out."""

from __future__ import annotations

import gzip
from collections.abc import Sequence
from datetime import date, timedelta
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from normalize.days import day_of_iso
from normalize.errors import AmbiguousWeather, UnreadableWeather, WeatherError
from normalize.weather.formats import format_of
from normalize.weather.formats.generic_days import METHOD_HOURS, METHOD_MAX_MIN
from normalize.weather.read import read_weather
from tests.weather.makers import seasons, write

FIRST = date(2022, 1, 1)
DAYS = 365
MEAN_F = seasons(FIRST, date(2022, 12, 31), seed=4)
HIGH = np.round((MEAN_F + 9.0 - 32) * 50 / 9).astype(int)  # tenths of °C
LOW = np.round((MEAN_F - 9.0 - 32) * 50 / 9).astype(int)
STATION = "USW00000001"


def expected() -> Any:
    """°F from tenths of °C, the definition."""
    return (HIGH + LOW) / 20 * 9 / 5 + 32


def dates() -> list[date]:
    return [FIRST + timedelta(days=i) for i in range(DAYS)]


def dly(
    values: dict[str, Sequence[int]],
    *,
    flags: dict[tuple[str, int], str] | None = None,
    station: str = STATION,
) -> list[str]:
    """Lines as the archive writes them; flags : (element, place in the record) → M, Q, S."""
    lines = []
    for month in range(1, 13):
        for element, all_values in values.items():
            cells = []
            for day in range(1, 32):
                try:
                    i = (date(2022, month, day) - FIRST).days
                except ValueError:
                    cells.append("-9999   ")
                    continue
                cells.append(f"{all_values[i]:5d}{(flags or {}).get((element, i), '  W')}")
            lines.append(f"{station}2022{month:02d}{element}{''.join(cells)}")
    return lines


PLAIN = {"TMAX": HIGH.tolist(), "TMIN": LOW.tolist(), "PRCP": [0] * DAYS}


def test_dly(tmp_path: Path) -> None:
    lines = dly(PLAIN)
    assert {len(line) for line in lines} == {269}
    w = read_weather(write(tmp_path, lines, f"{STATION}.dly"))
    assert (w.station, w.first_day, w.n_days) == (STATION, day_of_iso("2022-01-01"), DAYS)
    assert w.method == METHOD_MAX_MIN
    assert w.temp_f == pytest.approx(expected(), abs=1e-9)
    assert w.max_f == pytest.approx(HIGH / 10 * 9 / 5 + 32, abs=1e-9)
    assert w.notes == ()


def test_dly_flags_and_missing_days(tmp_path: Path) -> None:
    """A quality flag of any letter drops the value; lag, GMT days and gaps are said."""
    high = HIGH.tolist()
    high[100] = -9999
    flags = {("TMAX", 10): " IW", ("TMIN", 50): " XW", ("TMAX", 200): "L W", ("TMIN", 201): "  S"}
    w = read_weather(write(tmp_path, dly(PLAIN | {"TMAX": high}, flags=flags), "s.dly"))
    assert np.flatnonzero(w.filled).tolist() == [10, 50, 100]
    text = " ".join(w.notes)
    assert "2 values failed the archive's quality checks and count as missing." in text
    assert "1 value lags" in text
    assert "1 value comes from summaries of GMT days" in text
    assert "3 days in 3 short gaps" in text


def test_dly_of_a_volunteer_names_the_trap(tmp_path: Path) -> None:
    lines = dly(PLAIN, station="USC00000001")
    assert "volunteer observer" in " ".join(read_weather(write(tmp_path, lines, "s.dly")).notes)


def test_dly_with_a_mean_only(tmp_path: Path) -> None:
    mean = ((HIGH + LOW) // 2).tolist()
    w = read_weather(write(tmp_path, dly({"TAVG": mean}), "s.dly"))
    assert w.method == "the archive's daily mean (TAVG)"
    assert w.temp_f == pytest.approx(np.array(mean) / 10 * 9 / 5 + 32)
    assert "differ from one source to another" in w.notes[0]


def test_dly_without_temperature_and_with_two_stations(tmp_path: Path) -> None:
    with pytest.raises(UnreadableWeather, match="holds no daily temperatures"):
        read_weather(write(tmp_path, dly({"PRCP": [0] * DAYS}), "rain.dly"))
    both = write(tmp_path, dly(PLAIN) + dly(PLAIN, station="USW00000002"), "two.dly")
    with pytest.raises(AmbiguousWeather, match="2 stations"):
        read_weather(both)
    assert read_weather(both, station="USW00000002").n_days == DAYS


def test_a_station_that_moves_is_read_as_its_id_says(tmp_path: Path) -> None:
    """The archive gives a place that moved a new id: two ids are never joined in silence."""
    moved = dly(PLAIN)[:18] + dly(PLAIN, station="USW00000002")[18:]
    path = write(tmp_path, moved, "moved.dly")
    with pytest.raises(AmbiguousWeather, match="USW00000001, USW00000002"):
        read_weather(path)
    w = read_weather(path, station="USW00000001")
    assert w.n_days == 181  # January to June: 31 + 28 + 31 + 30 + 31 + 30


def rows(*, time: str = "2400", station: bool = True, header: str = "") -> list[str]:
    lines = [header] if header else []
    for i, day in enumerate(dates()):
        for element, values in (("TMAX", HIGH), ("TMIN", LOW)):
            start = f"{STATION}," if station else ""
            lines.append(f"{start}{day:%Y%m%d},{element},{values[i]},,,W,{time}")
    return lines


@pytest.mark.parametrize(
    ("station", "header"),
    [
        (True, ""),
        (True, "ID,DATE,ELEMENT,DATA_VALUE,M_FLAG,Q_FLAG,S_FLAG,OBS_TIME"),
        (False, "date,attr,value,a,b,c,d"),
    ],
)
def test_rows_with_and_without_header_and_station(
    tmp_path: Path, station: bool, header: str
) -> None:
    w = read_weather(write(tmp_path, rows(station=station, header=header), "2022.csv"))
    assert w.temp_f == pytest.approx(expected(), abs=1e-9)
    assert w.station == (STATION if station else "2022")


def test_rows_packed(tmp_path: Path) -> None:
    path = tmp_path / f"{STATION}.csv.gz"
    path.write_bytes(gzip.compress(("\n".join(rows()) + "\n").encode()))
    assert read_weather(path).temp_f == pytest.approx(expected(), abs=1e-9)
    path.write_bytes(path.read_bytes()[:-30])
    with pytest.raises(UnreadableWeather, match="cut off or damaged"):
        read_weather(path)


def test_rows_of_a_morning_observer_name_the_trap(tmp_path: Path) -> None:
    w = read_weather(write(tmp_path, rows(time="0700")))
    assert "100 % of the readings were made in the morning" in " ".join(w.notes)


def test_rows_with_ugly_lines(tmp_path: Path) -> None:
    lines = rows()
    lines[20] = f"{STATION},20221341,TMAX,12,,,W,"
    lines[40] = f"{STATION},20220121,TMAX,warm,,,W,"
    lines.append(f"{STATION},20220301,TMAX,999,,G,W,")
    lines.append(f"{STATION},20220302,TMAX,{HIGH[60] + 30},,,W,")
    text = " ".join(read_weather(write(tmp_path, lines)).notes)
    assert "1 row was left out because the date cannot be read" in text
    assert "1 row was left out for want of a value (line 41)" in text
    assert "1 value failed" in text
    assert "1 day given more than once with different TMAX counts as missing" in text


def access(unit: str = "tenths", *, attributes: bool = True) -> list[str]:
    def shown(tenths: int) -> str:
        return {
            "tenths": f"  {tenths}",
            "C": f"{tenths / 10:.1f}",
            "F": f"{round(tenths / 10 * 9 / 5 + 32)}",
        }[unit]

    columns = ["STATION", "DATE", "NAME"]
    for name in ("TMAX", "TMIN"):
        columns += [name, f"{name}_ATTRIBUTES"] if attributes else [name]
    lines = [",".join(columns)]
    for i, day in enumerate(dates()):
        flag = ["", '",,W,2400"'] if attributes else [""]
        cells = [f'"{STATION}"', f'"{day}"', '"HARROW VALLEY AP, ZZ US"']
        for values in (HIGH, LOW):
            cells += [f'"{shown(int(values[i]))}"', *flag[1:]]
        lines.append(",".join(cells))
    return lines


def test_access_table(tmp_path: Path) -> None:
    w = read_weather(write(tmp_path, access()))
    assert w.station == f"HARROW VALLEY AP, ZZ US ({STATION})"
    assert w.temp_f == pytest.approx(expected(), abs=1e-9)
    flagged = access()
    flagged[11] = flagged[11].replace(",,W", ",X,W", 1)
    assert read_weather(write(tmp_path, flagged)).filled[10]


@pytest.mark.parametrize("unit", ["C", "F", "tenths"])
@pytest.mark.parametrize("attributes", [True, False])
def test_service_answers_in_any_unit(tmp_path: Path, unit: str, attributes: bool) -> None:
    """The trap: without units= the service answers in tenths of °C."""
    w = read_weather(write(tmp_path, access(unit, attributes=attributes)))
    assert w.temp_f == pytest.approx(expected(), abs=0.5 if unit == "F" else 1e-6)


def test_a_short_service_answer_is_asked_about(tmp_path: Path) -> None:
    path = write(tmp_path, access("F")[:40])
    with pytest.raises(AmbiguousWeather, match="tenths of a °C"):
        read_weather(path)
    assert read_weather(path, unit="F").n_days == 39


GSOD_HEADER = (
    '"STATION","DATE","LATITUDE","LONGITUDE","ELEVATION","NAME","TEMP","TEMP_ATTRIBUTES","DEWP",'
    '"DEWP_ATTRIBUTES","MAX","MAX_ATTRIBUTES","MIN","MIN_ATTRIBUTES","PRCP","FRSHTT"'
)


def gsod(count: int = 24) -> list[str]:
    lines = [GSOD_HEADER]
    for i, day in enumerate(dates()):
        t = MEAN_F[i]
        lines.append(
            f'"72000000001","{day}","44.1","-72.1","300","HARROW, VALLEY, US",'
            f'"  {t:.1f}","{count:2d}",'
            f'"  20.0","24","  {t + 9:.1f}","*","  {t - 9:.1f}"," "," 0.00","000000"'
        )
    return lines


def test_gsod(tmp_path: Path) -> None:
    lines = gsod()
    lines[31] = lines[31].replace(f"{MEAN_F[30]:.1f}", "9999.9", 1)
    lines[61] = lines[61].replace('"24"', '" 6"', 1)
    path = write(tmp_path, lines, "72000000001.csv")
    found = format_of(path.read_bytes())
    assert found is not None
    assert found.name == "global summary of the day"  # and not any table of temperatures
    w = read_weather(path)
    assert w.station == "HARROW, VALLEY, US (72000000001)"
    assert w.temp_f[0] == pytest.approx(round(MEAN_F[0], 1))
    assert np.flatnonzero(w.filled).tolist() == [30, 60]
    text = " ".join(w.notes)
    assert "Its days are GMT days" in text
    assert "1 day with fewer than 20 observations counts as missing" in text
    assert "365 days maximum or minimum was derived" in text
    assert w.method == "mean of the observations of a GMT day"


def isd_lite(start_utc: int, n_hours: int) -> list[str]:
    """Hours from a number of hours after 2022-01-01 00 UTC; 10.0 °C by local day, see below."""
    lines = []
    for h in range(start_utc, start_utc + n_hours):
        day = FIRST + timedelta(days=h // 24)
        local = (h - 5) // 24  # Eastern standard time
        tenths = 100 + 10 * local
        lines.append(f"{day:%Y %m %d} {h % 24:02d}{tenths:6d}" + " -9999" * 7)
    return lines


def test_isd_lite_hours_become_local_days(tmp_path: Path) -> None:
    lines = isd_lite(5, 24 * 30)
    assert {len(line) for line in lines} == {61}
    path = tmp_path / "720000-00001-2022.gz"
    path.write_bytes(gzip.compress(("\n".join(lines) + "\n").encode()))
    with pytest.raises(AmbiguousWeather, match="hours are in UTC"):
        read_weather(path)
    w = read_weather(path, time_zone_offset=-5)
    assert w.method == METHOD_HOURS
    assert w.station == "720000-00001-2022"
    assert w.first_day == day_of_iso("2022-01-01")
    assert w.temp_f == pytest.approx((10.0 + np.arange(30)) * 9 / 5 + 32)  # each day by itself
    assert w.hour_f is not None
    assert w.hour_f.size == 24 * 30


def test_isd_lite_with_missing_hours(tmp_path: Path) -> None:
    lines = isd_lite(5, 24 * 30)
    lines[48] = lines[48][:13] + " -9999" + lines[48][19:]
    del lines[100:110]  # hours are missing, not padded
    lines[600] = "not an hour"
    w = read_weather(write(tmp_path, lines, "a.txt"), time_zone_offset=-5)
    assert "1 line that was no hour was left out (line 601)" in " ".join(w.notes)
    assert int(w.filled.sum()) == 1
    assert "1 day with fewer than 20 hours" in " ".join(w.notes)


def test_local_climatological_data_by_day(tmp_path: Path) -> None:
    """Daily values stand on the summary rows; suspect ones are dropped."""
    lines = [
        "STATION,DATE,REPORT_TYPE,HourlyDryBulbTemperature,DailyAverageDryBulbTemperature,"
        "DailyMaximumDryBulbTemperature,DailyMinimumDryBulbTemperature,DailyHeatingDegreeDays"
    ]
    own = []
    for i, day in enumerate(dates()[:60]):
        high, low = round(MEAN_F[i] + 9), round(MEAN_F[i] - 9)
        own.append(max(0, 65 - int(np.floor((high + low) / 2 + 0.5))))
        lines.append(f"72000000001,{day}T12:00:00,FM-15,{high},,,,")
        mark = "s" if i == 7 else ""
        lines.append(f"72000000001,{day}T23:59:00,SOD  ,,,{high}{mark},{low},{own[-1]}")
    w = read_weather(write(tmp_path, lines))
    assert w.method == METHOD_MAX_MIN
    assert np.flatnonzero(w.filled).tolist() == [7]
    assert "1 suspect value counts as missing" in " ".join(w.notes)
    from normalize.weather.degree_days import monthly_degree_days, parse_base

    table = monthly_degree_days(w, parse_base("65F"), method="whole-degrees")
    assert table.rows[1].heating == sum(own[31:59])  # the file's own whole-degree heating


def test_local_climatological_data_by_hour(tmp_path: Path) -> None:
    """One report an hour: the routine one first."""
    lines = ["STATION,DATE,REPORT_TYPE,HourlyDryBulbTemperature"]
    for day in dates()[:3]:
        for hour in range(24):
            lines.append(f"72000000001,{day}T{hour:02d}:51:00,FM-15,{40 + hour}")
            lines.append(f"72000000001,{day}T{hour:02d}:20:00,FM-16,99")
    w = read_weather(write(tmp_path, lines))
    assert w.temp_f.tolist() == [51.5, 51.5, 51.5]
    assert "72 further reports of the same hour count no second time" in " ".join(w.notes)


CANADA = (
    '"Longitude (x)","Latitude (y)","Station Name","Climate ID","Date/Time","Year","Month","Day",'
    '"Data Quality","Max Temp (°C)","Max Temp Flag","Min Temp (°C)","Min Temp Flag",'
    '"Mean Temp (°C)","Mean Temp Flag","Heat Deg Days (°C)","Heat Deg Days Flag"'
)


@pytest.mark.parametrize(("codec", "preamble"), [("utf-8-sig", 0), ("cp1252", 25), ("utf-8", 25)])
def test_environment_canada(tmp_path: Path, codec: str, preamble: int) -> None:
    lines = ['"Legend","x"', '"Station Name","ELDER BAY"'] * (preamble // 2) + [CANADA]
    own = 0.0
    for i, day in enumerate(dates()[:90]):
        high, low = HIGH[i] / 10, LOW[i] / 10
        own += max(0.0, 18 - (high + low) / 2)
        flag = {5: "M", 9: "E"}.get(i, "")
        shown = "" if flag == "M" else f"{high:.1f}"
        lines.append(
            f'"-70.1","45.2","ELDER BAY","7010000","{day}","{day.year}","{day.month:02d}",'
            f'"{day.day:02d}","†","{shown}","{flag}","{low:.1f}","","","","",""'
        )
    w = read_weather(write(tmp_path, lines, codec=codec))
    assert w.station == "ELDER BAY"
    assert w.method == METHOD_MAX_MIN
    assert np.flatnonzero(w.filled).tolist() == [5]
    assert "1 maximum was estimated by the archive" in " ".join(w.notes)
    keep = ~w.filled
    assert w.temp_f[keep] == pytest.approx(expected()[:90][keep], abs=1e-9)


def test_gridded_exports_are_labelled(tmp_path: Path) -> None:
    lines = [
        "latitude,longitude,elevation,utc_offset_seconds,timezone",
        "44.06,-72.23,210.0,-18000,America/New_York",
        "",
        "time,temperature_2m_mean (°C)",
        *[f"{d},{(t - 32) * 5 / 9:.1f}" for d, t in zip(dates(), MEAN_F, strict=True)],
    ]
    w = read_weather(write(tmp_path, lines))
    assert "Gridded weather" in " ".join(w.notes)
    assert w.temp_f == pytest.approx(MEAN_F, abs=0.1)
    plain = ["date,mean_f", *[f"{d},{t:.1f}" for d, t in zip(dates(), MEAN_F, strict=True)]]
    assert "Gridded" not in " ".join(read_weather(write(tmp_path, plain)).notes)


@pytest.mark.parametrize("builder", [lambda: dly(PLAIN), rows, access, gsod])
@pytest.mark.parametrize("cut", [1, 70, 300, 1000, 5000])
def test_torn_files_give_a_message_or_days(tmp_path: Path, builder: Any, cut: int) -> None:
    text = "\n".join(builder())
    path = tmp_path / "torn.txt"
    path.write_text(text[:cut])
    try:
        days = read_weather(path, unit="F").temp_f
    except WeatherError as error:
        days, message = None, str(error)
    assert "torn.txt" in message if days is None else np.isfinite(days).any()
