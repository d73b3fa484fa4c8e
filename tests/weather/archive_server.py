"""A small archive on this machine that speaks the real formats, and misbehaves when told to.

It listens on 127.0.0.1 and is reached by giving the fetcher another origin, which only tests
do: there is no setting and no environment variable for it.
"""

from __future__ import annotations

import threading
import time
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field
from http.server import BaseHTTPRequestHandler, ThreadingHTTPServer

from normalize.weather.stations.fetch import Origin

MODIFIED = "Tue, 02 Jan 2024 03:04:05 GMT"


@dataclass
class Answer:
    """What a path answers, once.

    claim : Content-Length other than the body's.  cut : bytes after which the connection
    closes.  drip : seconds between single bytes.
    """

    body: bytes = b""
    status: int = 200
    headers: dict[str, str] = field(default_factory=dict)
    claim: int | None = None
    cut: int | None = None
    drip: float = 0.0


@dataclass
class Asked:
    """A request that came: its path and headers."""

    path: str
    headers: dict[str, str]


@dataclass
class Archive:
    """Files by path; troubles, taken one by one, come before them."""

    files: dict[str, bytes] = field(default_factory=dict)
    troubles: dict[str, list[Answer]] = field(default_factory=dict)
    asked: list[Asked] = field(default_factory=list)
    etag: str = '"v1"'
    port: int = 0

    @property
    def origin(self) -> Origin:
        return Origin("http", "127.0.0.1", self.port)

    def answer(self, path: str, headers: dict[str, str]) -> Answer:
        self.asked.append(Asked(path, headers))
        waiting = self.troubles.get(path)
        if waiting:
            return waiting.pop(0)
        if path not in self.files:
            return Answer(b"<html>not found</html>\n", 404)
        body = self.files[path]
        marks = {"ETag": self.etag, "Last-Modified": MODIFIED, "Accept-Ranges": "bytes"}
        if headers.get("If-None-Match") == self.etag:
            return Answer(b"", 304, marks)
        asked = headers.get("Range", "")
        if asked.startswith("bytes=") and headers.get("If-Range") == self.etag:
            start = int(asked[6:].rstrip("-"))
            if start >= len(body):
                return Answer(b"", 416, marks)
            marks["Content-Range"] = f"bytes {start}-{len(body) - 1}/{len(body)}"
            return Answer(body[start:], 206, marks)
        return Answer(body, 200, marks)


class _Handler(BaseHTTPRequestHandler):
    archive: Archive

    def do_GET(self) -> None:
        path = self.path
        if path.startswith("http://"):  # as a proxy is asked
            path = "/" + path.split("/", 3)[3]
        given = self.archive.answer(path.lstrip("/"), dict(self.headers))
        self.send_response(given.status)
        for name, value in given.headers.items():
            self.send_header(name, value)
        length = len(given.body) if given.claim is None else given.claim
        self.send_header("Content-Length", str(length))
        self.send_header("Connection", "close")
        self.end_headers()
        body = given.body if given.cut is None else given.body[: given.cut]
        try:
            if given.drip:
                for i in range(len(body)):
                    self.wfile.write(body[i : i + 1])
                    self.wfile.flush()
                    time.sleep(given.drip)
            else:
                self.wfile.write(body)
        except OSError:
            pass  # the other side has hung up, as it should on a slow drip
        self.close_connection = True

    def log_message(self, *_args: object) -> None:
        pass


@contextmanager
def serving(archive: Archive) -> Iterator[Archive]:
    """The archive, reachable while the block lasts."""
    handler = type("Handler", (_Handler,), {"archive": archive})
    server = ThreadingHTTPServer(("127.0.0.1", 0), handler)
    server.daemon_threads = True
    archive.port = server.server_address[1]
    thread = threading.Thread(target=server.serve_forever, kwargs={"poll_interval": 0.02})
    thread.daemon = True
    thread.start()
    try:
        yield archive
    finally:
        server.shutdown()
        server.server_close()
        thread.join(timeout=5)
