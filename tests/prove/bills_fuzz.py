"""Broken bill files by the thousand: no exception but the program's own may leave the reader.

``python -m tests.prove.bills_fuzz [seconds]`` mutates the test corpus (tables, workbooks,
interval files, ESPI XML): bytes flipped, pieces cut, doubled, swapped between files, numbers and
marks from a list of nasty ones put in.  It prints how many inputs it tried and what it found.
"""

from __future__ import annotations

import random
import sys
import tempfile
import time
import traceback
import warnings
from collections import Counter
from pathlib import Path

from normalize.bills.accounts import read_accounts
from normalize.bills.read import read_bills
from normalize.bills.repair import reconcile
from normalize.errors import NormalizeError
from tests.bills.corpus import CORPUS
from tests.bills.espi_makers import gas
from tests.bills.hostile import workbook
from tests.bills.test_read_espi import GOOD

NASTY = (
    b"nan", b"inf", b"-inf", b"1e308", b"-1e308", b"1e-320", b"9" * 40, b"-0", b"0", b"",
    b"0001-01-01", b"9999-12-31", b"2023-02-30", b"2100-01-01", b"29/02/2023", b"=1+1", b"\0",
    b"\xff\xfe", b"\xef\xbb\xbf", b'"', b"'", b",", b";", b"\t", b"|", b"\n", b"\r", b"\r\n",
    b"2023-01-05 24:00", b"12:60", b"1,234,567", b"1.234,5", b"(45.10)", b"45-", b"$", b"%",
    b"kWh", b"therms", b"MBtu", b"Start", b"End", b"Usage", b"Meter reading", b"Total", b"E",
    b"<", b">", b"&", b"<!DOCTYPE a>", b"</entry>", b"<value>", b"Jan-23",
    b"\xc2\xa0", b"\xe2\x88\x92",
    "½٣३".encode(), "📈".encode(), b"12345678901234567890",
)  # fmt: skip
OPTIONS: tuple[dict[str, object], ...] = (
    {}, {}, {}, {"fuel": "natural gas"}, {"fuel": "electricity", "unit": "kWh"},
    {"dates": "day first"}, {"end_dates": "inclusive"}, {"kind": "delivery"},
    {"net_metered": True}, {"read_day": 31}, {"sum_to": "month"}, {"time_zone": "+14:00"},
    {"rows": "1234"}, {"decimal": "comma"}, {"multiplier": 1e8}, {"tank_size": 1.0},
    {"interval_times": "end"}, {"generation_column": "none"},
)  # fmt: skip


SEVERAL = (
    b"Account,Service,Start,End,Usage,Unit\n0011005678,Gas,2023-01-05,2023-02-06,81,therms\n"
    b"0011005678,Electric,2023-01-05,2023-02-06,500,kWh\nB2,Gas,2023-02-06,2023-03-07,7,therms\n"
    b",Gas,2023-02-06,2023-03-07,70.5,therms\nTotal,,,,9,\nB2,Gas,2023-01-05,2023-02-06,9,therms\n",
    b"Account: 7000112233\nStart,End,Therms\n2023-01-05,2023-02-06,81\n2023-02-06,2023-03-07,70\n"
    b"Account: 7000998877\nStart,End,Therms\n2023-01-05,2023-02-06,11\n",
    b"Read date,Electric kWh,Gas therms\n2022-12-20,900,9\n2023-01-20,950,110\n2023-02-19,8,\n",
)  # fmt: skip


def seeds() -> list[bytes]:
    """What is mutated: the corpus, ESPI files, interval files and a workbook."""
    texts = [c.text if isinstance(c.text, bytes) else c.text.encode() for c in CORPUS]
    texts += [t if isinstance(t, bytes) else t.encode() for t in GOOD.values()]
    hours = "".join(f"2023-01-{d} {h:02}:00,0.5\n" for d in (13, 14) for h in range(24))
    apart = "".join(f"1/{d}/2023,{h}:00,0.5,kWh\n" for d in (13, 14) for h in range(24))
    texts += [("Timestamp,kWh\n" + hours).encode(), ("Date,Time,Usage,Unit\n" + apart).encode()]
    turns = "".join(f"{a},2023-01-{d} {h:02}:00,0.5\n" for d in (13, 14) for h in range(24)
                    for a in ("11112222", "7000445566"))  # fmt: skip
    texts += [("Meter,Timestamp,kWh\n" + turns).encode()] * 3
    return [*texts, *SEVERAL * 5, gas().encode(), workbook()]


def mutated(rng: random.Random, data: bytes, others: list[bytes]) -> bytes:
    """A broken copy."""
    out = bytearray(data)
    for _ in range(rng.choice((1, 1, 2, 3, 8))):
        size = len(out)
        a = rng.randrange(size + 1)
        b = min(size, a + int(rng.expovariate(0.1)))
        match rng.randrange(7):
            case 0:
                out[a:b] = rng.choice(NASTY)
            case 1:
                out[a:a] = rng.choice(NASTY)
            case 2:
                del out[a:b]
            case 3:
                out[a:a] = out[a:b] * rng.choice((1, 2, 50))
            case 4 if size:
                out[min(a, size - 1)] = rng.randrange(256)
            case 5:
                other = rng.choice(others)
                c = rng.randrange(len(other) + 1)
                out[a:b] = other[c : c + int(rng.expovariate(0.01))]
            case _:
                lines = bytes(out).split(b"\n")
                rng.shuffle(lines)
                out = bytearray(b"\n".join(lines))
    return bytes(out)


def every_account(file: Path, options: dict[str, object]) -> None:
    """Every account of a file: no line in two of them, and none without a name of its own."""
    found = read_accounts(file, **options)
    lines = [(r.file, r.line) for bills in found.bills for r in bills.rows]
    one_fuel = len({b.fuel for b in found.bills}) <= 1  # side by side, a line is of two fuels
    if len(found.accounts) > 1 and one_fuel and len(set(lines)) != len(lines):
        raise AssertionError("a line is in two accounts")
    if len({a.label for a in found.accounts}) != len(found.accounts):
        raise AssertionError("two accounts have one name")


def fuzz(seconds: float, seed: int) -> tuple[Counter[str], list[str]]:
    """Outcomes, and tracebacks of what should not have happened."""
    warnings.simplefilter("error")
    rng = random.Random(seed)
    every = seeds()
    outcomes: Counter[str] = Counter()
    faults: list[str] = []
    until = time.monotonic() + seconds
    with tempfile.TemporaryDirectory() as folder:
        file = Path(folder) / "bills.csv"
        while time.monotonic() < until:
            data = mutated(rng, rng.choice(every), every)
            options = dict(rng.choice(OPTIONS))
            file.write_bytes(data)
            try:
                if rng.random() < 0.5:
                    reconcile(read_bills(file, **options))  # type: ignore[arg-type]
                    outcomes["read"] += 1
                else:
                    every_account(file, options)
                    outcomes["read, every account"] += 1
            except NormalizeError as err:
                outcomes[type(err).__name__] += 1
            except Exception:  # noqa: BLE001 (that is what is looked for)
                outcomes["fault"] += 1
                faults.append(f"{options} {data[:2000]!r}\n{traceback.format_exc()}")
                if len(faults) >= 5:
                    break
    return outcomes, faults


if __name__ == "__main__":
    given = float(sys.argv[1]) if len(sys.argv) > 1 else 600.0
    start = int(sys.argv[2]) if len(sys.argv) > 2 else 1
    counts, found = fuzz(given, start)
    tried = sum(counts.values())
    print(f"{tried:,} inputs in {given:g} s, seed {start}: {dict(counts.most_common())}")
    print("\n\n".join(found[:5]))
    sys.exit(bool(found))
