"""Stations ranked for a place, and the commands of ``normalize weather``."""

from __future__ import annotations

import json
from collections.abc import Callable, Iterator
from datetime import date
from pathlib import Path

import pytest

import normalize.cli.weather as cli_weather
from normalize.cli.main import main
from normalize.days import day_of
from normalize.errors import MissingWeather, UnreadableWeather, WeatherError
from normalize.weather import neighbour
from normalize.weather.source import read_source
from normalize.weather.stations import near
from normalize.weather.stations.cache import Cache
from normalize.weather.stations.fetch import Fetcher, Limits
from normalize.weather.stations.lists import Station, read_stations
from normalize.weather.stations.near import covered, distance_km, present, rank
from normalize.weather.stations.noaa import INVENTORY, STATIONS, path_of
from normalize.weather.stations.place import Place, height_of, place_of
from tests.weather.archive_server import Archive, serving
from tests.weather.makers import weather, write, years
from tests.weather.test_archives import PLAIN, dly
from tests.weather.test_published import COOLING, HEATING

HOME = Place(44.0, -72.0, "home")
SPAN = (day_of(date(2020, 1, 1)), day_of(date(2024, 1, 1)))


def station_line(number: str, lat: float, lon: float, height: float, name: str) -> str:
    return f"{number} {lat:8.4f} {lon:9.4f} {height:6.1f} ZZ {name:30s} {'':3s} {'':3s} {'':5s}"


def inventory_line(number: str, element: str, first: int, last: int) -> str:
    return f"{number}  44.0000  -72.0000 {element} {first} {last}"


LIST = [
    station_line("USW00000001", 44.1, -72.0, 200.0, "HARROW VALLEY AP"),
    station_line("USC00000002", 44.01, -72.0, 210.0, "HARROW VALLEY 2 N"),
    station_line("USW00000003", 44.05, -72.0, 1200.0, "ELDER MOUNTAIN"),
    station_line("USW00000004", 44.02, -72.0, -999.9, "OLD FIELD"),
    station_line("USW00000005", 47.9, -72.0, 200.0, "FAR AWAY"),
    station_line("USC00000006", 44.0, -72.0, 200.0, "RAIN ONLY"),
]
INVENTORY_LINES = [
    inventory_line(number, element, first, last)
    for number, first, last in (
        ("USW00000001", 1950, 2024),
        ("USC00000002", 1950, 2024),
        ("USW00000003", 1990, 2024),
        ("USW00000004", 1950, 2021),
        ("USW00000005", 1950, 2024),
    )
    for element in ("TMAX", "TMIN", "PRCP")
] + [inventory_line("USC00000006", "PRCP", 1950, 2024)]


def stations(folder: Path) -> tuple[Station, ...]:
    return read_stations(
        read_source(write(folder, LIST, "stations.txt")),
        read_source(write(folder, INVENTORY_LINES, "inventory.txt")),
    )


def test_lists(tmp_path: Path) -> None:
    found = stations(tmp_path)
    assert [s.id for s in found] == [f"US{c}" for c in (
        "W00000001", "C00000002", "W00000003", "W00000004", "W00000005")]  # fmt: skip
    assert found[0].name == "HARROW VALLEY AP, ZZ"
    assert (found[0].elevation_m, found[3].elevation_m) == (200.0, None)
    assert found[0].years == (1950, 2024)
    with pytest.raises(UnreadableWeather, match="no list of stations"):
        read_stations(read_source(write(tmp_path, ["date,mean_f", "x"], "no.txt")))


def test_distance() -> None:
    """New York (40.7128, -74.0060) to London (51.5074, -0.1278): 5570 km (common knowledge)."""
    assert distance_km(40.7128, -74.0060, 51.5074, -0.1278) == pytest.approx(5570, rel=0.002)
    assert distance_km(10.0, 179.9, 10.0, -179.9) == pytest.approx(21.9, abs=0.1)


def test_ranking(tmp_path: Path) -> None:
    """The airport beats a nearer volunteer of shifted days, a mountain, and a dead station."""
    found = rank(stations(tmp_path), HOME, SPAN, elevation_m=200.0)
    assert [c.station.id for c in found] == [
        "USW00000001", "USC00000002", "USW00000004", "USW00000003"]  # fmt: skip
    assert found[0].distance_km == pytest.approx(11.12, abs=0.01)
    assert found[3].rise_m == 1000.0
    assert found[2].complete == 0.5  # 2020 and 2021 of four years
    assert found[2].rise_m is None
    assert {c.zone for c in found} == {None}


def test_what_is_measured_and_zones_move_the_ranking(tmp_path: Path) -> None:
    found = rank(
        stations(tmp_path), HOME, SPAN, measured={"USW00000001": 0.4},
        zones={"USC00000002": 6, "USW00000001": 5},
    )  # fmt: skip
    assert found[0].station.id == "USC00000002"
    airport = next(c for c in found if c.station.id == "USW00000001")
    assert (airport.complete, airport.measured) == (0.4, True)
    assert (airport.same_zone, found[0].same_zone) == (False, True)


def test_completeness() -> None:
    w = years(2020, 2021)
    assert present(w, SPAN) == pytest.approx(731 / 1461)
    w.temp_f[:100] = float("nan")
    assert present(w, SPAN) == pytest.approx(631 / 1461)
    assert present(weather(date(2010, 1, 1), [50.0]), SPAN) == 0.0
    assert covered(Station("X", "", 0, 0, None, (1950, 1960)), SPAN) == 0.0
    assert covered(Station("X", "", 0, 0, None), SPAN) is None


def test_places() -> None:
    assert place_of(" 43.64, -72.25 ") == Place(43.64, -72.25, "43.64, -72.25")
    assert place_of("-33.9 151.2").latitude == -33.9
    assert height_of("177 m") == 177.0
    for bad in ("97.0,10", "home", "1,2,3", "4.5", "__import__('os')"):
        with pytest.raises(WeatherError):
            place_of(bad)
    for bad in ("580", "9999m", "tall"):
        with pytest.raises(WeatherError):
            height_of(bad)


def test_zip_codes() -> None:
    """Lebanon, NH lies at 43.64, -72.25 (common knowledge); the table is ``zipcodes`` (MIT)."""
    pytest.importorskip("zipcodes")
    place = place_of("03766")
    assert distance_km(place.latitude, place.longitude, 43.64, -72.25) < 10
    assert place_of("03766-1234").latitude == place.latitude
    with pytest.raises(MissingWeather, match="no such ZIP code"):
        place_of("00000")


# The commands


def normals_file() -> bytes:
    names, cells = ["STATION", "NAME"], ["USW00000001", "HARROW VALLEY AP, ZZ US"]
    for kind, values in (("HTDD", HEATING), ("CLDD", COOLING)):
        for base, value in values.items():
            names.append(f"ANN-{kind}-" + ("NORMAL" if base == 65 else f"BASE{base}"))
            cells.append(str(value))
    return "".join(",".join(f'"{c}"' for c in row) + "\n" for row in (names, cells)).encode()


@pytest.fixture
def archive(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Iterator[Archive]:
    """The commands reach the tests' own server: only by replacing what makes the fetcher."""
    pytest.importorskip("urllib3")
    for name in ("http_proxy", "HTTP_PROXY", "all_proxy", "ALL_PROXY"):
        monkeypatch.delenv(name, raising=False)
    files = {
        STATIONS: ("\n".join(LIST) + "\n").encode(),
        INVENTORY: ("\n".join(INVENTORY_LINES) + "\n").encode(),
        path_of("daily", "USW00000001"): ("\n".join(dly(PLAIN)) + "\n").encode(),
        path_of("normals", "USW00000001"): normals_file(),
    }
    with serving(Archive(files=files)) as running:
        limits = Limits(connect=2.0, apart=0.0, backoff=0.0, attempts=2)

        def fetcher(folder: Path | None) -> Fetcher:
            return Fetcher(Cache(folder or tmp_path / "cache"), running.origin, limits)

        monkeypatch.setattr(cli_weather, "_fetcher", fetcher)
        yield running


@pytest.fixture
def run(capsys: pytest.CaptureFixture[str]) -> Callable[..., tuple[int, str, str]]:
    def call(*args: str | Path) -> tuple[int, str, str]:
        capsys.readouterr()
        code = main([str(a) for a in args])
        out = capsys.readouterr()
        return code, out.out, out.err

    return call


Run = Callable[..., tuple[int, str, str]]


def test_near_asks_before_it_goes_online(run: Run, archive: Archive) -> None:
    code, _, err = run("weather", "near", "44.0,-72.0")
    assert code == 1
    assert "Nothing is downloaded unless you ask: add --download." in err
    assert archive.asked == []


def test_near_get_near_check(run: Run, archive: Archive, tmp_path: Path) -> None:
    span = ("--from", "2022-01-01", "--to", "2022-12-31")
    code, out, _ = run("weather", "near", "44.0,-72.0", "--elevation", "650ft", "--download", *span)
    assert code == 0
    first = out.splitlines()[4]
    assert first.startswith("USW00000001  HARROW VALLEY AP, ZZ")
    assert "+2 m" in first
    assert "100 % *" in first
    assert "  6  " in first
    n = len(archive.asked)
    code, out, _ = run("weather", "get", "usw00000001", "--into", tmp_path)
    assert code == 0
    assert "downloaded" in out
    code, out, _ = run("weather", "near", "44.0,-72.0", "--json", "-", *span)
    (best,) = [s for s in json.loads(out)["stations"] if s["station"] == "USW00000001"]
    assert (best["station"], best["complete"], best["complete_is_measured"], best["zone"]) == (
        "USW00000001", 1.0, True, 6)  # fmt: skip
    assert len(archive.asked) == n + 1  # near used the cache alone
    code, out, _ = run("weather", "check", tmp_path / "USW00000001.dly", "--years", "1")
    assert code == 0
    assert "GHCN-Daily file (.dly)" in out
    assert "the year 2022" in out


def test_get_offline_and_get_nonsense(run: Run, archive: Archive, tmp_path: Path) -> None:
    assert run("weather", "get", "USW00000001", "--offline")[0] == 1
    assert archive.asked == []
    code, _, err = run("weather", "get", "../../etc/passwd")
    assert code == 1
    assert "is no station" in err
    code, _, err = run("weather", "get", "USW00000009")
    assert code == 1
    assert "no such file" in err
    assert run("weather", "get", "USW00000001")[0] == 0
    code, out, _ = run("weather", "get", "USW00000001", "--offline")
    assert (code, "taken from the cache" in out) == (0, True)
    other = tmp_path / "USW00000001.dly"
    other.write_text("mine\n")
    assert run("weather", "get", "USW00000001", "--into", tmp_path)[0] == 1
    assert other.read_text() == "mine\n"


def test_near_in_the_south(run: Run, archive: Archive) -> None:
    code, out, _ = run("weather", "near", "-33.9,151.2", "--download")
    assert code == 0
    assert "No station with temperatures within 250 km" in out


def test_check_of_a_normals_file(run: Run, tmp_path: Path) -> None:
    path = tmp_path / "normals.csv"
    path.write_bytes(normals_file())
    code, out, _ = run("weather", "check", path)
    assert code == 0
    assert "normals 1991-2020 of HARROW VALLEY AP" in out
    assert "7,333" in out


def test_the_page_on_weather_gives_the_worths_that_are_used() -> None:
    page = (Path(__file__).parents[2] / "docs" / "weather.md").read_text(encoding="utf-8")
    for words in (
        f"| 100 m of height above or below the building | {near.KM_PER_100_M:.0f} km",
        f"| {near.KM_FOR_ALL_MISSING:.0f} km, in proportion",
        f"| another thermal climate zone | {near.KM_FOR_ANOTHER_ZONE:.0f} km",
        f"(no airport) | {near.KM_FOR_MORNING_DAYS:.0f} km",
        f"gaps of up to {neighbour.MAX_DAYS} days",
        f"{neighbour.MIN_COMMON_DAYS} days in common and an R² of {neighbour.MIN_R2}",
    ):
        assert words in " ".join(page.split()), words
