"""What all tests share: the same examples in every run, and the sample sites."""

from __future__ import annotations

from pathlib import Path

import pytest
from hypothesis import settings

ROOT = Path(__file__).parents[1]

# Examples are drawn from a fixed seed, so that a failure can be met again; and a busy machine
# is no failure.
settings.register_profile("normalize", derandomize=True, deadline=None)
settings.load_profile("normalize")

COMPILED_ROOMS = ("fitting", "savings")  # elsewhere a test is marked where it stands


def pytest_collection_modifyitems(items: list[pytest.Item]) -> None:
    """Mark the tests of the rooms that are compiled throughout."""
    for item in items:
        if any(item.path.is_relative_to(ROOT / "tests" / room) for room in COMPILED_ROOMS):
            item.add_marker(pytest.mark.kernel)


@pytest.fixture(scope="session")
def samples() -> Path:
    """The folder of sample sites."""
    return ROOT / "sample_data"
