"""``make bench``: every benchmark here, printed as a table of ratios.

A benchmark module offers ``measure() -> list[tuple[name, ratio, what]]``; what says which way
is good and what the peer was.  Nothing is compared across runs or machines.
"""

from __future__ import annotations

import importlib
import os
import platform
import sys
from pathlib import Path


def main(names: list[str]) -> int:
    """Run the named benchmarks, or all."""
    here = Path(__file__).parent
    modules = names or sorted(
        p.stem for p in here.glob("*.py") if p.stem not in ("run", "__init__")
    )
    print(f"{platform.machine()}, {os.cpu_count()} cores, Python {platform.python_version()}")
    for module in modules:
        print(f"\n{module}")
        for name, ratio, what in importlib.import_module(f"benchmarks.{module}").measure():
            print(f"  {name:<52} {ratio:>10.2f}   {what}")
    return 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
