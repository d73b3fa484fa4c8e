"""Degree-day tables as files: CSV, workbook and picture."""

from __future__ import annotations

import csv
import io
import os
from collections.abc import Callable, Iterator, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Final

from normalize.errors import UnwritableReport

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from normalize.report.svg import Picture
    from normalize.weather.degree_days import DegreeDayTable

HEAD: Final = (
    "station", "by", "label", "first day", "last day", "base", "heating", "cooling", "growing",
    "unit", "mean °F", "days present", "days missing", "days filled", "each day",
)  # fmt: skip
_TRIGGERS: Final = ("=", "+", "-", "@", "\t", "\r", "\uff1d", "\uff0b", "\uff0d", "\uff20")
PICTURES: Final = (".svg", ".png")
MOST_BARS: Final = 240  # of a picture; more cannot be told apart
LABELS: Final = 12
HEIGHT: Final = 300.0
LEFT, RIGHT, BOTTOM, TOP = 62.0, 8.0, 44.0, 56.0
PNG_DPI: Final = 200

Cell = str | float | int | None


def safe(text: str) -> str:
    """Text that a spreadsheet cannot take for a formula.

    >>> safe("=cmd"), safe("Harrow Valley")
    ("'=cmd", 'Harrow Valley')
    """
    clean = text.replace("\0", "")
    return "'" + clean if clean.lstrip(" ").startswith(_TRIGGERS) else clean


def rows_of(tables: Sequence[DegreeDayTable]) -> Iterator[list[Cell]]:
    """The tables' rows under HEAD; totals that are not whole are empty."""
    from normalize.days import iso

    for t in tables:
        for r in t.rows:
            yield [
                safe(t.station), t.by, r.label, iso(r.start), iso(r.end - 1), str(t.base),
                r.heating, r.cooling, r.growing, t.unit, r.mean_f,
                r.days_present, r.days_missing, r.days_filled, safe(t.method),
            ]  # fmt: skip


def write_csv(tables: Sequence[DegreeDayTable], path: Path, inputs: Sequence[Path]) -> None:
    """One table of all rows, full digits."""
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\r\n")
    writer.writerow(HEAD)
    writer.writerows(["" if cell is None else cell for cell in row] for row in rows_of(tables))
    data = out.getvalue().encode("utf-8-sig")  # spreadsheets read ° rightly with the mark
    _write(path, lambda part: part.write_bytes(data), inputs)


def write_workbook(tables: Sequence[DegreeDayTable], path: Path, inputs: Sequence[Path]) -> None:
    """One sheet of all rows; numbers are numbers and text stays text."""
    from datetime import datetime

    from openpyxl import Workbook
    from openpyxl.styles import Font

    book = Workbook()
    # Same input, same bytes: the times that openpyxl would write are fixed.
    book.properties.created = book.properties.modified = datetime(2000, 1, 1)  # noqa: DTZ001
    sheet = book.active
    if sheet is None:  # a new workbook always has one
        return
    sheet.title = "degree-days"
    for j, text in enumerate(HEAD, start=1):
        sheet.cell(1, j, text).font = Font(bold=True)
    for i, row in enumerate(rows_of(tables), start=2):
        for j, value in enumerate(row, start=1):
            cell = sheet.cell(i, j)
            cell.value = value
            if isinstance(value, str):
                cell.data_type = "s"
            elif isinstance(value, float):
                cell.number_format = "#,##0.0"
    sheet.freeze_panes = "A2"
    for letter, width in zip(
        "ABCDEFGHIJKLMNO", (28, 7, 24, 11, 11, 8) + (11,) * 8 + (36,), strict=True
    ):
        sheet.column_dimensions[letter].width = width

    def save(part: Path) -> None:
        with part.open("wb") as file:
            _save_steadily(book, file)

    _write(path, save, inputs)


def _save_steadily(book: object, file: io.BufferedWriter) -> None:
    """Save a workbook with fixed times inside its archive."""
    import zipfile

    packed = io.BytesIO()
    book.save(packed)  # type: ignore[attr-defined]
    with zipfile.ZipFile(packed) as old, zipfile.ZipFile(file, "w", zipfile.ZIP_DEFLATED) as new:
        for item in old.infolist():
            data = old.read(item)
            if item.filename == "docProps/core.xml":
                data = _without_times(data)
            fixed = zipfile.ZipInfo(item.filename, (1980, 1, 1, 0, 0, 0))
            fixed.compress_type = zipfile.ZIP_DEFLATED
            new.writestr(fixed, data)


def _without_times(core: bytes) -> bytes:
    import re

    return re.sub(rb"\d{4}-\d\d-\d\dT\d\d:\d\d:\d\dZ", b"2000-01-01T00:00:00Z", core)


def write_picture(table: DegreeDayTable, path: Path, inputs: Sequence[Path]) -> None:
    """Bars of heating above and cooling below the line, as SVG or PNG."""
    if path.suffix.lower() not in PICTURES:
        raise UnwritableReport(
            f"{path.suffix or 'no ending'} is no kind of picture",
            where=path.name,
            wanted="a name that ends in .svg or .png",
        )
    if len(table.rows) > MOST_BARS:
        raise UnwritableReport(
            f"a picture of {len(table.rows)} {table.by}s cannot be read",
            where=path.name,
            wanted=f"at most {MOST_BARS}",
            next_step="Draw years instead: --by year.",
        )
    made, png = _draw(table, png=path.suffix.lower() == ".png")
    data = png if png is not None else made.standalone().encode()
    _write(path, lambda part: part.write_bytes(data), inputs)


def _draw(table: DegreeDayTable, *, png: bool) -> tuple[Picture, bytes | None]:
    from normalize.report import axes as by_hand
    from normalize.report import look, svg

    title = _title(table)
    under = f"{table.station}; each day: {table.method}"
    with svg.surface(HEIGHT) as figure:
        svg.title(figure, title, under, height=HEIGHT)
        axes = svg.panel(
            figure, LEFT, BOTTOM, look.WIDTH - LEFT - RIGHT, HEIGHT - BOTTOM - TOP, of=HEIGHT
        )
        _bars(axes, table)
        by_hand.number_axis(axes, "y")
        for label in axes.texts:  # cooling is drawn downwards, and is not negative
            label.set_text(label.get_text().removeprefix("\u2212"))
        by_hand.ticks_below(axes, _labels(table))
        by_hand.name_below(axes, f"{table.unit} a {table.by}, base {table.base}")
        alt = f"{title}. Heating above the line, cooling below it, by {table.by}."
        made = svg.picture(
            figure, "degree-days", title=title, alt=alt,
            caption="Incomplete rows are left out.", height=HEIGHT,
        )  # fmt: skip
        if not png:
            return made, None
        target = io.BytesIO()
        figure.patch.set_visible(True)
        figure.patch.set_facecolor(look.PAPER)
        figure.savefig(target, format="png", dpi=PNG_DPI, metadata={"Software": None})
        return made, target.getvalue()


def _title(table: DegreeDayTable) -> str:
    from normalize.report.numbers import plain

    whole = [r for r in table.rows if r.heating is not None and r.cooling is not None]
    if not whole:
        return f"No {table.by} is complete"
    heating = sum(r.heating or 0.0 for r in whole)
    cooling = sum(r.cooling or 0.0 for r in whole)
    over = f"over {len(whole)} {table.by}s" if len(whole) > 1 else f"in {whole[0].label}"
    return f"{plain(heating, 0)} heating and {plain(cooling, 0)} cooling degree-days {over}"


def _bars(axes: Axes, table: DegreeDayTable) -> None:
    from normalize.report import look

    for i, row in enumerate(table.rows):
        if row.heating is None or row.cooling is None:
            axes.plot([i], [0.0], "x", color=look.CARE, markersize=5)
            continue
        if row.heating > 0:
            axes.bar([i], [row.heating], width=0.8, color=look.WEATHER)
        if row.cooling > 0:
            axes.bar(
                [i],
                [-row.cooling],
                width=0.8,
                facecolor="none",
                edgecolor=look.WEATHER,
                linewidth=1.0,
            )
    axes.axhline(0.0, color=look.QUIET, linewidth=0.8)
    axes.set_xlim(-0.6, len(table.rows) - 0.4)
    low, high = axes.get_ylim()
    room = 0.1 * (max(high, 1.0) - low)  # for the two words
    axes.set_ylim(low - room, max(high, 1.0) + room)
    for word, at in (("heating", 0.985), ("cooling", 0.015)):
        axes.text(
            0.995, at, word, transform=axes.transAxes, ha="right",
            va="top" if word == "heating" else "bottom", color=look.WEATHER,
            fontsize=look.TEXT_SIZE,
        )  # fmt: skip


def _labels(table: DegreeDayTable) -> list[tuple[float, str]]:
    every = -(-len(table.rows) // (LABELS if table.by != "bill" else 5))
    return [
        (float(i), row.label.split(" ")[0]) for i, row in enumerate(table.rows) if i % every == 0
    ]


def _write(path: Path, save: Callable[[Path], object], inputs: Sequence[Path]) -> None:
    """Written beside and moved, so that nobody reads half a result; inputs stay as they are."""
    if path.exists() and any(i.exists() and path.samefile(i) for i in inputs):
        raise UnwritableReport(
            "this is one of the inputs", where=path.name, next_step="Choose another name."
        )
    part = path.with_name(f".{path.name[:50]}.{os.getpid()}.part")
    try:
        try:
            save(part)
            part.replace(path)
        finally:
            part.unlink(missing_ok=True)
    except (OSError, ValueError) as error:
        reason = error.strerror if isinstance(error, OSError) else "no name for a file"
        raise UnwritableReport(f"cannot be written ({reason})", where=path.name) from None
