"""Bills from a file of the open utility-data standard (NAESB REQ.21, ESPI).

What belongs here: which series of the file are the account's use, what its numbers mean, and
their way into BillRows.  XML is in espi_xml.py, links in espi_links.py, codes in espi_codes.py,
clocks in local_days.py.  In the ledger a "line" is the number of the reading in the file.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from normalize.bills import espi_codes as codes
from normalize.bills.answers import Answers, Understood
from normalize.bills.columns import answer
from normalize.bills.day_rows import DayRows
from normalize.bills.espi_links import Series, join, refusal
from normalize.bills.espi_numbers import Numbers, added, cautions_of, merged
from normalize.bills.espi_spans import billed_spans, summaries_of
from normalize.bills.espi_xml import Entry, Reading, read_entries
from normalize.bills.local_days import Clock, clock_of, espi_clock
from normalize.bills.periods import BillRow
from normalize.bills.sum_rows import SHORT_READING, day_rows
from normalize.errors import AmbiguousBills, UnknownUnit, UnreadableBills
from normalize.units import canonical_unit

MOST_CHOICES = 12  # shown in a question
_COMPLETE_PARTS = 2  # parts by time of use or tier, beside no total, are added up


@dataclass(frozen=True, slots=True)
class Opened:
    """An ESPI file, its series joined. notes : what was passed over.

    clocks : entries that set a clock.  summaries : of bills, by the place of their usage point.
    """

    name: str
    series: tuple[Series, ...]
    notes: tuple[str, ...]
    clocks: tuple[Entry, ...]
    summaries: Mapping[int, Sequence[Entry]]


def open_espi(data: bytes, name: str) -> Opened:
    """Entries and usable series of a file.  Raises UnreadableBills."""
    entries = read_entries(data, name)
    every = join(entries, name)
    notes: list[str] = []
    summaries = summaries_of(entries, name)
    usable = _usable(every, name, notes) or _from_summaries(entries, summaries, notes)
    if not usable:
        raise _nothing(every, name)
    clocks = tuple(e for e in entries if e.kind in ("localtimeparameters", "timeconfiguration"))
    return Opened(name, tuple(usable), tuple(notes), clocks, summaries)


def meters_of(opened: Opened, said: Answers) -> list[tuple[str, str, Opened]]:
    """(name, fuel, its own part of the file) of each meter and fuel; fuel "" where not said."""
    found: dict[tuple[int, str], list[Series]] = {}
    for series in opened.series:
        fuel = _series_fuel(series)
        if said.fuel is None or fuel in ("", said.fuel):
            found.setdefault((series.point, fuel), []).append(series)
    return [
        (f"meter {point}", fuel, replace(opened, series=tuple(own)))
        for (point, fuel), own in sorted(found.items())
    ]


def read_espi(data: bytes, name: str, said: Answers) -> Understood:
    """Rows of one account.  Raises UnreadableBills, AmbiguousBills, UnknownUnit."""
    return understand_meter(open_espi(data, name), said)


def understand_meter(opened: Opened, said: Answers) -> Understood:
    """Rows of the one account that the answers choose.  Raises as read_espi does."""
    name, notes = opened.name, list(opened.notes)
    usable = list(opened.series)
    if said.rows is not None:
        usable = _named_meter(usable, said.rows, name)
    usable = _of_fuel(usable, said, name, notes)
    chosen, exports = _choose(usable, name, notes)
    fuel = _fuel_of(chosen[0], said, name)
    unit, factor = _unit_of(chosen[0], fuel, said, name)
    clock = _clock(opened.clocks, said, name)
    notes.append(f"days are those of the clock: {clock.name}")
    table = Numbers.of(chosen, exports, factor, name)
    rows, more = _rows(table, clock, said, name)
    costs = {}
    summaries = opened.summaries.get(chosen[0].point, ())
    if np.all(np.isnan(table.cost)):
        costs = _summary_costs(summaries, clock)
    if costs and not isinstance(rows, DayRows):
        rows = tuple(replace(r, cost=costs.get((r.start or 0, r.end or 0))) for r in rows)
        more.append("cost from the usage summaries")
    number = chosen[0].code("currency")
    return Understood(
        fuel, unit, "meter", rows,
        (
            "utility-data XML (ESPI); a line is the number of a reading in the file",
            f"fuel: {fuel}", f"unit: {unit}", *notes, *more,
        ),
        cautions_of(table), sent=bool(exports) or table.net,
        currency=codes.CURRENCIES.get(number or 0),
        spans=billed_spans(summaries, clock),
    )  # fmt: skip


def _usable(every: Sequence[Series], name: str, notes: list[str]) -> list[Series]:
    kept = []
    for series in every:
        why = refusal(series)
        if not series.readings:
            continue
        if why:
            notes.append(f"{len(series.readings)} readings passed over: they are {why}")
            continue
        if any(r.quality == codes.WEATHER_NORMALIZED for r in series.readings):
            raise UnreadableBills(
                "the readings have already been adjusted for weather, and adjusting them again "
                "would be wrong",
                where=name,
                wanted="readings as they were metered",
            )
        kept.append(series)
    return kept


def _nothing(every: Sequence[Series], name: str) -> UnreadableBills:
    reasons = list(dict.fromkeys(r for s in every if (r := refusal(s))))
    found = f"its readings are {'; '.join(reasons[:3])}" if reasons else "it holds no readings"
    return UnreadableBills(
        found,
        where=name,
        wanted="use of electricity, gas or another fuel",
        next_step="Ask for the usage data of an electric or gas account.",
    )


def _from_summaries(
    entries: Sequence[Entry], summaries: Mapping[int, Sequence[Entry]], notes: list[str]
) -> list[Series]:
    """Series made of the bills that usage summaries speak of; for files without readings."""
    found: dict[tuple[int | None, ...], Series] = {}
    points = [e for e in entries if e.kind == "usagepoint"]
    place_of = {id(e): place for place, some in summaries.items() for e in some}
    every = [e for e in entries if id(e) in place_of]
    for k, entry in enumerate(every, start=1):
        total = "overallconsumptionlastperiod/"
        value, start = entry.whole(total + "value"), entry.whole("billingperiod/start")
        seconds, uom = entry.whole("billingperiod/duration"), entry.whole(total + "uom")
        if value is None or start is None or seconds is None:
            continue
        power = entry.whole(total + "poweroftenmultiplier")
        place = place_of[id(entry)]
        kind = points[place - 1].whole("servicecategory/kind") if place else None
        key = (place, uom, power, entry.whole("commodity"))
        if key not in found:
            fields = {"uom": str(uom) if uom is not None else "",
                      "poweroftenmultiplier": str(power or 0)}  # fmt: skip
            for each in ("commodity", "currency"):
                fields[each] = entry.fields.get(each, "")
            found[key] = Series(Entry("readingtype", "", "", (), fields), place, kind)
        cost = entry.whole("billlastperiod")
        found[key].readings.append(
            Reading(k, float(start), float(seconds), float(value),
                    float(cost) if cost is not None else None,
                    entry.whole("qualityofreading"), 0)
        )  # fmt: skip
    good = [s for s in found.values() if not refusal(s)]
    if good:
        notes.append("bills from the usage summaries, for the file holds no readings")
    return good


def _series_fuel(series: Series) -> str:
    fuel = codes.FUEL_OF_COMMODITY.get(series.code("commodity") or -1, "")
    if not fuel and series.kind is not None:
        fuel = codes.FUEL_OF_KIND.get(series.kind, "")
    if not fuel and series.kind is None:
        fuel = {72: "electricity", 169: "natural gas"}.get(series.code("uom") or 0, "")
    return fuel


def _of_fuel(usable: list[Series], said: Answers, name: str, notes: list[str]) -> list[Series]:
    fuels = sorted({f for s in usable if (f := _series_fuel(s))})
    if said.fuel is not None:
        fits = [s for s in usable if _series_fuel(s) in ("", said.fuel)]
        if not fits:
            raise UnreadableBills(
                f"the file holds {' and '.join(fuels)}, not {said.fuel}", where=name,
                next_step="Check the fuel of the account.",
            )  # fmt: skip
        if len(fits) < len(usable):
            notes.append(f"{len(usable) - len(fits)} series of other fuels passed over")
        return fits
    if len(fuels) > 1:
        raise AmbiguousBills(f"the file holds several fuels ({', '.join(fuels)})", where=name,
                             next_step=answer("fuel", *fuels))  # fmt: skip
    return usable


def _fuel_of(series: Series, said: Answers, name: str) -> str:
    fuel = said.fuel or _series_fuel(series)
    if not fuel:
        raise AmbiguousBills(
            "the file does not say which fuel it is about in a way that all editions of the "
            "standard read alike",
            where=name,
            next_step=answer("fuel", "electricity", "natural gas"),
        )
    return fuel


def _unit_of(series: Series, fuel: str, said: Answers, name: str) -> tuple[str, float]:
    """Canonical unit and the factor from a raw value to it."""
    power = 10.0 ** (series.code("poweroftenmultiplier") or 0)
    uom = series.code("uom")
    if uom not in codes.USABLE_UNITS:
        if said.unit is None:
            usual = ("kWh", "Wh") if fuel == "electricity" else ("therm", "ccf")
            raise AmbiguousBills("the file does not say in which unit its readings are",
                                 where=name, next_step=answer("unit", *usual))  # fmt: skip
        return said.unit, power
    unit, factor = codes.USABLE_UNITS[uom]
    canonical_unit(unit, fuel, where=name)
    if said.unit is not None and said.unit != unit:
        raise UnknownUnit(
            f"the readings are in {unit}, but unit says {said.unit}", where=name,
            next_step="Leave out unit.",
        )  # fmt: skip
    return unit, power * factor


def _named_meter(usable: list[Series], rows: str, name: str) -> list[Series]:
    wanted = rows.strip().lower().removeprefix("meter").strip()
    kept = [s for s in usable if str(s.point) == wanted]
    if kept:
        return kept
    known = ", ".join(map(str, sorted({s.point for s in usable})[:MOST_CHOICES]))
    raise UnreadableBills(f"there is no meter {rows[:20]!r}", where=name, wanted=f"one of {known}")


def _choose(usable: list[Series], name: str, notes: list[str]) -> tuple[list[Series], list[Series]]:
    """The series that are the account's use (parts to add up), and those of export."""
    points = sorted({s.point for s in usable})
    if len(points) > 1:
        more = " or …" if len(points) > MOST_CHOICES else ""
        lines = " or ".join(f'rows = "meter {p}"' for p in points[:MOST_CHOICES])
        raise AmbiguousBills(
            f"the file holds {len(points)} meters", where=name,
            wanted="to know which is meant, for they are never added up",
            next_step=f"Put {lines}{more} under [[account]] in site.toml, or use --rows; "
            "normalize bills shows all of them.",
        )  # fmt: skip
    exports = [s for s in usable if s.code("flowdirection") == codes.EXPORT]
    use = [s for s in usable if s not in exports]
    if not use:
        raise UnreadableBills("the file holds only energy sent back to the grid", where=name,
                              wanted="what was taken from it")  # fmt: skip
    net = [s for s in use if s.code("flowdirection") == codes.NET]
    if net and len(net) < len(use):
        notes.append("the net series was taken rather than what came in and went out apart")
        use, exports = net, []
    return _whole(use, name, notes), _like(exports, use)


def _whole(use: list[Series], name: str, notes: list[str]) -> list[Series]:
    """One series; or parts by time of use and tier, where there is no total to take."""
    parts = [s for s in use if (s.code("tou") or 0) > 0 or (s.code("consumptiontier") or 0) > 0]
    totals = [s for s in use if s not in parts]
    if parts and not totals and len(parts) >= _COMPLETE_PARTS:
        notes.append(f"{len(parts)} series by time of use or tier added up")
        return parts
    use = totals or parts
    if len(use) == 1:
        return use
    # The same use told at several lengths of interval: the one that covers most, then the finest.
    lengths = {round(_length(s)) for s in use}
    if len(lengths) < len(use):
        raise AmbiguousBills(
            f"the file holds {len(use)} series of one meter, and nothing says which is its use",
            where=name, next_step="Download a file of one meter, or a CSV.",
        )  # fmt: skip
    best = max(use, key=lambda s: (round(_covered(s) / 86_400), -_length(s)))
    notes.append(f"of {len(use)} series at different intervals, the one that covers most was taken")
    return [best]


def _like(exports: list[Series], use: list[Series]) -> list[Series]:
    return [s for s in exports if round(_length(s)) == round(_length(use[0]))] or exports[:1]


def _length(series: Series) -> float:
    lengths = sorted(r.seconds for r in series.readings if r.seconds is not None)
    return lengths[len(lengths) // 2] if lengths else 0.0


def _covered(series: Series) -> float:
    return sum({(r.start, r.seconds): r.seconds or 0.0 for r in series.readings}.values())


def _rows(
    table: Numbers, clock: Clock, said: Answers, name: str
) -> tuple[Sequence[BillRow], list[str]]:
    local = clock.local(table.start)
    if np.median(table.seconds) < SHORT_READING:
        if table.several:
            table = merged(table)
            local = clock.local(table.start)
        return day_rows(
            name, local, table.seconds, table.use, table.cost, table.line, table.estimated,
            clock=clock,
        )  # fmt: skip
    # A bill begins and ends at the midnight nearest to its instants: some producers write
    # durations that forget an hour of summer time.
    first = (local + 43_200) // 86_400
    last = (clock.local(table.start + table.seconds) + 43_200) // 86_400
    if table.several:
        return added(name, table, first, last), []
    order = np.argsort(table.start, kind="stable")
    rows = tuple(
        BillRow(
            name, int(table.line[k]), int(first[k]), int(last[k]), float(table.use[k]),
            None if np.isnan(table.cost[k]) else float(table.cost[k]), bool(table.estimated[k]),
        )
        for k in order
    )  # fmt: skip
    return rows, []


def _clock(clocks: Sequence[Entry], said: Answers, name: str) -> Clock:
    if said.time_zone is not None:
        return clock_of(said.time_zone, where=name)
    for entry in clocks:
        offset = entry.whole("tzoffset")
        if offset is None:
            continue
        clock = espi_clock(
            offset, entry.whole("dstoffset") or 0,
            entry.fields.get("dststartrule", ""), entry.fields.get("dstendrule", ""),
        )  # fmt: skip
        if clock is not None:
            return clock
    raise AmbiguousBills(
        "the file does not say in which time zone its days begin, or says it in part",
        where=name,
        next_step='Put time_zone = "America/New_York" (your own) under [[account]] in site.toml, '
        "or use --time-zone.",
    )


def _summary_costs(summaries: Sequence[Entry], clock: Clock) -> dict[tuple[int, int], float]:
    """(first day, end) of a billing period → what its bill came to, for one meter."""
    found = {}
    for entry in summaries:
        start, seconds = entry.whole("billingperiod/start"), entry.whole("billingperiod/duration")
        money = entry.whole("billlastperiod")
        if start is None or seconds is None or money is None or not abs(start) < 2**40:
            continue
        ends = clock.local(np.array([start, start + min(abs(seconds), 2**32)], np.int64))
        first, last = ((ends + 43_200) // 86_400).tolist()
        found[first, last] = money * codes.MONEY
    return found
