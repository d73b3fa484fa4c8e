"""The rooms and the arrows between them, read from the source: imports go only downward."""

from __future__ import annotations

import ast
from pathlib import Path

import pytest

PACKAGE = Path(__file__).parents[1] / "normalize"

# From the bottom up.  A module imports from floors below its own, and from its own floor only
# within its own room.
FLOORS = (
    ("errors",),
    ("days", "defaults"),
    ("jit", "units", "text_files"),
    ("bills", "weather"),
    ("fitting",),
    ("savings",),
    ("sitefile",),
    ("site",),
    ("program",),
    ("report",),
    ("cli", "page"),
)
FLOOR = {room: number for number, rooms in enumerate(FLOORS) for room in rooms}
SAME_ROOM = {
    "account": "site",
    "sensitivity": "site",
    "plan": "site",
    "site_drivers": "site",
    "account_drivers": "site",
}  # parts of a site's job, in files of their own
ENTRANCES = {"__init__", "__main__"}  # of the package itself: doors to everything, lazily

MAX_LINES = 600  # the aim is 400
FAR_TOO_HEAVY = {"statsmodels"}  # 0.7 s and more: only inside the functions that need it
HEAVY = {"pandas", "statsmodels", "matplotlib", "openpyxl", "jinja2", "fpdf", "scipy"}
SAVINGS_PATH = ("errors", "days", "defaults", "jit", "units", "text_files", "bills", "weather",
                "fitting", "savings", "sitefile", "site")  # fmt: skip
LIGHT = ("cli", "sitefile", "errors", "days", "defaults", "units")  # no science when imported
SCIENCE = HEAVY | {"numpy", "numba"}


def modules() -> list[Path]:
    return sorted(PACKAGE.rglob("*.py"))


def room_of(path: Path) -> str:
    name = path.relative_to(PACKAGE).with_suffix("").parts[0]
    return SAME_ROOM.get(name, name)


def is_type_checking(node: ast.AST) -> bool:
    return (
        isinstance(node, ast.If)
        and isinstance(node.test, ast.Name)
        and node.test.id == "TYPE_CHECKING"
    )


def imports(path: Path, *, typing_too: bool = False, functions_too: bool = True) -> set[str]:
    """Dotted names of the modules that a module imports."""
    found: set[str] = set()

    def visit(node: ast.AST) -> None:
        if is_type_checking(node) and not typing_too:
            assert isinstance(node, ast.If)
            for child in node.orelse:
                visit(child)
            return
        if isinstance(node, ast.FunctionDef | ast.AsyncFunctionDef) and not functions_too:
            return
        if isinstance(node, ast.Import):
            found.update(alias.name for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"{path}: write imports out in full"
            assert node.module is not None
            # "from normalize import units" names the module in the second part.
            if node.module == "normalize":
                found.update(f"normalize.{alias.name}" for alias in node.names)
            else:
                found.add(node.module)
        for child in ast.iter_child_nodes(node):
            visit(child)

    visit(ast.parse(path.read_text(encoding="utf-8")))
    return found


def rooms_imported(path: Path, *, typing_too: bool) -> set[str]:
    names = (name.split(".") for name in imports(path, typing_too=typing_too))
    rooms = {parts[1] for parts in names if parts[0] == "normalize" and len(parts) > 1}
    return {SAME_ROOM.get(room, room) for room in rooms} - {"__version__"}


def test_every_room_has_its_floor() -> None:
    known = set(FLOOR) | ENTRANCES
    assert {room_of(path) for path in modules()} <= known


@pytest.mark.parametrize("path", modules(), ids=lambda p: str(p.relative_to(PACKAGE)))
def test_imports_go_only_downward(path: Path) -> None:
    room = room_of(path)
    if room in ENTRANCES:
        return
    upward = {
        other
        for other in rooms_imported(path, typing_too=False)
        if other != room and FLOOR[other] >= FLOOR[room]
    }
    assert not upward, f"{path.name} in {room} imports {upward}"


@pytest.mark.parametrize("path", modules(), ids=lambda p: str(p.relative_to(PACKAGE)))
def test_types_may_come_from_the_same_floor_but_not_from_above(path: Path) -> None:
    room = room_of(path)
    if room in ENTRANCES:
        return
    above = {other for other in rooms_imported(path, typing_too=True) if FLOOR[other] > FLOOR[room]}
    assert not above, f"{path.name} in {room} takes types from {above}"


def test_the_checks_above_see_an_upward_import(tmp_path: Path) -> None:
    """A check that cannot fail is none: give it something to find."""
    file = tmp_path / "x.py"
    file.write_text(
        "from typing import TYPE_CHECKING\n"
        "if TYPE_CHECKING:\n    from normalize.bills import a\n"
        "def f():\n    from normalize import site\n"
    )
    assert rooms_imported(file, typing_too=False) == {"site"}
    assert rooms_imported(file, typing_too=True) == {"site", "bills"}


def test_report_reads_results_and_fitting_sees_no_file() -> None:
    for path in (PACKAGE / "fitting").rglob("*.py"):
        names = imports(path, typing_too=True)
        assert not names & {"pathlib", "csv", "io", "normalize.units"}, path.name
    for path in (PACKAGE / "report").rglob("*.py"):
        assert not {name for name in imports(path) if name.split(".")[0] in {"numba", "scipy"}}


@pytest.mark.parametrize("path", modules(), ids=lambda p: str(p.relative_to(PACKAGE)))
def test_modules_are_short_enough_to_read(path: Path) -> None:
    lines = len(path.read_text(encoding="utf-8").splitlines())
    assert lines <= MAX_LINES, f"{path.name} has {lines} lines: split it by its nouns"


def test_heavy_libraries_are_loaded_only_where_they_are_needed() -> None:
    for path in modules():
        at_import = {name.split(".")[0] for name in imports(path, functions_too=False)}
        assert not at_import & FAR_TOO_HEAVY, path
        if room_of(path) in SAVINGS_PATH:
            assert not at_import & HEAVY, f"{path}: import it inside the function that needs it"
        if room_of(path) in LIGHT or room_of(path) in ENTRANCES:
            assert not at_import & SCIENCE, path


def test_the_savings_path_never_loads_statsmodels() -> None:
    """It costs more than the whole calculation, so not even inside a function."""
    for path in modules():
        if room_of(path) in {*SAVINGS_PATH, "cli"}:
            assert "statsmodels" not in {name.split(".")[0] for name in imports(path)}, path
