"""Least squares from the sums of many windows at a time, compiled.

Each loop reads and writes few arrays: only such ones does the compiler make work on several numbers at once.
"""

from __future__ import annotations

import numpy as np
from numba import njit

from lineproof.stats.window_alone import FITTED, MOMENTS, NEIGHBOURS, SLOPES, of_neighbours
from lineproof.stats.window_dates import SHARE_LEFT

_compiled = njit(cache=True, error_model="numpy")


@_compiled
def solve(what, sum_of, held, out, offset, state, k):  # pragma: no cover - compiled
    """Write what is asked for of each window; `state` is not `FITTED` where that would have cost too many digits."""
    m = len(state)
    sum_y, square_y, s = held[0], held[1], held[2 : 2 + k]
    left, weight = held[2 + k], held[3 + k]
    mean, products = held[4 + k : 4 + 2 * k], held[4 + 2 * k : 4 + 2 * k + k * k]
    inverse = held[4 + 2 * k + k * k : 4 + 2 * k + 2 * k * k]
    mean_y, syy, explained, rest, n_obs = held[-5], held[-4], held[-3], held[-2], held[-1]
    for w in range(m):
        mean_y[w] = sum_y[w] / weight[w]
    for w in range(m):
        syy[w] = square_y[w] - mean_y[w] * sum_y[w]
        explained[w] = 0.0
    for i in range(k):
        _take_product(s[i], mean[i], sum_y, m)
    for i in range(k):
        for j in range(k):
            _add_product(explained, s[i], inverse[i * k + j], s[j], m)
    for w in range(m):
        rest[w] = syy[w] - explained[w]
    for w in range(m):
        # the smaller of two shares, each times what is left, above its least
        kept = left[w] * rest[w] > SHARE_LEFT * syy[w]
        kept &= rest[w] > SHARE_LEFT * square_y[w]
        kept &= (left[w] > 0) & (syy[w] > 0)
        state[w] = FITTED if kept else 0
    if what == SLOPES:
        _slopes(
            sum_of, n_obs, weight, mean, inverse, s, mean_y, syy, explained, rest, out, offset, m, k
        )
    elif what == MOMENTS:
        for line, values in enumerate((mean[0], mean_y, products[0], s[0], syy, rest)):
            for w in range(m):
                out[line, offset + w] = values[w]
    elif what == NEIGHBOURS:
        _neighbours(n_obs, weight, mean, products, s, mean_y, syy, out, offset, state)


@_compiled
def _take_product(total, a, b, m):  # pragma: no cover - compiled
    for w in range(m):
        total[w] -= a[w] * b[w]


@_compiled
def _add_product(total, a, b, c, m):  # pragma: no cover - compiled
    for w in range(m):
        total[w] += a[w] * b[w] * c[w]


@_compiled
def _slopes(
    sum_of, n_obs, weight, mean, inverse, s, mean_y, syy, explained, rest, out, offset, m, k
):  # pragma: no cover - compiled
    """Beta, alpha, its standard error, R² and the residuals' standard deviation, a line each."""
    high = offset + m
    beta, alpha, se = out[0, offset:high], out[1, offset:high], out[2, offset:high]
    r2, sd = out[3, offset:high], out[4, offset:high]
    for w in range(m):
        beta[w] = 0.0
        alpha[w] = mean_y[w]
    for w in range(m):
        se[w] = 0.0
    for i in range(k):
        slope = sd  # for a while
        for w in range(m):
            slope[w] = 0.0
        for j in range(k):
            line, of_s, both = inverse[i * k + j], s[j], sum_of[i] * sum_of[j]
            for w in range(m):
                slope[w] += line[w] * of_s[w]
            for w in range(m):
                se[w] += both * line[w]
        of_beta = sum_of[i]
        for w in range(m):
            beta[w] += of_beta * slope[w]
        _take_product(alpha, slope, mean[i], m)
    variance = explained  # once R² is known
    for w in range(m):
        r2[w] = min(max(explained[w] / syy[w], 0.0), 1.0)
    for w in range(m):
        variance[w] = rest[w] / (n_obs[w] - k - 1)
    for w in range(m):
        se[w] = np.sqrt(se[w] * variance[w])
    for w in range(m):
        sd[w] = np.sqrt(variance[w] * (n_obs[w] / weight[w]))


@_compiled
def _neighbours(
    n_obs, weight, mean, products, s, mean_y, syy, out, offset, state
):  # pragma: no cover - compiled
    """The same for the sum of three single slopes over 1 + 2ρ."""
    single, squares = np.empty(3), np.empty((3, 3))
    for w in range(len(state)):
        place = offset + w
        for i in range(3):
            single[i] = s[i, w]
            for j in range(3):
                squares[i, j] = products[3 * i + j, w]
        beta, spread = of_neighbours(squares, single)
        if not spread > 0:
            state[w] = 0
            continue
        own = single[1] / squares[1, 1]
        rest = syy[w] - single[1] * own + (beta - own) ** 2 * squares[1, 1]
        variance = rest / (n_obs[w] - 2)
        out[0, place], out[1, place] = beta, mean_y[w] - beta * mean[1, w]
        out[2, place] = np.sqrt(spread * variance)
        out[3, place] = min(max((syy[w] - rest) / syy[w], 0.0), 1.0)
        out[4, place] = np.sqrt(variance * (n_obs[w] / weight[w]))
