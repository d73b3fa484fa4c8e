"""All ugly files of the tests, for whoever wants to break them further (tests/prove)."""

from __future__ import annotations

from tests.bills import (
    test_ugly_amounts,
    test_ugly_columns,
    test_ugly_dates,
    test_ugly_files,
    test_ugly_readings,
)

CORPUS = [
    *test_ugly_files.CORPUS,
    *test_ugly_dates.CORPUS,
    *test_ugly_readings.CORPUS,
    *test_ugly_columns.CORPUS,
    *test_ugly_amounts.CORPUS,
]
