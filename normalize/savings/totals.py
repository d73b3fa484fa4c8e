"""Totals over the accounts of a site: energy, money, carbon."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from normalize.savings.results import Amount, Estimate, Total


@dataclass(frozen=True, slots=True)
class Share:
    """One account's part of a total: its estimate and what a unit of it counts.

    mmbtu, price, co2_kg : per account unit, None where unknown.
    """

    account: str
    estimate: Estimate
    mmbtu: float | None
    price: float | None
    co2_kg: float | None


def total_of(shares: Sequence[Share]) -> Total:
    """Energy, cost and carbon of all accounts together. [MMBtu, currency, kg a year]"""
    return Total(
        energy_mmbtu=_amount([(s.account, s.estimate, s.mmbtu) for s in shares]),
        cost=_amount([(s.account, s.estimate, s.price) for s in shares]),
        co2_kg=_amount([(s.account, s.estimate, s.co2_kg) for s in shares]),
    )


def _amount(parts: Sequence[tuple[str, Estimate, float | None]]) -> Amount:
    """Sum of value·factor; ranges combined as if independent, and as if errors add up.

    Ranges are not symmetric, so each side is combined on its own.

    >>> a = Estimate(value=10.0, low=7.0, high=13.0)
    >>> b = Estimate(value=5.0, low=1.0, high=9.0)
    >>> t = _amount([("gas", a, 1.0), ("electricity", b, 1.0)])
    >>> t.value, t.low, t.high, t.worst_low, t.worst_high
    (15.0, 10.0, 20.0, 8.0, 22.0)
    """
    missing = tuple(
        name for name, e, factor in parts if e.value is None or factor is None or e.low is None
    )
    known = [
        (e.value * f, e.low * f, e.high * f)
        for _, e, f in parts
        if e.value is not None and e.low is not None and e.high is not None and f is not None
    ]
    if not known:
        return Amount(missing=missing, unavailable="no account has what this total needs")
    value = math.fsum(v for v, _, _ in known)
    below = math.sqrt(math.fsum((v - low) ** 2 for v, low, _ in known))
    above = math.sqrt(math.fsum((high - v) ** 2 for v, _, high in known))
    return Amount(
        value=value,
        low=value - below,
        high=value + above,
        worst_low=math.fsum(low for _, low, _ in known),
        worst_high=math.fsum(high for _, _, high in known),
        missing=missing,
    )
