"""Odd periods are flagged and left as they are; ordinary histories are not flagged.

The histories are invented; what must be flagged was put there by hand.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from normalize.bills import rules
from normalize.bills.flags import flag_batch
from normalize.bills.read import read_bills

pytestmark = pytest.mark.kernel
START = np.arange(36) * 30 + 18_000
WINTER = 1.0 + np.cos(2 * np.pi * (START + 15) / 365.25 - 0.3)


def history(seed: int = 1, noise: float = 0.1) -> np.ndarray:
    rng = np.random.default_rng(seed)
    return np.round((20.0 + 60.0 * WINTER) * np.exp(noise * rng.normal(size=36)), 2)


def flags(use: np.ndarray) -> list[set[str]]:
    bits = flag_batch(START, START + 30, use, [0, len(use)])
    return [{rules.FLAGS[b][0] for b in rules.FLAGS if int(k) & b} for k in bits]


def test_an_ordinary_history_has_no_flags() -> None:
    odd = sum(any(flags(history(seed))) for seed in range(200))
    assert odd <= 4  # 200 histories; the sway alone is set to err in well under 2 %


@pytest.mark.parametrize(("factor", "at"), [(10, 14), (0.1, 20), (100, 7)])
def test_one_bill_with_a_wrong_multiplier(factor: float, at: int) -> None:
    use = np.full(36, 50.0) + np.arange(36) % 7
    use[at] *= factor
    found = flags(use)
    assert "multiplier" in found[at]
    assert not any("multiplier" in f for k, f in enumerate(found) if k != at)


def test_a_multiplier_that_stays() -> None:
    use = history(noise=0.03)
    use[20:] *= 10
    found = flags(use)
    assert all("multiplier" in found[k] for k in range(21, 32))
    assert not any("multiplier" in f for f in found[:19])


def test_repeated_numbers_zero_use_and_an_empty_house() -> None:
    use = history()
    use[4:7] = 55.0
    use[25:28] = [3.0, 2.0, 0.0]
    found = flags(use)
    assert all("repeated number" in found[k] for k in (4, 5, 6))
    assert "zero use" in found[27]
    assert all("empty house" in found[k] for k in (25, 26, 27))


def test_guessed_readings_sway() -> None:
    caught = 0
    for seed in range(50):
        use = history(seed, noise=0.03)
        error = np.random.default_rng(seed + 999).normal(size=36) * 15.0
        error[1::2] = 0.0  # every other reading is a guess; its error comes back in the next
        use = use + error - np.concatenate([[0.0], error[:-1]])
        caught += any("alternating" in f for f in flags(use))
    assert caught >= 15  # regression, not truth


def test_flags_are_the_same_in_a_batch() -> None:
    many = [history(seed) for seed in range(5)]
    many[2][25:28] = 1.0
    one = np.concatenate([flag_batch(START, START + 30, u, [0, 36]) for u in many])
    batch = flag_batch(
        np.tile(START, 5), np.tile(START + 30, 5), np.concatenate(many), np.arange(6) * 36
    )
    assert batch.tolist() == one.tolist()


def test_flags_reach_the_bills(tmp_path: Path) -> None:
    file = tmp_path / "gas.csv"
    file.write_text(
        "Read date,Therms\n2023-01-01,1\n2023-02-01,40\n2023-03-01,400\n2023-04-01,39\n"
        "2023-05-01,0\n"
    )
    bills = read_bills(file)
    assert [(f.period, f.what) for f in bills.flags] == [(2, "multiplier"), (4, "zero use")]
    assert any(c.startswith("Period 4: no use at all") for c in bills.cautions)
    assert bills.periods.use.tolist() == [40.0, 400.0, 39.0, 0.0]


def test_solar_by_its_summers(tmp_path: Path) -> None:
    lines = ["Read date,kWh", "2022-01-01,1"]
    per_month = [700, 600, 400, 30, 10, 5, 8, 20, 150, 300, 500, 700]
    lines += [f"2022-{m + 2:02}-01,{u}" for m, u in enumerate(per_month[:-1])]
    file = tmp_path / "power.csv"
    file.write_text("\n".join(lines))
    assert "sunny months" in read_bills(file).unfit
    file.write_text("\n".join(lines).replace("kWh", "therms"))
    assert read_bills(file).unfit == ""  # gas does vanish in summer
    file.write_text("Read date,kWh\n2022-01-01,1\n2022-02-01,90\n2022-03-01,-9\n")
    assert "sent to the grid" in read_bills(file, net_metered=True).unfit
