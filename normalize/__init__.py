"""How much energy an upgrade saved in a normal year, from bills and weather, with its range.

>>> import normalize
>>> normalize.NormalizeError.__name__
'NormalizeError'

Every name below is loaded when it is first used, so that ``import normalize`` costs nothing.
"""

from __future__ import annotations

import importlib
from typing import TYPE_CHECKING, Final

if TYPE_CHECKING:
    from normalize.bills.accounts import FileAccounts, read_accounts
    from normalize.bills.periods import Bills
    from normalize.bills.read import read_bills
    from normalize.errors import NormalizeError
    from normalize.fitting.fit import fit
    from normalize.fitting.results import Fit
    from normalize.savings.compare import measure_savings
    from normalize.savings.results import Estimate, Savings
    from normalize.site import Site, SiteResult, assess, read_site
    from normalize.weather.read import read_weather
    from normalize.weather.temperature import DailyTemperature
    from normalize.weather.year import LongTermYear, long_term_year, read_long_term_year

__version__: Final = "0.1.0"

__all__ = [
    "Bills",
    "DailyTemperature",
    "Estimate",
    "FileAccounts",
    "Fit",
    "LongTermYear",
    "NormalizeError",
    "Savings",
    "Site",
    "SiteResult",
    "__version__",
    "assess",
    "fit",
    "long_term_year",
    "measure_savings",
    "read_accounts",
    "read_bills",
    "read_long_term_year",
    "read_site",
    "read_weather",
]

_HOME: Final = {
    "Bills": "normalize.bills.periods",
    "DailyTemperature": "normalize.weather.temperature",
    "Estimate": "normalize.savings.results",
    "FileAccounts": "normalize.bills.accounts",
    "Fit": "normalize.fitting.results",
    "LongTermYear": "normalize.weather.year",
    "NormalizeError": "normalize.errors",
    "Savings": "normalize.savings.results",
    "Site": "normalize.site",
    "SiteResult": "normalize.site",
    "assess": "normalize.site",
    "fit": "normalize.fitting.fit",
    "long_term_year": "normalize.weather.year",
    "measure_savings": "normalize.savings.compare",
    "read_accounts": "normalize.bills.accounts",
    "read_bills": "normalize.bills.read",
    "read_long_term_year": "normalize.weather.year",
    "read_site": "normalize.site",
    "read_weather": "normalize.weather.read",
}


def __getattr__(name: str) -> object:
    home = _HOME.get(name)
    if home is None:
        raise AttributeError(f"module 'normalize' has no attribute {name!r}")
    value = getattr(importlib.import_module(home), name)
    globals()[name] = value  # asked once
    return value


def __dir__() -> list[str]:
    return sorted(__all__)
