"""A fit in a normal year, compiled: NAC and its derivatives."""

from __future__ import annotations

import numpy as np

from normalize.fitting.columns import BASE, SLOPE_C, SLOPE_H, SLOPE_LINE, TAU_C, TAU_H
from normalize.fitting.forms import COOLING, HEATING, LINE, TWO_SLOPES
from normalize.fitting.sweep import SHIFT_F
from normalize.jit import kernel


@kernel
def year_at(base, temp, days, degrees):
    """(days below, H0, C0) of a long-term year at a base."""
    k = np.searchsorted(temp, base)
    below = days[k]
    heating = base * days[k] - degrees[k]
    last = days.shape[0] - 1
    cooling = degrees[last] - degrees[k] - base * (days[last] - days[k])
    return below, heating, cooling


@kernel
def nac_of(row, form, temp, days, degrees):
    """Normalized annual consumption of a fitted row."""
    last = days.shape[0] - 1
    total = days[last] * row[BASE]
    if form == LINE:
        total += row[SLOPE_LINE] * degrees[last]
    if form == HEATING or form >= TWO_SLOPES:
        total += row[SLOPE_H] * year_at(row[TAU_H], temp, days, degrees)[1]
    if form == COOLING or form >= TWO_SLOPES:
        total += row[SLOPE_C] * year_at(row[TAU_C], temp, days, degrees)[2]
    return total


@kernel
def nac_gradient(row, form, k, drivers, temp, days, degrees):
    """(k,) derivatives of NAC in the order of the Jacobian's columns.

    drivers : how many; they are measured from their normal level, so NAC has none of them.
    """
    last = days.shape[0] - 1
    g = np.zeros(k)
    g[0] = days[last]
    at = 1 + drivers
    heating = form == HEATING or form >= TWO_SLOPES
    cooling = form == COOLING or form >= TWO_SLOPES
    if form == LINE:
        g[at] = degrees[last] - SHIFT_F * days[last]
    below = 0.0
    if heating:
        below, g[at], _ = year_at(row[TAU_H], temp, days, degrees)
        at += 1
    above = 0.0
    if cooling:
        _, _, g[at] = year_at(row[TAU_C], temp, days, degrees)
        # Strictly above, as the Jacobian counts: a day at τ itself does not move.
        above = days[last] - days[np.searchsorted(temp, row[TAU_C], side="right")]
        at += 1
    if at < k:
        if form == TWO_SLOPES:
            g[at] = row[SLOPE_H] * below - row[SLOPE_C] * above
            return g
        if heating:
            g[at] = row[SLOPE_H] * below
            at += 1
        if cooling:
            g[at] = -row[SLOPE_C] * above
    return g
