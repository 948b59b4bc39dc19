"""Joint pricing tests: are all intercepts of the time-series regressions zero?

Every statistic but the heteroskedasticity-robust one is a function of a single number, the distance
W = a'S^-1 a / (1 + f'V^-1 f), with a the alphas, S the residual covariance (divisor T), f and V the
mean and covariance (divisor T) of the factors.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from lineproof.stats import PERIOD, Undefined
from lineproof.stats.covariance import inverse, long_run_sum
from lineproof.stats.distributions import JointStatistic
from lineproof.stats.time_series import Regression

SINGULAR = "a combination of the assets has no residual variance: the covariance matrix is singular"


@dataclass(frozen=True)
class AlphaDistance:
    """How far the alphas are from zero, jointly.

    Attributes:
        distance: W, no unit.
        sharpe2_market: squared Sharpe ratio per period of the best portfolio of the factors.
        sharpe2_best: the same of factors and assets together (both with variances of divisor T).
    """

    distance: float
    sharpe2_market: float
    sharpe2_best: float


def sharpe2_factors(regression: Regression) -> float:
    """Highest squared Sharpe ratio per period that the factors allow; of one factor, its own."""
    means = regression.factors.mean(axis=0)
    precision = inverse(regression.factor_covariance, reason="a factor does not vary")
    return float(means @ precision @ means)


def measure_alphas(regression: Regression) -> AlphaDistance:
    """Distance of the alphas from zero (Gibbons, Ross and Shanken 1989).

    Raises `Undefined` with fewer than N+K+1 periods or if the residual covariance is singular.
    """
    precision = _residual_precision(regression)
    quadratic = float(regression.alphas @ precision @ regression.alphas)
    market = sharpe2_factors(regression)
    return AlphaDistance(quadratic / (1.0 + market), market, market + quadratic)


def _residual_precision(regression: Regression) -> np.ndarray:
    require_periods(regression)
    scale = np.diagonal(regression.return_covariance)
    return inverse(regression.residual_covariance, scale=scale, reason=SINGULAR)


def require_periods(regression: Regression) -> None:
    """Raise `Undefined` unless T >= N+K+1, without which the residual covariance is singular."""
    needed = regression.n_assets + regression.n_factors + 1
    if regression.n_periods < needed:
        raise Undefined(
            f"needs at least {needed} {PERIOD}s for {regression.n_assets} assets, "
            f"has {regression.n_periods}"
        )


def exact_f(distance: float, n_periods: int, n_assets: int, n_factors: int) -> JointStatistic:
    """(T-N-K)/N W ~ F(N, T-N-K), exact under normal residuals (Gibbons, Ross and Shanken 1989)."""
    spare = n_periods - n_assets - n_factors
    return JointStatistic(spare / n_assets * distance, n_assets, spare)


def wald(distance: float, n_periods: int, n_assets: int, n_factors: int) -> JointStatistic:
    """T W ~ chi-square(N) in large samples."""
    return JointStatistic(n_periods * distance, n_assets)


def likelihood_ratio(
    distance: float, n_periods: int, n_assets: int, n_factors: int
) -> JointStatistic:
    """T ln(1+W) ~ chi-square(N) in large samples."""
    return JointStatistic(n_periods * math.log1p(distance), n_assets)


def corrected_likelihood_ratio(
    distance: float, n_periods: int, n_assets: int, n_factors: int
) -> JointStatistic:
    """(T - N/2 - K - 1) ln(1+W) ~ chi-square(N), good in small samples (Jobson and Korkie 1982)."""
    factor = n_periods - n_assets / 2.0 - n_factors - 1.0
    return JointStatistic(factor * math.log1p(distance), n_assets)


def lagrange_multiplier(
    distance: float, n_periods: int, n_assets: int, n_factors: int
) -> JointStatistic:
    """T W/(1+W) ~ chi-square(N) in large samples."""
    return JointStatistic(n_periods * distance / (1.0 + distance), n_assets)


AlphaStatistic = Callable[[float, int, int, int], JointStatistic]

# Name of a joint pricing test -> statistic from (W, T, N, K).
ALPHA_STATISTICS: dict[str, AlphaStatistic] = {
    "f": exact_f,
    "wald": wald,
    "lr": likelihood_ratio,
    "lr_corrected": corrected_likelihood_ratio,
    "lm": lagrange_multiplier,
}


def hac_wald(regression: Regression, lag: int) -> JointStatistic:
    """a'V^-1 a ~ chi-square(N), V the HAC covariance of alphas (Hansen 1982; Newey and West 1987).

    Allows residuals whose variance moves and which are correlated over time. Raises `Undefined`
    under the same conditions as `measure_alphas`.
    """
    require_periods(regression)
    # Row 0 of (X'X)^-1 X' weighs the periods in the alphas: no need to stack the other moments.
    period_weights = regression.design @ regression.bread[0]
    covariance = long_run_sum(period_weights[:, None] * regression.residuals, lag)
    scale = np.diagonal(regression.return_covariance) * (period_weights @ period_weights)
    precision = inverse(covariance, scale=scale, reason=SINGULAR)
    return JointStatistic(
        float(regression.alphas @ precision @ regression.alphas), regression.n_assets
    )


def _sharpe2_best(regression: Regression) -> float:
    return measure_alphas(regression).sharpe2_best


def _mean_absolute_alpha(regression: Regression) -> float:
    return float(np.abs(regression.alphas).mean())


def _root_mean_square_alpha(regression: Regression) -> float:
    return float(np.sqrt((regression.alphas**2).mean()))


# Name of a measure of how large the alphas are -> function of the regression.
ALPHA_MEASURES: dict[str, Callable[[Regression], float]] = {
    "sharpe2_market": sharpe2_factors,
    "sharpe2_best": _sharpe2_best,
    "mean_abs_alpha": _mean_absolute_alpha,
    "rms_alpha": _root_mean_square_alpha,
}
