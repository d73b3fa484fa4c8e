"""How each range was made, in the words that reports carry."""

from __future__ import annotations

from dataclasses import dataclass

METHOD = (
    "balance temperature, serial correlation of the bills and growth of their errors with use "
    "all integrated over (restricted likelihood, first-order autoregression, Student t)"
)
METHOD_UNSURE = METHOD + (
    "; the bills do not place the balance temperature, so every value in its range was tried"
)
METHOD_STATED = (
    "a stated balance temperature, and the hull of the ranges over the customary ones; serial "
    "correlation of the bills and growth of their errors with use integrated over (restricted "
    "likelihood, Student t)"
)
METHOD_AVOIDED = (
    "the baseline fit's uncertainty and the bills' noise, serial correlation and growth of "
    "errors with use integrated over; "
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
    def of(cls, unsure: tuple[bool, bool], stated: bool) -> Methods:
        """By whether each side's balance temperature was found, tried over its range or stated."""
        if stated:
            avoided = METHOD_AVOIDED + "; stated balance temperature"
            return cls(METHOD_STATED, METHOD_STATED, METHOD_STATED, avoided)
        before, after = (METHOD_UNSURE if u else METHOD for u in unsure)
        both = METHOD_UNSURE if any(unsure) else METHOD
        avoided = METHOD_AVOIDED + (
            "; every balance temperature in its range was tried" if unsure[0] else ""
        )
        return cls(before, after, both, avoided)
