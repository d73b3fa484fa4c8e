"""``normalize savings FOLDER``: the main job."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import click

from normalize.cli.console import console_width, only_ascii, say, show
from normalize.cli.options import (
    FOLDER,
    STDOUT,
    Confidence,
    assess_folder,
    input_files,
    json_option,
    write_json,
)
from normalize.defaults import CONFIDENCE

if TYPE_CHECKING:
    from normalize.site import SiteResult


@click.command(
    "savings",
    epilog="Example: normalize savings my-house --report my-house/report",
    short_help="How much less was used after an upgrade, in a normal year.",
)
@click.argument("folder", type=FOLDER)
@json_option
@click.option(
    "--report",
    "report_to",
    metavar="DIR",
    type=FOLDER,
    help="Also write DIR/report.html, with pictures, every bill and every check.",
)
@click.option(
    "--confidence",
    type=Confidence(),
    default=CONFIDENCE,
    show_default=True,
    help="How sure the ranges are, two-sided: 0.9 or 90%.",
)
@click.option(
    "--short", is_flag=True, help="Print the plain answer and its cautions, not the statistics."
)
@click.option(
    "--sensitivity",
    is_flag=True,
    help="Repeat the job with every other station and normal year that site.toml offers.",
)
@click.option(
    "--show-accounts",
    is_flag=True,
    help="Show account numbers and addresses in full; otherwise long numbers are masked.",
)
def command(
    folder: Path,
    json_to: str | None,
    report_to: Path | None,
    confidence: float,
    short: bool,
    sensitivity: bool,
    show_accounts: bool,
) -> int | None:
    """Say how much less (or more) was used after the work in FOLDER, in a normal year.

    FOLDER holds site.toml, which names the bills, the weather and the work. The plain answer
    comes first, with its range; the statistics follow. Exit code 1 when no account has an answer.
    """
    result = assess_folder(folder, confidence=confidence, sensitivity=sensitivity)
    from normalize.report.numbers import name

    if json_to != STDOUT:
        from normalize.report.text import to_text

        text = to_text(
            result,
            statistics=not short,
            width=console_width(),
            ascii=only_ascii(),
            show_accounts=show_accounts,
            subject=name(result.site.name),
        )
        show(text.rstrip("\n"))
    if report_to is not None:
        from normalize.report.html import write_html

        path = report_to / "report.html"
        write_html(result, path, show_accounts=show_accounts, subject=name(result.site.name))
        say(f"the report is {path}")
    if json_to is not None:
        from normalize.report.json import to_json

        write_json(to_json(result), json_to, inputs=input_files(result))
    return exit_code(result)


def exit_code(result: SiteResult) -> int | None:
    """1, with a word about it, when no account has any answer."""
    if any(account.has_answer for account in result.accounts):
        return None
    say("no account has an answer; the reasons are given with the result")
    return 1
