"""One file from a public archive, over https, into the cache.

Polite and suspicious: one request at a time and half a second apart, a name that says who
asks, waiting as long as the server wants; only hosts on a list, no redirect elsewhere, a cap
on size and on time, and nothing kept that is not whole.  A download that was cut goes on where
it stopped.
"""

from __future__ import annotations

import hashlib
import re
import time
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, field, replace
from datetime import UTC, datetime
from email.utils import parsedate_to_datetime
from pathlib import Path
from typing import TYPE_CHECKING, Final
from urllib.parse import urljoin, urlsplit

from normalize.errors import MissingWeather, NormalizeError, WeatherError
from normalize.weather.stations.cache import Cache, Note

if TYPE_CHECKING:
    from urllib3 import BaseHTTPResponse, PoolManager

ALLOWED_HOSTS: Final = frozenset({"www.ncei.noaa.gov"})
LATER: Final = frozenset({408, 429, 500, 502, 503, 504})  # worth another try
REDIRECTS: Final = frozenset({301, 302, 303, 307, 308})
MAX_REDIRECTS: Final = 3
CHUNK: Final = 64 * 1024


@dataclass(frozen=True, slots=True)
class Origin:
    """Who is asked.  Plain http is for this machine alone, where the tests' server is."""

    scheme: str
    host: str
    port: int

    def __post_init__(self) -> None:
        listed = self.scheme == "https" and self.host in ALLOWED_HOSTS and self.port == 443
        if not listed and (self.scheme, self.host) != ("http", "127.0.0.1"):
            raise WeatherError(
                f"{self.scheme}://{self.host}:{self.port} is not on the list of hosts",
                where="download",
                wanted="https and " + " or ".join(sorted(ALLOWED_HOSTS)),
            )

    @property
    def base(self) -> str:
        """The beginning of every address."""
        port = "" if self.port == 443 else f":{self.port}"
        return f"{self.scheme}://{self.host}{port}/"


ARCHIVE: Final = Origin("https", "www.ncei.noaa.gov", 443)


@dataclass(frozen=True, slots=True)
class Limits:
    """What a download may cost.  Seconds and bytes."""

    max_bytes: int = 100 * 1024 * 1024  # the longest station files are under 3 MB, lists 40 MB
    connect: float = 10.0
    silence: float = 30.0  # between two pieces
    whole: float = 300.0  # for one attempt, however slowly it drips
    attempts: int = 5
    backoff: float = 1.0  # doubled at each attempt
    longest_wait: float = 120.0  # that a server may ask for; beyond it, it is asked another day
    apart: float = 0.5  # between requests


@dataclass(frozen=True, slots=True)
class Fetched:
    """A file in the cache. how : "new", "unchanged" or "cached".  remark : a sentence or ""."""

    file: Path
    note: Note
    how: str
    remark: str = ""


class _TryAgain(Exception):
    """An attempt failed in a way that another may not."""

    def __init__(self, reason: str, wait: float | None = None) -> None:
        super().__init__(reason)
        self.reason, self.wait = reason, wait


@dataclass(slots=True)
class Fetcher:
    """Fetches files of one origin. sleep, clock : for tests.

    origin : the public archive; only the tests give another.
    """

    cache: Cache
    origin: Origin = ARCHIVE
    limits: Limits = field(default_factory=Limits)
    sleep: Callable[[float], None] = time.sleep
    clock: Callable[[], float] = time.monotonic
    _pool: PoolManager | None = None
    _last: float | None = None

    def fetch(self, path: str, *, offline: bool = False) -> Fetched:
        """A file by its path on the server, from the cache if the server has none newer.

        offline : from the cache alone.  Raises MissingWeather for a file that is not there,
        WeatherError with the reason where it cannot be had.
        """
        held = self.cache.note(path)
        file = self.cache.place(path)
        if offline:
            if held is None:
                raise MissingWeather(
                    "is not in the cache",
                    where=path.rsplit("/", 1)[-1],
                    next_step="Get it once with a connection, without --offline.",
                )
            return Fetched(file, held, "cached")
        _need_urllib3()
        try:
            return self._with_patience(path, held)
        except MissingWeather:
            raise
        except NormalizeError as error:
            if held is None:
                raise
            remark = f"The copy of {held.fetched} is used: {error}"
            return Fetched(file, held, "cached", remark)

    def _with_patience(self, path: str, held: Note | None) -> Fetched:
        reason = ""
        for attempt in range(self.limits.attempts):
            try:
                return self._attempt(path, held)
            except _TryAgain as again:
                reason = again.reason
                wait = again.wait if again.wait is not None else self.limits.backoff * 2**attempt
                if wait > self.limits.longest_wait:
                    raise WeatherError(
                        f"the server asks to come back in {wait / 60:.0f} minutes",
                        where=self.origin.host,
                        next_step="Try again then.",
                    ) from None
            if attempt + 1 < self.limits.attempts:
                self.sleep(wait)
        raise WeatherError(
            f"could not be downloaded in {self.limits.attempts} attempts; the last time {reason}",
            where=path.rsplit("/", 1)[-1],
            next_step="Try again later. What has arrived is kept and need not come again.",
        )

    def _attempt(self, path: str, held: Note | None) -> Fetched:
        """One request, answered by a whole file or by an exception."""
        part = self.cache.part(path)
        mark = self.cache.part_mark(path)
        had = part.stat().st_size if mark and part.exists() else 0
        headers = _headers(held, had, mark)
        url = self.origin.base + path
        response = self._ask(url, headers)
        try:
            if response.status == 304 and held is not None:
                note = replace(held, fetched=_today())
                self.cache.write_note(path, note)
                return Fetched(self.cache.place(path), note, "unchanged")
            self._begin(path, response, had)
            self._receive(path, response)
        finally:
            response.release_conn()
            response.close()
        data = part.read_bytes()
        problem = damage(data, path)
        if problem:
            self.cache.drop(path)
            raise _TryAgain(problem)
        note = Note(
            url=url,
            fetched=_today(),
            size=len(data),
            sha256=hashlib.sha256(data).hexdigest(),
            etag=response.headers.get("ETag", ""),
            modified=response.headers.get("Last-Modified", ""),
        )
        self.cache.keep(path, note)
        return Fetched(self.cache.place(path), note, "new")

    def _ask(self, url: str, headers: Mapping[str, str]) -> BaseHTTPResponse:
        """The answer to a request, redirects within the same server followed."""
        import urllib3

        timeout = urllib3.Timeout(connect=self.limits.connect, read=self.limits.silence)
        for _ in range(MAX_REDIRECTS + 1):
            self._keep_apart()
            try:
                response = self._connection(url).request(
                    "GET", url, headers=dict(headers), timeout=timeout, retries=False,
                    redirect=False, preload_content=False, decode_content=False,
                )  # fmt: skip
            except urllib3.exceptions.HTTPError as error:
                raise _TryAgain(f"the server could not be reached ({_kind(error)})") from None
            if response.status not in REDIRECTS:
                return response
            target = urljoin(url, response.headers.get("Location", ""))
            response.close()
            if not target.startswith(self.origin.base) or ".." in urlsplit(target).path:
                raise WeatherError(
                    f"the server points elsewhere, to {urlsplit(target).hostname or 'nowhere'}",
                    where=self.origin.host,
                    wanted="the file itself",
                    next_step="It was not followed. Look on the archive's own pages whether the "
                    "file has moved.",
                )
            url = target
        raise WeatherError("the server points in circles", where=self.origin.host)

    def _begin(self, path: str, response: BaseHTTPResponse, had: int) -> None:
        """Make ready for the answer's body; whatever is no body is an exception."""
        name = path.rsplit("/", 1)[-1]
        if response.status in LATER:
            wait = retry_after(response.headers.get("Retry-After", ""), datetime.now(UTC))
            raise _TryAgain(f"the server answered {response.status}", wait)
        if response.status == 416:
            self.cache.drop(path)
            raise _TryAgain("the server could not go on where it stopped", 0.0)
        if response.status in (404, 410):
            raise MissingWeather(
                "the archive has no such file", where=name, next_step="Check the station's id."
            )
        if response.status not in (200, 206):
            raise WeatherError(f"the server answered {response.status}", where=name)
        if response.status == 206:
            if response.headers.get("Content-Range", "").startswith(f"bytes {had}-"):
                return
            self.cache.drop(path)
            raise _TryAgain("the server went on at another place", 0.0)
        self.cache.begin(path, response.headers.get("ETag", "") or _modified(response))

    def _receive(self, path: str, response: BaseHTTPResponse) -> None:
        """Append the body to the part, within the limits."""
        part = self.cache.part(path)
        size, started = part.stat().st_size, self.clock()
        with part.open("ab") as file:
            for piece in _pieces(response):
                size += len(piece)
                if size > self.limits.max_bytes:
                    self.cache.drop(path)
                    raise WeatherError(
                        f"is larger than {self.limits.max_bytes / 1024**2:.0f} MB",
                        where=path.rsplit("/", 1)[-1],
                        wanted="a station's file",
                    )
                file.write(piece)
                if self.clock() - started > self.limits.whole:
                    raise _TryAgain("it came too slowly")

    def _keep_apart(self) -> None:
        if self._last is not None:
            left = self.limits.apart - (self.clock() - self._last)
            if left > 0:
                self.sleep(left)
        self._last = self.clock()

    def _connection(self, url: str) -> PoolManager:
        """A pool, through the proxy that the system names for such an address, if any."""
        if self._pool is None:
            self._pool = connection(url)
        return self._pool


def _need_urllib3() -> None:
    from importlib.util import find_spec

    if find_spec("urllib3") is None:
        raise WeatherError(
            "what downloads need is not installed",
            where="download",
            next_step="Install normalize[download], or fetch the file with a browser.",
        )


def _pieces(response: BaseHTTPResponse) -> Iterator[bytes]:
    """The body as it arrives; a broken connection is worth another try."""
    import urllib3

    while True:
        try:
            piece = response.read1(CHUNK)
        except urllib3.exceptions.HTTPError as error:
            raise _TryAgain(f"the connection broke ({_kind(error)})") from None
        if not piece:
            return
        yield piece


def connection(url: str) -> PoolManager:
    """A pool of connections that trusts what this system trusts, through its proxy if any."""
    import ssl
    from urllib.request import getproxies, proxy_bypass

    import urllib3

    try:
        import truststore

        context: ssl.SSLContext = truststore.SSLContext(ssl.PROTOCOL_TLS_CLIENT)
    except ImportError:
        context = ssl.create_default_context()
    where = urlsplit(url)
    proxy = getproxies().get(where.scheme)
    if proxy and not proxy_bypass(where.hostname or ""):
        if "://" not in proxy:
            proxy = f"http://{proxy}"
        return urllib3.ProxyManager(proxy, ssl_context=context)
    return urllib3.PoolManager(ssl_context=context)


def _headers(held: Note | None, had: int, mark: str) -> dict[str, str]:
    from normalize import __version__

    headers = {
        "User-Agent": f"normalize/{__version__} (weather for energy savings; one file at a time)",
        "Accept-Encoding": "identity",  # lengths and ranges then mean the file itself
    }
    if had:
        return headers | {"Range": f"bytes={had}-", "If-Range": mark}
    if held is not None and held.etag:
        headers["If-None-Match"] = held.etag
    if held is not None and held.modified:
        headers["If-Modified-Since"] = held.modified
    return headers


def _modified(response: BaseHTTPResponse) -> str:
    return response.headers.get("Last-Modified", "")


def retry_after(text: str, now: datetime) -> float | None:
    """Seconds that a Retry-After asks for, as seconds or as a date; None where it says nothing.

    >>> retry_after("7", datetime.now(UTC)), retry_after("soon", datetime.now(UTC))
    (7.0, None)
    """
    text = text.strip()
    if re.fullmatch(r"\d{1,9}", text):
        return float(text)
    try:
        when = parsedate_to_datetime(text)
    except (ValueError, IndexError):
        return None
    if when.tzinfo is None:
        return None
    return max(0.0, (when - now).total_seconds())


def damage(data: bytes, path: str) -> str:
    """What is wrong with a file that arrived, in a clause; "" where nothing is.

    >>> damage(b"<html>Maintenance</html>", "a.csv")
    'a web page came instead of data'
    """
    from normalize.text_files import GZIP
    from normalize.weather.source import unpacked

    if path.endswith(".gz"):
        if not data.startswith(GZIP):
            return "it is not the compressed file that it should be"
        try:
            data = unpacked(data, path)
        except WeatherError as error:
            return f"it {error.found}"
    if not data.strip():
        return "it was empty"
    if data.lstrip(b"\xef\xbb\xbf \r\n\t").startswith(b"<"):
        return "a web page came instead of data"
    if b"\x00" in data:
        return "it is not text"
    if not data.endswith(b"\n"):
        return "it was cut off in the middle of a line"
    return ""


def _kind(error: Exception) -> str:
    return re.sub(r"(?<=[a-z])(?=[A-Z])", " ", type(error).__name__).lower()


def _today() -> str:
    return datetime.now(UTC).date().isoformat()
