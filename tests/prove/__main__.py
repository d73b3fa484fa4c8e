"""Run every proof and write docs/evidence.md with date, machine and versions."""

from __future__ import annotations

import importlib
import os
import platform
import sys
import time
from datetime import UTC, datetime
from importlib.metadata import version
from pathlib import Path

HERE = Path(__file__).parent
EVIDENCE = HERE.parent.parent / "docs" / "evidence.md"
PACKAGES = ("numpy", "numba", "scipy", "statsmodels", "pandas")


def heading() -> str:
    """When, where and with what the figures were measured."""
    versions = ", ".join(f"{name} {version(name)}" for name in PACKAGES)
    today = datetime.now(UTC).date().isoformat()
    return (
        "# Evidence\n\n"
        "Written by `make prove`; nothing here is typed by hand.\n\n"
        f"Measured on {today}: {platform.machine()}, {os.cpu_count()} cores, "
        f"Python {platform.python_version()}, {versions}.\n"
    )


def main(names: list[str]) -> int:
    """Run the named proofs, or all, and write the page."""
    modules = names or sorted(
        p.stem for p in HERE.glob("*.py") if p.stem not in ("__init__", "__main__")
    )
    parts = [heading()]
    for name in modules:
        begin = time.perf_counter()
        print(f"{name} …", file=sys.stderr, flush=True)
        module = importlib.import_module(f"tests.prove.{name}")
        if not hasattr(module, "prove"):  # run by its own name; writes its own page
            continue
        parts.append(module.prove())
        print(f"{name}: {time.perf_counter() - begin:.0f} s", file=sys.stderr, flush=True)
    EVIDENCE.write_text("\n".join(parts), encoding="utf-8")
    return 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
