"""Other weather that an answer can be repeated with, to see how far it moves.

Which station and which normal year is a choice; these are the ones that a site offers.  Each
is a whole input of its own; one that cannot be read carries its reason and ends nothing.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

from normalize.errors import NormalizeError

if TYPE_CHECKING:
    from pathlib import Path

    from normalize.weather.temperature import DailyTemperature
    from normalize.weather.year import LongTermYear

OTHER_SPANS: Final = (5, 20, 30)  # whole years, beside the site's own number


@dataclass(frozen=True, slots=True)
class Alternative:
    """One choice of station and long-term year.

    name : as a table says it.  changes : "station" or "long-term year".
    weather, year : None where unavailable says why.
    """

    name: str
    changes: str
    weather: DailyTemperature | None
    year: LongTermYear | None
    unavailable: str = ""

    @property
    def usable(self) -> bool:
        """Whether an answer can be computed with it."""
        return self.weather is not None and self.year is not None


def alternatives(
    weather: DailyTemperature,
    year: LongTermYear,
    *,
    stations: Sequence[Path] = (),
    years: Sequence[Path] = (),
    n_years: int | None = None,
    reader: Mapping[str, object] | None = None,
) -> tuple[Alternative, ...]:
    """Every station and every long-term year offered, one changed at a time.

    weather, year : the site's own choice.  stations : files of other stations; each makes its
    own long-term year where the site's is a mean of ``n_years`` whole years, else keeps the
    site's.  years : typical-year and normals files.  Means of 5, 20 and 30 whole years of the
    site's own station are offered too, as far as its record has them.
    reader : the site's answers to the reader's questions; only its unit and date order are
    used, as columns differ between files.
    """
    found: list[Alternative | None] = []
    found += [_station(path, year, n_years, reader or {}) for path in stations]
    found += [_spans(weather, n, year) for n in OTHER_SPANS if not weather.by_bill]
    found += [_year(weather, path) for path in years]
    return tuple(f for f in found if f is not None)


def _station(
    path: Path, year: LongTermYear, n_years: int | None, reader: Mapping[str, object]
) -> Alternative:
    from normalize.weather.read import read_weather
    from normalize.weather.year import long_term_year

    answers = {k: v for k, v in reader.items() if k in ("unit", "dates", "time_zone_offset")}
    try:
        other = read_weather(path, **answers)  # type: ignore[arg-type]
    except NormalizeError as error:
        return Alternative(path.stem, "station", None, None, str(error))
    if n_years is None:
        return Alternative(other.station, "station", other, year)
    try:
        own = long_term_year(other, years=n_years)
    except NormalizeError as error:
        return Alternative(other.station, "station", other, None, str(error))
    return Alternative(f"{other.station}, {own.name}", "station", other, own)


def _spans(weather: DailyTemperature, n: int, year: LongTermYear) -> Alternative | None:
    """The mean of another number of whole years, where the record has so many."""
    from normalize.weather.year import long_term_year

    try:
        other = long_term_year(weather, years=n)
    except NormalizeError:
        return None
    if len(other.years) < n or other.years == year.years:
        return None
    return Alternative(other.name, "long-term year", weather, other)


def _year(weather: DailyTemperature, path: Path) -> Alternative:
    from normalize.weather.year import read_long_term_year

    try:
        return Alternative(
            (other := read_long_term_year(path)).name, "long-term year", weather, other
        )
    except NormalizeError as error:
        return Alternative(path.stem, "long-term year", weather, None, str(error))
