"""What the documents say is so: generated parts are current, examples run, links lead somewhere."""

from __future__ import annotations

import importlib.util
import re
from pathlib import Path
from types import ModuleType

import pytest

ROOT = Path(__file__).parents[1]
PAGES = sorted([*ROOT.glob("*.md"), *(ROOT / "docs").glob("*.md"), ROOT / "reports" / "README.md"])


@pytest.fixture(scope="module")
def generate() -> ModuleType:
    spec = importlib.util.spec_from_file_location("generate", ROOT / "docs" / "generate.py")
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


def test_the_reference_of_commands_is_current(generate: ModuleType) -> None:
    """If this fails: make docs."""
    assert generate.CLI.read_text(encoding="utf-8") == generate.cli_reference()


def test_the_answer_in_the_readme_is_a_real_one(generate: ModuleType) -> None:
    """If this fails: make docs."""
    text = generate.README.read_text(encoding="utf-8")
    (block,) = generate.BLOCK.findall(text)
    assert block[2].strip()
    assert text == generate.readme()


def test_the_python_in_the_readme_runs(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.chdir(ROOT)
    (code,) = re.findall(r"```python\n(.*?)```", (ROOT / "README.md").read_text("utf-8"), re.S)
    exec(compile(code, "README.md", "exec"), {})  # noqa: S102 - our own page
    lines = capsys.readouterr().out.splitlines()
    assert lines[0].startswith("gas ")
    assert lines[0].endswith(" therm")


@pytest.mark.parametrize("page", PAGES, ids=lambda p: str(p.relative_to(ROOT)))
def test_links_lead_to_files(page: Path) -> None:
    links = re.findall(r"\]\(([^)#]+)\)", page.read_text(encoding="utf-8"))
    inside = [link for link in links if "://" not in link]
    assert [link for link in inside if not (page.parent / link).exists()] == []


def test_every_verb_of_make_is_in_the_readme() -> None:
    makefile = (ROOT / "Makefile").read_text(encoding="utf-8")
    readme = (ROOT / "README.md").read_text(encoding="utf-8")
    verbs = set(re.findall(r"^#   make (\w+)", makefile, re.M))
    targets = set(re.findall(r"^(\w+):", makefile, re.M))
    assert verbs <= targets
    assert {verb for verb in verbs if f"`make {verb}`" not in readme} == set()


def test_the_glossary_names_every_form() -> None:
    from normalize.fitting.forms import FORMS

    glossary = (ROOT / "docs" / "glossary.md").read_text(encoding="utf-8")
    for form in FORMS.values():
        assert f"| {form.name} | {form.equation.removeprefix('use a day = ')} |" in glossary
