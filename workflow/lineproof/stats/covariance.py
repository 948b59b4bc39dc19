"""Covariance matrices of regression coefficients and means, and an inverse that knows its limits.

Shapes: T periods, N assets, p coefficients (intercept and K factors). All assets share one design.
"""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from lineproof.stats import PERIOD, Undefined

Floats = NDArray[np.float64]

# Relative size below which a difference is taken for rounding: some thousand times the rounding
# error of a double, and far below the last digit of any recorded return.
ROUNDING = 1e-12


def without_rounding(differences: Floats, original: Floats) -> Floats:
    """Set to zero each column of `differences` that is mere rounding beside the same of `original`.

    Without this a perfect fit leaves residuals of 1e-18, and ratios of two such residuals look like
    numbers.
    """
    limit = ROUNDING * np.abs(original).max(axis=0)
    return np.where(np.abs(differences).max(axis=0) <= limit, 0.0, differences)


def deviations(values: Floats) -> Floats:
    """Deviations of a (T,) or (T, N) array from its means over T; exactly zero where constant."""
    return without_rounding(values - values.mean(axis=0), values)


def inverse(matrix: Floats, *, reason: str, scale: Floats | None = None) -> Floats:
    """Inverse of a covariance matrix (N, N); raises `Undefined` with `reason` where it has none.

    Rule: after dividing row and column i by the square root of `scale[i]` (a variance in the same
    units; by default the diagonal itself), no eigenvalue may be at or below 1e-12, nor at or below
    1e-12 of the largest. With the variances of whole returns as `scale` this says that every
    combination of assets must have more than a 1e-12th of their variance left.
    """
    scale = np.diagonal(matrix) if scale is None else scale
    if not np.all(scale > 0.0):
        raise Undefined(reason)
    root = np.sqrt(scale)
    values, vectors = np.linalg.eigh(matrix / np.outer(root, root))
    if values[0] <= ROUNDING * max(1.0, values[-1]):
        raise Undefined(reason)
    scaled = vectors / root[:, None]
    return (scaled / values) @ scaled.T


def automatic_lag(n_periods: int) -> int:
    """Truncation lag floor(4 (T/100)^(2/9)) (Newey and West 1994)."""
    return math.floor(4.0 * (n_periods / 100.0) ** (2.0 / 9.0))


def long_run_sum(scores: Floats, lag: int) -> Floats:
    """Sum over t and s of weight(|t-s|) x_t x_s' for `scores` (T, k): a (k, k) matrix.

    Bartlett weights 1 - l/(lag+1) keep it positive semi-definite (Newey and West 1987). Divided by
    T squared it is the variance of the mean of scores that average zero.
    """
    total = scores.T @ scores
    for step in range(1, min(lag, len(scores) - 1) + 1):
        lagged = scores[step:].T @ scores[:-step]
        total += (1.0 - step / (lag + 1.0)) * (lagged + lagged.T)
    return total


def _products(left: Floats, right: Floats) -> Floats:
    """Outer product of each pair of rows, flattened: (T, p) and (T, p) to (T, p*p)."""
    return (left[:, :, None] * right[:, None, :]).reshape(len(left), -1)


def _sandwich(design: Floats, bread: Floats, squares: Floats) -> Floats:
    """bread (sum over t of squares_ti x_t x_t') bread for every asset i: (N, p, p)."""
    meat = squares.T @ _products(design, design)
    return bread @ meat.reshape(-1, *bread.shape) @ bread


def _spare(design: Floats, bread: Floats) -> Floats:
    """One minus each period's leverage, as a (T, 1) column."""
    spare = 1.0 - np.einsum("tp,pq,tq->t", design, bread, design)
    if spare.min() <= ROUNDING:
        raise Undefined(
            f"one {PERIOD} alone decides the fit, so its residual carries no information"
        )
    return spare[:, None]


def _classical(design: Floats, bread: Floats, residuals: Floats, lag: int) -> Floats:
    variance = (residuals**2).sum(axis=0) / (design.shape[0] - design.shape[1])
    return variance[:, None, None] * bread


def _hc0(design: Floats, bread: Floats, residuals: Floats, lag: int) -> Floats:
    return _sandwich(design, bread, residuals**2)


def _hc1(design: Floats, bread: Floats, residuals: Floats, lag: int) -> Floats:
    n_periods, n_coefficients = design.shape
    return _hc0(design, bread, residuals, lag) * (n_periods / (n_periods - n_coefficients))


def _hc2(design: Floats, bread: Floats, residuals: Floats, lag: int) -> Floats:
    return _sandwich(design, bread, residuals**2 / _spare(design, bread))


def _hc3(design: Floats, bread: Floats, residuals: Floats, lag: int) -> Floats:
    return _sandwich(design, bread, (residuals / _spare(design, bread)) ** 2)


def _hac(design: Floats, bread: Floats, residuals: Floats, lag: int) -> Floats:
    meat = ((residuals**2).T @ _products(design, design)).reshape(-1, *bread.shape)
    for step in range(1, min(lag, len(design) - 1) + 1):
        pairs = (residuals[step:] * residuals[:-step]).T @ _products(design[step:], design[:-step])
        pairs = pairs.reshape(-1, *bread.shape)
        meat = meat + (1.0 - step / (lag + 1.0)) * (pairs + pairs.transpose(0, 2, 1))
    return bread @ meat @ bread


# Name of a covariance estimator of regression coefficients -> function of the design X (T, p),
# (X'X)^-1 (p, p), the residuals (T, N) and the truncation lag (used by hac only), giving (N, p, p).
# hc0 White 1980; hc1, hc2, hc3 MacKinnon and White 1985; hac Newey and West 1987, not corrected for
# degrees of freedom.
COEFFICIENT_COVARIANCES: dict[str, Callable[[Floats, Floats, Floats, int], Floats]] = {
    "classical": _classical,
    "hc0": _hc0,
    "hc1": _hc1,
    "hc2": _hc2,
    "hc3": _hc3,
    "hac": _hac,
}
