"""``normalize degree-days FILE``: tables by month, year or bill at any base."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Final

import click

from normalize.cli.console import show
from normalize.cli.options import FILE, STDOUT, json_option, write_json
from normalize.cli.tables import paragraph, table

if TYPE_CHECKING:
    from normalize.bills.periods import Periods
    from normalize.weather.degree_days import Base, DegreeDayRow, DegreeDayTable
    from normalize.weather.temperature import DailyTemperature


@click.command(
    "degree-days",
    epilog="Example: normalize degree-days station.csv --base 65F --base 18C --by year",
    short_help="Degree-days of a weather file, by month, year or bill, at any base.",
)
@click.argument("file", type=FILE)
@click.option(
    "--base",
    "bases",
    metavar="TEMP",
    multiple=True,
    default=("65F",),
    show_default=True,
    help="Base temperature with its unit, such as 65F or 18C; may be given several times.",
)
@click.option(
    "--by",
    type=click.Choice(["month", "year", "bill"]),
    help="One table only; otherwise months and years are both shown.",
)
@click.option(
    "--bills", type=FILE, metavar="FILE", help="With --by bill: the bills whose days are summed."
)
@click.option(
    "--method",
    type=click.Choice(["mean", "max-min", "whole-degrees", "four-case", "hourly"]),
    default="mean",
    show_default=True,
    help="How a day's degree-days are formed: from the day's mean as the file gives it; from "
    "the mean of maximum and minimum; from that in whole °F, as the weather service counts; by "
    "the four-case formulas on both; or hour by hour.",
)
@click.option("--growing", is_flag=True, help="Growing degree-days too: (mean - base), never < 0.")
@json_option
@click.option("--csv", "csv_to", type=FILE, metavar="FILE", help="Write the tables as CSV.")
@click.option("--xlsx", "xlsx_to", type=FILE, metavar="FILE", help="Write them as a workbook.")
@click.option(
    "--picture",
    "picture_to",
    type=FILE,
    metavar="FILE",
    help="Draw the first table, as .svg or .png.",
)
@click.option(
    "--neighbour",
    type=FILE,
    metavar="FILE",
    help="A station near by, from which gaps of up to 30 days are filled.",
)
@click.option("--unit", type=click.Choice(["F", "C"]), help="Where the file does not say.")
@click.option("--date-column", metavar="NAME", help="The column of dates.")
@click.option("--temperature-column", metavar="NAME", help="The column of mean temperatures.")
@click.option("--max-column", metavar="NAME", help="The column of daily maxima.")
@click.option("--min-column", metavar="NAME", help="The column of daily minima.")
@click.option(
    "--dates",
    type=click.Choice(["month first", "day first", "year first"]),
    help="The order of dates such as 01/02/2023.",
)
@click.option(
    "--time-zone-offset",
    type=float,
    metavar="HOURS",
    help="From UTC to local standard time, for files whose hours are UTC.",
)
@click.option("--station", metavar="NAME", help="Its name, or which of several in the file.")
def command(
    file: Path,
    bases: tuple[str, ...],
    by: str | None,
    bills: Path | None,
    method: str,
    growing: bool,
    json_to: str | None,
    csv_to: Path | None,
    xlsx_to: Path | None,
    picture_to: Path | None,
    neighbour: Path | None,
    unit: str | None,
    date_column: str | None,
    temperature_column: str | None,
    max_column: str | None,
    min_column: str | None,
    dates: str | None,
    time_zone_offset: float | None,
    station: str | None,
) -> None:
    """Show heating and cooling degree-days of a weather FILE, daily or hourly.

    A month, year or bill with a missing day has no total, and says how many days are missing;
    gaps of up to three days are filled and counted.  Degree-days at one base are summed from
    the days, never scaled from another base.
    """
    if (by == "bill") != (bills is not None):
        raise click.UsageError("--by bill and --bills FILE go together.")
    from normalize.weather.read import read_weather

    chosen = [_base(text) for text in bases]
    weather = read_weather(
        file,
        unit=unit,
        date_column=date_column,
        temperature_column=temperature_column,
        max_column=max_column,
        min_column=min_column,
        dates=dates,
        time_zone_offset=time_zone_offset,
        station=station,
        neighbour=neighbour,
    )
    tables = _tables(weather, chosen, by, method, bills)
    inputs = tuple(path for path in (file, bills, neighbour) if path is not None)
    _write_files(tables, inputs, csv_to, xlsx_to, picture_to)
    if json_to is not None:
        write_json(to_json(tables), json_to, inputs=inputs)
    if json_to != STDOUT:
        show(to_text(tables, weather.notes, growing=growing))


def _write_files(
    tables: Sequence[DegreeDayTable],
    inputs: tuple[Path, ...],
    csv_to: Path | None,
    xlsx_to: Path | None,
    picture_to: Path | None,
) -> None:
    from normalize.cli import degree_day_files as files

    if csv_to is not None:
        files.write_csv(tables, csv_to, inputs)
    if xlsx_to is not None:
        files.write_workbook(tables, xlsx_to, inputs)
    if picture_to is not None:
        files.write_picture(tables[0], picture_to, inputs)


def _base(text: str) -> Base:
    from normalize.errors import WeatherError
    from normalize.weather.degree_days import parse_base

    try:
        return parse_base(text)
    except WeatherError as error:
        raise click.BadParameter(str(error), param_hint="--base") from None


def _tables(
    weather: DailyTemperature,
    bases: Sequence[Base],
    by: str | None,
    method: str,
    bills: Path | None,
) -> list[DegreeDayTable]:
    from normalize.weather.degree_days import annual_degree_days, monthly_degree_days

    if bills is not None:
        return _by_bill(weather, bases, method, bills)
    makers = {"month": monthly_degree_days, "year": annual_degree_days}
    return [
        make(weather, base, method=method)
        for name, make in makers.items()
        if by in (None, name)
        for base in bases
    ]


def _by_bill(
    weather: DailyTemperature, bases: Sequence[Base], method: str, bills: Path
) -> list[DegreeDayTable]:
    from normalize.weather.degree_days import bill_degree_days

    periods = bill_periods(bills)
    return [
        bill_degree_days(weather, periods.start, periods.end, base, method=method) for base in bases
    ]


# What a bill file may be about, where it does not say and only its days matter.
_FUELS: Final = (
    ("electricity", "kWh"),
    ("natural gas", "therm"),
    ("heating oil", "gallon"),
    ("propane", "gallon"),
)


def bill_periods(file: Path) -> Periods:
    """The periods of a bill file, of which only the days matter here.

    A file that does not say its fuel or unit is read as whichever it can be, since nothing of
    the use is shown; where none fits, its own first question is asked.
    """
    from normalize.bills.read import read_bills
    from normalize.errors import AmbiguousBills, BillError, UnknownUnit

    try:
        return read_bills(file).periods
    except (AmbiguousBills, UnknownUnit) as error:
        first = error
    for fuel, unit in _FUELS:
        for stated in (None, unit):
            try:
                return read_bills(file, fuel=fuel, unit=stated).periods
            except BillError:
                continue
    raise first


def to_text(
    tables: Sequence[DegreeDayTable], notes: Sequence[str] = (), *, growing: bool = False
) -> str:
    """Tables in plain text, with a word about every row that is not whole."""
    blocks = []
    for t in tables:
        head = [t.by, f"heating {t.unit}", f"cooling {t.unit}", "mean °F", ""]
        if growing:
            head.insert(3, f"growing {t.unit}")
        blocks.append(
            f"{t.station}: degree-days by {t.by}, base {t.base} (each day: {t.method})\n\n"
            + table(head, [_row(row, growing) for row in t.rows])
        )
    blocks += [paragraph(note) for note in notes]
    return "\n\n".join(blocks)


def _row(row: DegreeDayRow, growing: bool) -> list[str]:
    from normalize.report.numbers import plain

    remarks = []
    if row.days_missing:
        remarks.append(f"{row.days_missing} days missing")
    if row.days_filled:
        remarks.append(f"{row.days_filled} filled")
    cells = [row.label, plain(row.heating, 1), plain(row.cooling, 1)]
    if growing:
        cells.append(plain(row.growing, 1))
    return [*cells, plain(row.mean_f, 1), ", ".join(remarks)]


def to_json(tables: Sequence[DegreeDayTable]) -> str:
    """The same as JSON, schema 1; a row that is not whole has null for its totals."""
    import json

    whole = {
        "schema": 1,
        "station": tables[0].station,
        "method": tables[0].method,
        "tables": [
            {
                "by": t.by,
                "base": t.base.degrees,
                "base_unit": t.base.unit,
                "unit": t.unit,
                "rows": [
                    {
                        t.by: row.label,
                        "heating": row.heating,
                        "cooling": row.cooling,
                        "growing": row.growing,
                        "mean_f": row.mean_f,
                        "days_present": row.days_present,
                        "days_missing": row.days_missing,
                        "days_filled": row.days_filled,
                    }
                    for row in t.rows
                ],
            }
            for t in tables
        ],
    }
    return json.dumps(whole, indent=2, ensure_ascii=False, allow_nan=False)
