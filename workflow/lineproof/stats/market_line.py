"""The market line: mean excess returns across assets on betas, r = g0 + g1 beta.

Notation: Z = [1 beta] (N, 2), W the weights (N, N), A = (Z'WZ)^-1 Z'W (2, N), g = A r the
coefficients (intercept, slope), e = r - Z g the pricing errors; S the residual covariance of the
time-series regressions and V the market's variance (divisor T), f its mean; c = g1^2 / V.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from lineproof.stats import Undefined
from lineproof.stats.covariance import deviations, inverse, long_run_sum
from lineproof.stats.distributions import JointStatistic
from lineproof.stats.fitted_line import Line, fit_line, textbook_covariance
from lineproof.stats.joint_alpha import SINGULAR, require_periods
from lineproof.stats.time_series import Regression

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class MarketLine:
    """A line drawn from the betas and means of the same periods' single-factor regressions."""

    line: Line
    regression: Regression
    weighting: Weighting

    @property
    def market(self) -> Floats:
        """(T,) market excess returns."""
        return self.regression.factors[:, 0]

    @property
    def market_variance(self) -> float:
        """V, divisor T."""
        return float(self.regression.factor_covariance[0, 0])

    @property
    def against_market(self) -> Floats:
        """(2,) intercept, and slope less the market's mean: zero under the Sharpe-Lintner CAPM."""
        return self.line.coefficients - np.array([0.0, self.market.mean()])

    @property
    def correction(self) -> float:
        """c, the factor by which estimated betas add to the variance (Shanken 1992)."""
        return float(self.line.coefficients[1] ** 2 / self.market_variance)


@dataclass(frozen=True)
class Weighting:
    """How assets are weighed.

    Attributes:
        weights: the matrix W from the regressions.
        influence: (T, 2) effect of each period on the coefficients through the estimated weights.
        metric: the matrix in which R squared is measured.
        pricing_error_tests: tests that no pricing error is left, by reference distribution.
    """

    weights: Callable[[Regression], Floats]
    influence: Callable[[MarketLine], Floats]
    metric: Callable[[Regression], Floats]
    pricing_error_tests: Mapping[str, Callable[[MarketLine], JointStatistic]]


def _equal_weights(regression: Regression) -> Floats:
    return np.eye(regression.n_assets)


def _variance_weights(regression: Regression) -> Floats:
    variances = (regression.residuals**2).mean(axis=0)
    if not variances.all():
        raise Undefined("an asset has no residual variance")
    return np.diag(1.0 / variances)


def _covariance_weights(regression: Regression) -> Floats:
    require_periods(regression)
    scale = np.diagonal(regression.return_covariance)
    return inverse(regression.residual_covariance, scale=scale, reason=SINGULAR)


def _return_precision(regression: Regression) -> Floats:
    # The covariance of returns, not of residuals: R squared then measures how far the market is
    # from the frontier (Kandel and Stambaugh 1995). The line is the same in both metrics.
    return inverse(regression.return_covariance, reason=SINGULAR)


def _known_weights(drawn: MarketLine) -> Floats:
    return np.zeros((drawn.regression.n_periods, 2))


def _estimated_variances(drawn: MarketLine) -> Floats:
    shares = drawn.regression.residuals**2 * np.diagonal(drawn.line.weights)
    return -(shares * drawn.line.residuals) @ drawn.line.projection.T


def _estimated_covariances(drawn: MarketLine) -> Floats:
    slopes = drawn.regression.residuals @ drawn.line.projection.T
    return -slopes * _error_returns(drawn)[:, None]


def draw_line(regression: Regression, weighting: Weighting) -> MarketLine:
    """Draw the market line of single-factor regressions; raises `Undefined` where there is none."""
    weights = weighting.weights(regression)
    line = fit_line(regression.betas[0], regression.returns.mean(axis=0), weights)
    return MarketLine(line, regression, weighting)


@dataclass(frozen=True)
class LineCovariance:
    """What is known of the coefficients' sampling error under one kind of standard error.

    Attributes:
        coefficients: (2, 2) covariance of (intercept, slope).
        against_market: (2, 2) covariance of (intercept, slope - market mean).
        df: degrees of freedom of Student's t for single coefficients; NaN means standard normal.
        joint_df: degrees of freedom of F below, for both coefficients; NaN means chi-square(2).
        joint_factor: what the Wald statistic is multiplied by to follow F(2, joint_df).
    """

    coefficients: Floats
    against_market: Floats
    df: float = float("nan")
    joint_df: float = float("nan")
    joint_factor: float = 1.0


def _textbook(drawn: MarketLine, lag: int) -> LineCovariance:
    # Takes the market's mean as known as well. One variance is estimated, so that half the Wald
    # statistic is the F of a linear regression.
    covariance, df = textbook_covariance(drawn.line), len(drawn.line.means) - 2
    return LineCovariance(covariance, covariance, df, joint_df=df, joint_factor=0.5)


def _by_period(drawn: MarketLine, lag: int) -> LineCovariance:
    n_periods = drawn.regression.n_periods
    own, gap = (long_run_sum(each, 0) for each in _slope_deviations(drawn))
    scale = n_periods * (n_periods - 1.0)
    df = n_periods - 1
    # A mean of two coefficients over its own estimated covariance: Hotelling's T squared.
    return LineCovariance(own / scale, gap / scale, df, df - 1, (df - 1) / (2.0 * df))


def _by_period_hac(drawn: MarketLine, lag: int) -> LineCovariance:
    n_periods = drawn.regression.n_periods
    own, gap = (long_run_sum(each, lag) for each in _slope_deviations(drawn))
    return LineCovariance(own / n_periods**2, gap / n_periods**2, n_periods - 1)


def _errors_in_variables(drawn: MarketLine, lag: int) -> LineCovariance:
    # The market is a traded factor: the sampling error of its own mean moves the slope one for one
    # and cancels from the slope less that mean.
    projection, n_periods = drawn.line.projection, drawn.regression.n_periods
    spread = projection @ drawn.regression.residual_covariance @ projection.T
    gap = (1.0 + drawn.correction) * spread / n_periods
    own = gap + np.diag([0.0, drawn.market_variance]) / n_periods
    return LineCovariance(own, gap)


def _robust(drawn: MarketLine, lag: int) -> LineCovariance:
    return _robust_hac(drawn, 0)


def _robust_hac(drawn: MarketLine, lag: int) -> LineCovariance:
    own = influences(drawn)
    gap = own - _market_deviations(drawn)
    scale = drawn.regression.n_periods**2
    return LineCovariance(long_run_sum(own, lag) / scale, long_run_sum(gap, lag) / scale)


def _market_deviations(drawn: MarketLine) -> Floats:
    """(T, 2): zero, and the market's deviation from its mean."""
    moves = deviations(drawn.market)
    return np.column_stack([np.zeros_like(moves), moves])


def _slope_deviations(drawn: MarketLine) -> tuple[Floats, Floats]:
    """(T, 2) deviations from their means of A r_t, and of A r_t less the market in the slope."""
    own = deviations(drawn.regression.returns) @ drawn.line.projection.T
    return own, own - _market_deviations(drawn)


def _error_returns(drawn: MarketLine) -> Floats:
    """(T,) deviations u_t = e'W(r_t - r) of a portfolio that holds the pricing errors."""
    return deviations(drawn.regression.returns) @ (drawn.line.weights @ drawn.line.residuals)


def influences(drawn: MarketLine) -> Floats:
    """(T, 2) effect h_t of each period on the coefficients, betas and weights moving with it.

    h_t = (g_t - g) - (p_t - p) w_t + (Z'WZ)^-1 [0, u_t m_t / V] + effect of the weights, with
    g_t = A r_t, p_t = g_t less the market in the slope, m_t = f_t - f, w_t = g1 m_t / V and
    u_t = e'W(r_t - r) (Kan, Robotti and Shanken 2013). Estimated weights add
    -A diag(x_it^2 / s_i^2) e for WLS (x the residuals, s their standard deviations) and
    -(p_t - p) u_t for GLS. That paper weighs GLS by the inverse covariance of returns and so writes
    -(g_t - g) u_t: its Z'WZ differs from this one, and the sum of the last two terms is the same.
    """
    own, gap = _slope_deviations(drawn)
    slope = drawn.line.coefficients[1]
    errors = np.outer(_error_returns(drawn), drawn.line.bread[1])
    moves = deviations(drawn.market)[:, None] / drawn.market_variance
    return own + (errors - slope * gap) * moves + drawn.weighting.influence(drawn)


# Name of a kind of standard error -> function of the drawn line and the truncation lag.
LINE_COVARIANCES: dict[str, Callable[[MarketLine, int], LineCovariance]] = {
    "textbook": _textbook,
    "monthly_slopes": _by_period,
    "monthly_slopes_hac": _by_period_hac,
    "errors_in_variables": _errors_in_variables,
    "misspecification_robust": _robust,
    "misspecification_robust_hac": _robust_hac,
}


def sharpe_lintner_wald(drawn: MarketLine, covariance: LineCovariance) -> JointStatistic:
    """Are the intercept zero and the slope the market's mean? A Wald statistic W by its law.

    W ~ chi-square(2) in large samples; with textbook errors W/2 ~ F(2, N-2), with the spread of
    monthly slopes W (T-2)/(2(T-1)) ~ F(2, T-2) (Hotelling 1931), exact where betas are known and
    returns are normal.
    """
    precision = inverse(
        covariance.against_market, reason="the covariance of the coefficients is singular"
    )
    wald = float(drawn.against_market @ precision @ drawn.against_market)
    return JointStatistic(covariance.joint_factor * wald, 2, covariance.joint_df)


def pricing_error_chi2(drawn: MarketLine) -> JointStatistic:
    """e'[(1+c)(I-ZA)S(I-ZA)'/T]^+ e ~ chi-square(N-2): are all pricing errors zero? (Shanken 1985)

    Computed from N-2 combinations L of assets with L'Z = 0: since I - ZA = B L' with B of full
    rank, the pseudo-inverse form is T/(1+c) (L'r)'(L'SL)^-1 L'r whatever the weights. Raises
    `Undefined` as `measure_alphas` does.
    """
    regression = drawn.regression
    require_periods(regression)
    contrasts = np.linalg.qr(drawn.line.design, mode="complete")[0][:, 2:]
    values = contrasts.T @ drawn.line.residuals
    # Combine residuals, not their covariances: where the combination is small, digits survive.
    combined = regression.residuals @ contrasts
    covariance = combined.T @ combined / regression.n_periods
    scale = (contrasts**2).T @ np.diagonal(regression.return_covariance)
    precision = inverse(covariance, scale=scale, reason=SINGULAR)
    statistic = regression.n_periods * (values @ precision @ values) / (1.0 + drawn.correction)
    return JointStatistic(float(statistic), len(values))


def pricing_error_f(drawn: MarketLine) -> JointStatistic:
    """Q (T-N+1)/((N-2)(T-2)) ~ F(N-2, T-N+1): the pricing-error test in finite samples, for GLS.

    Q = T e'S_u^-1 e/(1+c) with S_u the residual covariance of divisor T-2 (Shanken 1985).
    """
    n_periods, n_assets = drawn.regression.returns.shape
    # The two divisors make Q / (T-2) the chi-square statistic over T.
    ratio = pricing_error_chi2(drawn).value / n_periods
    df1, df2 = n_assets - 2, n_periods - n_assets + 1
    return JointStatistic(ratio * df2 / df1, df1, df2)


_CHI2 = {"chi2": pricing_error_chi2}

# Name of a weighting -> Weighting: equal, inverse residual variances, inverse residual covariance.
WEIGHTINGS: dict[str, Weighting] = {
    "ols": Weighting(_equal_weights, _known_weights, _equal_weights, _CHI2),
    "wls": Weighting(_variance_weights, _estimated_variances, _variance_weights, _CHI2),
    "gls": Weighting(
        _covariance_weights,
        _estimated_covariances,
        _return_precision,
        {**_CHI2, "f": pricing_error_f},
    ),
}
