"""How kernels are compiled: once, to a cache that knows when any kernel has changed.

numba checks only the file of the function it loads, so an edited helper in another module
would leave stale machine code behind.  Here each module has a cache folder whose name is a
hash of the module, of all it imports from this package, of numba, numpy and Python, and of
the bounds-check switch: an edit makes stale what is built on it and nothing else.  The folder
is beside the package if that can be written, else in the user's cache folder; else kernels are
compiled anew in every process, which is slow but right.
"""

from __future__ import annotations

import hashlib
import os
import re
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any, TypeVar, cast

F = TypeVar("F", bound=Callable[..., Any])

# A kernel module's imports from this package, at the top level: what its machine code holds.
_IMPORT = re.compile(rb"^from normalize\.([a-z_.0-9]+) import", re.MULTILINE)
# Modules whose words and settings never reach machine code (a test of the architecture).
NOT_COMPILED_IN = frozenset({"errors", "defaults"})


def kernel_hash(module: str) -> str:
    """Twelve hex digits that change when a module, one it imports, the compiler or a switch does.

    module : as ``savings.kernel``, without the package's name.  Constants of an imported
    module are compiled in, so every import counts, kernels in it or not.
    """
    import numba
    import numpy

    digest = hashlib.sha256()
    here = Path(__file__).parent
    for file in sorted(_reach(here, module)):
        digest.update(file.relative_to(here).as_posix().encode())
        digest.update(file.read_bytes())
    versions = (numba.__version__, numpy.__version__, sys.version)
    switches = [os.environ.get(name, "") for name in ("NUMBA_BOUNDSCHECK", "NUMBA_OPT")]
    digest.update(repr((versions, switches)).encode())
    return digest.hexdigest()[:12]


def _reach(package: Path, module: str) -> set[Path]:
    """The files of a module and of all that it imports from this package, directly or not."""
    found: set[Path] = set()
    ahead = [module]
    while ahead:
        file = package.joinpath(*ahead.pop().split(".")).with_suffix(".py")
        if file in found or not file.is_file():
            continue
        found.add(file)
        names = {name.decode() for name in _IMPORT.findall(file.read_bytes())}
        ahead += sorted(names - NOT_COMPILED_IN)
    return found


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


def cache_folder(module: str) -> Path | None:
    """The folder of a module's compiled kernels, or None when no place can be written."""
    name = f"kernels-{module}-{kernel_hash(module)}"
    beside = Path(__file__).parent / "__pycache__" / name
    user = _user_cache()
    for folder in (beside, user / name if user else None):
        if folder is not None and (_holds_kernels(folder) or _writable(folder)):
            return folder
    return None


def _holds_kernels(folder: Path) -> bool:
    return folder.is_dir() and os.access(folder, os.W_OK)


_folders: dict[str, Path | None] = {}


def _folder_once(module: str) -> Path | None:
    if module not in _folders:
        _folders[module] = cache_folder(module)
        if _folders[module] is None and list(_folders.values()).count(None) == 1:
            print(
                "normalize: no folder can be written for compiled code, so each run prepares "
                "anew (about a minute). Set XDG_CACHE_HOME to a folder you may write to.",
                file=sys.stderr,
            )
    return _folders[module]


def kernels_are_ready() -> bool:
    """Whether compiled kernels are already on disk, so that a first run can say "preparing"."""
    folder = cache_folder("savings.kernel")
    return folder is not None and folder.is_dir() and any(folder.rglob("*compare_batch*.nbi"))


def kernel(function: F) -> F:
    """Compile a function under the rules for kernels: cached, serial, no GIL, IEEE arithmetic.

    One signature each: callers coerce at the gate (C-contiguous arrays, one dtype each).
    """
    return _compiled(function, inline="never")


def part(function: F) -> F:
    """A kernel that is compiled as part of the one or two kernels that call it.

    A function's machine code is optimised again inside every caller, and theirs inside
    theirs: for large functions with a single caller that is most of the time to compile.
    """
    return _compiled(function, inline="always")


def _compiled(function: F, *, inline: str) -> F:
    import numba
    from numba.core import config

    folder = _folder_once(function.__module__.partition(".")[2])
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
            inline=inline,
        )(function)
    finally:
        config.CACHE_DIR = before
    return cast(F, compiled)
