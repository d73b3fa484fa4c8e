"""Many accounts in one file: does the time grow with the lines, and not with their square?

``python benchmarks/bills_accounts.py [most accounts]`` prints a table for docs/evidence-bills.md.
Invented bills, 24 an account, two fuels, a tenth of the readings estimated.
"""

from __future__ import annotations

import random
import resource
import sys
import tempfile
import time
from datetime import date, timedelta
from pathlib import Path

from normalize.bills.accounts import read_accounts
from normalize.bills.read import read_bills

MONTHS = 24


def text_of(accounts: int, *, by_date: bool) -> str:
    """A file of that many accounts, one after the other or in order of dates."""
    rng = random.Random(1)
    lines = []
    for k in range(accounts):
        day = date(2021, 1, 3) + timedelta(days=k % 28)
        fuel, unit = (("Electric", "kWh"), ("Gas", "therms"))[k % 2]
        for _ in range(MONTHS):
            end = day + timedelta(days=rng.randint(28, 33))
            mark = "E" if rng.random() < 0.1 else "A"
            lines.append((
                end, f"{700_000_000_000 + 7919 * k},{fuel},{day:%m/%d/%Y},{end:%m/%d/%Y},"
                f"{rng.randint(20, 900)},{unit},{rng.randint(20, 99)}.10,{mark}"
            ))  # fmt: skip
            day = end
    if by_date:
        lines.sort()
    head = "Account Number,Service,Start Date,End Date,Usage,Unit,Cost,Read Type"
    return "\n".join([head, *(line for _, line in lines)]) + "\n"


def main(most: int) -> None:
    """Print the table."""
    print("| accounts | lines | MB | seconds | ms an account | peak MB |")
    print("| --: | --: | --: | --: | --: | --: |")
    with tempfile.TemporaryDirectory() as folder:
        file = Path(folder) / "bills.csv"
        file.write_text(text_of(1, by_date=False))
        read_bills(file)  # kernels loaded
        for count in (most // 10, most // 3, most):
            for by_date in (False, True) if count == most else (False,):
                text = text_of(count, by_date=by_date)
                file.write_text(text)
                began = time.perf_counter()
                found = read_accounts(file)
                took = time.perf_counter() - began
                if len(found.bills) != count:
                    raise SystemExit(f"{len(found.bills)} of {count} accounts were read")
                peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
                order = ", in order of dates" if by_date else ""
                print(f"| {count:,}{order} | {count * MONTHS:,} | {len(text) / 1e6:.0f} | "
                      f"{took:.1f} | {1000 * took / count:.2f} | {peak:,.0f} |")  # fmt: skip


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else 10_000)
