"""The command line, run as a person runs it and as a function."""

from __future__ import annotations

import os
import subprocess
import sys
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import pytest

from normalize.cli.main import main

ROOT = Path(__file__).parents[2]


@dataclass(frozen=True)
class Ran:
    code: int
    out: str
    err: str


@pytest.fixture
def run(capsys: pytest.CaptureFixture[str]) -> Callable[..., Ran]:
    """main() in this process."""

    def call(*args: str | Path) -> Ran:
        capsys.readouterr()
        code = main([str(arg) for arg in args])
        captured = capsys.readouterr()
        return Ran(code, captured.out, captured.err)

    return call


@pytest.fixture
def process() -> Callable[..., Ran]:
    """``python -m normalize`` in a process of its own; env : added to this one's."""

    def call(*args: str | Path, env: dict[str, str] | None = None) -> Ran:
        done = subprocess.run(
            [sys.executable, "-m", "normalize", *map(str, args)],
            capture_output=True,
            cwd=ROOT,
            env={**os.environ, "PYTHONPATH": str(ROOT), **(env or {})},
            stdin=subprocess.DEVNULL,
        )
        return Ran(
            done.returncode,
            done.stdout.decode("utf-8", "backslashreplace"),
            done.stderr.decode("utf-8", "backslashreplace"),
        )

    return call
