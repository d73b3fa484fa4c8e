"""Make the sample data: an invented place, its weather, four buildings and their bills.

    python sample_data/make_sample_data.py [FOLDER]

Writes into its own folder, or into FOLDER: the stations' files, the bills, truth.json and
README.md.  The four site.toml are written by hand.  Running it again gives the same bytes.
"""

from __future__ import annotations

import json
import sys
from dataclasses import dataclass, replace
from datetime import date, timedelta
from pathlib import Path
from typing import TYPE_CHECKING

from maker.chance import Chance
from maker.files import write_csv, write_workbook
from maker.place import stations, write_cape_station, write_valley_station
from maker.readme import readme
from maker.station import LONG_TERM_YEARS, Station
from maker.use import Account, Behaviour, metered, read_days

if TYPE_CHECKING:
    from openpyxl.worksheet.worksheet import Worksheet


@dataclass(frozen=True, slots=True)
class Bill:
    """A row of a bill file before it is laid out."""

    start: date
    end: date
    use: float
    estimated: bool = False

    @property
    def days(self) -> int:
        """Days from reading to reading."""
        return (self.end - self.start).days


def billed(account: Account, reads: list[date], seed: str, decimals: int = 0) -> list[Bill]:
    """A bill from each reading to the next."""
    use = metered(account, reads, seed, decimals)
    return [Bill(a, b, u) for a, b, u in zip(reads[:-1], reads[1:], use, strict=True)]


def estimate(bills: list[Bill], when: date, share: float, decimals: int = 0) -> None:
    """Guess the reading that ends the bill over that day; the next bill makes up for it."""
    i = next(i for i, bill in enumerate(bills) if bill.start <= when < bill.end)
    guess = round(bills[i].use * share, decimals)
    rest = round(bills[i + 1].use + bills[i].use - guess, decimals)
    bills[i] = replace(bills[i], use=guess, estimated=True)
    bills[i + 1] = replace(bills[i + 1], use=rest)


def over(bills: list[Bill], when: date) -> Bill:
    """The bill that covers a day."""
    return next(bill for bill in bills if bill.start <= when < bill.end)


# ---- Quince Street: a house heated with gas; attic insulation and air sealing -------------

QUINCE_WORK = (date(2023, 9, 11), date(2023, 9, 22))


def quince_gas(valley: Station) -> Account:
    """Less loss: a lower slope and a lower balance temperature."""
    before = Behaviour(base_load=0.62, heating_slope=0.121, balance_heating_f=61.0)
    after = Behaviour(base_load=0.60, heating_slope=0.1025, balance_heating_f=59.0)
    return Account(valley, "natural gas", "therm", before, after, QUINCE_WORK, 0.055)


def quince_electricity(valley: Station) -> Account:
    """The furnace's fan and a few window units; a freezer comes with the work's month."""
    before = Behaviour(11.4, 0.085, 61.0, 1.15, 67.0)
    after = Behaviour(12.3, 0.070, 59.0, 1.00, 67.5)
    return Account(valley, "electricity", "kWh", before, after, QUINCE_WORK, 0.05)


def write_quince(folder: Path, valley: Station) -> dict[str, Account]:
    """Both accounts of the house."""
    gas, electricity = quince_gas(valley), quince_electricity(valley)
    write_quince_gas(folder / "gas.csv", gas)
    write_quince_electricity(folder / "electricity.csv", electricity)
    write_valley_station(folder / "station.csv", valley)
    return {"gas": gas, "electricity": electricity}


def write_quince_gas(path: Path, account: Account) -> None:
    """A supplier's export: lines above the header, a total below, and a bill that went wrong."""
    reads = read_days(date(2020, 10, 1), date(2025, 10, 5), 1, 4, "quince gas reads")
    bills = billed(account, reads, "quince gas 1", decimals=1)
    former = date(2021, 2, 20)  # someone else lived there, and kept it warmer
    bills = [replace(b, use=round(b.use * 1.17, 1)) if b.end < former else b for b in bills]
    estimate(bills, date(2023, 2, 12), 0.88, decimals=1)
    wrong, missing = over(bills, date(2022, 12, 14)), over(bills, date(2024, 11, 14))
    rows: list[list[object]] = [
        ["Natural gas usage history"],
        ["Account", "30-0417-88213", "Service address", "14 Quince Street, Varrow Mills"],
        ["Printed", "10/12/2025"],
        [],
        ["Bill Date", "From", "To", "Days", "Therms", "Read Type", "Total Charges"],
    ]
    for bill in bills:
        if bill == missing:
            continue
        if bill == wrong:
            misread = replace(bill, use=round(bill.use + 100.0, 1))
            rows.append(gas_row(misread))
            rows.append(gas_row(replace(misread, use=-misread.use), late=9))
            rows.append(gas_row(bill, late=9))
            continue
        rows.append(gas_row(bill))
    total = sum(bill.use for bill in bills if bill != missing)
    rows += [[], ["Total", "", "", "", f"{total:,.1f}", "", ""]]
    rows.append(["Readings marked Estimated were not taken at the meter."])
    write_csv(path, rows, ends="\r\n")


def gas_row(bill: Bill, late: int = 0) -> list[object]:
    """One line of the gas export: a customer charge of $14.50, then $1.32 a therm."""
    charge = bill.use * 1.32 + (14.50 if bill.use >= 0 else -14.50)
    money = f"${charge:,.2f}" if charge >= 0 else f"-${-charge:,.2f}"
    dates = [d.strftime("%m/%d/%Y") for d in (bill.end + timedelta(3 + late), bill.start, bill.end)]
    kind = "Estimated" if bill.estimated else "Actual"
    return [*dates, bill.days, f"{bill.use:.1f}", kind, money]


def write_quince_electricity(path: Path, account: Account) -> None:
    """Another supplier's export: reading date and days, newest first, A and E."""
    reads = read_days(date(2020, 12, 1), date(2025, 9, 30), 1, 17, "quince electricity reads")
    bills = billed(account, reads, "quince electricity 4")
    estimate(bills, date(2022, 1, 25), 1.12)
    estimate(bills, date(2024, 7, 25), 0.90)
    rows: list[list[object]] = [["Read date", "Days", "kWh used", "Read", "Amount"]]
    for bill in reversed(bills):
        amount = 9.75 + 0.214 * bill.use
        when, kind = bill.end.strftime("%d-%b-%Y"), "E" if bill.estimated else "A"
        rows.append([when, bill.days, f"{bill.use:,.0f}", kind, f"{amount:.2f}"])
    write_csv(path, rows)


# ---- Harrow farm: a farmhouse on deliveries of oil that gets a heat pump ------------------

HARROW_WORK = (date(2023, 10, 9), date(2023, 10, 20))


def write_harrow(folder: Path, valley: Station) -> dict[str, Account]:
    """Oil falls, electricity rises; the boiler stays for hot water and one cold room."""
    oil = Account(
        valley,
        "heating oil",
        "gal",
        Behaviour(base_load=0.48, heating_slope=0.092, balance_heating_f=62.0),
        Behaviour(base_load=0.47, heating_slope=0.023, balance_heating_f=58.0),
        HARROW_WORK,
        0.05,
    )
    electricity = Account(
        valley,
        "electricity",
        "kWh",
        Behaviour(base_load=18.5, heating_slope=0.13, balance_heating_f=62.0),
        Behaviour(18.5, 0.96, 60.5, 0.85, 69.0),
        HARROW_WORK,
        0.05,
    )
    write_harrow_oil(folder / "oil.csv", oil)
    write_harrow_electricity(folder / "electricity.csv", electricity)
    write_valley_station(folder / "station.csv", valley)
    return {"oil": oil, "electricity": electricity}


def delivery_days() -> list[date]:
    """The dealer comes every few weeks in winter and every six or seven in summer."""
    chance, day, out = Chance("harrow deliveries 2"), date(2019, 9, 18), []
    while day <= date(2026, 6, 26):
        out.append(day)
        winter = day.month in (11, 12, 1, 2, 3)
        low, high = (38, 48) if 5 <= day.month <= 9 else (15, 27) if winter else (26, 36)
        if day > HARROW_WORK[1] and winter:
            low, high = 24, 33  # little is burnt by now
        day += timedelta(chance.between(low, high))
        day += timedelta({5: 2, 6: 1}.get(day.weekday(), 0))
    return out


def oil_price(day: date) -> float:
    """Dollars a gallon: cheap, then dear, then between."""
    known = [(2019, 2.92), (2020, 2.31), (2021, 2.74), (2022, 4.63), (2023, 4.05), (2024, 3.74)]
    known += [(2025, 3.58), (2026, 3.69), (2027, 3.69)]
    year = next(i for i, (y, _) in enumerate(known) if y == day.year)
    share = (day.timetuple().tm_yday - 1) / 366
    return round(known[year][1] * (1 - share) + known[year + 1][1] * share, 3)


def write_harrow_oil(path: Path, account: Account) -> None:
    """The dealer's tickets. A partial fill leaves the tank short by what the next one adds."""
    days, chance = delivery_days(), Chance("harrow fills")
    used = metered(account, days, "harrow oil 5", 3)
    partial = {min(d for d in days if d >= date(2022, month, 1)) for month in (3, 11)}
    partial.add(min(d for d in days if d >= date(2025, 1, 10)))
    rows: list[list[object]] = [
        ["Delivery date", "Ticket", "Gallons delivered", "Fill", "Price per gallon", "Amount"]
    ]
    short, level = 61.0, 0.0  # gallons missing from full; how much the last fill fell short
    for i, day in enumerate(days):
        short += used[i - 1] if i else 0.0
        full = day not in partial
        now = 1.2 * chance.normal()  # "full" is where the driver stops
        gallons = round(short + level - now if full else 0.55 * short, 1)
        short, level = (0.0, now) if full else (short - gallons, level)
        price = oil_price(day)
        money = [f"{price:.3f}", f"{gallons * price:.2f}"]
        rows.append([day.isoformat(), 40217 + 131 * i, gallons, "full" if full else "partial"])
        rows[-1] += money
    write_csv(path, rows, mark=True)


def write_harrow_electricity(path: Path, account: Account) -> None:
    """Readings every second month; only the day of the reading is given."""
    reads = read_days(date(2019, 9, 1), date(2026, 6, 28), 2, 12, "harrow electricity reads")
    bills = billed(account, reads, "harrow electricity 2")
    estimate(bills, date(2022, 4, 1), 0.85)
    rows: list[list[object]] = [["Meter read date", "Usage (kWh)", "Estimated?", "Charges ($)"]]
    for bill in bills:
        kind, charge = "yes" if bill.estimated else "no", 23.60 + 0.187 * bill.use
        rows.append([bill.end.isoformat(), f"{bill.use:.0f}", kind, f"{charge:.2f}"])
    write_csv(path, rows)


# ---- The library in the mill: new windows and controls ------------------------------------

LIBRARY_WORK = (date(2023, 6, 5), date(2023, 8, 18))


def write_library(folder: Path, cape: Station) -> dict[str, Account]:
    """Gas for heat; electricity for light, people's machines and cooling."""
    gas = Account(
        cape,
        "natural gas",
        "ccf",
        Behaviour(base_load=0.75, heating_slope=0.262, balance_heating_f=60.0),
        Behaviour(base_load=0.70, heating_slope=0.229, balance_heating_f=57.0),
        LIBRARY_WORK,
        0.05,
    )
    electricity = Account(
        cape,
        "electricity",
        "kWh",
        Behaviour(base_load=64.0, cooling_slope=6.4, balance_cooling_f=58.0),
        Behaviour(base_load=60.0, cooling_slope=5.2, balance_cooling_f=59.5),
        LIBRARY_WORK,
        0.035,
    )
    write_library_gas(folder / "gas.xlsx", gas)
    write_library_electricity(folder / "electricity.xlsx", electricity)
    write_cape_station(folder / "station.csv", cape)
    return {"gas": gas, "electricity": electricity}


def write_library_gas(path: Path, account: Account) -> None:
    """A sheet kept by hand: titles, a merged header, numbers that are text, a row twice."""
    reads = read_days(date(2020, 5, 1), date(2026, 6, 12), 1, 9, "library gas reads")
    bills = billed(account, reads, "library gas 3")
    estimate(bills, date(2022, 1, 20), 1.15)

    def fill(sheet: Worksheet) -> None:
        sheet.title = "Gas"
        sheet.append(["The Mill Library, gas"])
        sheet.append(["kept by the town clerk, from the paper bills"])
        sheet.append([])
        sheet.append(["Service period", None, None, "Meter", None, "Charges"])
        sheet.append(["From", "To", "Days", "Read", "Usage (ccf)", "Cost ($)"])
        for area in ("A1:F1", "A2:F2", "A4:C4", "D4:E4"):
            sheet.merge_cells(area)
        for i, bill in enumerate(bills):
            kind, cost = "Est." if bill.estimated else "Actual", 31.0 + 1.41 * bill.use
            use: object = f"{bill.use:,.0f}" if i % 3 else bill.use
            row = [bill.start, bill.end, bill.days, kind, use, round(cost, 2)]
            for _ in range(2 if i == 40 else 1):
                sheet.append(row)
        sheet.append([])
        sheet.append(["Total", None, None, None, sum(b.use for b in bills), None])
        for letter in "ABCDEF":
            sheet.column_dimensions[letter].width = 13

    write_workbook(path, fill)


def write_library_electricity(path: Path, account: Account) -> None:
    """Reading dates as dates, days beside them, and one bill that was never filed."""
    reads = read_days(date(2020, 5, 1), date(2026, 6, 26), 1, 22, "library electricity reads")
    bills = billed(account, reads, "library electricity 2")
    estimate(bills, date(2021, 11, 28), 0.92)
    missing = over(bills, date(2022, 4, 1))

    def fill(sheet: Worksheet) -> None:
        sheet.title = "Electricity"
        sheet.append(["The Mill Library, electricity"])
        sheet.append([])
        sheet.append(["Read date", "Billing days", "kWh", "Read type", "Total cost"])
        sheet.merge_cells("A1:E1")
        for bill in bills:
            if bill != missing:
                kind, cost = "Estimated" if bill.estimated else "Actual", 44 + 0.171 * bill.use
                sheet.append([bill.end, bill.days, f"{bill.use:,.0f}", kind, f"{cost:,.2f}"])
        for letter in "ABCDE":
            sheet.column_dimensions[letter].width = 14

    write_workbook(path, fill)


# ---- Tarn Lane School: new boilers, and fewer school days after them -----------------------

SCHOOL_WORK = (date(2023, 7, 3), date(2023, 8, 11))
SCHOOL_DAYS = 175.0  # a year, in a normal year
SCHOOL_TERMS = ((8, 28, 12, 21), (1, 4, 3, 29), (4, 8, 6, 16))  # month and day, first and last
BREAKS = ((10, 16, 10, 20), (2, 12, 2, 16))
CLOSED_FROM = date(2024, 1, 4)  # on Fridays, from then on


def is_school_day(day: date) -> bool:
    """Whether there is school: in a term, no weekend, no break; no Fridays after the work."""

    def inside(spans: tuple[tuple[int, int, int, int], ...]) -> bool:
        return any((a, b) <= (day.month, day.day) <= (c, d) for a, b, c, d in spans)

    if day.weekday() >= 5 or not inside(SCHOOL_TERMS) or inside(BREAKS):
        return False
    return day < CLOSED_FROM or day.weekday() != 4


def write_school(folder: Path, cape: Station) -> dict[str, Account]:
    """Gas for heat and hot water; a school day takes more of both."""
    gas = Account(
        cape,
        "natural gas",
        "ccf",
        Behaviour(base_load=20.0, heating_slope=0.95, balance_heating_f=59.0),
        Behaviour(base_load=18.5, heating_slope=0.84, balance_heating_f=58.0),
        SCHOOL_WORK,
        0.04,
        driver=lambda day: float(is_school_day(day)),
        normal=SCHOOL_DAYS / 365.0,
        each=(30.0, 28.0),
    )
    reads = read_days(date(2021, 3, 1), date(2025, 12, 12), 1, 6, "school gas reads")
    rows: list[list[object]] = [["Start", "End", "Usage (ccf)", "Cost ($)", "School days"]]
    for bill in billed(gas, reads, "school gas 3"):
        days = [bill.start + timedelta(n) for n in range(bill.days)]
        rows.append(
            [
                bill.start.isoformat(),
                bill.end.isoformat(),
                f"{bill.use:.0f}",
                f"{48.0 + 1.37 * bill.use:.2f}",
                sum(map(is_school_day, days)),
            ]
        )
    write_csv(folder / "gas.csv", rows)
    write_cape_station(folder / "station.csv", cape)
    return {"gas": gas}


def make(folder: Path) -> None:
    """Write everything into the folder."""
    valley, cape = stations()
    sites: dict[str, dict[str, Account]] = {}
    for name, write, station in (
        ("quince_street", write_quince, valley),
        ("harrow_farm", write_harrow, valley),
        ("mill_library", write_library, cape),
        ("tarn_lane_school", write_school, cape),
    ):
        (folder / name).mkdir(parents=True, exist_ok=True)
        sites[name] = write(folder / name, station)
    truth = {
        "about": "Invented data: no such place, station, building or account exists.",
        "long_term_years": list(LONG_TERM_YEARS),
        "heating_degree_days_65f": {
            s.name: {str(y): s.heating_65(y) for y in range(2012, 2026)} for s in (valley, cape)
        },
        "sites": {
            site: {name: account.truth() for name, account in accounts.items()}
            for site, accounts in sites.items()
        },
    }
    text = json.dumps(truth, indent=1, ensure_ascii=False) + "\n"
    (folder / "truth.json").write_bytes(text.encode())
    (folder / "README.md").write_bytes(readme(truth, (valley, cape)).encode())


if __name__ == "__main__":
    target = Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).parent
    make(target)
    print(f"sample data written to {target}")
