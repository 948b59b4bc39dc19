"""Time-series regressions of excess returns on factors, all assets at once."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from lineproof.stats import PERIOD, Undefined
from lineproof.stats.covariance import (
    COEFFICIENT_COVARIANCES,
    deviations,
    inverse,
    without_rounding,
)

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Regression:
    """Least squares of N assets' excess returns on a constant and K factors over the same T periods.

    Attributes:
        returns: (T, N) excess returns, decimal per period.
        factors: (T, K) factor excess returns.
        design: (T, K+1), the constant first.
        bread: (K+1, K+1), the inverse of design'design.
        coefficients: (K+1, N), alphas in the first row, betas below.
        residuals: (T, N).
    """

    returns: Floats
    factors: Floats
    design: Floats
    bread: Floats
    coefficients: Floats
    residuals: Floats

    @property
    def n_periods(self) -> int:
        """T."""
        return self.returns.shape[0]

    @property
    def n_assets(self) -> int:
        """N."""
        return self.returns.shape[1]

    @property
    def n_factors(self) -> int:
        """K."""
        return self.factors.shape[1]

    @property
    def df(self) -> int:
        """Residual degrees of freedom of each regression, T - K - 1."""
        return self.n_periods - self.n_factors - 1

    @property
    def alphas(self) -> Floats:
        """(N,) intercepts, decimal per period."""
        return self.coefficients[0]

    @property
    def betas(self) -> Floats:
        """(K, N) slopes."""
        return self.coefficients[1:]

    @property
    def residual_covariance(self) -> Floats:
        """(N, N) maximum-likelihood covariance of the residuals: divisor T."""
        return self.residuals.T @ self.residuals / self.n_periods

    @property
    def return_covariance(self) -> Floats:
        """(N, N) covariance of the returns, divisor T."""
        centred = deviations(self.returns)
        return centred.T @ centred / self.n_periods

    @property
    def factor_covariance(self) -> Floats:
        """(K, K) covariance of the factors, divisor T."""
        centred = deviations(self.factors)
        return centred.T @ centred / self.n_periods


def regress(returns: Floats, factors: Floats) -> Regression:
    """Regress each column of `returns` (T, N) on a constant and `factors` (T, K).

    Both must be complete (ValueError otherwise). Raises `Undefined` with fewer than K+2 periods, or
    if the factors are constant or linearly dependent.
    """
    returns = np.asarray(returns, dtype=float)
    factors = np.asarray(factors, dtype=float)
    if returns.ndim != 2 or factors.ndim != 2 or len(returns) != len(factors):
        raise ValueError("returns must be (T, N) and factors (T, K) with the same T")
    if not (np.isfinite(returns).all() and np.isfinite(factors).all()):
        raise ValueError(
            "returns and factors must be complete: drop periods with missing values first"
        )
    n_periods, n_factors = factors.shape
    if n_periods < n_factors + 2:
        raise Undefined(f"needs at least {n_factors + 2} complete {PERIOD}s, has {n_periods}")
    centred = deviations(factors)
    inverse(centred.T @ centred, reason=_no_factor_variation(n_factors))
    design = np.column_stack([np.ones(n_periods), factors])
    orthogonal, triangular = np.linalg.qr(design)
    unwind = np.linalg.inv(triangular)
    coefficients = unwind @ (orthogonal.T @ returns)
    residuals = without_rounding(returns - design @ coefficients, returns)
    return Regression(returns, factors, design, unwind @ unwind.T, coefficients, residuals)


def _no_factor_variation(n_factors: int) -> str:
    if n_factors == 1:
        return "the market return does not vary"
    return "a factor does not vary or is a combination of the others"


def standard_errors(regression: Regression, kind: str, lag: int) -> Floats:
    """(K+1, N) standard errors of the coefficients; `kind` is a key of COEFFICIENT_COVARIANCES.

    `lag` is the truncation lag of "hac". Compare with Student's t with T-K-1 degrees of freedom.
    """
    estimator = COEFFICIENT_COVARIANCES[kind]
    covariances = estimator(regression.design, regression.bread, regression.residuals, lag)
    return np.sqrt(np.diagonal(covariances, axis1=1, axis2=2)).T


def r_squared(regression: Regression) -> Floats:
    """(N,) share of each asset's variance that the factors explain; NaN for a constant return."""
    total = (deviations(regression.returns) ** 2).sum(axis=0)
    return 1.0 - _ratio((regression.residuals**2).sum(axis=0), total)


def correlation(regression: Regression) -> Floats:
    """(N,) correlation of each asset with the first factor; NaN for a constant return."""
    returns = deviations(regression.returns)
    factor = deviations(regression.factors[:, 0])
    spread = np.sqrt((returns**2).sum(axis=0) * (factor**2).sum())
    return _ratio(factor @ returns, spread)


def residual_sd(regression: Regression) -> Floats:
    """(N,) standard deviation of the residuals, divisor T-K-1."""
    return np.sqrt((regression.residuals**2).sum(axis=0) / regression.df)


def residual_autocorrelation(regression: Regression) -> Floats:
    """(N,) first-order autocorrelation of the residuals; NaN for a perfect fit."""
    residuals = regression.residuals
    products = (residuals[1:] * residuals[:-1]).sum(axis=0)
    return _ratio(products, (residuals**2).sum(axis=0))


def _ratio(numerator: Floats, denominator: Floats) -> Floats:
    """Elementwise quotient, NaN where the denominator is zero."""
    result = np.full(np.shape(denominator), np.nan)
    return np.divide(numerator, denominator, out=result, where=denominator != 0.0)
