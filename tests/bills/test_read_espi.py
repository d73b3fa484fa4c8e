"""The open utility-data standard: its sample files' totals, and one small file for each trap."""

from __future__ import annotations

from pathlib import Path

import pytest

from normalize.bills.periods import Bills
from normalize.bills.read import read_bills
from normalize.days import iso
from normalize.errors import AmbiguousBills, NormalizeError, UnknownUnit, UnreadableBills
from tests.bills.espi_makers import (
    DAY,
    FEB,
    HEAD,
    JAN,
    MAR,
    MONTHS,
    at,
    block,
    clock,
    feed,
    gas,
    meter,
    point,
    reading,
    reading_type,
    summary,
)

SAMPLES = Path(__file__).parents[3] / "shared" / "data" / "espi"
JFM = [("2023-01-05", "2023-02-06", 81.0), ("2023-02-06", "2023-03-14", 70.5)]


def read(text: str | bytes, folder: Path, **options: object) -> Bills:
    file = folder / "usage.xml"
    file.write_bytes(text if isinstance(text, bytes) else text.encode())
    return read_bills(file, **options)  # type: ignore[arg-type]


def periods_of(bills: Bills) -> list[tuple[str, str, float]]:
    p = bills.periods
    return [
        (iso(int(a)), iso(int(b)), round(float(u), 6))
        for a, b, u in zip(p.start, p.end, p.use, strict=True)
    ]


@pytest.mark.skipif(not SAMPLES.is_dir(), reason="the standard's sample files are not here")
@pytest.mark.parametrize(
    ("name", "fuel", "unit", "n", "first", "use", "cost"),
    [
        # Totals from data/SOURCE.md, summed there independently.
        ("Gas.xml", "natural gas", "therm", 13, "2011-04-01", 1074.821, 3094.66),
        ("MonthlyOnlyElectricData.xml", "electricity", "kWh", 14, "2011-08-26", 9567, 5376.18),
        ("1dayLP_45Days.xml", "electricity", "kWh", 45, "2012-03-01", 2958.004, None),
    ],
)
def test_sample_files(
    name: str, fuel: str, unit: str, n: int, first: str, use: float, cost: float | None
) -> None:
    bills = read_bills(SAMPLES / name)
    assert (bills.fuel, bills.unit, len(bills.rows)) == (fuel, unit, n)
    assert bills.rows[0].start is not None
    assert iso(bills.rows[0].start) == first
    assert sum(r.use or 0 for r in bills.rows) == pytest.approx(use, abs=5e-4)
    assert bills.periods.use.sum() == pytest.approx(use, abs=5e-4)
    if cost is not None:
        assert bills.periods.cost.sum() == pytest.approx(cost, abs=5e-3)
    if name.startswith("1day"):  # the day of 23 hours is one day like the others
        assert bills.periods.days.tolist() == [1] * 45


@pytest.mark.skipif(not SAMPLES.is_dir(), reason="the standard's sample files are not here")
@pytest.mark.parametrize(
    ("name", "words"), [("Water.xml", "water, not energy"), ("Temperature.xml", "temperatures")]
)
def test_samples_that_are_no_energy(name: str, words: str) -> None:
    with pytest.raises(UnreadableBills, match=words):
        read_bills(SAMPLES / name)


def test_bills_in_local_days_through_dst(tmp_path: Path) -> None:
    bills = read(gas(), tmp_path)
    assert periods_of(bills) == JFM
    assert bills.periods.cost.tolist() == pytest.approx([95.10, 88.00])
    assert (bills.fuel, bills.unit) == ("natural gas", "therm")


TO_TYPE = '<link rel="related" href="ReadingType/1"/>'
DEMAND = (
    meter("U/1/UsagePoint/1/MeterReading/2", "ReadingType/2")
    + block([reading(JAN, 900, 5)], own="U/1/UsagePoint/1/MeterReading/2/IntervalBlock/1")
    + reading_type("ReadingType/2", uom=38)
)
GOOD = {
    "prefixes instead of the default namespace": gas()
    .replace('<UsagePoint xmlns="http://naesb.org/espi">', '<e:UsagePoint xmlns:e="http://naesb.org/espi">')
    .replace("</UsagePoint>", "</e:UsagePoint>")
    .replace("<ServiceCategory><kind>1</kind></ServiceCategory>",
             "<e:ServiceCategory><e:kind>1</e:kind></e:ServiceCategory>"),
    "absolute links on one side": gas().replace(
        'rel="self" href="U/1', 'rel="self" href="https://h.example/espi/1_1/resource/U/1'
    ),
    "no up links": gas().replace('rel="up"', 'rel="other"'),
    "no related links": gas().replace('rel="related"', 'rel="other"'),
    "no usage point; one reading type": feed(clock(), block(MONTHS), reading_type()),
    "no links at all": gas().replace("<link ", "<nolink "),
    "links twice": gas().replace(
        TO_TYPE, TO_TYPE * 2
    ),
    "kind empty": gas().replace("<kind>1</kind>", "<kind/>"),
    "kind absent, commodity says gas": gas(types=reading_type(commodity=7)).replace(
        "<kind>1</kind>", ""
    ),
    "typing error in an element's name": feed(
        point(), clock(), meter(), block(MONTHS, name="IntervalBLock"), reading_type()
    ),
    "byte order mark": "\ufeff" + gas(),
    "no XML declaration": gas().removeprefix(HEAD),
    "multiplier absent": gas(
        [reading(JAN, FEB - JAN, 81), reading(FEB, MAR - FEB, 70.5)],
        types=reading_type(powerOfTenMultiplier=None),
    ),
    "instants in milliseconds": gas(
        [reading(JAN * 1000, FEB - JAN, 81000), reading(FEB * 1000, MAR - FEB, 70500)]
    ),
    "instants with fractions": gas(
        [reading(f"{JAN}.66136", FEB - JAN, 81000), reading(f"{FEB}.2", MAR - FEB, 70500)]
    ),
    "durations that forget an hour of summer time": gas(
        [reading(JAN, FEB - JAN - 3600, 81000), reading(FEB, MAR - FEB + 3600, 70500)]
    ),
    "interval length of the type wrong": gas(types=reading_type(intervalLength=900)),
    "start of the block differs from its first reading": feed(
        point(), clock(), meter(), block(MONTHS, start=JAN - DAY), reading_type()
    ),
    "the same readings twice": gas(MONTHS * 2),
    "newest first": gas(MONTHS[::-1]),
    "two blocks in one entry": gas().replace(
        MONTHS[1],
        '</IntervalBlock><IntervalBlock xmlns="http://naesb.org/espi">' + MONTHS[1],
    ),
    "a series of demand beside it": gas(more=DEMAND),
    "bills in usage summaries only": feed(
        point(), clock(), summary(JAN, FEB - JAN, 81000, 1), summary(FEB, MAR - FEB, 70500, 2)
    ),
    "summaries of gas under their old name": feed(
        point(),
        clock(),
        summary(JAN, FEB - JAN, 81000, 1, "ElectricPowerUsageSummary"),
        summary(FEB, MAR - FEB, 70500, 2, "ElectricPowerUsageSummary"),
    ),
    "UTF-16": gas().replace("UTF-8", "UTF-16").encode("utf-16"),
    "a reading without a value": gas([*MONTHS, reading(MAR, DAY, "")]),
    "readings without times": feed(
        point(), clock(), meter(),
        block([reading(None, 0, 81000)], start=JAN),
        block(MONTHS[1:], own="U/1/UsagePoint/1/MeterReading/1/IntervalBlock/2"),
        reading_type(intervalLength=FEB - JAN),
    ),
}  # fmt: skip


@pytest.mark.parametrize("name", GOOD)
def test_traps_that_are_handled(name: str, tmp_path: Path) -> None:
    assert periods_of(read(GOOD[name], tmp_path)) == JFM


def test_register_readings_are_differenced(tmp_path: Path) -> None:
    text = gas(
        [reading(JAN, 0, 1000), reading(FEB, 0, 82000), reading(MAR, 0, 152500)],
        types=reading_type(accumulationBehaviour=1),
    )
    assert periods_of(read(text, tmp_path)) == JFM


def test_estimated_quality_is_joined_forward(tmp_path: Path) -> None:
    text = gas([reading(JAN, FEB - JAN, 81000, quality=8), MONTHS[1]])
    assert periods_of(read(text, tmp_path)) == [("2023-01-05", "2023-03-14", 151.5)]


def test_costs_of_summaries_fill_in(tmp_path: Path) -> None:
    bare = [reading(JAN, FEB - JAN, 81000), reading(FEB, MAR - FEB, 70500)]
    bills = read(gas(bare, more=summary(JAN, FEB - JAN, 81000, 9510000)), tmp_path)
    assert bills.periods.cost[0] == pytest.approx(95.10)


def hours(first: str, n: int, value: int = 500) -> list[str]:
    return [reading(at(first) + 3600 * k, 3600, value) for k in range(n)]


def electric(readings: list[str], more: str = "", **codes: object) -> str:
    types = reading_type(uom=72, powerOfTenMultiplier=0, **codes)
    return feed(point("0"), clock(), meter(), block(readings), types, more)


def test_hours_are_summed_to_local_days_through_dst(tmp_path: Path) -> None:
    # 2023-03-11, -12 (23 hours) and -13, local days of the US East (public rule of 2007).
    bills = read(electric(hours("2023-03-11T05:00", 24 + 23 + 24)), tmp_path)
    assert periods_of(bills) == [
        ("2023-03-11", "2023-03-12", 12.0),
        ("2023-03-12", "2023-03-13", 11.5),
        ("2023-03-13", "2023-03-14", 12.0),
    ]
    # 2023-11-05 has 25.
    bills = read(electric(hours("2023-11-05T04:00", 25)), tmp_path)
    assert periods_of(bills) == [("2023-11-05", "2023-11-06", 12.5)]


def test_missing_hours_are_counted(tmp_path: Path) -> None:
    readings = hours("2023-01-11T05:00", 72)
    del readings[30:32]
    bills = read(electric(readings), tmp_path)
    assert len(periods_of(bills)) == 2
    assert any("1 day from which 2 readings are missing" in text for text in bills.reading)
    assert (
        "readings of 2 h are missing" in next(e for e in bills.ledger if e.fate == "left out").note
    )


def test_export_is_taken_off_and_flagged(tmp_path: Path) -> None:
    out = (
        meter("U/1/UsagePoint/1/MeterReading/2", "ReadingType/2")
        + block(
            hours("2023-06-11T04:00", 24, 700),
            own="U/1/UsagePoint/1/MeterReading/2/IntervalBlock/1",
        )
        + reading_type("ReadingType/2", uom=72, powerOfTenMultiplier=0, flowDirection=19)
    )
    bills = read(electric(hours("2023-06-11T04:00", 24), more=out), tmp_path)
    assert periods_of(bills) == [("2023-06-11", "2023-06-12", -4.8)]
    assert "solar" in bills.unfit


def test_net_series_is_flagged(tmp_path: Path) -> None:
    bills = read(electric(hours("2023-06-11T04:00", 24), flowDirection=4), tmp_path)
    assert "solar" in bills.unfit


def test_tiers_without_a_total_are_added(tmp_path: Path) -> None:
    second = (
        meter("U/1/UsagePoint/1/MeterReading/2", "ReadingType/2")
        + block(MONTHS, own="U/1/UsagePoint/1/MeterReading/2/IntervalBlock/1")
        + reading_type("ReadingType/2", tou=2)
    )
    bills = read(gas(types=reading_type(tou=1), more=second), tmp_path)
    assert periods_of(bills) == [(a, b, 2 * use) for a, b, use in JFM]


REFUSED = {
    "water": (gas(kind="2"), "water, not energy"),
    "temperature": (gas(types=reading_type(uom=23)), "temperatures"),
    "demand": (gas(types=reading_type(uom=38)), "demand"),
    "reactive": (gas(types=reading_type(uom=73)), "reactive"),
    "power by kind": (gas(types=reading_type(kind=37)), "power"),
    "highest values": (gas(types=reading_type(dataQualifier=8)), "highest values"),
    "momentary values": (gas(types=reading_type(accumulationBehaviour=12)), "momentary"),
    "weather-normalised already": (
        gas([reading(JAN, FEB - JAN, 81000, quality=15)]),
        "already been adjusted for weather",
    ),
    "only export": (gas(types=reading_type(flowDirection=19)), "sent back to the grid"),
    "one start for all": (
        gas([reading(JAN, DAY * (30 + k), 5000 + k) for k in range(5)]),
        "same moment",
    ),
    "odd multiplier": (gas(types=reading_type(powerOfTenMultiplier=5)), "multiplier"),
    "several types, no links": (
        gas(more=reading_type("ReadingType/9", uom=38)).replace("<link ", "<nolink "),
        "links do not say",
    ),
    "customer data": (
        feed().replace("</feed>", '<C xmlns="http://naesb.org/espi/customer"/></feed>'),
        "no file of the utility-data standard",
    ),
    "no readings": (feed(point(), clock()), "no readings"),
    "HTML": ("<html><body>hello</body></html>", "XML or HTML"),
    "broken off": (gas()[:-200], "breaks off"),
    "a document type": (
        '<!DOCTYPE feed [<!ENTITY a "aaaa">]>' + gas().removeprefix(HEAD),
        "for safety",
    ),
    "a document type, spaced and cased": ("\n\n<!doctype html><html/>", "for safety"),
    "absurd instants": (gas([reading(10**30, 1, 1)]), "time and a value"),
}  # fmt: skip


@pytest.mark.parametrize("name", REFUSED)
def test_traps_that_are_refused(name: str, tmp_path: Path) -> None:
    text, words = REFUSED[name]
    with pytest.raises(NormalizeError, match=words) as caught:
        read(text, tmp_path)
    assert "Private" not in str(caught.value)


ASKED = {
    "rule cut short": (feed(point(), clock(begins="360E", ends="B40E"), meter(), block(MONTHS),
                            reading_type()), "time zone", {"time_zone": "America/New_York"}),
    "no clock": (feed(point(), meter(), block(MONTHS), reading_type()), "time zone",
                 {"time_zone": "-05:00"}),
    "kind on which editions differ": (gas(kind="4").replace("169", "31"), "which fuel",
                                      {"fuel": "natural gas"}),
    "no unit": (gas(types=reading_type(uom=None)), "which unit", {"unit": "therm"}),
    "two meters": (
        gas(more=point(own="U/1/UsagePoint/2") + meter("U/1/UsagePoint/2/MeterReading/1")
            + block(MONTHS, own="U/1/UsagePoint/2/MeterReading/1/IntervalBlock/1")),
        "2 meters", {"rows": "meter 1"},
    ),
    "gas and electricity": (
        gas(more=point("0", own="U/1/UsagePoint/2")
            + meter("U/1/UsagePoint/2/MeterReading/1", "ReadingType/2")
            + block(MONTHS, own="U/1/UsagePoint/2/MeterReading/1/IntervalBlock/1")
            + reading_type("ReadingType/2", uom=72)),
        "several fuels", {"fuel": "natural gas"},
    ),
}  # fmt: skip


@pytest.mark.parametrize("name", ASKED)
def test_questions_and_their_answers(name: str, tmp_path: Path) -> None:
    text, words, said = ASKED[name]
    with pytest.raises(AmbiguousBills, match=words) as caught:
        read(text, tmp_path)
    assert f"{next(iter(said))} =" in str(caught.value)
    assert len(read(text, tmp_path, **said).rows) == 2


def test_another_unit_than_the_files(tmp_path: Path) -> None:
    with pytest.raises(UnknownUnit, match="in therm"):
        read(gas(), tmp_path, unit="ccf")
