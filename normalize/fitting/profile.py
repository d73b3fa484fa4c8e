"""How well the bills place a balance temperature: the best fit with τ held, along τ."""

from __future__ import annotations

import numpy as np

from normalize.fitting.forms import HEATING_AND_COOLING, TWO_SLOPES
from normalize.fitting.least_squares import orthonormal, residual
from normalize.fitting.pair import other_side
from normalize.fitting.sweep import degree_days_per_day
from normalize.jit import kernel


@kernel
def profile_gains(form, ts, ps, y, d, w, taus, cooling, box):
    """(len(taus),) sum of squares explained at each held τ; −1 where none qualifies.

    For heating and cooling together the other balance temperature is swept anew at each τ.
    taus and box are about SHIFT_F.
    """
    n = d.shape[0]
    q = w / d
    tn = -ts[::-1].copy()
    pn = ps[::-1].copy()
    out = np.full(taus.shape[0], -1.0)
    h = np.empty(n)
    ones = np.ones((n, 1))
    z = orthonormal(ones, w)
    tbar = np.zeros(n)
    for i in range(ts.shape[0]):
        tbar[ps[i]] += ts[i]
    tbar /= d
    for i in range(taus.shape[0]):
        tau = taus[i]
        if form == HEATING_AND_COOLING:
            lo = box[0] if cooling else max(box[2], tau)
            hi = min(box[1], tau) if cooling else box[3]
            if lo > hi:
                continue
            out[i], _ = other_side(
                ts, ps, tn, pn, y, w, q, d, z, tau, not cooling, lo, hi, 0.0, 0.0
            )
            continue
        if cooling:
            degree_days_per_day(tn, pn, d, -tau, h)
        else:
            degree_days_per_day(ts, ps, d, tau, h)
        columns = 3 if form == TWO_SLOPES else 2
        x = np.ones((n, columns))
        x[:, 1] = h
        if form == TWO_SLOPES:
            x[:, 2] = tbar
        _, s = residual(y, w, orthonormal(x, w))
        gain = 0.0
        for j in range(1, s.shape[0]):
            gain += s[j] * s[j]
        out[i] = gain
    return out
