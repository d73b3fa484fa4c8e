"""What a user says of a bill file beforehand, and what a reader says of it afterwards.

What belongs here: the answers to the readers' questions, as checked values, and the common
shape of what tables, interval files and ESPI XML come to before repair.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Literal, cast

from normalize.bills.amounts import Decimal
from normalize.bills.dates import ORDERS, Order
from normalize.bills.periods import BillRow, Spans
from normalize.bills.repair import Kind
from normalize.bills.sum_rows import SumTo
from normalize.days import day_of_iso
from normalize.defaults import MIN_DAYS_A_SIDE
from normalize.errors import BillError
from normalize.units import canonical_fuel, canonical_unit

ReadDay = int  # 1 to 31
NO_COLUMN = "none"  # generation_column of a file whose usage is gross already
CALENDAR = "calendar"  # read_day for bills of whole calendar months
TankPercent = Literal["before", "after"]

ONE_BILL = "one bill alone cannot show how use answers to the weather"
ENOUGH_BILLS = (
    f"At least {MIN_DAYS_A_SIDE} days of bills on each side of the work are needed, with a winter "
    "and a summer among them, better a whole year: ask the supplier for the account's history."
)

CHOICES: dict[str, tuple[str, ...]] = {
    "dates": ORDERS,
    "end_dates": ("exclusive", "inclusive"),
    "kind": ("meter", "delivery"),
    "decimal": ("point", "comma"),
    "sum_to": ("day", "month", "bill"),
    "tank_percent": ("before", "after"),
    "interval_times": ("start", "end"),
}
COLUMN_ROLES = (
    "usage", "start", "end", "days", "cost", "estimated", "temperature",
    "register", "generation",
)  # fmt: skip


@dataclass(frozen=True, slots=True)
class Answers:
    """What the user said; each is None where nothing was said.  As read_bills documents them.

    made_column : of the file of generation.
    read_day : 1 to 31, or 0 for calendar months.  gross : usage is what the house used, solar
    panels or not.  named : role → heading.
    """

    fuel: str | None = None
    unit: str | None = None
    dates: Order | None = None
    end_dates: str | None = None
    kind: Kind | None = None
    decimal: Decimal | None = None
    temperature_unit: str | None = None
    rows: str | None = None
    read_day: int | None = None
    time_zone: str | None = None
    sum_to: SumTo | None = None
    periods_from: str | None = None
    generation: str | None = None
    made_column: str | None = None
    solar_since: int | None = None
    interval_times: str | None = None
    multiplier: float | None = None
    tank_size: float | None = None
    tank_percent: str | None = None
    gross: bool = False
    named: dict[str, str] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class Understood:
    """A file, read: one account's rows before repair, and how they were understood.

    sent : energy sent to the grid was found.  generation : it was added back, so that use is
    gross.  currency : where the file says it.  settled : what its lines proved, as answers.
    spans : the bills that the file itself tells of, for days to be summed to.
    """

    fuel: str
    unit: str
    kind: Kind
    rows: Sequence[BillRow]
    reading: tuple[str, ...]
    cautions: tuple[str, ...] = ()
    sent: bool = False
    generation: bool = False
    currency: str | None = None
    settled: dict[str, str] = field(default_factory=dict)
    spans: Spans | None = None


def answers_of(name: str, given: dict[str, object]) -> Answers:
    """Answers, checked.  Raises BillError with the choices.

    >>> answers_of("gas.csv", {"fuel": "gas", "read_day": "5"}).read_day
    5
    """
    for key, choices in CHOICES.items():
        value = given.get(key)
        if value is not None and value not in choices:
            raise BillError(f"{key} is {str(value)[:40]!r}", wanted=" or ".join(choices))
    fuel, unit = given.get("fuel"), given.get("unit")
    fuel = canonical_fuel(str(fuel), where=name) if fuel else None
    return Answers(
        fuel=fuel,
        unit=canonical_unit(str(unit), fuel, where=name) if unit else None,
        dates=cast("Order | None", given.get("dates")),
        end_dates=_text(given, "end_dates"),
        kind=cast("Kind | None", given.get("kind")),
        decimal=cast("Decimal | None", given.get("decimal")),
        temperature_unit=_text(given, "temperature_unit"),
        rows=_text(given, "rows"),
        read_day=_read_day(given.get("read_day")),
        time_zone=_text(given, "time_zone"),
        sum_to=cast("SumTo | None", given.get("sum_to")),
        periods_from=_text(given, "periods_from"),
        generation=_text(given, "generation"),
        made_column=_text(given, "generation_column") if given.get("generation") else None,
        solar_since=_day(given, "solar_since"),
        interval_times=_text(given, "interval_times"),
        multiplier=_positive(given, "multiplier"),
        tank_size=_positive(given, "tank_size"),
        tank_percent=_text(given, "tank_percent"),
        gross=given.get("generation_column") == NO_COLUMN,
        named={
            r: str(given[f"{r}_column"])
            for r in COLUMN_ROLES
            if given.get(f"{r}_column")
            and given[f"{r}_column"] != NO_COLUMN
            and not (r == "generation" and given.get("generation"))
        },
    )


def _text(given: dict[str, object], key: str) -> str | None:
    value = given.get(key)
    return None if value is None else str(value)


def _day(given: dict[str, object], key: str) -> int | None:
    """A day number, or a date such as 2021-05-01."""
    value = given.get(key)
    if value is None or isinstance(value, int):
        return value
    try:
        return day_of_iso(str(value))
    except ValueError:
        raise BillError(
            f"{key} is {str(value)[:40]!r}", wanted="a date such as 2021-05-01"
        ) from None


def _positive(given: dict[str, object], key: str) -> float | None:
    value = given.get(key)
    if value is None:
        return None
    if isinstance(value, (int, float, str)):
        try:
            number = float(value)
        except ValueError:
            number = 0.0
        if 0.0 < number < 1e9:
            return number
    raise BillError(f"{key} is {str(value)[:40]!r}", wanted="a number above zero")


def _read_day(value: object) -> int | None:
    """0 for calendar months, else a day of the month."""
    if value is None:
        return None
    text = str(value).strip().lower()
    if text == CALENDAR:
        return 0
    if text.isdigit() and len(text) < 3 and 1 <= int(text) <= 31:
        return int(text)
    raise BillError(
        f"read_day is {text[:40]!r}",
        wanted='the day of the month on which the meter is read, 1 to 31, or "calendar"',
    )
