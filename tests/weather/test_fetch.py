"""Downloads against a server that misbehaves; nothing here leaves this machine."""

from __future__ import annotations

import gzip
import os
import subprocess
import sys
from collections.abc import Callable, Iterator
from datetime import UTC, datetime, timedelta
from email.utils import format_datetime
from pathlib import Path

import pytest

from normalize.errors import MissingWeather, WeatherError
from normalize.weather.stations import fetch as fetch_module
from normalize.weather.stations.cache import Cache
from normalize.weather.stations.fetch import ARCHIVE, Fetcher, Limits, Origin, damage, retry_after
from normalize.weather.stations.noaa import PRODUCTS, path_of
from tests.weather.archive_server import MODIFIED, Answer, Archive, serving

pytest.importorskip("urllib3")

PATH = "data/normals-annualseasonal/1991-2020/access/USW00000001.csv"
BODY = b"STATION,DATE,TMAX\n" + b"USW00000001,2023-01-01,12\n" * 400
QUICK = Limits(connect=2.0, silence=1.0, whole=1.5, apart=0.0)


@pytest.fixture
def archive(monkeypatch: pytest.MonkeyPatch) -> Iterator[Archive]:
    for name in ("http_proxy", "HTTP_PROXY", "all_proxy", "ALL_PROXY"):
        monkeypatch.delenv(name, raising=False)
    with serving(Archive(files={PATH: BODY})) as running:
        yield running


@pytest.fixture
def waits() -> list[float]:
    return []


@pytest.fixture
def make(archive: Archive, tmp_path: Path, waits: list[float]) -> Callable[..., Fetcher]:
    def build(limits: Limits = QUICK) -> Fetcher:
        return Fetcher(Cache(tmp_path / "cache"), archive.origin, limits, sleep=waits.append)

    return build


def test_a_file_is_kept_and_not_sent_again(
    make: Callable[..., Fetcher], archive: Archive, waits: list[float]
) -> None:
    first = make().fetch(PATH)
    assert (first.how, first.file.read_bytes()) == ("new", BODY)
    assert archive.asked[0].headers["User-Agent"].startswith("normalize/")
    again = make().fetch(PATH)
    assert (again.how, again.file.read_bytes()) == ("unchanged", BODY)
    assert archive.asked[1].headers["If-Modified-Since"] == MODIFIED
    assert archive.asked[1].headers["If-None-Match"] == '"v1"'
    archive.files[PATH] = BODY + BODY[18:]
    archive.etag = '"v2"'
    newer = make().fetch(PATH)
    assert (newer.how, newer.file.read_bytes()) == ("new", archive.files[PATH])
    assert waits == []


def test_offline_answers_from_the_cache_alone(
    make: Callable[..., Fetcher], archive: Archive
) -> None:
    with pytest.raises(MissingWeather, match="not in the cache"):
        make().fetch(PATH, offline=True)
    make().fetch(PATH)
    n = len(archive.asked)
    assert make().fetch(PATH, offline=True).how == "cached"
    assert len(archive.asked) == n


def test_a_copy_serves_when_the_server_does_not(
    make: Callable[..., Fetcher], archive: Archive
) -> None:
    make().fetch(PATH)
    archive.troubles[PATH] = [Answer(b"", 503)] * 5
    held = make().fetch(PATH)
    assert held.how == "cached"
    assert held.file.read_bytes() == BODY
    assert "The copy of" in held.remark
    assert "503" in held.remark


def test_a_changed_copy_is_not_trusted(make: Callable[..., Fetcher], archive: Archive) -> None:
    file = make().fetch(PATH).file
    file.write_bytes(BODY + b"more\n")
    assert make().fetch(PATH).how == "new"
    assert file.read_bytes() == BODY


def test_429_waits_as_long_as_it_is_asked_to(
    make: Callable[..., Fetcher], archive: Archive, waits: list[float]
) -> None:
    archive.troubles[PATH] = [Answer(b"", 429, {"Retry-After": "7"})]
    assert make().fetch(PATH).how == "new"
    assert waits == [7.0]


def test_503_backs_off_and_gives_up_with_a_reason(
    make: Callable[..., Fetcher], archive: Archive, waits: list[float]
) -> None:
    archive.troubles[PATH] = [Answer(b"", 503)] * 9
    with pytest.raises(WeatherError, match="in 5 attempts; the last time the server answered 503"):
        make().fetch(PATH)
    assert waits == [1.0, 2.0, 4.0, 8.0]
    assert len(archive.asked) == 5


def test_a_wait_of_hours_is_left_to_the_person(
    make: Callable[..., Fetcher], archive: Archive, waits: list[float]
) -> None:
    archive.troubles[PATH] = [Answer(b"", 429, {"Retry-After": "7200"})]
    with pytest.raises(WeatherError, match="come back in 120 minutes"):
        make().fetch(PATH)
    assert waits == []


def test_retry_after_as_a_date() -> None:
    """RFC 9110, 10.2.3: seconds or an HTTP date."""
    now = datetime(2024, 1, 1, tzinfo=UTC)
    assert retry_after(format_datetime(now + timedelta(seconds=30), usegmt=True), now) == 30.0
    assert retry_after(format_datetime(now - timedelta(days=1), usegmt=True), now) == 0.0
    for nothing in ("", "soon", "-3", "Mon, 99 Foo"):
        assert retry_after(nothing, now) is None


def test_a_cut_download_goes_on_where_it_stopped(
    make: Callable[..., Fetcher], archive: Archive
) -> None:
    archive.troubles[PATH] = [Answer(BODY, 200, {"ETag": '"v1"'}, cut=3000)]
    assert make().fetch(PATH).file.read_bytes() == BODY
    assert archive.asked[1].headers["Range"] == "bytes=3000-"
    assert archive.asked[1].headers["If-Range"] == '"v1"'


def test_a_cut_download_of_a_file_that_has_changed_starts_anew(
    make: Callable[..., Fetcher], archive: Archive
) -> None:
    archive.troubles[PATH] = [Answer(b"old\n" * 1000, 200, {"ETag": '"v0"'}, cut=3000)]
    assert make().fetch(PATH).file.read_bytes() == BODY
    assert archive.asked[1].headers["If-Range"] == '"v0"'


def test_what_has_arrived_waits_for_another_day(
    make: Callable[..., Fetcher], archive: Archive
) -> None:
    archive.troubles[PATH] = [Answer(BODY, 200, {"ETag": '"v1"'}, cut=3000)]
    one = Limits(connect=2.0, silence=1.0, attempts=1, apart=0.0)
    with pytest.raises(WeatherError, match="What has arrived is kept"):
        make(one).fetch(PATH)
    assert make(one).fetch(PATH).file.read_bytes() == BODY
    assert archive.asked[-1].headers["Range"] == "bytes=3000-"


def test_a_longer_length_than_the_file_is_no_whole_file(
    make: Callable[..., Fetcher], archive: Archive
) -> None:
    archive.troubles[PATH] = [Answer(BODY, 200, claim=len(BODY) + 100)]
    assert make().fetch(PATH).file.read_bytes() == BODY
    assert len(archive.asked) == 2


def test_a_shorter_length_than_the_file_shows_in_its_last_line(
    make: Callable[..., Fetcher], archive: Archive
) -> None:
    archive.troubles[PATH] = [Answer(BODY, 200, claim=len(BODY) - 7)]
    assert make().fetch(PATH).file.read_bytes() == BODY
    assert len(archive.asked) == 2


def test_truncated_gzip_is_never_kept(make: Callable[..., Fetcher], archive: Archive) -> None:
    path = path_of("isd-lite", "725300-94846", 2016)
    whole = gzip.compress(BODY, mtime=0)
    archive.files[path] = whole
    archive.troubles[path] = [Answer(whole[:-20]), Answer(whole[:50])]
    assert make().fetch(path).file.read_bytes() == whole
    assert len(archive.asked) == 3
    archive.etag = '"v2"'
    archive.troubles[path] = [Answer(whole[:-20])] * 5
    assert make().fetch(path).how == "cached"  # the good copy stays


def test_a_gzip_bomb_is_refused(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("normalize.weather.source.MAX_BYTES", 100_000)
    bomb = gzip.compress(b"0" * 10_000_000)
    assert len(bomb) < 20_000
    assert "unpacks to more than" in damage(bomb, "a.gz")


def test_a_web_page_instead_of_data(make: Callable[..., Fetcher], archive: Archive) -> None:
    page = b"\n<!DOCTYPE html><html>Down for maintenance</html>\n"
    archive.troubles[PATH] = [Answer(page)] * 9
    with pytest.raises(WeatherError, match="a web page came instead of data"):
        make().fetch(PATH)
    assert not list(make().cache.folder.rglob("*.csv"))


def test_a_slow_drip_is_cut_off(make: Callable[..., Fetcher], archive: Archive) -> None:
    archive.troubles[PATH] = [Answer(BODY, 200, {"ETag": '"v1"'}, drip=0.01)]
    assert (
        make(Limits(connect=2.0, silence=1.0, whole=0.3, apart=0.0)).fetch(PATH).file.read_bytes()
        == BODY
    )
    assert archive.asked[1].headers["Range"].startswith("bytes=")


def test_silence_is_cut_off(make: Callable[..., Fetcher], archive: Archive) -> None:
    archive.troubles[PATH] = [Answer(BODY, 200, drip=2.0)]
    assert make(Limits(connect=2.0, silence=0.3, apart=0.0)).fetch(PATH).how == "new"


def test_a_redirect_elsewhere_is_not_followed(
    make: Callable[..., Fetcher], archive: Archive
) -> None:
    for target in ("https://example.org/x.csv", "http://127.0.0.1:1/x.csv", "//example.org/x"):
        archive.troubles[PATH] = [Answer(b"", 302, {"Location": target})]
        with pytest.raises(WeatherError, match="points elsewhere"):
            make().fetch(PATH)


def test_a_redirect_at_home_is_followed_but_not_in_circles(
    make: Callable[..., Fetcher], archive: Archive
) -> None:
    archive.files["new/place.csv"] = BODY
    archive.troubles[PATH] = [Answer(b"", 301, {"Location": "/new/place.csv"})]
    assert make().fetch(PATH).file.read_bytes() == BODY
    circle = "data/circle.csv"
    archive.troubles[circle] = [Answer(b"", 302, {"Location": f"/{circle}"})] * 9
    with pytest.raises(WeatherError, match="in circles"):
        make().fetch(circle)


def test_a_file_beyond_the_cap_is_refused(make: Callable[..., Fetcher], archive: Archive) -> None:
    with pytest.raises(WeatherError, match="is larger than"):
        make(Limits(max_bytes=1000, apart=0.0)).fetch(PATH)
    assert not list(make().cache.folder.rglob("*.part"))


def test_404_is_a_plain_sentence(make: Callable[..., Fetcher], archive: Archive) -> None:
    with pytest.raises(MissingWeather, match="the archive has no such file"):
        make().fetch("data/normals-daily/1991-2020/access/USW00000009.csv")
    assert len(archive.asked) == 1


def test_requests_keep_apart(make: Callable[..., Fetcher], waits: list[float]) -> None:
    fetcher = make(Limits(apart=0.5))
    fetcher.fetch(PATH)
    fetcher.fetch(PATH)
    assert len(waits) == 1
    assert 0.0 < waits[0] <= 0.5


def test_through_a_proxy(
    make: Callable[..., Fetcher], archive: Archive, monkeypatch: pytest.MonkeyPatch
) -> None:
    with serving(Archive(files={PATH: BODY})) as proxy:
        monkeypatch.setenv("http_proxy", f"http://127.0.0.1:{proxy.port}")
        monkeypatch.delenv("no_proxy", raising=False)
        monkeypatch.delenv("NO_PROXY", raising=False)
        assert make().fetch(PATH).how == "new"
        assert len(proxy.asked) == 1
    assert archive.asked == []


@pytest.mark.parametrize(
    ("scheme", "host", "port"),
    [
        ("http", "www.ncei.noaa.gov", 80),
        ("https", "example.org", 443),
        ("https", "www.ncei.noaa.gov.example.org", 443),
        ("https", "www.ncei.noaa.gov", 8443),
        ("http", "localhost", 80),
        ("http", "10.0.0.1", 80),
        ("file", "", 0),
    ],
)
def test_only_listed_hosts_over_https(scheme: str, host: str, port: int) -> None:
    with pytest.raises(WeatherError, match="not on the list"):
        Origin(scheme, host, port)


def test_the_default_is_the_public_archive_and_nothing_in_the_program_gives_another() -> None:
    assert ARCHIVE.base == "https://www.ncei.noaa.gov/"
    package = Path(str(fetch_module.__file__)).parents[2]
    for file in package.rglob("*.py"):
        text = file.read_text(encoding="utf-8")
        if file != Path(str(fetch_module.__file__)):
            assert "Origin(" not in text, file
            assert "origin=" not in text.replace("_origin=", ""), file


@pytest.mark.parametrize(
    ("product", "station", "year"),
    [
        ("daily", "../../etc/passwd", None),
        ("daily", "USW0009472", None),
        ("daily", "usw00094728", None),
        ("daily", "USW00094728\n", None),
        ("gsod", "72530094846", None),
        ("gsod", "72530094846", 1492),
        ("isd-lite", "725300", 2016),
    ],
)
def test_ids_are_checked(product: str, station: str, year: int | None) -> None:
    with pytest.raises(WeatherError):
        path_of(product, station, year)


def test_paths_of_every_product_stay_in_the_cache(tmp_path: Path) -> None:
    cache = Cache(tmp_path)
    for product in PRODUCTS.values():
        path = path_of(product.name, product.example, 2020)
        assert cache.place(path).is_relative_to(tmp_path)
    for bad in ("../x", "a/../b", "/etc/x", "a//b", "a/.hidden", "a\\b"):
        with pytest.raises(WeatherError):
            cache.place(bad)


def test_without_the_extra_a_message_says_what_to_install(
    make: Callable[..., Fetcher], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("importlib.util.find_spec", lambda name: None)
    with pytest.raises(WeatherError, match=r"Install normalize\[download\]"):
        make().fetch(PATH)


def test_the_pool_for_the_archive_checks_certificates(monkeypatch: pytest.MonkeyPatch) -> None:
    """Made, not used: nothing leaves this machine."""
    import ssl

    import urllib3

    for name in ("https_proxy", "HTTPS_PROXY", "no_proxy", "NO_PROXY", "all_proxy", "ALL_PROXY"):
        monkeypatch.delenv(name, raising=False)
    direct = fetch_module.connection(ARCHIVE.base)
    assert not isinstance(direct, urllib3.ProxyManager)
    context = direct.connection_pool_kw["ssl_context"]
    assert context.verify_mode == ssl.CERT_REQUIRED
    assert context.check_hostname
    monkeypatch.setenv("https_proxy", "proxy.example:3128")
    through = fetch_module.connection(ARCHIVE.base)
    assert isinstance(through, urllib3.ProxyManager)
    assert through.proxy is not None
    assert through.proxy.url == "http://proxy.example:3128"
    monkeypatch.setenv("no_proxy", "ncei.noaa.gov")
    assert not isinstance(fetch_module.connection(ARCHIVE.base), urllib3.ProxyManager)


def test_no_other_command_goes_online(tmp_path: Path) -> None:
    """The network modules are not even loaded by a command that reads weather."""
    station = tmp_path / "s.csv"
    station.write_text("date,mean_f\n" + "".join(f"2023-01-{d:02d},30\n" for d in range(1, 32)))
    code = (
        "import sys\nfrom normalize.cli.main import main\n"
        "main(['degree-days', sys.argv[1]])\n"
        "main(['weather', 'check', sys.argv[1]])\n"
        "assert 'urllib3' not in sys.modules and 'http.client' not in sys.modules\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", code, str(station)],
        capture_output=True, text=True, check=False, env=dict(os.environ),
    )  # fmt: skip
    assert done.returncode == 0, done.stderr
