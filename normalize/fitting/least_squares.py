"""Small weighted least squares, exact enough to compare with a library to 1e-9."""

from __future__ import annotations

import numpy as np

from normalize.jit import kernel

RANK = 1e-8  # a column that keeps less of its length than this after projection is dependent


@kernel
def orthonormal(x, w):
    """Orthonormal columns under weights w spanning those of x; dependent ones are dropped.

    x (n, k), w (n,).  Gram-Schmidt twice over: orthogonal to machine precision.
    """
    n, k = x.shape
    z = np.empty((n, k))
    kept = 0
    for j in range(k):
        v = x[:, j].copy()
        before = 0.0
        for p in range(n):
            before += w[p] * v[p] * v[p]
        for _ in range(2):
            for i in range(kept):
                dot = 0.0
                for p in range(n):
                    dot += w[p] * z[p, i] * v[p]
                for p in range(n):
                    v[p] -= dot * z[p, i]
        after = 0.0
        for p in range(n):
            after += w[p] * v[p] * v[p]
        if after <= RANK * RANK * before or after <= 0.0:
            continue
        scale = 1.0 / np.sqrt(after)
        for p in range(n):
            z[p, kept] = v[p] * scale
        kept += 1
    return np.ascontiguousarray(z[:, :kept])


@kernel
def residual(y, w, z):
    """y with the columns of z taken out, and Σ w·z_j·y for each."""
    n, k = z.shape
    r = y.copy()
    s = np.zeros(k)
    for _ in range(2):
        for j in range(k):
            dot = 0.0
            for p in range(n):
                dot += w[p] * z[p, j] * r[p]
            s[j] += dot
            for p in range(n):
                r[p] -= dot * z[p, j]
    return r, s


@kernel
def weighted_fit(x, y, w):
    """Weighted least squares: (coefficients, unscaled covariance, rss, ok).

    x (n, k), y (n,), w (n,).  Covariance is (X'WX)⁻¹; multiply by rss/(n−k).
    ok is false when the columns are dependent; the rest is then NaN.
    """
    n, k = x.shape
    qm = np.empty((n, k))
    rm = np.zeros((k, k))
    coef = np.full(k, np.nan)
    cov = np.full((k, k), np.nan)
    for j in range(k):
        length = 0.0
        for p in range(n):
            qm[p, j] = x[p, j]
            length += w[p] * x[p, j] * x[p, j]
        for _ in range(2):
            for i in range(j):
                dot = 0.0
                for p in range(n):
                    dot += w[p] * qm[p, i] * qm[p, j]
                rm[i, j] += dot
                for p in range(n):
                    qm[p, j] -= dot * qm[p, i]
        left = 0.0
        for p in range(n):
            left += w[p] * qm[p, j] * qm[p, j]
        if not left > RANK * RANK * length:
            return coef, cov, np.nan, False
        rm[j, j] = np.sqrt(left)
        for p in range(n):
            qm[p, j] /= rm[j, j]
    r, s = residual(y, w, qm)
    inverse = np.zeros((k, k))
    for j in range(k):
        inverse[j, j] = 1.0 / rm[j, j]
        for i in range(j - 1, -1, -1):
            dot = 0.0
            for m in range(i + 1, j + 1):
                dot += rm[i, m] * inverse[m, j]
            inverse[i, j] = -dot / rm[i, i]
    for i in range(k):
        coef[i] = 0.0
        for j in range(i, k):
            coef[i] += inverse[i, j] * s[j]
        for m in range(k):
            dot = 0.0
            for j in range(max(i, m), k):
                dot += inverse[i, j] * inverse[m, j]
            cov[i, m] = dot
    rss = 0.0
    for p in range(n):
        rss += w[p] * r[p] * r[p]
    return coef, cov, rss, True
