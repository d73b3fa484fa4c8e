"""``normalize plan FOLDER``: will a saving show, and after how many bills?"""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Final

import click

from normalize.cli.console import patience, say, show
from normalize.cli.options import FILE, FOLDER, STDOUT, Confidence, json_option, write_json
from normalize.cli.tables import paragraph, table
from normalize.defaults import CONFIDENCE
from normalize.errors import SiteError, UnwritableReport

if TYPE_CHECKING:
    from normalize.plan import Outlook, SiteOutlook

LEAST: Final = 0.005  # nobody could tell less
MOST: Final = 0.95


class Share(click.ParamType[float]):
    """A share of use in per cent (12%) or as a fraction below one (0.12)."""

    name = "share"

    def convert(
        self, value: object, param: click.Parameter | None, ctx: click.Context | None
    ) -> float:
        """The fraction; a bare number of one or more is asked about, never guessed."""
        text = str(value).strip()
        percent = text.endswith("%")
        try:
            number = float(text.removesuffix("%").strip())
        except ValueError:
            self.fail(f"{text!r} is no share: write 12% or 0.12.", param, ctx)
        if not percent and number >= 1.0:
            self.fail(
                f"{text!r} could be per cent or something else: write {text}% if it is per cent.",
                param,
                ctx,
            )
        number = number / 100.0 if percent else number
        if not LEAST <= number <= MOST:
            self.fail(
                f"{text!r} is out of range: a saving from {LEAST:.1%} to {MOST:.0%} of use can "
                "be asked for.",
                param,
                ctx,
            )
        return number


@click.command(
    "plan",
    epilog="Example: normalize plan my-house --saving 12%",
    short_help="Will a saving show? After how many bills, from the bills before the work.",
)
@click.argument("folder", type=FOLDER)
@click.option(
    "--saving",
    type=Share(),
    metavar="SHARE",
    help="The saving hoped for, as a share of use: 12% or 0.12.",
)
@click.option("--account", metavar="NAME", help="Only this account of site.toml.")
@click.option(
    "--confidence",
    type=Confidence(),
    default=CONFIDENCE,
    show_default=True,
    help="How sure the range will be, two-sided: 0.9 or 90%.",
)
@click.option(
    "--picture",
    "picture_to",
    metavar="FILE",
    type=FILE,
    help="Also draw the smallest saving against the number of bills, as SVG to FILE.",
)
@json_option
def command(
    folder: Path,
    saving: float | None,
    account: str | None,
    confidence: float,
    picture_to: Path | None,
    json_to: str | None,
) -> int | None:
    """Say how small a saving could be told from no change after 3 to 36 more bills.

    Only the bills of FOLDER before the work are used; site.toml need not name any work. What
    decides is how those bills scatter about their fit, and the weather to come. Exit code 1
    when nothing can be said of any account.
    """
    from normalize.plan import outlook
    from normalize.site import read_site

    with patience():
        site = read_site(folder)
        found = _only(outlook(site, confidence=confidence), account)
    inputs = tuple(site.folder / name for name, _ in site.inputs)
    if json_to != STDOUT:
        show(to_text(found, saving))
    if picture_to is not None:
        _draw(found, saving, picture_to, inputs)
    if json_to is not None:
        from normalize.report.outlook import to_json

        write_json(to_json(found, saving), json_to, inputs=inputs)
    if any(not a.unavailable for a in found.accounts):
        return None
    say("nothing can be said of any account; the reasons are given with the result")
    return 1


def _only(found: SiteOutlook, account: str | None) -> SiteOutlook:
    """The outlook of one account, where one is named."""
    if account is None:
        return found
    mine = tuple(a for a in found.accounts if a.account == account)
    if not mine:
        names = ", ".join(a.account for a in found.accounts)
        raise SiteError(
            f"there is no account {account!r}", where="--account", wanted=f"one of {names}"
        )
    return replace(found, accounts=mine)


def to_text(found: SiteOutlook, saving: float | None) -> str:
    """The sentences of every account, its table, and what they rest on."""
    from normalize.report import outlook as words
    from normalize.report.numbers import mask, name

    blocks = [mask(name(found.site.name))]
    for account in found.accounts:
        lines = words.sentences(account, found.confidence, saving)
        blocks.append("\n".join(paragraph(mask(s)) for s in lines))
        grid = words.table_of(account)
        if grid is not None:
            blocks.append(paragraph(f"{grid.caption}:") + "\n\n" + _grid(grid.rows))
    if any(a.prospects for a in found.accounts):
        blocks += [paragraph(words.ODDS), paragraph(words.SAME_SHARE)]
    return "\n\n".join(blocks)


def _grid(rows: tuple[tuple[str, ...], ...]) -> str:
    """The table, with the two kinds of saving named over their columns."""
    head = ("more bills", "until", "even odds", "4 in 5", "even odds", "4 in 5")
    lines = table(head, rows, left=0).splitlines()
    wide = [len(part) for part in lines[1].split("  ")]
    first = sum(wide[:2]) + 4
    second = sum(wide[2:4]) + 4
    over = " " * first + "avoided use".ljust(second) + "normal year"
    return "\n".join(f"  {line}" for line in (over, *lines))


def _draw(found: SiteOutlook, saving: float | None, path: Path, inputs: tuple[Path, ...]) -> None:
    from normalize.report.figure_outlook import outlook_figure

    known: list[Outlook] = [a for a in found.accounts if a.prospects]
    if path.suffix.lower() != ".svg":
        raise UnwritableReport(
            f"{path.suffix or 'no ending'} is no kind of picture",
            where=path.name,
            wanted="a name that ends in .svg",
        )
    if len(known) > 1:
        names = ", ".join(a.account for a in known)
        raise UnwritableReport(
            f"a picture shows one account, and there are {len(known)}",
            where=path.name,
            next_step=f"Name one with --account: {names}.",
        )
    if path.exists() and any(i.exists() and path.samefile(i) for i in inputs):
        raise UnwritableReport(
            "this is one of the inputs", where=path.name, next_step="Choose another name."
        )
    drawn = outlook_figure(known[0], saving, "outlook") if known else None
    if drawn is None:
        raise UnwritableReport("there is nothing to draw", where=path.name)
    write_json(drawn.standalone(), str(path))
