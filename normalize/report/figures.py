"""All pictures of a report, account by account, in the order in which they are read."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from normalize.report.figure_parts import parts_figure
from normalize.report.figure_residuals import residuals_figure
from normalize.report.figure_temperature import temperature_figure
from normalize.report.figure_time import time_figure
from normalize.report.figure_years import years_figure

if TYPE_CHECKING:
    from normalize.report.svg import Picture
    from normalize.site import AccountResult
    from normalize.weather.year import LongTermYear


@dataclass(frozen=True, slots=True)
class Figures:
    """The pictures of one account; None where there is nothing to draw."""

    temperature: Picture | None
    years: Picture | None
    time: Picture | None
    residuals: Picture | None
    parts: Picture | None = None

    @property
    def shown(self) -> tuple[Picture, ...]:
        """Those that could be drawn."""
        every = (self.temperature, self.years, self.parts, self.time, self.residuals)
        return tuple(picture for picture in every if picture is not None)


def figures_of(account: AccountResult, year: LongTermYear | None, number: int) -> Figures:
    """The pictures of an account. number : its place in the report, from 1; makes ids."""
    key = f"a{number}"
    return Figures(
        temperature=temperature_figure(account, year, f"{key}-temperature"),
        years=years_figure(account, f"{key}-years"),
        time=time_figure(account, f"{key}-time"),
        residuals=residuals_figure(account, f"{key}-residuals"),
        parts=parts_figure(account, f"{key}-parts"),
    )
