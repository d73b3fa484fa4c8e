"""Options and outputs that several commands share."""

from __future__ import annotations

import os
import sys
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

import click

from normalize.cli.console import patience
from normalize.errors import UnwritableReport

if TYPE_CHECKING:
    from collections.abc import Callable

    from normalize.site import Site, SiteResult

FOLDER: Final = click.Path(path_type=Path)
FILE: Final = click.Path(path_type=Path)
STDOUT: Final = "-"


def json_option(command: Callable[..., Any]) -> Callable[..., Any]:
    """``--json FILE``, or ``--json -`` for standard output instead of the text."""
    return click.option(
        "--json",
        "json_to",
        metavar="FILE",
        help="Write the result as JSON to FILE; - writes it to standard output instead of the "
        "text.",
    )(command)


class Confidence(click.ParamType[float]):
    """A confidence as a fraction (0.9) or in per cent (90%)."""

    name = "confidence"

    def convert(
        self, value: object, param: click.Parameter | None, ctx: click.Context | None
    ) -> float:
        """The fraction; usage error when it is none."""
        text = str(value).strip()
        try:
            number = float(text.removesuffix("%")) / (100.0 if text.endswith("%") else 1.0)
        except ValueError:
            number = float("nan")
        if not 0.5 <= number <= 0.999:
            self.fail(
                f"{text!r} is no confidence: write a fraction such as 0.9, or 90%, "
                "from 0.5 to 0.999.",
                param,
                ctx,
            )
        return number


def write_json(text: str, target: str, *, inputs: tuple[Path, ...] = ()) -> None:
    """Write JSON to a file or, for ``-``, to standard output.

    Raises UnwritableReport; an input is never written over.
    """
    if not text.endswith("\n"):
        text += "\n"
    if target == STDOUT:
        sys.stdout.write(text)
        return
    path = Path(target)
    if path.exists() and any(i.exists() and path.samefile(i) for i in inputs):
        raise UnwritableReport(
            "this is one of the inputs", where=target, next_step="Choose another file for --json."
        )
    try:
        # Written beside and moved, so that nobody reads half a result.
        part = path.with_name(f".{path.name[:50]}.{os.getpid()}.part")
        try:
            part.write_text(text, encoding="utf-8", newline="\n")
            part.replace(path)
        finally:
            part.unlink(missing_ok=True)
    except (OSError, ValueError) as error:
        reason = error.strerror if isinstance(error, OSError) else "no name for a file"
        raise UnwritableReport(f"cannot be written ({reason})", where=target) from None


def assess_folder(
    folder: Path, *, confidence: float, sensitivity: bool = False, without_work: bool = False
) -> SiteResult:
    """Read and assess a site, with a word when the first run takes longer."""
    from normalize.site import assess, read_site

    with patience():
        site = read_site(folder)
        if without_work and not site.upgrades:
            site = _all_before(site)
        result = assess(site, confidence=confidence)
        if sensitivity:
            from dataclasses import replace

            from normalize.sensitivity import how_far

            result = replace(result, moved=how_far(site, result))
        return result


NO_WORK = "no work named"  # stands for the upgrade that a site without one does not have


def _all_before(site: Site) -> Site:
    """The site as if work came after its last bill: every bill then stands before it."""
    from dataclasses import replace

    from normalize.sitefile import Upgrade

    ends = [int(b.periods.end.max()) for b in site.bills if b is not None and b.periods.n]
    last = max(ends, default=0)
    return replace(site, upgrades=(Upgrade(NO_WORK, last, last + 1),))


def input_files(result: SiteResult) -> tuple[Path, ...]:
    """The files that a site was read from."""
    site = result.site
    return tuple(site.folder / name for name, _ in site.inputs)
