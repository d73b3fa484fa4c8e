"""What a unit is worth: the price of the last unit, never the average with its fixed charge."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from normalize.bills.periods import Periods
from normalize.savings.results import Price

LAST_DAYS = 731  # prices drift: only the last two years of bills speak of today's
MIN_BILLS = 6  # a fixed charge and a price from fewer would be guessing
MAX_PRICE_ERROR = 0.10  # of the price: with more, charge and price cannot be told apart
FROM_BILLS = "the bills' cost with the fixed charge taken out"
AVERAGE = "the bills' cost divided by their use, fixed charges included"
DELIVERED = "the price a unit of the last deliveries"


def price_of(periods: Periods, *, stated: float | None, delivered: bool) -> Price:
    """The price of the last unit, from the site file or from the bills' cost.

    A bill is a charge a day plus a price a unit, cost = f·days + p·use; p is what a saved
    unit saves.  Where that cannot be told apart the average is used and called so.

    >>> n = np.arange(12); use = 40.0 + 30.0 * np.cos(n)
    >>> p = Periods((30 * n).astype(np.int32), (30 * n + 30).astype(np.int32), use,
    ...     15.0 + 1.25 * use, np.zeros(12, bool), np.ones(12, np.int32))
    >>> round(price_of(p, stated=None, delivered=False).per_unit, 6)
    1.25
    """
    if stated is not None:
        return Price(stated, "site file")
    keep = np.isfinite(periods.cost) & np.isfinite(periods.use) & (periods.use > 0.0)
    if keep.any():
        keep &= periods.end > periods.end[keep].max() - LAST_DAYS
    if not keep.any():
        return Price(
            None,
            "",
            "the bills carry no cost and site.toml names no price; add price = … to the account",
        )
    use, cost = periods.use[keep], periods.cost[keep]
    days = periods.days[keep].astype(np.float64)
    average = float(cost.sum() / use.sum())
    if delivered:
        return _sane(Price(average, DELIVERED))
    fitted = _marginal(use, cost, days)
    if fitted is None or not 0.0 < fitted <= 3.0 * average:
        return _sane(Price(average, AVERAGE))
    return _sane(Price(fitted, FROM_BILLS))


def _marginal(
    use: NDArray[np.float64], cost: NDArray[np.float64], days: NDArray[np.float64]
) -> float | None:
    if use.shape[0] < MIN_BILLS:
        return None
    # Some charge by the day, some by the bill: whichever explains the costs better.
    tried = [_charge_and_price(charge, use, cost) for charge in (days, np.ones_like(days))]
    known = [t for t in tried if t is not None]
    if not known:
        return None
    _, price, error = min(known)
    return price if error <= MAX_PRICE_ERROR * abs(price) else None


def _charge_and_price(
    charge: NDArray[np.float64], use: NDArray[np.float64], cost: NDArray[np.float64]
) -> tuple[float, float, float] | None:
    """(sum of squares, price, its standard error) of cost = f·charge + p·use."""
    x = np.column_stack([charge, use])
    coef, _, rank, values = np.linalg.lstsq(x, cost, rcond=None)
    if rank < 2 or values[1] <= 1e-9 * values[0]:
        return None
    left = float(((cost - x @ coef) ** 2).sum())
    cov = np.linalg.inv(x.T @ x)
    error = np.sqrt(left / (use.shape[0] - 2) * cov[1, 1])
    return left, float(coef[1]), float(error)


def _sane(price: Price) -> Price:
    if price.per_unit is None or not np.isfinite(price.per_unit) or price.per_unit <= 0.0:
        return Price(None, "", "the bills' costs give no price above zero; add price = … instead")
    return price
