"""README.md of the sample data, written from the same numbers as the data."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from maker.station import Station

HEAD = """\
# Sample data

Everything here is invented: Varrowmere County, its stations Varrow Mills Airfield and Corrow
Point, the four buildings, their accounts and suppliers do not exist.  The weather has a cool
climate's means, swings and persistence, but never happened.

`make_sample_data.py` (with `maker/`) writes every file but the four `site.toml`, and gives
the same bytes whenever it is run; change it, not the files.  A test runs it and compares.

- `quince_street/`, a house heated with gas; attic insulation and air sealing, 2023-09-11 to 22.
  - `gas.csv`: lines above the header and a total below, one estimated reading (2023-02), one bill
    cancelled and billed again (2022-12), one missing (2024-11), a former owner until 2021-02.
  - `electricity.csv`: the furnace's fan and summer cooling; reading date and days, newest first,
    two estimates.  A freezer came in the month of the work, so that use rose a little.
- `harrow_farm/`, a farmhouse heated with oil; a heat pump, 2023-10-09 to 20.
  - `oil.csv`: the dealer's deliveries, three of them partial fills.  Hot water and one cold room
    stay on oil.
  - `electricity.csv`: readings every second month, only their dates, one estimate.  It rises.
- `mill_library/`, a small public library; new windows and controls, 2023-06-05 to 2023-08-18.
  - `gas.xlsx`: a sheet kept by hand: titles, a merged header, numbers stored as text, one row
    twice, one estimate.
  - `electricity.xlsx`: light, machines and cooling; one bill missing, one estimate.  The longer
    hours that `site.toml` mentions leave no trace in the bills.
- `tarn_lane_school/`, a school; new boilers, 2023-07-03 to 2023-08-11.
  - `gas.csv`: tidy, with a column of school days.  Each takes 30 ccf before the work and 28 after,
    and from 2024 on there is no school on Fridays: an answer from the weather alone takes the
    fewer days for a saving.  A normal year has 175 school days; the base loads below belong to it.

The last winter before the works was cold and the first after them mild, so that comparing bills
without the weather flatters the work.  The stations' files (2012-01-01 to 2026-06-30, daily
maximum and minimum in whole °F) have short gaps, and one long gap each: eleven days in June 2019
in the valley, seven days in October 2024 at the cape.

## The truth

What a perfect analysis would find, from `truth.json`.  A normal year is 365 days of the weather of
2016–2025, all days known; use is what the building's behaviour gives at each day's mean of
maximum and minimum.  Bills scatter around it, each correlated with the next by 0.3, half in
proportion to the bill and half to an average one.

"""


def readme(truth: Mapping[str, Any], stations: Sequence[Station]) -> str:
    """The text of README.md."""
    lines = [
        "| account | unit | normal year before | after | saved | share | scatter of a bill |",
        "| --- | --- | ---: | ---: | ---: | ---: | ---: |",
    ]
    shapes = [
        "",
        "| account | | base load a day | heating slope | balance °F | cooling slope | balance °F |",
        "| --- | --- | ---: | ---: | ---: | ---: | ---: |",
    ]
    for site, accounts in truth["sites"].items():
        for name, a in accounts.items():
            title = f"{site}, {name}"
            before, after = a["before"], a["after"]
            lines.append(
                f"| {title} | {a['unit']} | {before['nac']:,.1f} | {after['nac']:,.1f} "
                f"| {a['normalized']:,.1f} | {a['fraction']:.1%} | {a['bill_noise']:.1%} |"
            )
            shapes += [f"| {title} | {side} | {_shape(a[side])} |" for side in ("before", "after")]
    years = [
        "",
        "Degree-days below 65 °F, January to December:",
        "",
        "| year | " + " | ".join(s.name for s in stations) + " |",
        "| --- |" + " ---: |" * len(stations),
    ]
    for year in range(2012, 2026):
        cells = " | ".join(f"{s.heating_65(year):,.1f}" for s in stations)
        years.append(f"| {year} | {cells} |")
    return HEAD + "\n".join([*lines, *shapes, *years]) + "\n"


def _shape(side: Mapping[str, float | None]) -> str:
    keys = ("base_load", "heating_slope", "balance_heating_f", "cooling_slope", "balance_cooling_f")
    return " | ".join("" if side[key] is None else f"{side[key]:g}" for key in keys)
