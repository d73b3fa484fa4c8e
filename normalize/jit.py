"""How kernels are compiled: once, to a cache that knows when any kernel has changed.

numba checks only the file of the function it loads, so an edited helper in another module
would leave stale machine code behind.  Here the cache folder's name is a hash of every
kernel source, of numba, numpy and Python, and of the bounds-check switch.  The folder is
beside the package if that can be written, else in the user's cache folder; else kernels are
compiled anew in every process, which is slow but right.
"""

from __future__ import annotations

import hashlib
import os
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any, TypeVar, cast

F = TypeVar("F", bound=Callable[..., Any])

# Which rooms' kernels a room's kernels may call: an edit in one must not make another's stale.
_REACH = {
    "bills": ("bills",),
    "weather": ("weather",),
    "fitting": ("fitting",),
    "savings": ("fitting", "savings"),
    "program": ("bills", "weather", "fitting", "savings", "program"),
}


def kernel_hash(room: str) -> str:
    """Twelve hex digits that change when a kernel within reach, the compiler or a switch does."""
    import numba
    import numpy

    digest = hashlib.sha256()
    here = Path(__file__).parent
    for file in [here / "jit.py", *_kernel_files(here, _REACH[room])]:
        digest.update(file.name.encode())
        digest.update(file.read_bytes())
    versions = (numba.__version__, numpy.__version__, sys.version)
    digest.update(repr((versions, os.environ.get("NUMBA_BOUNDSCHECK", ""))).encode())
    return digest.hexdigest()[:12]


def _kernel_files(package: Path, rooms: tuple[str, ...]) -> list[Path]:
    return [
        file
        for room in rooms
        for file in sorted((package / room).glob("*.py"))
        if b"normalize.jit" in file.read_bytes()
    ]


def _writable(folder: Path) -> bool:
    probe = folder / f".probe-{os.getpid()}"
    try:
        folder.mkdir(parents=True, exist_ok=True)
        probe.write_bytes(b"")
        probe.unlink()
    except OSError:
        return False
    return True


def _user_cache() -> Path | None:
    home = os.environ.get("XDG_CACHE_HOME") or os.environ.get("LOCALAPPDATA")
    try:
        base = Path(home) if home else Path.home() / ".cache"
    except RuntimeError:  # no home folder at all
        return None
    return base / "normalize"


def cache_folder(room: str) -> Path | None:
    """The folder that holds a room's compiled kernels, or None when no place can be written."""
    name = f"kernels-{room}-{kernel_hash(room)}"
    beside = Path(__file__).parent / "__pycache__" / name
    user = _user_cache()
    for folder in (beside, user / name if user else None):
        if folder is not None and (_holds_kernels(folder) or _writable(folder)):
            return folder
    return None


def _holds_kernels(folder: Path) -> bool:
    return folder.is_dir() and os.access(folder, os.W_OK)


_folders: dict[str, Path | None] = {}


def _folder_once(room: str) -> Path | None:
    if room not in _folders:
        _folders[room] = cache_folder(room)
        if _folders[room] is None and list(_folders.values()).count(None) == 1:
            print(
                "normalize: no folder can be written for compiled code, so each run prepares "
                "anew (about a minute). Set XDG_CACHE_HOME to a folder you may write to.",
                file=sys.stderr,
            )
    return _folders[room]


def kernels_are_ready() -> bool:
    """Whether compiled kernels are already on disk, so that a first run can say "preparing"."""
    folder = cache_folder("savings")
    return folder is not None and folder.is_dir() and any(folder.rglob("*compare_batch*.nbi"))


def kernel(function: F) -> F:
    """Compile a function under the rules for kernels: cached, serial, no GIL, IEEE arithmetic.

    One signature each: callers coerce at the gate (C-contiguous arrays, one dtype each).
    """
    import numba
    from numba.core import config

    folder = _folder_once(function.__module__.split(".")[1])
    before = config.CACHE_DIR
    try:
        if folder is not None:
            config.CACHE_DIR = str(folder)
        compiled = numba.njit(
            cache=folder is not None,
            nogil=True,
            error_model="numpy",
            fastmath=False,
            parallel=False,
        )(function)
    finally:
        config.CACHE_DIR = before
    return cast(F, compiled)
