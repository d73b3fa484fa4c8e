"""Write the parts of the documents that are generated: ``python docs/generate.py``.

docs/cli.md comes from the commands' own help; the answer shown in README.md is a real run on
the sample data.  Tests fail when either is out of date.
"""

from __future__ import annotations

import os
import re
import subprocess
import sys
from pathlib import Path

import click

ROOT = Path(__file__).parents[1]
sys.path.insert(0, str(ROOT))  # works from the source tree, installed or not
CLI = ROOT / "docs" / "cli.md"
README = ROOT / "README.md"
BLOCK = re.compile(r"(<!-- begin: (normalize [^>]+) -->\n```text\n)(.*?)(```\n<!-- end -->)", re.S)

HEAD = """\
# Commands

Generated from the commands' own help by `python docs/generate.py`.

Exit codes: 0 done; 1 the input needs a person, and the message says where, what was found, what
was wanted and what to do next; 2 wrong usage; 130 interrupted. Results go to standard output,
messages to standard error. With `NORMALIZE_DEBUG=1` a fault of the program shows its traceback.
"""


def cli_reference() -> str:
    """docs/cli.md as it should be."""
    from normalize.cli.main import COMMANDS, cli

    parts = [HEAD, f"## normalize\n\n```text\n{_help(cli, 'normalize')}\n```\n"]
    top = click.Context(cli, info_name="normalize")
    for name in COMMANDS:
        command = cli.get_command(top, name)
        assert command is not None
        text = _help(command, f"normalize {name}")
        parts.append(f"## normalize {name}\n\n```text\n{text}\n```\n")
        for under, inner in sorted(getattr(command, "commands", {}).items()):
            whole = f"normalize {name} {under}"
            parts.append(f"## {whole}\n\n```text\n{_help(inner, whole)}\n```\n")
    return "\n".join(parts)


def _help(command: click.Command, name: str) -> str:
    context = click.Context(
        command,
        info_name=name,
        terminal_width=88,
        max_content_width=88,
        help_option_names=["-h", "--help"],
    )
    return command.get_help(context).rstrip()


def readme() -> str:
    """README.md with each marked block replaced by what its command prints."""
    return BLOCK.sub(lambda found: found[1] + run(found[2]) + found[4], README.read_text("utf-8"))


def run(command: str) -> str:
    """What a command prints, run from the project's folder."""
    words = command.split()
    assert words[0] == "normalize"
    until = None
    if words[-2] == "until":  # "normalize savings X until Statistics": the start of the output
        *words, _, until = words
    done = subprocess.run(
        [sys.executable, "-m", *words],
        cwd=ROOT,
        capture_output=True,
        text=True,
        encoding="utf-8",
        check=True,
        env={**os.environ, "PYTHONIOENCODING": "utf-8"},
    )
    lines = done.stdout.splitlines()
    if until is not None:
        lines = lines[: next(i for i, line in enumerate(lines) if line.startswith(until))]
    return "\n".join(lines).rstrip() + "\n"


if __name__ == "__main__":
    CLI.write_text(cli_reference(), encoding="utf-8", newline="\n")
    print(f"wrote {CLI}")
    README.write_text(readme(), encoding="utf-8", newline="\n")
    print(f"wrote {README}")
