"""Flags of the kernel in words: one for each odd period, one caution for each kind.

What belongs here: sentences.  The rules are in rules.py, the kernel in flags.py.
"""

from __future__ import annotations

from collections.abc import Sequence

from normalize.bills import rules
from normalize.bills.flags import flag_batch
from normalize.bills.periods import Flag, Periods


def flags_of(periods: Periods) -> tuple[Flag, ...]:
    """Flags of one account's periods, in their order.

    >>> import numpy as np
    >>> day = np.array([0, 30], np.int32)
    >>> p = Periods(day, day + 30, np.array([5.0, 0.0]), day * 0.0, day > 99, day)
    >>> flags_of(p)[0].what
    'zero use'
    """
    bits = flag_batch(periods.start, periods.end, periods.use, [0, periods.n])
    return tuple(
        Flag(k + 1, *words)
        for k in bits.nonzero()[0].tolist()
        for bit, words in rules.FLAGS.items()
        if int(bits[k]) & bit
    )


def flag_cautions(flags: Sequence[Flag]) -> tuple[str, ...]:
    """One sentence for each kind of flag, with the periods it concerns."""
    said = []
    for note in dict.fromkeys(f.note for f in flags):
        numbers = [f.period for f in flags if f.note == note]
        what = next(f.what for f in flags if f.note == note)
        if what == "alternating":
            said.append(f"{note[0].upper()}{note[1:]}.")
            continue
        shown = ", ".join(map(str, numbers[:8]))
        more = f" and {len(numbers) - 8} more" if len(numbers) > 8 else ""
        one = "Period" if len(numbers) == 1 else "Periods"
        said.append(f"{one} {shown}{more}: {note}.")
    return tuple(said)
