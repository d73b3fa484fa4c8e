"""Days between bills that no bill covers, in words: what is missing is said, not only seen."""

from __future__ import annotations

from typing import Final

from normalize.bills.periods import Periods
from normalize.days import iso

MOST_NAMED: Final = 6  # gaps told one by one; more are counted


def gap_words(periods: Periods) -> str:
    """A sentence that names the stretches without a bill, or nothing where there are none.

    periods : in order of time.
    """
    gaps = [
        (int(end), int(start))
        for end, start in zip(periods.end[:-1], periods.start[1:], strict=True)
        if start > end
    ]
    if not gaps:
        return ""
    named = "; ".join(
        f"{iso(first)} to {iso(last)} ({last - first} days)" for first, last in gaps[:MOST_NAMED]
    )
    more = f"; and {len(gaps) - MOST_NAMED} more stretches" if len(gaps) > MOST_NAMED else ""
    return f"No bill covers {named}{more}."
