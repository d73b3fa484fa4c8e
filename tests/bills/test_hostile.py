"""Files made to hurt end in a clear error, or in an answer that tells what was left out.

Time and memory are measured in tests/prove/bills_hostile.py; here they are only kept from
running away.
"""

from __future__ import annotations

from pathlib import Path

import pytest

from normalize.bills.read import read_bills
from normalize.errors import NormalizeError
from tests.bills.hostile import MAKERS, READABLE, SLOW


@pytest.mark.parametrize("name", [n for n in MAKERS if n not in SLOW])
def test_hostile_file(name: str, tmp_path: Path) -> None:
    file = tmp_path / "bills.csv"
    MAKERS[name](file)
    if name in READABLE:
        bills = read_bills(file)
        assert bills.periods.n
        assert all(abs(u) < 1e9 for u in bills.periods.use.tolist())
        return
    with pytest.raises(NormalizeError) as said:
        read_bills(file)
    text = str(said.value)
    assert text.startswith("bills.csv")
    assert len(text) < 800
    assert text.isprintable()
