"""Daily tables: units asked about, columns found, ugly files read, hopeless ones refused."""

from __future__ import annotations

from datetime import date
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from normalize.days import day_of
from normalize.errors import AmbiguousWeather, UnreadableWeather, WeatherError
from normalize.weather.read import read_weather
from tests.weather.makers import daily_lines, seasons, write

WINTER = date(2023, 1, 1)


def _year_f() -> Any:
    return seasons(date(2022, 1, 1), date(2022, 12, 31))


def test_mean_with_its_unit_in_the_header(tmp_path: Path) -> None:
    w = read_weather(write(tmp_path, ["Date,Mean Temp (°C)", "2023-01-01,-5", "2023-01-02,0.0"]))
    assert w.first_day == day_of(WINTER)
    assert w.temp_f.tolist() == pytest.approx([23.0, 32.0])
    assert w.method == "as given"
    assert w.station == "station"
    assert w.source[0][0] == "station.csv"
    assert len(w.source[0][1]) == 64


def test_maximum_and_minimum(tmp_path: Path) -> None:
    w = read_weather(write(tmp_path, ["date,tmax_f,tmin_f", "2023-01-01,68,53"]))
    assert w.temp_f.tolist() == [60.5]
    assert w.method == "mean of daily maximum and minimum"
    assert w.max_f is not None
    assert w.min_f is not None
    assert (w.max_f.tolist(), w.min_f.tolist()) == ([68.0], [53.0])


def test_mean_as_given_wins_and_is_never_mixed(tmp_path: Path) -> None:
    rows = [
        "date,max_f,min_f,mean_f",
        "2023-01-01,40,20,29",
        "2023-01-02,44,20,",
        "2023-01-03,40,20,33",
    ]
    w = read_weather(write(tmp_path, rows))
    assert w.method == "as given"
    assert w.filled.tolist() == [False, True, False]
    assert w.temp_f[1] != 32.0


def test_an_empty_mean_column_gives_way(tmp_path: Path) -> None:
    rows = ["date,max_f,min_f,mean_f", "2023-01-01,40,20,", "2023-01-02,44,20,"]
    w = read_weather(write(tmp_path, rows))
    assert w.temp_f.tolist() == [30.0, 32.0]
    assert "mostly empty" in w.notes[0]


@pytest.mark.parametrize(
    ("header", "unit"),
    [
        ("temp_f", "F"),
        ("TAVG (°F)", "F"),
        ("Mean Temp (F)", "F"),
        ("avg temp degF", "F"),
        ("Mean temperature, Fahrenheit", "F"),
        ("AvgTempF", "F"),
        ("temperature_2m_mean (°C)", "C"),
        ("t_mean_c", "C"),
        ("Mean Temp (\ufffdC)", "C"),
        ("Mean Temp (Â°C)", "C"),
        ("tavg [C]", "C"),
    ],
)
def test_units_in_headers(tmp_path: Path, header: str, unit: str) -> None:
    path = write(tmp_path, [f'date,"{header}"', "2023-01-01,10"])
    assert read_weather(path).temp_f[0] == pytest.approx(10.0 if unit == "F" else 50.0)


def test_winter_alone_is_asked_about(tmp_path: Path) -> None:
    path = write(tmp_path, ["date,mean", *daily_lines(WINTER, [5, 12, 30, 41, 20] * 12)])
    with pytest.raises(AmbiguousWeather) as err:
        read_weather(path)
    assert 'unit = "F" or "C" under [weather] in site.toml' in str(err.value)
    assert "--unit" in str(err.value)
    assert read_weather(path, unit="F").temp_f[0] == 5.0
    assert read_weather(path, unit="C").temp_f[0] == 41.0


def test_values_that_leave_no_doubt(tmp_path: Path) -> None:
    temps = _year_f()
    hot = read_weather(write(tmp_path, ["date,mean", *daily_lines(date(2022, 1, 1), temps)]))
    assert any("read as °F" in n for n in hot.notes)
    lines = daily_lines(date(2022, 1, 1), (temps - 32) / 1.8, "{day},{temp:.3f}")
    cool = read_weather(write(tmp_path, ["date,mean", *lines]))
    assert any("read as °C" in n for n in cool.notes)
    assert hot.temp_f == pytest.approx(cool.temp_f, abs=0.06)


def test_doubtful_values_are_asked_about(tmp_path: Path) -> None:
    """A few typing errors above 60, half a year of °C, and an ice cap in °F decide nothing."""
    celsius = (_year_f() - 32) / 1.8
    typo = celsius[:200].copy()
    typo[[3, 50]] = 99.0
    for temps in (typo, celsius[:200], _year_f() - 75.0):
        with pytest.raises(AmbiguousWeather, match="°F or °C"):
            read_weather(write(tmp_path, ["date,mean", *daily_lines(date(2022, 1, 1), temps)]))


def test_units_in_the_cells_and_above_the_header(tmp_path: Path) -> None:
    cells = write(tmp_path, ["date,mean", "2023-01-01,−3 °C", "2023-01-02,4 °C"])
    assert read_weather(cells).temp_f == pytest.approx([26.6, 39.2])
    above = write(
        tmp_path, ["# station: Harrow Valley", "# units: degC", "date,temp", "2023-01-01,0"]
    )
    w = read_weather(above)
    assert (w.temp_f.tolist(), w.station) == ([32.0], "Harrow Valley")


def test_asked_unit_against_the_file_is_noted(tmp_path: Path) -> None:
    w = read_weather(write(tmp_path, ["date,temp_c", "2023-01-01,50"]), unit="F")
    assert w.temp_f.tolist() == [50.0]
    assert "though the file says °C" in w.notes[0]


def test_tenths_and_kelvin_are_refused(tmp_path: Path) -> None:
    for header in ("TG (0.1 °C)", "temp (K)", "mean temp tenths of deg C"):
        path = write(tmp_path, [f"date,{header}", "2023-01-01,280"])
        with pytest.raises(WeatherError):
            read_weather(path, temperature_column=header)


def test_tenths_without_a_word_are_refused(tmp_path: Path) -> None:
    lines = daily_lines(date(2022, 1, 1), (_year_f() - 32) / 0.18, "{day},{temp:.0f}")
    with pytest.raises(UnreadableWeather, match="tenths"):
        read_weather(write(tmp_path, ["date,mean", *lines]))


@pytest.mark.parametrize("codec", ["utf-8-sig", "utf-16", "utf-16-le", "utf-16-be", "cp1252"])
def test_encodings(tmp_path: Path, codec: str) -> None:
    path = write(tmp_path, ["date,Mean (°C)", *daily_lines(WINTER, [1, 2, 3])], codec=codec)
    assert read_weather(path).temp_f == pytest.approx([33.8, 35.6, 37.4])


def test_semicolons_and_decimal_commas(tmp_path: Path) -> None:
    path = write(tmp_path, ["Date;Mean °C;Note", "31.12.2022;-2,5;x", "01.01.2023;1,5;"])
    w = read_weather(path)
    assert w.temp_f == pytest.approx([27.5, 34.7])
    assert w.first_day == day_of(date(2022, 12, 31))


def test_tabs_old_line_ends_and_empty_lines(tmp_path: Path) -> None:
    path = tmp_path / "a.tsv"
    path.write_bytes(b"date\tmean_f\r\n2023-01-01\t30\r\n\r\n2023-01-02\t32\r\n")
    assert read_weather(path).temp_f.tolist() == [30.0, 32.0]
    path.write_bytes(b"date,mean_f\r2023-01-01,30\r2023-01-02,32\r")
    assert read_weather(path).temp_f.tolist() == [30.0, 32.0]


@pytest.mark.parametrize(
    "dates",
    [
        ["1/30/2023", "1/31/2023"], ["30/01/2023", "31/01/2023"], ["20230130", "20230131"],
        ["30-Jan-2023", "31-Jan-2023"], ["Jan 30, 2023", "Jan 31, 2023"],
        ["2023/01/30", "2023/1/31"], ["1/30/23", "1/31/23"],
        ["2023-01-30 00:00", "2023-01-31T00:00:00"],
    ],
)  # fmt: skip
def test_dates_in_many_hands(tmp_path: Path, dates: list[str]) -> None:
    path = write(tmp_path, ["date;mean_f", *(f"{d};{30 + i}" for i, d in enumerate(dates))])
    w = read_weather(path)
    assert (w.first_day, w.temp_f.tolist()) == (day_of(date(2023, 1, 30)), [30.0, 31.0])


def test_open_order_of_day_and_month_is_asked_about(tmp_path: Path) -> None:
    path = write(tmp_path, ["date,mean_f", "01/02/2023,30", "02/02/2023,31"])
    with pytest.raises(AmbiguousWeather, match='dates = "month first" or "day first"'):
        read_weather(path)
    assert read_weather(path, dates="day first").first_day == day_of(date(2023, 2, 1))
    assert read_weather(path, dates="month first").n_days == 32


def test_year_month_day_columns(tmp_path: Path) -> None:
    w = read_weather(write(tmp_path, ["Year,Month,Day,TAVG_F", "2024,2,28,30", "2024,2,29,31"]))
    assert (w.first_day, w.n_days) == (day_of(date(2024, 2, 28)), 2)


def test_unsorted_and_duplicated_days(tmp_path: Path) -> None:
    rows = ["2023-01-04,34", "2023-01-01,30", "2023-01-02,31", "2023-01-01,30", "2023-01-03,33",
            *daily_lines(date(2023, 1, 5), range(40)), "2023-01-03,39"]  # fmt: skip
    w = read_weather(write(tmp_path, ["date,mean_f", *rows]))
    assert w.n_days == 44
    assert w.temp_f[0] == 30.0
    assert w.filled.tolist()[:4] == [False, False, True, False]
    assert any("1 day given more than once with one value counts once" in n for n in w.notes)
    assert any("different temperatures counts as missing: 2023-01-03" in n for n in w.notes)


def test_bad_cells_become_missing_with_a_note(tmp_path: Path) -> None:
    rows = daily_lines(WINTER, [30.0] * 100)
    rows[10], rows[20], rows[30], rows[40] = (
        "2023-01-11,oops", "2023-01-21,nan", "2023-01-31,-9999", "2023-02-10,250",
    )  # fmt: skip
    rows[50] = "9999-12-31,30"
    rows[60] = "2023-02-36,30"
    w = read_weather(write(tmp_path, ["date,mean_f", *rows]))
    text = " ".join(w.notes)
    assert "(such as 'oops') counts as missing (line 12)" in text
    assert "outside -90 to 60 °C" in text
    assert "2 rows were left out because the date cannot be read" in text
    assert "(lines 52, 62)" in text
    assert w.days_filled == 6
    assert np.isfinite(w.temp_f).all()


def test_maximum_below_minimum(tmp_path: Path) -> None:
    rows = ["2023-01-01,40,20", "2023-01-02,20,40", "2023-01-03,40,20"]
    w = read_weather(write(tmp_path, ["date,max_f,min_f", *rows]))
    assert w.filled.tolist() == [False, True, False]
    assert any("maximum below the minimum" in n for n in w.notes)


def test_metadata_above_and_other_columns_beside(tmp_path: Path) -> None:
    lines = [
        "latitude,longitude,elevation,utc_offset_seconds,timezone",
        "44.1,-72.2,210.0,-18000,America/New_York", "",
        "time,temperature_2m_mean (°C),apparent_temperature_mean (°C),rain_sum (mm)",
        "2023-01-01,1.5,-3.0,0.0",
    ]  # fmt: skip
    assert read_weather(write(tmp_path, lines)).temp_f.tolist() == pytest.approx([34.7])


def test_environment_canada_daily_header(tmp_path: Path) -> None:
    names = (
        "Longitude (x)|Latitude (y)|Station Name|Climate ID|Date/Time|Year|Month|Day|Data Quality|"
        "Max Temp (°C)|Max Temp Flag|Min Temp (°C)|Min Temp Flag|Mean Temp (°C)|Mean Temp Flag|"
        "Heat Deg Days (°C)|Heat Deg Days Flag"
    )
    values = "-72|45|HARROW VALLEY|1|2023-01-01|2023|01|01||5||-5||0||18|"
    header, row = (",".join(f'"{c}"' for c in line.split("|")) for line in (names, values))
    w = read_weather(write(tmp_path, [header, row], codec="utf-8-sig"))
    assert (w.station, w.temp_f.tolist()) == ("HARROW VALLEY", [32.0])


def test_two_columns_that_would_do_are_asked_about(tmp_path: Path) -> None:
    path = write(tmp_path, ["date,mean temp f,average temp f", "2023-01-01,30,40"])
    with pytest.raises(AmbiguousWeather, match="temperature_column = "):
        read_weather(path)
    assert read_weather(path, temperature_column="average temp f").temp_f.tolist() == [40.0]


def test_both_units_printed(tmp_path: Path) -> None:
    w = read_weather(write(tmp_path, ["date,mean_c,mean_f", "2023-01-01,0,32.4"]))
    assert w.temp_f.tolist() == [32.4]


def test_several_stations(tmp_path: Path) -> None:
    path = write(tmp_path, ["station,date,mean_f", "North,2023-01-01,30", "South,2023-01-01,40"])
    with pytest.raises(AmbiguousWeather, match="2 stations: North, South"):
        read_weather(path)
    w = read_weather(path, station="South")
    assert (w.station, w.temp_f.tolist()) == ("South", [40.0])
    unlabelled = write(tmp_path, ["day,mean_f", "2023-01-01,30", "2023-01-01,40"])
    with pytest.raises(UnreadableWeather, match="several stations"):
        read_weather(unlabelled)


def test_names_are_fit_to_print(tmp_path: Path) -> None:
    path = write(tmp_path, ["name,date,mean_f", '"North\x07\tpeak' + "x" * 200 + '",2023-01-01,30'])
    name = read_weather(path).station
    assert name.isprintable()
    assert len(name) == 80


HOSTILE = {
    "empty": b"",
    "spaces": b" \n\n ",
    "bom alone": b"\xef\xbb\xbf\n",
    "header alone": b"date,mean_f\n",
    "no header": b"2023-01-01,30\n2023-01-02,31\n",
    "no date column": b"place,mean_f\nx,30\n",
    "no temperature column": b"date,rain\n2023-01-01,3\n",
    "year 9999": b"date,mean_f\n9999-01-01,30\n",
    "year 0": b"date,mean_f\n0000-01-01,30\n",
    "text": b"date,mean_f\n2023-01-01,warm\n2023-01-02,cold\n",
    "nan": b"date,mean_f\n2023-01-01,nan\n2023-01-02,inf\n",
    "gigantic": b"date,mean_f\n2023-01-01,1e308\n2023-01-02,-1e308\n",
    "digits": b"date,mean_f\n" + b"9" * 10000 + b",30\n",
    "nul": b"date,mean_f\n2023-01-01,3\x000\n",
    "binary": bytes(range(256)) * 40,
    "workbook": b"PK\x03\x04rest",
    "gzip": b"\x1f\x8brest",
    "pdf": b"%PDF-1.7 rest",
    "web page": b"<!DOCTYPE html><html><body>503</body></html>",
    "open quote": b'date,mean_f\n"2023-01-01,30\n' + b"x" * 200_000,
    "prose": b"Dear sir, the weather was fine today, and yesterday too.\n",
    "one word": b"hello",
    "commas": b",,,,,\n,,,,,\n",
    "mixed orders": b"date,mean_f\n" + b"13/01/2023,1\n01/14/2023,2\n" * 50,
}


@pytest.mark.parametrize("name", HOSTILE)
def test_hostile_files_give_one_clear_message(tmp_path: Path, name: str) -> None:
    path = tmp_path / "bad.csv"
    path.write_bytes(HOSTILE[name])
    with pytest.raises(WeatherError) as err:
        read_weather(path)
    text = str(err.value)
    assert text.startswith("bad.csv")
    assert "\n" not in text
    assert len(text) < 700


@settings(deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(
    st.binary(max_size=300)
    | st.text(alphabet='date,mean_fFC;\t\n"0123456789-/: .°', max_size=300).map(str.encode)
    | st.lists(st.text(alphabet="0123456789-/:., T", max_size=20), max_size=12).map(
        lambda rows: ("date,mean_f\n" + "\n".join(rows)).encode()
    )
)
def test_any_bytes_give_weather_or_one_message(tmp_path: Path, data: bytes) -> None:
    path = tmp_path / "bad.csv"
    path.write_bytes(data)
    try:
        w = read_weather(path)
    except WeatherError as refused:
        message = str(refused)
        w = None
    if w is None:
        assert message.startswith("bad.csv")
    else:
        assert w.temp_f.shape == w.filled.shape
        assert np.isfinite(w.temp_f[[0, -1]]).all()
        assert (np.abs(w.temp_f[np.isfinite(w.temp_f)]) <= 140.0).all()


def test_what_is_not_there(tmp_path: Path) -> None:
    with pytest.raises(UnreadableWeather, match="no such file"):
        read_weather(tmp_path / "none.csv")
    with pytest.raises(UnreadableWeather, match="folder"):
        read_weather(tmp_path)
    with pytest.raises(UnreadableWeather):
        read_weather("bad\x00name.csv")


def test_a_typical_year_is_not_observed_weather(tmp_path: Path) -> None:
    lines = [
        "LOCATION,X,Y,Z,a,1,0,0,0,0",
        "DATA PERIODS,1,1,Data,Sunday,1/1,12/31",
        "1999,1,1,1,0,?,5",
    ]
    with pytest.raises(UnreadableWeather, match="typical year, not the weather that was"):
        read_weather(write(tmp_path, lines))


@pytest.mark.parametrize(
    "options",
    [{"unit": "K"}, {"dates": "us"}, {"time_zone_offset": 99}, {"max_column": "a"}, {"unit": 3},
     {"date_column": "nowhere"}, {"temperature_column": "nowhere"}],
)  # fmt: skip
def test_answers_that_are_none(tmp_path: Path, options: dict[str, Any]) -> None:
    path = write(tmp_path, ["date,mean_f", "2023-01-01,30"])
    with pytest.raises(WeatherError):
        read_weather(path, **options)


def test_same_file_same_bits(tmp_path: Path) -> None:
    path = write(tmp_path, ["date,mean_f", *daily_lines(WINTER, _year_f())])
    assert read_weather(path).temp_f.tobytes() == read_weather(path).temp_f.tobytes()
