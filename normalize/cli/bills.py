"""``normalize bills FILE``: how a file of bills was understood and repaired."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

import click

from normalize.cli.console import patience, show
from normalize.cli.options import FILE, STDOUT, json_option, write_json
from normalize.cli.tables import paragraph, table

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

    from normalize.bills.accounts import FileAccounts
    from normalize.bills.periods import Bills

LEFT_OUT = "left out"
MOST_PERIODS: Final = 60  # shown from either end of a long record
MOST_ENTRIES: Final = 200

# Options that answer what a file leaves open; the same keys under [[account]] keep the answers.
ANSWERS: Final = (
    click.option("--fuel", metavar="NAME", help="Where the file does not say: natural gas, …"),
    click.option("--unit", metavar="NAME", help="Where the file does not say: therm, kWh, gal, …"),
    click.option(
        "--dates",
        type=click.Choice(["month first", "day first", "year first"]),
        help="The order of dates such as 01/02/2023.",
    ),
    click.option(
        "--end-dates",
        type=click.Choice(["exclusive", "inclusive"]),
        help="Whether an end date is the day of the reading or the last day of the bill.",
    ),
    click.option("--start-column", metavar="NAME", help="The column in which a bill starts."),
    click.option("--end-column", metavar="NAME", help="The column of ends or of readings."),
    click.option("--days-column", metavar="NAME", help="The column of days."),
    click.option("--usage-column", metavar="NAME", help="The column of use."),
    click.option("--register-column", metavar="NAME", help="The column of meter readings."),
    click.option("--generation-column", metavar="NAME", help="What solar panels made, or none."),
    click.option("--cost-column", metavar="NAME", help="The column of cost."),
    click.option("--estimated-column", metavar="NAME", help="The column that marks estimates."),
    click.option("--temperature-column", metavar="NAME", help="The column of mean temperature."),
    click.option(
        "--temperature-unit", type=click.Choice(["F", "C"]), help="The unit of that column."
    ),
    click.option("--sheet", metavar="NAME", help="The sheet of a workbook."),
    click.option(
        "--kind", type=click.Choice(["meter", "delivery"]), help="Readings or deliveries."
    ),
    click.option("--rows", metavar="NAME", help="Which account, meter or fuel, where several."),
    click.option(
        "--decimal", type=click.Choice(["point", "comma"]), help="How decimals are written."
    ),
    click.option(
        "--read-day",
        metavar="DAY",
        help="For bills that name a month: the day on which the meter is read, or calendar.",
    ),
    click.option(
        "--time-zone",
        metavar="ZONE",
        help="Where readings are in UTC: America/New_York or -05:00.",
    ),
    click.option(
        "--sum-to",
        type=click.Choice(["day", "month", "bill"]),
        help="Interval data to days, months, or the bills that the file itself tells of.",
    ),
    click.option(
        "--periods-from",
        metavar="FILE",
        type=FILE,
        help="Interval data to the periods of the bills in another FILE.",
    ),
    click.option(
        "--generation",
        metavar="FILE",
        type=FILE,
        help="What solar panels made, to be added to net use; by days or by the same periods.",
    ),
    click.option("--solar-since", metavar="DATE", help="The panels' first day."),
    click.option(
        "--interval-times",
        type=click.Choice(["start", "end"]),
        help="Whether a time is the start or the end of its interval.",
    ),
    click.option("--multiplier", type=float, help="Of the meter whose readings are given."),
    click.option("--tank-size", type=float, help="What the full tank holds."),
    click.option(
        "--tank-percent",
        type=click.Choice(["before", "after"]),
        help="Whether levels of the tank are before or after the delivery.",
    ),
)


def _answers(command: Callable[..., Any]) -> Callable[..., Any]:
    for option in reversed(ANSWERS):
        command = option(command)
    return command


@click.command(
    "bills",
    epilog="Example: normalize bills gas.csv --fuel 'natural gas' --unit therm",
    short_help="How a file of bills was understood and repaired.",
)
@click.argument("file", type=FILE)
@_answers
@click.option("--net-metered", is_flag=True, help="Use may be below zero (solar panels).")
@click.option(
    "--picture",
    "picture_to",
    metavar="FILE",
    type=FILE,
    help="Also draw the bills on a time line, repairs marked, as SVG to a new FILE.",
)
@click.option(
    "--expect-total",
    metavar="USE",
    multiple=True,
    help="Check the sum of use against a total that is printed elsewhere; of several accounts "
    "5678=1074.8, once for each.",
)
@click.option(
    "--write",
    "write_to",
    metavar="FILE",
    type=FILE,
    help="Also write the cleaned periods as CSV to a new FILE.",
)
@click.option(
    "--full-numbers",
    is_flag=True,
    help="Write account numbers of a file of several in full (--write, --json).",
)
@json_option
def command(
    file: Path,
    *,
    net_metered: bool,
    picture_to: Path | None,
    expect_total: tuple[str, ...],
    write_to: Path | None,
    full_numbers: bool,
    json_to: str | None,
    **answers: Any,
) -> None:
    """Show how FILE (CSV, XLSX or ESPI XML) was understood: periods, and the fate of every bill.

    Several accounts, meters or fuels are shown one after the other, never added up; --rows
    names one. Options answer what the file leaves open; in site.toml they are keys of
    [[account]], with _ for -.
    """
    from normalize.bills.accounts import read_accounts

    with patience():
        found = read_accounts(file, account=file.stem, net_metered=net_metered, **answers)
    keep = lines_to_keep(answers, net_metered=net_metered)
    if found.alone is not None:
        outputs = _of_one(found.alone, keep)
    else:
        outputs = _of_several(found, keep, full_numbers=full_numbers)
    if write_to is not None:
        outputs.write(write_to)
    drawn = outputs.draw(picture_to) if picture_to is not None else ""
    if json_to is not None:
        write_json(outputs.json(), json_to, inputs=(file,))
    if json_to != STDOUT:
        show("\n\n".join(filter(None, [outputs.text(), drawn])))
    if found.alone is None and not found.bills:
        from normalize.cli.bill_accounts import none_read

        raise none_read(found)
    for said in outputs.check(expect_total) if expect_total else ():
        if json_to != STDOUT:
            show(f"\n{said}")


@dataclass(frozen=True)
class _Outputs:
    """What a command can do with bills, of one account or of several."""

    text: Callable[[], str]
    json: Callable[[], str]
    write: Callable[[Path], None]
    draw: Callable[[Path], str]
    check: Callable[[Sequence[str]], Sequence[str]]


def _of_one(bills: Bills, keep: list[str]) -> _Outputs:
    from normalize.bills.totals import check_total
    from normalize.bills.write import write_periods
    from normalize.report.figure_bills import write_bills_figure

    def draw(path: Path) -> str:
        write_bills_figure(bills, path)
        return ""

    return _Outputs(
        text=lambda: to_text(bills, keep=keep),
        json=lambda: to_json(bills),
        write=lambda path: write_periods(bills, path),
        draw=draw,
        check=lambda totals: [check_total(bills, total) for total in totals],
    )


def _of_several(found: FileAccounts, keep: list[str], *, full_numbers: bool) -> _Outputs:
    from normalize.bills.totals import check_totals
    from normalize.bills.write import write_accounts
    from normalize.cli import bill_accounts as several

    return _Outputs(
        text=lambda: several.to_text(found, keep),
        json=lambda: several.to_json(found, full_numbers=full_numbers),
        write=lambda path: write_accounts(found, path, full_numbers=full_numbers),
        draw=lambda path: several.write_pictures(found, path),
        check=lambda totals: check_totals(found, totals),
    )


def lines_to_keep(answers: dict[str, Any], *, net_metered: bool) -> list[str]:
    """The lines of site.toml that keep the answers given as options."""
    lines = []
    for key, value in answers.items():
        if value is None:
            continue
        number = isinstance(value, float) or (key == "read_day" and str(value).isdigit())
        text = f"{value:g}" if isinstance(value, float) else str(value)
        text = value.name if isinstance(value, Path) else text  # in the site's folder
        quoted = text.replace("\\", "\\\\").replace('"', '\\"')
        lines.append(f"{key} = {text}" if number else f'{key} = "{quoted}"')
    return [*lines, "net_metered = true"] if net_metered else lines


def to_text(bills: Bills, *, keep: list[str] | None = None) -> str:
    """What was read, the periods, and the rows that did not simply become one.

    keep : lines of site.toml that keep the answers.
    """
    from normalize.report.numbers import mask

    understood = "\n".join(paragraph(mask(f"{text}."), indent="  ") for text in bills.reading)
    blocks = [
        f"{bills.fuel}, in {bills.unit}",
        *([f"How the file was understood:\n{understood}"] if understood else []),
        _periods(bills),
        *([paragraph(f"Unfit for this method: {bills.unfit}")] if bills.unfit else []),
        *(f"Caution: {paragraph(mask(text))}" for text in bills.cautions),
        _ledger(bills),
    ]
    if keep:
        lines = "\n".join(f"  {mask(line)}" for line in keep)
        blocks.append(f"To keep these answers, put them under [[account]] in site.toml:\n{lines}")
    return "\n\n".join(blocks)


def _marks(bills: Bills, i: int) -> str:
    p = bills.periods
    words = [f"{int(p.joined[i])} bills joined"] if p.joined[i] > 1 else []
    words += ["ends on an estimate"] if p.estimated[i] else []
    flags = [f.what for f in bills.flags if f.period == i + 1 and f.what != "alternating"]
    return ", ".join([*words, *dict.fromkeys(f"{what}?" for what in flags)])


def _periods(bills: Bills) -> str:
    from normalize.bills.gaps import gap_words
    from normalize.days import iso
    from normalize.report.numbers import plain

    p = bills.periods
    rows = [
        [
            str(i + 1),
            iso(int(p.start[i])),
            iso(int(p.end[i])),
            str(int(p.days[i])),
            plain(float(p.use[i]), 1),
            plain(float(p.use[i] / p.days[i]), 2),
            plain(float(p.cost[i]), 2),
            _marks(bills, i),
        ]
        for i in range(p.n)
    ]
    if len(rows) > 2 * MOST_PERIODS:
        gap = [["…", "", "", "", "", "", "", f"{len(rows) - 2 * MOST_PERIODS} more"]]
        rows = rows[:MOST_PERIODS] + gap + rows[-MOST_PERIODS:]
    head = ["period", "start", "end", "days", bills.unit, "a day", "cost", ""]
    days, use = int(p.days.sum()), plain(float(p.use.sum()), 1)
    gaps = f"\n{paragraph(gap_words(p))}" if gap_words(p) else ""
    return f"{table(head, rows, left=3)}\n\n{p.n} periods, {days} days, {use} {bills.unit}{gaps}"


def _ledger(bills: Bills) -> str:
    from normalize.report.numbers import mask

    left_out = {(e.file, e.line) for e in bills.ledger if e.fate == LEFT_OUT}
    noted = [e for e in bills.ledger if e.note]
    count = f"{len(bills.rows)} rows, {len(left_out)} of them left out"
    if not noted:
        return f"Ledger: {count}; every row became a period as it was."
    more = len(noted) - MOST_ENTRIES
    noted = noted[:MOST_ENTRIES]
    lines = [paragraph(mask(f"{e.file}:{e.line}: {e.fate}: {e.note}"), indent="  ") for e in noted]
    if more > 0:
        lines.append(f"  … and {more} more; --json writes all of them.")
    return f"Ledger: {count}. What was done:\n" + "\n".join(lines)


def to_json(bills: Bills) -> str:
    """The same as JSON, schema 1; unknown numbers are null."""
    import json

    whole = {"schema": 1, **to_dict(bills)}
    return json.dumps(whole, indent=2, ensure_ascii=False, allow_nan=False)


def to_dict(bills: Bills) -> dict[str, Any]:
    """One account's bills as JSON has them."""
    import math

    from normalize.days import iso

    p = bills.periods
    periods = [
        {
            "number": i + 1,
            "start": iso(int(p.start[i])),
            "end": iso(int(p.end[i])),
            "days": int(p.days[i]),
            "use": float(p.use[i]),
            "cost": float(p.cost[i]) if math.isfinite(p.cost[i]) else None,
            "estimated": bool(p.estimated[i]),
            "joined": int(p.joined[i]),
        }
        for i in range(p.n)
    ]
    ledger = [
        {"file": e.file, "line": e.line, "fate": e.fate, "note": e.note} for e in bills.ledger
    ]
    return {
        "fuel": bills.fuel,
        "unit": bills.unit,
        "kind": bills.kind,
        "reading": list(bills.reading),
        "periods": periods,
        "ledger": ledger,
        "cautions": list(bills.cautions),
        "flags": [{"period": f.period, "what": f.what, "note": f.note} for f in bills.flags],
        "unfit": bills.unfit or None,
        "source": [{"file": name, "sha256": digest} for name, digest in bills.source],
    }
