"""A line through points (beta, mean excess return), by least squares in any metric.

Notation as in `market_line`: Z = [1 beta] (N, 2), W the weights (N, N), A = (Z'WZ)^-1 Z'W (2, N).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from lineproof.stats import Undefined
from lineproof.stats.covariance import deviations, without_rounding

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Line:
    """A line through N points (beta, mean excess return).

    Attributes:
        coefficients: (2,) intercept and slope, decimal per period.
        design: (N, 2), Z.
        weights: (N, N), W.
        bread: (2, 2), the inverse of Z'WZ.
        projection: (2, N), A.
        means: (N,) mean excess returns.
        residuals: (N,) pricing errors e.
    """

    coefficients: Floats
    design: Floats
    weights: Floats
    bread: Floats
    projection: Floats
    means: Floats
    residuals: Floats


def fit_line(betas: Floats, means: Floats, weights: Floats | None = None) -> Line:
    """Fit the line to `betas` (N,) and `means` (N,), with `weights` (N, N), by default equal ones.

    Needs nothing but the two columns, so a published table will do. Raises `Undefined` with fewer
    than three assets or if all betas are equal.
    """
    betas, means = np.asarray(betas, dtype=float), np.asarray(means, dtype=float)
    n_assets = len(betas)
    if n_assets < 3:
        raise Undefined(f"a line with an error needs at least 3 assets, has {n_assets}")
    if not deviations(betas).any():
        raise Undefined("all betas are equal")
    weights = np.eye(n_assets) if weights is None else weights
    design = np.column_stack([np.ones(n_assets), betas])
    root = np.linalg.cholesky(weights).T
    orthogonal, triangular = np.linalg.qr(root @ design)
    unwind = np.linalg.inv(triangular)
    projection = unwind @ orthogonal.T @ root
    coefficients = projection @ means
    residuals = without_rounding(means - design @ coefficients, means)
    return Line(coefficients, design, weights, unwind @ unwind.T, projection, means, residuals)


def textbook_covariance(line: Line) -> Floats:
    """(2, 2) covariance s^2 (Z'WZ)^-1 with s^2 = e'We/(N-2): takes the betas as known."""
    variance = line.residuals @ line.weights @ line.residuals / (len(line.means) - 2)
    return variance * line.bread


def line_r_squared(line: Line, metric: Floats | None = None) -> float:
    """Share of the means' spread that the line explains: 1 - e'Me / d'Md.

    M is the metric (N, N), by default W, and d what a constant fitted in the same metric leaves.
    NaN if all means are equal.
    """
    metric = line.weights if metric is None else metric
    ones = np.ones(len(line.means))
    centre = (ones @ metric @ line.means) / (ones @ metric @ ones)
    spread = without_rounding(line.means - centre, line.means)
    if not spread.any():
        return float("nan")
    return float(1.0 - line.residuals @ metric @ line.residuals / (spread @ metric @ spread))
