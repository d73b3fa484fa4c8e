"""How each range was made, in the words that reports carry."""

from __future__ import annotations

from dataclasses import dataclass

METHOD = (
    "balance temperature and serial correlation of the bills both integrated over "
    "(restricted likelihood, first-order autoregression, Student t)"
)
METHOD_HELD = METHOD + "; the balance temperature was held, because the bills do not place it"
METHOD_STATED = (
    "a stated balance temperature, and the hull of the ranges over the customary ones; serial "
    "correlation of the bills integrated over (restricted likelihood, Student t)"
)
METHOD_AVOIDED = (
    "the baseline fit's uncertainty and the bills' noise, serial correlation integrated over; "
    "the reporting period's bills are taken as they are"
)


@dataclass(frozen=True, slots=True)
class Methods:
    """How each range was made, in words."""

    before: str
    after: str
    both: str
    avoided: str

    @classmethod
    def of(cls, held: tuple[bool, bool], stated: bool) -> Methods:
        """By whether each side's balance temperature was found, held or stated."""
        if stated:
            avoided = METHOD_AVOIDED + "; stated balance temperature"
            return cls(METHOD_STATED, METHOD_STATED, METHOD_STATED, avoided)
        before, after = (METHOD_HELD if h else METHOD for h in held)
        both = METHOD_HELD if any(held) else METHOD
        avoided = METHOD_AVOIDED + ("; balance temperature held" if held[0] else "")
        return cls(before, after, both, avoided)
