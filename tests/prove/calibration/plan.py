"""The design of the study: a full core, and spokes that change one thing at a time."""

from __future__ import annotations

from dataclasses import replace

from tests.prove.calibration.cells import FORMS, Cell

BILLS = (9, 12, 18, 24, 36)
TWO_MONTHLY = (6, 9, 12, 18)
RHOS = (0.0, 0.3, 0.5, 0.7)
NOISES = (0.03, 0.05, 0.10, 0.15, 0.20, 0.30)
CLIMATES = ("mild", "cold", "hot")
SPOKE_BILLS = (12, 24)
SPOKE_RHO = 0.3
SPOKE_FORMS = ("flat", "heating", "cooling", "heating and cooling")
DELIVERIES = ((10, 5), (14, 7), (20, 10), (20, 5), (28, 7))  # intervals a side, a year
DELIVERY_ERRORS = ((0.05, 0.0), (0.10, 0.0), (0.10, 0.3), (0.20, 0.3))  # noise, correlation
ASKED = ("line", "two slopes")  # chosen only when asked for, so the homes' owners ask


def core() -> list[Cell]:
    """Every form × monthly bills a side × correlation at 10 % noise, temperate climate."""
    return [_of(form, bills, rho) for form in FORMS for bills in BILLS for rho in RHOS]


def spokes() -> dict[str, list[Cell]]:
    """Name of a spoke → its cells, each a core cell with one thing changed."""
    hubs = [_of(form, bills, SPOKE_RHO) for form in SPOKE_FORMS for bills in SPOKE_BILLS]
    sloped = [c for c in hubs if c.form in ("heating", "heating and cooling")]
    two = [
        replace(_of(form, bills, rho), schedule="two-monthly")
        for form in SPOKE_FORMS for bills in TWO_MONTHLY for rho in (0.0, 0.3)
    ]  # fmt: skip
    delivered = [
        Cell("heating", n, rho, noise, schedule="delivered", a_year=a, offer="heat")
        for n, a in DELIVERIES for noise, rho in DELIVERY_ERRORS
    ]  # fmt: skip
    return {
        "noise": [replace(c, noise=x) for c in hubs for x in NOISES if x != c.noise],
        "tails": [replace(c, tails=t) for c in hubs for t in ("t3", "outliers")],
        "errors in proportion to use": [replace(c, spread="use") for c in hubs if c.form != "flat"],
        "climate": [replace(c, climate=k) for c in hubs if c.form != "flat" for k in CLIMATES],
        "estimated readings joined": [replace(c, folded=True) for c in hubs],
        "two-monthly bills": two,
        "delivered fuel": delivered,
        "a heating fuel's choice": [
            replace(_of("heating", b, r), offer="heat") for b in BILLS[:4] for r in (0.0, 0.3, 0.5)
        ],
        "a form that was not offered": [
            Cell(form, bills, SPOKE_RHO) for form in ASKED for bills in SPOKE_BILLS
        ],
        "long and short bills err alike": [
            replace(c, spread="equal", schedule="two-monthly", bills=c.bills // 2 + 3)
            for c in sloped
        ],
    }


def _of(form: str, bills: int, rho: float) -> Cell:
    return Cell(form, bills, rho, offer="asked" if form in ASKED else "all")


DAILY_DAYS = (365, 730)
DAILY_NOISE = 0.30
DAILY_ERRORS = ((0.0, ""), (0.3, ""), (0.5, ""), (0.8, ""), (0.5, "weekly"), (0.5, "slow"))


def daily() -> list[Cell]:
    """Daily data: form × days a side × kind of error."""
    return [
        Cell(form, days, rho, DAILY_NOISE, schedule="daily", pattern=pattern)
        for form in SPOKE_FORMS for days in DAILY_DAYS for rho, pattern in DAILY_ERRORS
    ]  # fmt: skip


CHOICE_BILLS = (9, 12, 18, 24)
CHOICE_RHOS = (0.0, 0.3)
CHOICE_NOISY_BILLS, CHOICE_NOISE = 12, 0.20  # where forms are hardest to tell apart


def choice() -> list[Cell]:
    """Cells in which ways of choosing a form are compared: the default four are offered."""
    noisy = [
        replace(_of(form, CHOICE_NOISY_BILLS, SPOKE_RHO), noise=CHOICE_NOISE)
        for form in SPOKE_FORMS
    ]
    return noisy + [
        _of(form, bills, rho)
        for form in SPOKE_FORMS for bills in CHOICE_BILLS for rho in CHOICE_RHOS
    ]  # fmt: skip
