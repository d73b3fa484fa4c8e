"""Damaged archive files: a message or days, never a fault of the program.

Seeded damage to small invented files: bytes changed, cut out, repeated; lines and cells lost.
"""

from __future__ import annotations

import random
from pathlib import Path

import numpy as np
import pytest

from normalize.errors import NormalizeError
from normalize.weather.formats import format_of
from normalize.weather.read import read_weather
from normalize.weather.year import read_long_term_year
from tests.weather import test_archives as archives
from tests.weather.test_published import URBANA
from tests.weather.test_stations import normals_file

TRIALS = 25


def summaries() -> list[str]:
    lines = [
        "STATION,DATE,REPORT_TYPE,HourlyDryBulbTemperature,"
        "DailyMaximumDryBulbTemperature,DailyMinimumDryBulbTemperature"
    ]
    for day in archives.dates()[:20]:
        lines += [f"7,{day}T12:00:00,FM-15,50,,", f"7,{day}T23:59:00,SOD  ,,60,40"]
    return lines


def canada() -> list[str]:
    return [archives.CANADA] + [
        f'"-70.1","45.2","ELDER BAY","7010000","{day}","2022","1","2","","5.0","","1.0","","","",""'
        for day in archives.dates()[:30]
    ]


def tmy2() -> list[str]:
    hour = "0" * 58 + "{t:4d}" + "A7" * 20
    return [" 12839 HARROW                 ZZ  -5 N 44 48 W  72 16     2"] + [
        f" 62 1{d:2d}{h:2d}" + hour.format(t=10 * h) for d in range(1, 4) for h in range(1, 25)
    ]


SEEDS = {
    "GHCN-Daily file (.dly)": lambda: archives.dly(archives.PLAIN)[:9],
    "GHCN-Daily rows": lambda: archives.rows()[:60],
    "GHCN-Daily table": lambda: archives.access()[:40],
    "global summary of the day": lambda: archives.gsod()[:40],
    "ISD-Lite file": lambda: archives.isd_lite(5, 72),
    "local climatological data": summaries,
    "Environment Canada daily table": canada,
    "normals file": lambda: normals_file().decode().splitlines(),
    "table of monthly means": lambda: [
        "month,mean_f",
        *[f"{i + 1},{t}" for i, t in enumerate(URBANA)],
    ],
    "TMY2 file": tmy2,
}


def damaged(data: bytes, rng: random.Random) -> bytes:
    out = bytearray(data)
    for _ in range(rng.randint(1, 6)):
        i = rng.randrange(max(1, len(out) if rng.random() < 0.5 else min(len(out), 300)))
        kind = rng.randrange(6)
        lines = bytes(out).split(b"\n")
        at = rng.randrange(len(lines))
        if kind == 0 and out:
            out[i] = rng.randrange(256)
        elif kind == 1:
            del out[i : i + rng.randint(1, 40)]
        elif kind == 2:
            out[i:i] = bytes(rng.choice(b'0123456789,-."\n\r\x00 TMAX') for _ in range(9))
        elif kind == 3:
            out[i:i] = out[at : at + rng.randint(1, 200)]
        elif kind == 4:
            out = bytearray(b"\n".join(lines[:at] + lines[at + 1 :]))
        else:
            cells = lines[at].split(b",")
            cells.pop(rng.randrange(len(cells)))
            out = bytearray(b"\n".join([*lines[:at], b",".join(cells), *lines[at + 1 :]]))
    return bytes(out) or b"x"


@pytest.mark.parametrize("kind", sorted(SEEDS))
def test_damage_is_a_message_or_days(kind: str, tmp_path: Path) -> None:
    whole = "\n".join(SEEDS[kind]()).encode()
    found = format_of(whole)
    assert found is not None
    assert found.name == kind
    rng = random.Random(kind)
    path = tmp_path / "a.txt"
    path.write_bytes(whole)
    read = (days, year)
    assert kind == "TMY2 file" or any(f(path) is True for f in read)  # three days are no year
    for _ in range(TRIALS):
        path.write_bytes(damaged(whole, rng))
        for f in read:
            answer = f(path)
            assert answer is True or (isinstance(answer, str) and 0 < len(answer) < 2000)


def days(path: Path) -> bool | str:
    try:
        return bool(np.isfinite(read_weather(path, unit="F", time_zone_offset=-5).temp_f).any())
    except NormalizeError as error:
        return str(error)


def year(path: Path) -> bool | str:
    try:
        return abs(float(read_long_term_year(path).weight.sum()) - 365.0) < 1e-6
    except NormalizeError as error:
        return str(error)
