"""Small invented files of the open utility-data standard, each with one trap.

Codes as in the standard's published schema (NAESB REQ.21); no schema text is copied.
"""

from __future__ import annotations

from datetime import UTC, datetime

HEAD = '<?xml version="1.0" encoding="UTF-8"?>\n'


def at(text: str) -> int:
    """Epoch seconds of ISO text in UTC."""
    return int(datetime.fromisoformat(text).replace(tzinfo=UTC).timestamp())


def entry(own: str, up: str, related: list[str], content: str) -> str:
    links = f'<link rel="self" href="{own}"/>' if own else ""
    links += f'<link rel="up" href="{up}"/>' if up else ""
    links += "".join(f'<link rel="related" href="{r}"/>' for r in related)
    title = "<title>12 Private Street</title>"
    return f"<entry><id>x</id>{links}{title}<content>{content}</content></entry>"


def point(kind: str = "1", own: str = "U/1/UsagePoint/1", related: list[str] | None = None) -> str:
    body = (
        f'<UsagePoint xmlns="http://naesb.org/espi"><ServiceCategory><kind>{kind}</kind>'
        "</ServiceCategory></UsagePoint>"
    )
    return entry(own, own.rpartition("/")[0], related or [f"{own}/MeterReading"], body)


def clock(
    tz: int = -18000, dst: int = 3600, begins: str = "360E2000", ends: str = "B40E2000"
) -> str:
    body = (
        f'<LocalTimeParameters xmlns="http://naesb.org/espi"><dstEndRule>{ends}</dstEndRule>'
        f"<dstOffset>{dst}</dstOffset><dstStartRule>{begins}</dstStartRule>"
        f"<tzOffset>{tz}</tzOffset></LocalTimeParameters>"
    )
    return entry("LocalTimeParameters/1", "LocalTimeParameters", [], body)


def meter(own: str = "U/1/UsagePoint/1/MeterReading/1", kind: str = "ReadingType/1") -> str:
    return entry(
        own,
        own.rpartition("/")[0],
        [f"{own}/IntervalBlock", kind],
        '<MeterReading xmlns="http://naesb.org/espi"/>',
    )


def reading_type(own: str = "ReadingType/1", **codes: object) -> str:
    fields = {"powerOfTenMultiplier": -3, "uom": 169, "flowDirection": 1, **codes}
    inner = "".join(f"<{k}>{v}</{k}>" for k, v in fields.items() if v is not None)
    return entry(
        own, "ReadingType", [], f'<ReadingType xmlns="http://naesb.org/espi">{inner}</ReadingType>'
    )


def reading(
    start: object, seconds: object, value: object, cost: object = None, quality: object = None
) -> str:
    inner = f"<cost>{cost}</cost>" if cost is not None else ""
    if quality is not None:
        inner += f"<ReadingQuality><quality>{quality}</quality></ReadingQuality>"
    if start is not None:
        inner += f"<timePeriod><duration>{seconds}</duration><start>{start}</start></timePeriod>"
    return f"<IntervalReading>{inner}<value>{value}</value></IntervalReading>"


def block(
    readings: list[str],
    *,
    own: str = "U/1/UsagePoint/1/MeterReading/1/IntervalBlock/1",
    start: object = 0,
    name: str = "IntervalBlock",
) -> str:
    body = (
        f'<{name} xmlns="http://naesb.org/espi"><interval><duration>1</duration>'
        f"<start>{start}</start></interval>{''.join(readings)}</{name}>"
    )
    return entry(own, own.rpartition("/")[0], [], body)


def summary(start: int, seconds: int, value: int, bill: int, name: str = "UsageSummary") -> str:
    body = (
        f'<{name} xmlns="http://naesb.org/espi"><billingPeriod><duration>{seconds}</duration>'
        f"<start>{start}</start></billingPeriod><billLastPeriod>{bill}</billLastPeriod>"
        "<overallConsumptionLastPeriod><powerOfTenMultiplier>-3</powerOfTenMultiplier>"
        f"<uom>169</uom><value>{value}</value></overallConsumptionLastPeriod></{name}>"
    )
    return entry(f"U/1/UsagePoint/1/{name}/{start}", f"U/1/UsagePoint/1/{name}", [], body)


def feed(*entries: str, head: str = HEAD) -> str:
    return (
        f'{head}<feed xmlns="http://www.w3.org/2005/Atom"><title>t</title>{"".join(entries)}</feed>'
    )


DAY = 86_400
JAN, FEB, MAR = at("2023-01-05T05:00"), at("2023-02-06T05:00"), at("2023-03-14T04:00")
MONTHS = [reading(JAN, FEB - JAN, 81000, 9510000), reading(FEB, MAR - FEB, 70500, 8800000)]


def gas(
    readings: list[str] | None = None, *, types: str | None = None, more: str = "", **where: str
) -> str:
    return feed(
        point(where.get("kind", "1")),
        clock(),
        meter(),
        block(readings or MONTHS),
        types if types is not None else reading_type(),
        more,
    )
