"""The whole ``normalize savings`` run against a process that only imports two libraries."""

from __future__ import annotations

import os
import subprocess
import sys
import tempfile
import time
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent
REPEAT = 5
Row = tuple[str, float, str]


# An installed program has its modules compiled to bytecode; a shell may forbid that.
ENVIRONMENT = {k: v for k, v in os.environ.items() if k != "PYTHONDONTWRITEBYTECODE"}


def _seconds(command: list[str]) -> float:
    times = []
    for _ in range(REPEAT):
        begin = time.perf_counter()
        subprocess.run(command, check=True, capture_output=True, cwd=ROOT, env=ENVIRONMENT)
        times.append(time.perf_counter() - begin)
    return min(times)


def measure() -> list[Row]:
    """Least of several runs each, in turn on the same machine; kernels already compiled."""
    python = sys.executable
    peer = _seconds([python, "-c", "import pandas, matplotlib.pyplot"])
    out: list[Row] = [("import pandas, matplotlib.pyplot, s", peer, "the peer")]
    with tempfile.TemporaryDirectory() as folder:
        for site in ("quince_street", "harrow_farm", "mill_library"):
            base = [python, "-m", "normalize", "savings", f"sample_data/{site}"]
            report = [*base, "--report", str(Path(folder) / site)]
            subprocess.run(base, check=True, capture_output=True, cwd=ROOT, env=ENVIRONMENT)
            for name, command in (("answer", base), ("answer and report", report)):
                ratio = _seconds(command) / peer
                out.append((f"savings {site}, {name} ÷ peer", ratio, "2.5 at most"))
    bare = _seconds([python, "-c", "pass"])
    helped = _seconds([python, "-m", "normalize", "--help"])
    out.append(("normalize --help, s", helped, "0.15 at most"))
    out.append(("normalize --help ÷ python -c pass", helped / bare, "lower is better"))
    return out
