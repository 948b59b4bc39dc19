"""Least squares on the observations of one window, pass by pass, compiled: for windows whose sums would cost digits."""

from __future__ import annotations

import numpy as np
from numba import njit

# A factor whose standard deviation is below this, relative to its level (and to 1), only rounds; one of which the
# other factors leave a smaller share than this is a mixture of them.
_ROUNDING = 1e-12
_MIXTURE = 1e-10

SLOPES, NEIGHBOURS, MOMENTS = range(3)  # what is made of a window: see `windows.fit_windows`
ALL, BELOW_MEAN = range(2)  # which observations of a window count
TOO_FEW, NO_VARIATION, FITTED = range(3)

_compiled = njit(cache=True, error_model="numpy")


@_compiled
def of_neighbours(products, s):  # pragma: no cover - compiled
    """The sum of three single slopes over 1 + 2ρ, and its variance for errors of variance one (0 where undefined)."""
    rho = products[0, 1] / np.sqrt(products[0, 0] * products[1, 1])
    scale = 1 + 2 * rho
    if not scale > 0:
        return 0.0, 0.0
    beta, variance = 0.0, 0.0
    for i in range(3):
        beta += s[i] / products[i, i]
        for j in range(3):
            variance += products[i, j] / (products[i, i] * products[j, j])
    return beta / scale, variance / (scale * scale)


@_compiled
def _write(
    beta, alpha, variance, explained, rest, syy, n, unit, used, out, place
):  # pragma: no cover - compiled
    """Beta to residual standard deviation; `unit` makes the mean weight one, `used` counts the coefficients."""
    out[0, place], out[1, place] = beta, alpha
    out[2, place] = np.sqrt(variance * rest / (n - used))
    out[3, place] = min(max(explained / syy, 0.0), 1.0) if syy > 0 else 0.0
    out[4, place] = np.sqrt(unit * rest / (n - used))


@_compiled
def _write_moments(mean_x, mean_y, sxx, sxy, syy, rest, out, place):  # pragma: no cover - compiled
    out[0, place], out[1, place], out[2, place] = mean_x, mean_y, sxx
    out[3, place], out[4, place], out[5, place] = sxy, syy, rest


@_compiled
def fit_alone(period, y, x, powers, end, how, sum_of, out, place):  # pragma: no cover - compiled
    """A window by itself, pass by pass: centre, make the factors orthogonal, take off the fit. Gives n and state."""
    _, min_obs, what, which = how
    n, k = len(period), x.shape[1]
    columns, weights = np.empty((k + 1, n)), np.empty(n)
    limit = np.inf if which == ALL else _mean_of(x, period)
    size = 0
    for row in range(n):
        if x[period[row], 0] < limit:
            weights[size] = powers[end - period[row]]
            for i in range(k):
                columns[i, size] = x[period[row], i]
            columns[k, size] = y[row]
            size += 1
    if size < min_obs:
        return size, TOO_FEW
    columns, weights = columns[:, :size], weights[:size]
    weight = 0.0
    for row in range(size):
        weight += weights[row]
    means, products = np.empty(k + 1), np.empty((k + 1, k + 1))
    for i in range(k + 1):
        means[i] = _centre_column(columns, i, weights, weight)
    for i in range(k + 1):
        for j in range(k + 1):
            products[i, j] = _product(columns, i, j, weights)
    for i in range(k):
        if not products[i, i] > _ROUNDING**2 * weight * (1 + means[i] ** 2):
            return size, NO_VARIATION
    if what == NEIGHBOURS:
        beta, variance = of_neighbours(products[:k, :k], products[k, :k])
        if not variance > 0:
            return size, NO_VARIATION
        for row in range(size):
            columns[k, row] -= beta * columns[1, row]
        rest, alpha = _product(columns, k, k, weights), means[k] - beta * means[1]
        syy = products[k, k]
        _write(beta, alpha, variance, syy - rest, rest, syy, size, size / weight, 2, out, place)
        return size, FITTED
    slopes = np.empty(k)
    variance = _orthogonal_fit(columns, weights, products, sum_of, slopes)
    if not variance >= 0:
        return size, NO_VARIATION
    rest = _product(columns, k, k, weights)
    syy = products[k, k]
    if what == MOMENTS:
        _write_moments(means[0], means[1], products[0, 0], products[0, 1], syy, rest, out, place)
        return size, FITTED
    beta, alpha = 0.0, means[k]
    for i in range(k):
        beta += sum_of[i] * slopes[i]
        alpha -= slopes[i] * means[i]
    _write(beta, alpha, variance, syy - rest, rest, syy, size, size / weight, k + 1, out, place)
    return size, FITTED


@_compiled
def _mean_of(x, period):  # pragma: no cover - compiled
    total = 0.0
    for row in range(len(period)):
        total += x[period[row], 0] - x[period[0], 0]
    return x[period[0], 0] + total / len(period)


@_compiled
def _centre_column(columns, i, weights, weight):  # pragma: no cover - compiled
    """Take off the mean, and give it; it is taken from the first value: exact for constant data."""
    base, total = columns[i, 0], 0.0
    for row in range(len(weights)):
        total += weights[row] * (columns[i, row] - base)
    mean = base + total / weight
    for row in range(len(weights)):
        columns[i, row] -= mean
    return mean


@_compiled
def _product(columns, i, j, weights):  # pragma: no cover - compiled
    total = 0.0
    for row in range(len(weights)):
        total += weights[row] * columns[i, row] * columns[j, row]
    return total


@_compiled
def _orthogonal_fit(columns, weights, products, sum_of, slopes):  # pragma: no cover - compiled
    """Turn centred columns into orthogonal ones, the last into residuals; the variance of the summed slopes for errors
    of variance one, −1 where a factor is a mixture of others."""
    k = len(columns) - 1
    shares, squares = np.zeros((k + 1, k + 1)), np.zeros(k)
    for j in range(k + 1):
        for _ in range(2):  # the second time takes off what rounding left
            for i in range(j):
                share = _product(columns, i, j, weights) / squares[i]
                shares[i, j] += share
                for row in range(len(weights)):
                    columns[j, row] -= share * columns[i, row]
        if j < k:
            squares[j] = _product(columns, j, j, weights)
            if not squares[j] > _MIXTURE**2 * products[j, j]:
                return -1.0
    part, variance = sum_of.copy(), 0.0
    for j in range(k):
        for i in range(j):
            part[j] -= shares[i, j] * part[i]
        variance += part[j] * part[j] / squares[j]
    for j in range(k - 1, -1, -1):
        slopes[j] = shares[j, k]
        for i in range(j + 1, k):
            slopes[j] -= shares[j, i] * slopes[i]
    return variance
