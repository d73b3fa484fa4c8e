"""The six forms a fit can take, and why one is set aside."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

from normalize.errors import UnknownForm

FLAT: Final = 0
LINE: Final = 1
HEATING: Final = 2
COOLING: Final = 3
TWO_SLOPES: Final = 4
HEATING_AND_COOLING: Final = 5
N_FORMS: Final = 6


@dataclass(frozen=True, slots=True)
class Form:
    """One form. parameters counts coefficients and balance temperatures."""

    code: int
    name: str
    parameters: int
    terms: tuple[str, ...]
    equation: str
    trade_name: str


FORMS: Final[dict[str, Form]] = {
    form.name: form
    for form in (
        Form(FLAT, "flat", 1, ("base load",), "use a day = a", "mean"),
        Form(LINE, "line", 2, ("base load", "line slope"), "use a day = a + b·T", "two-parameter"),
        Form(
            HEATING,
            "heating",
            3,
            ("base load", "heating slope"),
            "use a day = a + b·(τ − T)⁺",
            "three-parameter heating",
        ),
        Form(
            COOLING,
            "cooling",
            3,
            ("base load", "cooling slope"),
            "use a day = a + c·(T − τ)⁺",
            "three-parameter cooling",
        ),
        Form(
            TWO_SLOPES,
            "two slopes",
            4,
            ("base load", "heating slope", "cooling slope"),
            "use a day = a + b·(τ − T)⁺ + c·(T − τ)⁺",
            "four-parameter",
        ),
        Form(
            HEATING_AND_COOLING,
            "heating and cooling",
            5,
            ("base load", "heating slope", "cooling slope"),
            "use a day = a + b·(τh − T)⁺ + c·(T − τc)⁺, τh ≤ τc",
            "five-parameter",
        ),
    )
}
BY_CODE: Final[tuple[Form, ...]] = tuple(sorted(FORMS.values(), key=lambda f: f.code))

# Status of a form after the kernel has tried it.
FITTED: Final = 0
TOO_FEW: Final = 1
NO_BALANCE: Final = 2
WRONG_SIGN: Final = 3
WEAK_SLOPE: Final = 4
NEGATIVE_BASE: Final = 5
SINGULAR: Final = 6
NOT_TRIED: Final = 7

REASONS: Final[dict[int, str]] = {
    FITTED: "",
    TOO_FEW: "too few bills: this form needs {needed} and there are {n}",
    NO_BALANCE: (
        "the bills do not span enough cold and mild weather to place a balance temperature "
        "(3 periods on the side of the slope and 2 on the other are needed)"
    ),
    WRONG_SIGN: "the best slope is not positive: use does not rise in that weather",
    WEAK_SLOPE: "a slope cannot be told from zero (|t| {t:.1f}, 2 is wanted)",
    NEGATIVE_BASE: "the base load would be below zero",
    SINGULAR: "the bills do not tell its coefficients apart",
    NOT_TRIED: "offered only when asked for",
}


def form_named(name: str) -> Form:
    """The form of that name.

    >>> form_named("heating").parameters
    3
    """
    if name not in FORMS:
        raise UnknownForm(
            f"there is no form called {name!r}", wanted="one of " + ", ".join(sorted(FORMS))
        )
    return FORMS[name]
