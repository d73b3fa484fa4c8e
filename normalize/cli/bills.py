"""``normalize bills FILE``: how a file of bills was understood and repaired."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import click

from normalize.cli.console import patience, show
from normalize.cli.options import FILE, STDOUT, json_option, write_json
from normalize.cli.tables import paragraph, table

if TYPE_CHECKING:
    from normalize.bills.periods import Bills

LEFT_OUT = "left out"


@click.command(
    "bills",
    epilog="Example: normalize bills gas.csv --fuel 'natural gas' --unit therm",
    short_help="How a file of bills was understood and repaired.",
)
@click.argument("file", type=FILE)
@click.option("--fuel", metavar="NAME", help="Where the file does not say: natural gas, …")
@click.option("--unit", metavar="NAME", help="Where the file does not say: therm, kWh, gal, …")
@click.option(
    "--dates",
    type=click.Choice(["month first", "day first", "year first"]),
    help="The order of dates such as 01/02/2023.",
)
@click.option(
    "--end-dates",
    type=click.Choice(["exclusive", "inclusive"]),
    help="Whether an end date is the day of the reading or the last day of the bill.",
)
@click.option("--start-column", metavar="NAME", help="The column in which a bill starts.")
@click.option("--end-column", metavar="NAME", help="The column of ends or of readings.")
@click.option("--days-column", metavar="NAME", help="The column of days.")
@click.option("--usage-column", metavar="NAME", help="The column of use.")
@click.option("--cost-column", metavar="NAME", help="The column of cost.")
@click.option("--estimated-column", metavar="NAME", help="The column that marks estimates.")
@click.option("--temperature-column", metavar="NAME", help="The column of mean temperature.")
@click.option("--temperature-unit", type=click.Choice(["F", "C"]), help="The unit of that column.")
@click.option("--sheet", metavar="NAME", help="The sheet of a workbook.")
@click.option("--kind", type=click.Choice(["meter", "delivery"]), help="Readings or deliveries.")
@click.option("--net-metered", is_flag=True, help="Use may be below zero (solar panels).")
@click.option("--rows", metavar="NAME", help="Which account, meter or fuel, where several.")
@click.option("--decimal", type=click.Choice(["point", "comma"]), help="How decimals are written.")
@click.option(
    "--write",
    "write_to",
    metavar="FILE",
    type=FILE,
    help="Also write the cleaned periods as CSV to a new FILE.",
)
@json_option
def command(
    file: Path,
    fuel: str | None,
    unit: str | None,
    dates: str | None,
    end_dates: str | None,
    start_column: str | None,
    end_column: str | None,
    days_column: str | None,
    usage_column: str | None,
    cost_column: str | None,
    estimated_column: str | None,
    temperature_column: str | None,
    temperature_unit: str | None,
    sheet: str | None,
    kind: str | None,
    net_metered: bool,
    rows: str | None,
    decimal: str | None,
    write_to: Path | None,
    json_to: str | None,
) -> None:
    """Show how FILE (CSV or XLSX) was understood: its periods, and what became of every bill.

    Options answer what the file leaves open; in site.toml they are keys of [[account]], with _
    for -.
    """
    from normalize.bills.read import read_bills

    with patience():
        bills = read_bills(
            file,
            fuel=fuel,
            unit=unit,
            account=file.stem,
            dates=dates,
            end_dates=end_dates,
            usage_column=usage_column,
            start_column=start_column,
            end_column=end_column,
            days_column=days_column,
            cost_column=cost_column,
            estimated_column=estimated_column,
            temperature_column=temperature_column,
            temperature_unit=temperature_unit,
            sheet=sheet,
            kind=kind,
            net_metered=net_metered,
            rows=rows,
            decimal=decimal,
        )
    if write_to is not None:
        from normalize.bills.write import write_periods

        write_periods(bills, write_to)
    if json_to is not None:
        write_json(to_json(bills), json_to, inputs=(file,))
    if json_to != STDOUT:
        show(to_text(bills))


def to_text(bills: Bills) -> str:
    """What was read, the periods, and the rows that did not simply become one."""
    from normalize.report.numbers import mask

    blocks = [
        f"{bills.fuel}, in {bills.unit}",
        "How the file was understood:\n"
        + "\n".join(paragraph(mask(f"{text}."), indent="  ") for text in bills.reading),
        _periods(bills),
        *(f"Caution: {paragraph(mask(text))}" for text in bills.cautions),
        _ledger(bills),
    ]
    return "\n\n".join(blocks)


def _periods(bills: Bills) -> str:
    from normalize.days import iso
    from normalize.report.numbers import plain

    p = bills.periods
    marks = [
        ", ".join(
            word
            for word, holds in (
                (f"{int(p.joined[i])} bills joined", p.joined[i] > 1),
                ("ends on an estimate", p.estimated[i]),
            )
            if holds
        )
        for i in range(p.n)
    ]
    rows = [
        [
            str(i + 1),
            iso(int(p.start[i])),
            iso(int(p.end[i])),
            str(int(p.days[i])),
            plain(float(p.use[i]), 1),
            plain(float(p.use[i] / p.days[i]), 2),
            plain(float(p.cost[i]), 2),
            marks[i],
        ]
        for i in range(p.n)
    ]
    head = ["period", "start", "end", "days", bills.unit, "a day", "cost", ""]
    days, use = int(p.days.sum()), plain(float(p.use.sum()), 1)
    return f"{table(head, rows, left=3)}\n\n{p.n} periods, {days} days, {use} {bills.unit}"


def _ledger(bills: Bills) -> str:
    from normalize.report.numbers import mask

    left_out = {(e.file, e.line) for e in bills.ledger if e.fate == LEFT_OUT}
    noted = [e for e in bills.ledger if e.note]
    count = f"{len(bills.rows)} rows, {len(left_out)} of them left out"
    if not noted:
        return f"Ledger: {count}; every row became a period as it was."
    lines = [paragraph(mask(f"{e.file}:{e.line}: {e.fate}: {e.note}"), indent="  ") for e in noted]
    return f"Ledger: {count}. What was done:\n" + "\n".join(lines)


def to_json(bills: Bills) -> str:
    """The same as JSON, schema 1; unknown numbers are null."""
    import json
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
    whole = {
        "schema": 1,
        "fuel": bills.fuel,
        "unit": bills.unit,
        "kind": bills.kind,
        "reading": list(bills.reading),
        "periods": periods,
        "ledger": ledger,
        "cautions": list(bills.cautions),
        "source": [{"file": name, "sha256": digest} for name, digest in bills.source],
    }
    return json.dumps(whole, indent=2, ensure_ascii=False, allow_nan=False)
