"""Measuring cells on a few processes; each result is kept, so that a run can be taken up again."""

from __future__ import annotations

import hashlib
import json
import os
import sys
import time
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import ProcessPoolExecutor, as_completed
from dataclasses import asdict, dataclass
from multiprocessing import get_context
from pathlib import Path
from typing import Any, Generic, Protocol, Self, TypeVar

from tests.prove.calibration.cells import Cell
from tests.prove.calibration.choice import Choice, compare_ways
from tests.prove.calibration.measures import Result, measure

HERE = Path(__file__).parent
SIMULATORS = ("cells", "errors", "climates", "loads", "homes", "answers")


class Kept(Protocol):
    """A result that can be written down and read again."""

    def as_json(self) -> dict[str, object]: ...

    @classmethod
    def from_json(cls, data: dict[str, object]) -> Self: ...


R = TypeVar("R", bound=Kept)


@dataclass(frozen=True)
class Work(Generic[R]):
    """Something measured cell by cell. makers : modules whose change makes results stale."""

    name: str
    do: Callable[[Cell, int], R]
    result: type[R]
    makers: tuple[str, ...]


COVERAGE = Work("coverage", measure, Result, (*SIMULATORS, "guideline", "measures"))
CHOICE = Work("choice", compare_ways, Choice, (*SIMULATORS, "choice"))


def cache_folder() -> Path:
    """Outside the project: $XDG_CACHE_HOME or ~/.cache, then normalize/calibration."""
    home = os.environ.get("XDG_CACHE_HOME")
    return (Path(home) if home else Path.home() / ".cache") / "normalize" / "calibration"


def version(makers: Sequence[str]) -> str:
    """Twelve hex digits that change with the kernels or with what simulates and counts."""
    from normalize.jit import kernel_hash

    digest = hashlib.sha256(kernel_hash("savings.kernel").encode())
    for name in makers:
        digest.update((HERE / f"{name}.py").read_bytes())
    return digest.hexdigest()[:12]


def results_of(
    work: Work[R],
    cells: Sequence[Cell],
    homes: int,
    *,
    processes: int = 2,
    cache: Path | None = None,
) -> dict[Cell, R]:
    """Every cell measured, from the cache where it is there; dearest first."""
    folder = (cache or cache_folder()) / f"{work.name}-{version(work.makers)}"
    folder.mkdir(parents=True, exist_ok=True)
    out: dict[Cell, R] = {}
    todo = []
    for cell in dict.fromkeys(cells):
        file = folder / _name(cell, homes)
        if file.exists():
            out[cell] = work.result.from_json(json.loads(file.read_text("utf-8")))
        else:
            todo.append(cell)
    todo.sort(key=lambda c: -c.bills * (1 if c.form == "flat" else 3))
    begin = time.perf_counter()
    for done, (cell, result) in enumerate(_measured(work, todo, homes, processes), start=1):
        _keep(folder / _name(cell, homes), result.as_json())
        out[cell] = result
        spent = time.perf_counter() - begin
        said = f"{work.name}: {done} of {len(todo)} cells, {spent:.0f} s"
        print(said, file=sys.stderr, flush=True)
    return {cell: out[cell] for cell in dict.fromkeys(cells)}


def _measured(
    work: Work[R], cells: Sequence[Cell], homes: int, processes: int
) -> Iterator[tuple[Cell, R]]:
    """Cells as they are done; in this process where one is enough."""
    if processes == 1 or not cells:
        yield from ((cell, work.do(cell, homes)) for cell in cells)
        return
    with ProcessPoolExecutor(processes, mp_context=get_context("spawn")) as pool:
        waiting = {pool.submit(work.do, cell, homes): cell for cell in cells}
        for future in as_completed(waiting):
            yield waiting[future], future.result()


def _name(cell: Cell, homes: int) -> str:
    text = repr(sorted(asdict(cell).items()))
    return f"{hashlib.sha256(text.encode()).hexdigest()[:20]}-{homes}.json"


def _keep(file: Path, data: dict[str, Any]) -> None:
    new = file.with_suffix(f".{os.getpid()}")
    new.write_text(json.dumps(data), "utf-8")
    new.replace(file)
