"""A text table of weather: where its header is, and its rows below it."""

from __future__ import annotations

import csv
import io
import re
from dataclasses import dataclass
from typing import Final

from normalize.errors import UnreadableWeather
from normalize.weather.columns import date_rank, has_date_and_temperature, role_of
from normalize.weather.options import WeatherOptions

DELIMITERS: Final = (",", ";", "\t", "|")
MAX_PREAMBLE: Final = 80  # lines of metadata before the header, at most


@dataclass(frozen=True, slots=True)
class Table:
    """A delimited table. first_line : the line number of rows[0]; preamble : lines before."""

    header: tuple[str, ...]
    rows: list[list[str]]
    first_line: int
    preamble: tuple[str, ...]

    def column(self, i: int) -> list[str]:
        """The cells of one column, stripped of nothing; empty where a row is short."""
        try:
            return [row[i] for row in self.rows]
        except IndexError:
            return [row[i] if i < len(row) else "" for row in self.rows]


def read_table(text: str, name: str, options: WeatherOptions) -> Table:
    """Find the header and read what is below it; UnreadableWeather where there is none."""
    # Everything before the header is metadata and may be torn in ways csv cannot read, so
    # the header is looked for line by line and only the rest goes through csv.
    lines = _first_lines(text)
    for i, line in enumerate(lines):
        for delimiter in DELIMITERS:
            if delimiter not in line:
                continue
            cells = _split(line, delimiter)
            if has_date_and_temperature(cells, options):
                below = _rest(text, i + 1)
                return Table(
                    header=tuple(cells),
                    rows=_rows(below, delimiter, name, i + 2),
                    first_line=i + 2,
                    preamble=tuple(lines[:i]),
                )
    raise _no_header(lines, name)


def _first_lines(text: str) -> list[str]:
    lines: list[str] = []
    start = 0
    while len(lines) <= MAX_PREAMBLE and start < len(text):
        end = text.find("\n", start)
        end = len(text) if end < 0 else end
        lines.append(text[start:end].rstrip("\r"))
        start = end + 1
    if len(lines) == 1 and "\r" in text:  # lines ended the old way, by a carriage return alone
        return text.split("\r", MAX_PREAMBLE + 1)[: MAX_PREAMBLE + 1]
    return lines


def _rest(text: str, n_lines: int) -> str:
    end = "\n" if "\n" in text else "\r"
    start = 0
    for _ in range(n_lines):
        found = text.find(end, start)
        if found < 0:
            return ""
        start = found + 1
    return text[start:]


def _split(line: str, delimiter: str) -> list[str]:
    try:
        cells = next(csv.reader([line.lstrip("#\ufeff ")], delimiter=delimiter), [])
    except csv.Error:
        return []
    return [" ".join(cell.split()) for cell in cells]


def _rows(text: str, delimiter: str, name: str, first_line: int) -> list[list[str]]:
    reader = csv.reader(io.StringIO(text, newline=""), delimiter=delimiter, skipinitialspace=True)
    try:
        return list(reader)
    except csv.Error as err:
        raise UnreadableWeather(
            f"cannot be read as a table ({err})",
            where=f"{name}:{first_line + reader.line_num}",
            wanted="one row a line",
            next_step="Look for a quotation mark that is never closed.",
        ) from None


def _no_header(lines: list[str], name: str) -> UnreadableWeather:
    """Say which of the two columns is missing, or that there is no header at all."""
    best: list[str] = []
    for line in lines:
        for delimiter in DELIMITERS:
            cells = _split(line, delimiter) if delimiter in line else []
            known = any(date_rank(c) is not None or role_of(c) is not None for c in cells)
            if known and len(cells) > len(best):
                best = cells
    first = next((line for line in lines if line.strip()), "")
    if best:
        found = (
            f"no header line names both a date and a temperature; the nearest has {_quoted(best)}"
        )
    elif re.match(r'["\s]*\d', first):
        found = "has no header: its first line is already numbers"
    else:
        found = "no line of it looks like the header of a weather table"
    return UnreadableWeather(
        found,
        where=name,
        wanted="a first line such as 'date,mean_f' or 'date,tmax_c,tmin_c'",
        next_step="Add a header line, or name the columns under [weather] in site.toml "
        '(date_column = "…", temperature_column = "…").',
    )


def _quoted(cells: list[str]) -> str:
    return ", ".join(repr(c[:30]) for c in cells[:8] if c)
