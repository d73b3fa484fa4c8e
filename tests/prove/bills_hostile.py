"""Seconds and memory that hostile bill files cost, each in a process of its own.

``python -m tests.prove.bills_hostile`` prints a table for docs/evidence-bills.md.  Memory is the
peak of the process (Linux), which with the libraries alone is the first line.
"""

from __future__ import annotations

import subprocess
import sys
import tempfile
from pathlib import Path

from tests.bills.hostile import MAKERS

_READ = """
import re, sys, time
from pathlib import Path
from normalize.bills.read import read_bills
from normalize.errors import NormalizeError
import normalize.bills.intervals, normalize.bills.table_bills, normalize.bills.espi, openpyxl
begin = time.perf_counter()
try:
    word = f"read, {read_bills(sys.argv[1]).periods.n} periods" if len(sys.argv) > 1 else "nothing"
except NormalizeError as err:
    word = str(err)[:70]
took = time.perf_counter() - begin
peak = int(re.search(r"VmHWM:\\s+(\\d+)", Path("/proc/self/status").read_text())[1]) / 1024
print(f"{took:.2f}|{peak:.0f}|{word}")
"""


def prove() -> str:
    """The table, as Markdown."""
    lines = [
        "| file | s | peak MB | what was said |",
        "| --- | --: | --: | --- |",
        _row("(no file)", []),
    ]
    with tempfile.TemporaryDirectory() as folder:
        file = Path(folder) / "bills.csv"
        for name, make in MAKERS.items():
            make(file)
            lines.append(_row(name, [str(file)]))
    return "\n".join(lines)


def _row(name: str, arguments: list[str]) -> str:
    ran = subprocess.run(
        [sys.executable, "-c", _READ, *arguments],
        capture_output=True, text=True, timeout=300, check=False,
    )  # fmt: skip
    last = (ran.stderr.strip().splitlines() or ["no word"])[-1][:70]
    seconds, memory, word = (ran.stdout.strip() or f"–|–|fault: {last}").split("|", 2)
    return f"| {name} | {seconds} | {memory} | {word.replace('|', '/')} |"


if __name__ == "__main__":
    print(prove())
