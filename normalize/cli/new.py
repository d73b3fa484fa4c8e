"""``normalize new FOLDER``: start a folder for a new site."""

from __future__ import annotations

from pathlib import Path

import click

from normalize.cli.console import show
from normalize.cli.options import FOLDER


@click.command(
    "new",
    epilog="Example: normalize new my-house",
    short_help="Start a folder for a new site.",
)
@click.argument("folder", type=FOLDER)
def command(folder: Path) -> None:
    """Write FOLDER with a commented site.toml and a template for bills (CSV and XLSX).

    Nothing that is there already is written over.
    """
    from normalize.sitefile import write_new_site

    for path in write_new_site(folder):
        show(f"wrote {path}")
    show(
        f"\nNext: fill in {folder / 'site.toml'} and the bills, add the weather of a station near "
        f"by as station.csv,\nthen type: normalize savings {folder}"
    )
