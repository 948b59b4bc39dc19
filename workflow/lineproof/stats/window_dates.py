"""What whole windows share that end at one date, compiled: the moments of the factors, made once for all securities."""

from __future__ import annotations

import numpy as np
from numba import njit, prange

# Centring within the window and taking off the fit both cancel digits. Sums are kept while more than this share of the
# raw sum of squares is left after both: 3 digits lost at most.
SHARE_LEFT = 1e-3

_compiled = njit(cache=True, error_model="numpy")
_parallel = njit(cache=True, error_model="numpy", parallel=True)


@_parallel
def by_date(factors, wanted, powers):  # pragma: no cover - compiled
    """What whole windows that end at the wanted dates share, a column a date: the share left by centring (0 where there
    is no such window, or it needs care), the sum of weights, means, and centred products with their inverse."""
    k = factors.shape[1]
    out = np.zeros((2 + k + 2 * k * k, len(factors)))
    for date in prange(len(factors)):
        _one_date(factors, wanted[date], powers, date, out)
    return out


@_compiled
def _one_date(factors, is_wanted, powers, date, out):  # pragma: no cover - compiled
    n, k = len(powers) - 1, factors.shape[1]
    weight, first = 0.0, date - n + 1
    if not is_wanted:
        return
    for row in range(n):
        weight += powers[n - 1 - row]
        for i in range(k):
            if np.isnan(factors[first + row, i]):
                return
    mean, raw, inverse = np.empty(k), np.empty(k), np.empty((k, k))
    for i in range(k):
        total, raw[i], base = 0.0, 0.0, factors[first, i]
        for row in range(n):
            x = factors[first + row, i]
            total += powers[n - 1 - row] * (x - base)
            raw[i] += powers[n - 1 - row] * x * x
        mean[i] = base + total / weight
        out[2 + i, date] = mean[i]
    for i in range(k):
        for j in range(i + 1):
            product = 0.0
            for row in range(n):
                u, v = factors[first + row, i] - mean[i], factors[first + row, j] - mean[j]
                product += powers[n - 1 - row] * u * v
            inverse[i, j], inverse[j, i] = product, product
            out[2 + k + i * k + j, date], out[2 + k + j * k + i, date] = product, product
    out[0, date], out[1, date] = invert(inverse, raw), weight
    for i in range(k):
        for j in range(k):
            out[2 + k + k * k + i * k + j, date] = inverse[i, j]


@_compiled
def invert(matrix, raw):  # pragma: no cover - compiled
    """Invert a positive definite matrix in place; the smallest pivot relative to `raw`, 0 where there is none."""
    k, left = len(raw), 1.0
    for p in range(k):
        pivot = matrix[p, p]
        if not pivot > SHARE_LEFT * raw[p]:
            return 0.0
        left = min(left, pivot / raw[p])
        matrix[p, p] = 1.0
        for j in range(k):
            matrix[p, j] /= pivot
        for i in range(k):
            if i != p:
                factor = matrix[i, p]
                matrix[i, p] = 0.0
                for j in range(k):
                    matrix[i, j] -= factor * matrix[p, j]
    return left
