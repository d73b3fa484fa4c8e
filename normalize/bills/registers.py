"""Use from readings of the meter: each reading less the one before, through rollover.

What belongs here: differences of a register, its passing of 9999, a meter that was replaced.
Thresholds are in rules.py.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from normalize.bills import rules
from normalize.bills.layouts import OPENS, REOPENS, Record

_OPENING = (OPENS.split(":")[0], REOPENS.split(":")[0])


@dataclass(slots=True)
class Register:
    """A line's readings. now : at the bill's end.  before : at its start, where it is given.

    meter : which meter it is of.  times : its multiplier.
    """

    record: Record
    now: float | None
    before: float | None
    meter: str
    times: float


def difference(registers: Sequence[Register]) -> tuple[str, ...]:
    """Turn readings into use, in place; returns sentences.

    A line whose use cannot be known is blamed.  Lines that already have a problem other than
    opening the record still serve as the reading before the next.
    """
    for meter in dict.fromkeys(r.meter for r in registers):
        _one_meter(sorted((r for r in registers if r.meter == meter), key=_when))
    return ("use is each reading of the meter less the one before",)


def _when(register: Register) -> tuple[int, int]:
    end = register.record.end
    return (end if end is not None else 2**31, register.record.line)


def _one_meter(ordered: Sequence[Register]) -> None:
    before: Register | None = None
    steps: list[tuple[Register, float, float]] = []
    for this in ordered:
        record = this.record
        record.use = None
        if this.now is None or record.end is None:
            record.blame("no reading given")
            continue
        last = this.before
        if last is None and before is not None and _follows(before, this):
            last = before.now
        before = this
        if last is None:
            opens = record.problem.startswith(_OPENING)
            record.problem = record.problem if opens else record.problem or _NO_BEFORE
            continue
        if record.problem.startswith(_OPENING):
            continue  # its reading before is given, but not the date of it
        steps.append((this, last, this.now))
    usual = _usual_a_day(steps)
    size = _dial(steps)
    for this, last, now in steps:
        _settle(this, last, now, usual, size)


_NO_BEFORE = "the reading before it is not in the file"


def _follows(before: Register, this: Register) -> bool:
    """Whether a line's bill begins where the line before ended."""
    return this.record.start is not None and this.record.start == before.record.end


def _length(register: Register) -> int:
    record = register.record
    return max(1, (record.end or 0) - (record.start or 0)) if record.start is not None else 1


def _usual_a_day(steps: Sequence[tuple[Register, float, float]]) -> float:
    """The largest rise a day of an ordinary line; 0 where there is none."""
    return max(((now - last) / _length(this) for this, last, now in steps if now >= last),
               default=0.0)  # fmt: skip


def _dial(steps: Sequence[tuple[Register, float, float]]) -> float:
    """What the register counts to: the power of ten above its highest reading."""
    highest = max((max(last, now) for _, last, now in steps), default=0.0)
    size = 10.0 ** rules.DIAL_DIGITS[0]
    while size <= highest and size < 10.0 ** rules.DIAL_DIGITS[1]:
        size *= 10.0
    return size


def _settle(this: Register, last: float, now: float, usual: float, size: float) -> None:
    record = this.record
    if now >= last:
        record.use = (now - last) * this.times
        return
    rolled = now + size - last
    if usual > 0 and 0 < rolled / _length(this) <= rules.ROLLOVER_TIMES * usual:
        record.use = rolled * this.times
        record.note = f"the register passed {size - 1:.0f} and began again"
        return
    record.blame(
        f"the reading fell from {last:g} to {now:g}: the meter was replaced, or one of the two is "
        "wrong"
    )
