"""The market line: worked by hand, against libraries, loops and numerical derivatives."""

from __future__ import annotations

import numpy as np
import pytest
import statsmodels.api as sm

from lineproof.stats import Undefined
from lineproof.stats.market_line import (
    LINE_COVARIANCES,
    WEIGHTINGS,
    MarketLine,
    draw_line,
    fit_line,
    influences,
    line_r_squared,
    pricing_error_chi2,
    pricing_error_f,
    sharpe_lintner_wald,
    textbook_covariance,
)
from lineproof.stats.time_series import regress

# Matrix products and inverses by two routes.
CLOSE = 1e-9


def _returns(seed: int = 1, n_periods: int = 90, n_assets: int = 6) -> tuple:
    """Returns that fit no line exactly, with correlated residuals of unequal size."""
    rng = np.random.default_rng(seed)
    market = 0.02 + 0.05 * rng.standard_normal(n_periods)
    spread = np.diag(np.linspace(0.5, 2.0, n_assets)) + 0.3 * rng.random((n_assets, n_assets))
    noise = 0.03 * rng.standard_normal((n_periods, n_assets)) @ spread
    betas = np.linspace(0.4, 1.6, n_assets)
    means = 0.01 + 0.01 * betas + 0.004 * rng.standard_normal(n_assets)
    return means + betas * (market[:, None] - 0.02) + noise, market[:, None]


def _draw(name: str, returns: np.ndarray, market: np.ndarray) -> MarketLine:
    return draw_line(regress(returns, market), WEIGHTINGS[name])


@pytest.fixture(params=list(WEIGHTINGS))
def drawn(request: pytest.FixtureRequest) -> MarketLine:
    return _draw(request.param, *_returns())


def _weights(name: str, drawn: MarketLine) -> np.ndarray:
    covariance = np.cov(drawn.regression.residuals.T, bias=True)
    return {
        "ols": np.eye(len(covariance)),
        "wls": np.diag(1 / np.diag(covariance)),
        "gls": np.linalg.inv(covariance),
    }[name]


def _of(drawn: MarketLine) -> str:
    return next(name for name, each in WEIGHTINGS.items() if each is drawn.weighting)


# --- the line itself -----------------------------------------------------------------------------


def test_three_points_worked_by_hand() -> None:
    # Slope (.025 - .01) / 1 = .015; residuals -1/1200, 2/1200, -1/1200, squares 6/1200^2, one
    # degree of freedom; betas' squares about their mean sum to .5.
    line = fit_line(np.array([0.5, 1.0, 1.5]), np.array([0.01, 0.02, 0.025]))
    variance = 6 / 1200**2
    np.testing.assert_allclose(line.coefficients, [0.055 / 3 - 0.015, 0.015], rtol=1e-12)
    np.testing.assert_allclose(line.residuals, np.array([-1, 2, -1]) / 1200, rtol=1e-10)
    np.testing.assert_allclose(
        np.diag(textbook_covariance(line)),
        [variance * (1 / 3 + 1 / 0.5), variance / 0.5],
        rtol=1e-10,
    )
    # Means' squares about their mean: (25 + 1 + 16) / 600^2.
    assert line_r_squared(line) == pytest.approx(1 - variance / (42 / 600**2), rel=1e-10)


def test_the_line_agrees_with_a_general_library(drawn: MarketLine) -> None:
    line, weights = drawn.line, _weights(_of(drawn), drawn)
    expected = sm.GLS(line.means, line.design, sigma=np.linalg.inv(weights)).fit()
    np.testing.assert_allclose(line.coefficients, expected.params, rtol=CLOSE)
    np.testing.assert_allclose(textbook_covariance(line), expected.cov_params(), rtol=CLOSE)
    np.testing.assert_allclose(line.projection @ line.means, line.coefficients, rtol=CLOSE)
    if _of(drawn) != "gls":
        r2 = sm.WLS(line.means, line.design, weights=np.diag(weights)).fit().rsquared
        assert line_r_squared(line) == pytest.approx(r2, rel=CLOSE)


def test_gls_draws_the_same_line_with_the_covariance_of_returns() -> None:
    drawn = _draw("gls", *_returns())
    line = drawn.line
    precision = np.linalg.inv(np.cov(drawn.regression.returns.T, bias=True))
    again = fit_line(line.design[:, 1], line.means, precision)
    np.testing.assert_allclose(again.coefficients, line.coefficients, rtol=CLOSE)
    # ... so R squared in that metric is the R squared of that regression.
    metric = drawn.weighting.metric(drawn.regression)
    assert line_r_squared(line, metric) == pytest.approx(line_r_squared(again), rel=CLOSE)


def test_gls_r_squared_of_an_efficient_market_is_one() -> None:
    returns, market = _returns()
    fit = regress(returns, market)
    # Means moved onto the line through the market's own mean.
    priced = draw_line(regress(returns - fit.alphas, market), WEIGHTINGS["gls"])
    np.testing.assert_allclose(priced.line.coefficients, [0.0, market.mean()], atol=1e-12)
    assert line_r_squared(priced.line, priced.weighting.metric(fit)) == pytest.approx(1.0)


@pytest.mark.parametrize(
    ("betas", "reason"),
    [([1.0, 2.0], "at least 3 assets, has 2"), ([0.9, 0.9, 0.9], "all betas are equal")],
)
def test_no_line(betas: list[float], reason: str) -> None:
    with pytest.raises(Undefined, match=reason):
        fit_line(np.array(betas), np.linspace(0.01, 0.02, len(betas)))


def test_equal_means_have_no_r_squared() -> None:
    assert np.isnan(line_r_squared(fit_line(np.array([0.5, 1.0, 1.4]), np.full(3, 0.01))))


def test_weights_need_residual_variance() -> None:
    returns, market = _returns()
    with_market = np.hstack([returns, market])
    with pytest.raises(Undefined, match="no residual variance"):
        _draw("wls", with_market, market)
    with pytest.raises(Undefined, match="singular"):
        _draw("gls", with_market, market)
    with pytest.raises(Undefined, match="at least 8 periods for 6 assets"):
        _draw("gls", returns[:7], market[:7])


# --- standard errors -----------------------------------------------------------------------------


def _monthly_slopes(drawn: MarketLine) -> np.ndarray:
    """One cross-sectional regression a month."""
    z, weights = drawn.line.design, _weights(_of(drawn), drawn)
    return np.array(
        [
            np.linalg.solve(z.T @ weights @ z, z.T @ weights @ month)
            for month in drawn.regression.returns
        ]
    )


def test_the_line_is_the_mean_of_the_monthly_slopes(drawn: MarketLine) -> None:
    np.testing.assert_allclose(
        _monthly_slopes(drawn).mean(axis=0), drawn.line.coefficients, rtol=CLOSE
    )


def test_monthly_slopes_agree_with_a_loop(drawn: MarketLine) -> None:
    slopes = _monthly_slopes(drawn)
    gaps = slopes - np.column_stack([np.zeros(90), drawn.market])
    found = LINE_COVARIANCES["monthly_slopes"](drawn, 3)
    np.testing.assert_allclose(found.coefficients, np.cov(slopes.T) / 90, rtol=CLOSE)
    np.testing.assert_allclose(found.against_market, np.cov(gaps.T) / 90, rtol=CLOSE)
    assert found.df == 89


def test_hac_of_monthly_slopes_agrees_with_a_general_library(drawn: MarketLine) -> None:
    slopes = _monthly_slopes(drawn)
    found = LINE_COVARIANCES["monthly_slopes_hac"](drawn, 3)
    series = [slopes[:, 0], slopes[:, 1], slopes[:, 1] - drawn.market]
    expected = [
        sm.OLS(each, np.ones(90)).fit(cov_type="HAC", cov_kwds={"maxlags": 3}).bse[0] ** 2
        for each in series
    ]
    variances = [*np.diag(found.coefficients), found.against_market[1, 1]]
    np.testing.assert_allclose(variances, expected, rtol=CLOSE)
    assert found.df == 89


def test_errors_in_variables_equals_its_definition(drawn: MarketLine) -> None:
    omega = drawn.market.var()
    z, weights = drawn.line.design, _weights(_of(drawn), drawn)
    a = np.linalg.solve(z.T @ weights @ z, z.T @ weights)
    spread = a @ np.cov(drawn.regression.residuals.T, bias=True) @ a.T
    correction = 1 + drawn.line.coefficients[1] ** 2 / omega
    found = LINE_COVARIANCES["errors_in_variables"](drawn, 3)
    own = (correction * spread + np.diag([0, omega])) / 90
    np.testing.assert_allclose(found.coefficients, own, rtol=CLOSE)
    np.testing.assert_allclose(found.against_market, correction * spread / 90, rtol=CLOSE)
    assert np.isnan(found.df)


def _line_of_weighted_months(
    name: str, returns: np.ndarray, market: np.ndarray, shares: np.ndarray
) -> np.ndarray:
    """Intercept, slope and market mean when month t has probability `shares[t]`."""
    centre, mean = shares @ returns, shares @ market
    moves, gaps = market - mean, returns - centre
    betas = (shares * moves) @ gaps / (shares @ moves**2)
    residuals = gaps - np.outer(moves, betas)
    covariance = residuals.T @ (residuals * shares[:, None])
    weights = {
        "ols": np.eye(len(betas)),
        "wls": np.diag(1 / np.diag(covariance)),
        "gls": np.linalg.inv(covariance),
    }[name]
    z = np.column_stack([np.ones(len(betas)), betas])
    return np.append(np.linalg.solve(z.T @ weights @ z, z.T @ weights @ centre), mean)


def _numerical_influences(name: str, returns: np.ndarray, market: np.ndarray) -> np.ndarray:
    """Derivative of the line, and of the market mean, in the probability of each month: (T, 3)."""
    n_periods, step = len(market), 1e-5
    even = np.full(n_periods, 1 / n_periods)
    rows = []
    for month in range(n_periods):
        towards = step * (np.eye(n_periods)[month] - even)
        up, down = (
            _line_of_weighted_months(name, returns, market, even + sign * towards)
            for sign in (1, -1)
        )
        rows.append((up - down) / (2 * step))
    return np.array(rows)


def test_influences_are_the_derivatives_of_the_whole_estimator(drawn: MarketLine) -> None:
    # Central differences leave errors of the order of their step's square, 1e-10, and rounding
    # divided by the step, 1e-11, both times derivatives that can be large.
    returns, market = _returns()
    expected = _numerical_influences(_of(drawn), returns, market[:, 0])
    found = influences(drawn)
    np.testing.assert_allclose(found, expected[:, :2], atol=1e-7 * np.abs(expected).max())
    np.testing.assert_allclose(found.mean(axis=0), 0.0, atol=1e-14)


@pytest.mark.parametrize("lag", [0, 4])
def test_robust_covariance_is_that_of_the_influences(drawn: MarketLine, lag: int) -> None:
    returns, market = _returns()
    numerical = _numerical_influences(_of(drawn), returns, market[:, 0])
    gap = numerical[:, :2] - np.column_stack([np.zeros(90), numerical[:, 2]])
    kind = "misspecification_robust_hac" if lag else "misspecification_robust"
    found = LINE_COVARIANCES[kind](drawn, lag)
    for matrix, scores in ((found.coefficients, numerical[:, :2]), (found.against_market, gap)):
        expected = np.zeros((2, 2))
        for t, left in enumerate(scores):
            for s, right in enumerate(scores):
                expected += max(0.0, 1 - abs(t - s) / (lag + 1)) * np.outer(left, right) / 90**2
        # The differences' own error, as above.
        np.testing.assert_allclose(matrix, expected, rtol=1e-6)


def test_gls_influences_equal_the_form_with_the_covariance_of_returns() -> None:
    # Kan, Robotti and Shanken 2013, GLS, as they write it.
    drawn = _draw("gls", *_returns())
    fit, line = drawn.regression, drawn.line
    precision = np.linalg.inv(np.cov(fit.returns.T, bias=True))
    bread = np.linalg.inv(line.design.T @ precision @ line.design)
    moves = drawn.market - drawn.market.mean()
    deviations = fit.returns - line.means
    u = deviations @ precision @ line.residuals
    own = deviations @ precision @ line.design @ bread
    gap = own - np.column_stack([np.zeros(90), moves])
    z = np.column_stack([np.zeros(90), u * moves / moves.var()])
    w = line.coefficients[1] * moves / moves.var()
    expected = own - gap * w[:, None] + z @ bread - own * u[:, None]
    np.testing.assert_allclose(influences(drawn), expected, atol=1e-10)


def test_without_lags_the_plain_and_the_hac_forms_meet(drawn: MarketLine) -> None:
    robust, hac = (
        LINE_COVARIANCES[kind](drawn, 0).coefficients
        for kind in ("misspecification_robust", "misspecification_robust_hac")
    )
    np.testing.assert_array_equal(robust, hac)
    monthly, hac = (
        LINE_COVARIANCES[kind](drawn, 0).coefficients
        for kind in ("monthly_slopes", "monthly_slopes_hac")
    )
    np.testing.assert_allclose(monthly * 89 / 90, hac, rtol=1e-12)


def test_textbook_takes_the_market_mean_as_known(drawn: MarketLine) -> None:
    found = LINE_COVARIANCES["textbook"](drawn, 3)
    np.testing.assert_array_equal(found.against_market, found.coefficients)
    assert found.df == 4


# --- hypotheses ----------------------------------------------------------------------------------


@pytest.mark.parametrize("kind", list(LINE_COVARIANCES))
def test_joint_hypothesis_equals_its_definition(drawn: MarketLine, kind: str) -> None:
    covariance = LINE_COVARIANCES[kind](drawn, 3)
    gap = drawn.line.coefficients - [0.0, drawn.market.mean()]
    found = sharpe_lintner_wald(drawn, covariance)
    expected = gap @ np.linalg.inv(covariance.against_market) @ gap
    assert found.value == pytest.approx(expected, rel=CLOSE)
    assert found.df1 == 2


def test_pricing_errors_equal_the_pseudo_inverse(drawn: MarketLine) -> None:
    line, fit = drawn.line, drawn.regression
    left_over = np.eye(6) - line.design @ line.projection
    correction = 1 + line.coefficients[1] ** 2 / drawn.market.var()
    covariance = left_over @ np.cov(fit.residuals.T, bias=True) @ left_over.T * correction / 90
    # Two of the six eigenvalues are zero up to rounding.
    expected = line.residuals @ np.linalg.pinv(covariance, rcond=1e-9) @ line.residuals
    found = pricing_error_chi2(drawn)
    assert found.value == pytest.approx(expected, rel=CLOSE)
    assert found.df1 == 4


def test_the_f_of_pricing_errors_equals_its_definition() -> None:
    drawn = _draw("gls", *_returns())
    errors, residuals = drawn.line.residuals, drawn.regression.residuals
    correction = 1 + drawn.line.coefficients[1] ** 2 / drawn.market.var()
    q = 90 * errors @ np.linalg.solve(residuals.T @ residuals / 88, errors) / correction
    found = pricing_error_f(drawn)
    assert found.value == pytest.approx(q * (90 - 6 + 1) / ((6 - 2) * (90 - 2)), rel=CLOSE)
    assert (found.df1, found.df2) == (4, 85)


def test_only_gls_has_the_f() -> None:
    kinds = {name: list(each.pricing_error_tests) for name, each in WEIGHTINGS.items()}
    assert kinds == {"ols": ["chi2"], "wls": ["chi2"], "gls": ["chi2", "f"]}


def test_pricing_errors_need_months_and_independent_assets() -> None:
    returns, market = _returns()
    with pytest.raises(Undefined, match="at least 8 periods"):
        pricing_error_chi2(_draw("ols", returns[:7], market[:7]))
    # Of three assets one contrast is left; here it holds next to nothing but the market.
    second = 2 * returns[:, 0] - market[:, 0] + 1e-8 * returns[:, 1]
    three = np.column_stack([returns[:, 0], second, market[:, 0]])
    with pytest.raises(Undefined, match="singular"):
        pricing_error_chi2(_draw("ols", three, market))
