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
from lineproof.stats.covariance import deviations, inverse, long_run_sum, without_rounding
from lineproof.stats.distributions import JointStatistic
from lineproof.stats.joint_alpha import SINGULAR, require_periods
from lineproof.stats.time_series import Regression

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
    """

    coefficients: Floats
    against_market: Floats
    df: float = float("nan")


def _textbook(drawn: MarketLine, lag: int) -> LineCovariance:
    # Takes the market's mean as known as well.
    covariance = textbook_covariance(drawn.line)
    return LineCovariance(covariance, covariance, len(drawn.line.means) - 2)


def _by_period(drawn: MarketLine, lag: int) -> LineCovariance:
    n_periods = drawn.regression.n_periods
    own, gap = (long_run_sum(each, 0) for each in _slope_deviations(drawn))
    scale = n_periods * (n_periods - 1.0)
    return LineCovariance(own / scale, gap / scale, n_periods - 1)


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
    """Wald statistic of intercept zero and slope equal to the market's mean ~ chi-square(2)."""
    precision = inverse(
        covariance.against_market, reason="the covariance of the coefficients is singular"
    )
    return JointStatistic(float(drawn.against_market @ precision @ drawn.against_market), 2)


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
