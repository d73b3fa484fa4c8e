"""Which forms an account is offered: what its fuel is used for decides."""

from __future__ import annotations

from normalize.fitting.fit import CHOICE
from normalize.units import FUELS


def forms_offered(
    fuel: str, *, space_heating: bool = True, asked: tuple[str, ...] | None = None
) -> tuple[str, ...]:
    """Names of the forms offered to the choice.

    A piped or delivered heating fuel is not offered cooling unless asked.  An account that
    heats only water is offered the flat form: cold inlet water in winter would pass for
    heating.

    >>> forms_offered("natural gas")
    ('flat', 'heating')
    >>> forms_offered("natural gas", space_heating=False)
    ('flat',)
    """
    if asked is not None:
        return asked
    heating_only = FUELS[fuel].heating_only if fuel in FUELS else False
    if not space_heating:
        return ("flat",) if heating_only else ("flat", "cooling")
    return ("flat", "heating") if heating_only else CHOICE
