"""site.toml, the one file that a user writes: what it may say, and what it says.

values : what it says, as frozen values.
table : one table of the file, taken apart strictly.
read : the file, read and checked.
new : a new folder, with a commented site.toml and a template for bills.
"""

from __future__ import annotations

from normalize.sitefile.new import write_new_site
from normalize.sitefile.read import SITE_FILE, read_site_file
from normalize.sitefile.values import AccountPlan, Change, SiteFile, Upgrade, WeatherPlan

__all__ = [
    "SITE_FILE",
    "AccountPlan",
    "Change",
    "SiteFile",
    "Upgrade",
    "WeatherPlan",
    "read_site_file",
    "write_new_site",
]
