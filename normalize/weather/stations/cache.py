"""Files that were fetched, each with a note of what the server said of it."""

from __future__ import annotations

import hashlib
import json
import re
from dataclasses import asdict, dataclass
from pathlib import Path
from typing import Final

from normalize.errors import WeatherError

_PART: Final = re.compile(r"[A-Za-z0-9][A-Za-z0-9_.\-]*")


@dataclass(frozen=True, slots=True)
class Note:
    """What is known of a cached file.

    fetched : day it was last confirmed, ISO.  etag, modified : the server's own marks, sent
    back to ask whether there is anything newer.
    """

    url: str
    fetched: str
    size: int
    sha256: str
    etag: str = ""
    modified: str = ""


@dataclass(frozen=True, slots=True)
class Cache:
    """A folder of fetched files, laid out as on the server."""

    folder: Path

    def place(self, path: str) -> Path:
        """Where a server's path is kept. Raises WeatherError for a path that is not plain."""
        parts = path.split("/")
        if not all(_PART.fullmatch(part) for part in parts):
            raise WeatherError(f"{path[:80]!r} is no plain path", where="cache")
        return self.folder.joinpath(*parts)

    def note(self, path: str) -> Note | None:
        """The note of a file that is whole; None where there is none or it was changed."""
        file = self.place(path)
        try:
            note = Note(**json.loads(_beside(file, ".note.json").read_text(encoding="utf-8")))
            data = file.read_bytes()
        except (OSError, ValueError, TypeError):
            return None
        whole = len(data) == note.size and hashlib.sha256(data).hexdigest() == note.sha256
        return note if whole else None

    def part(self, path: str) -> Path:
        """Where a file is kept while it is not whole yet."""
        return _beside(self.place(path), ".part")

    def part_mark(self, path: str) -> str:
        """The server's mark of the file that the part belongs to, or ""."""
        try:
            return _beside(self.place(path), ".part.mark").read_text(encoding="utf-8")
        except (OSError, ValueError):
            return ""

    def begin(self, path: str, mark: str) -> None:
        """Make room for a new part."""
        part = self.part(path)
        try:
            part.parent.mkdir(parents=True, exist_ok=True)
            part.write_bytes(b"")
            _beside(self.place(path), ".part.mark").write_text(mark, encoding="utf-8")
        except OSError as error:
            raise _unwritable(self.folder, error) from None

    def drop(self, path: str) -> None:
        """Forget the part."""
        self.part(path).unlink(missing_ok=True)
        _beside(self.place(path), ".part.mark").unlink(missing_ok=True)

    def keep(self, path: str, note: Note) -> None:
        """The part is whole: it becomes the file."""
        try:
            self.part(path).replace(self.place(path))
            self.write_note(path, note)
        except OSError as error:
            raise _unwritable(self.folder, error) from None
        self.drop(path)

    def write_note(self, path: str, note: Note) -> None:
        """Write what is known of a file, whole or not at all."""
        target = _beside(self.place(path), ".note.json")
        fresh = _beside(self.place(path), ".note.new")
        fresh.write_text(json.dumps(asdict(note), indent=1), encoding="utf-8")
        fresh.replace(target)


def _beside(file: Path, ending: str) -> Path:
    return file.with_name(file.name + ending)


def _unwritable(folder: Path, error: OSError) -> WeatherError:
    return WeatherError(
        f"the cache cannot be written ({error.strerror or type(error).__name__})",
        where=str(folder),
        next_step="Choose another folder: --cache FOLDER.",
    )
