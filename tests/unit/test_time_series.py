"""Time-series regressions: worked by hand, against single least squares, and at the limits."""

from __future__ import annotations

import numpy as np
import pytest

from lineproof.stats import Undefined
from lineproof.stats.time_series import (
    Regression,
    correlation,
    r_squared,
    regress,
    residual_autocorrelation,
    residual_sd,
    standard_errors,
)

# Four months, worked by hand: mean market .5, its squares about the mean sum to 5; with the returns
# they give beta 6/5 and alpha 1.5 - 1.2 x .5; residuals .3, .1, -1.1, .7, squares summing to 1.8.
MARKET = np.array([[-1.0], [0.0], [1.0], [2.0]])
RETURNS = np.array([[0.0], [1.0], [1.0], [4.0]])
# Hand-worked numbers have few operations: a handful of roundings.
EXACT = 1e-13
# Another algorithm for the same least squares.
CLOSE = 1e-10


@pytest.fixture
def worked() -> Regression:
    return regress(RETURNS, MARKET)


def _data(
    seed: int, n_periods: int, n_assets: int, n_factors: int
) -> tuple[np.ndarray, np.ndarray]:
    rng = np.random.default_rng(seed)
    factors = rng.normal(0.005, 0.04, (n_periods, n_factors))
    betas = rng.uniform(0.3, 1.6, (n_factors, n_assets))
    return 0.001 + factors @ betas + rng.normal(0.0, 0.03, (n_periods, n_assets)), factors


def test_coefficients_worked_by_hand(worked: Regression) -> None:
    np.testing.assert_allclose(worked.coefficients[:, 0], [0.9, 1.2], rtol=EXACT)
    np.testing.assert_allclose(worked.residuals[:, 0], [0.3, 0.1, -1.1, 0.7], rtol=EXACT)
    assert (worked.n_periods, worked.n_assets, worked.n_factors, worked.df) == (4, 1, 1, 2)


def test_moments_divide_by_the_number_of_months(worked: Regression) -> None:
    assert worked.residual_covariance[0, 0] == pytest.approx(1.8 / 4, rel=EXACT)
    assert worked.factor_covariance[0, 0] == pytest.approx(5.0 / 4, rel=EXACT)
    assert worked.return_covariance[0, 0] == pytest.approx(9.0 / 4, rel=EXACT)


@pytest.mark.parametrize(
    ("kind", "variance"),
    [
        ("classical", 0.9 / 5),
        ("hc0", 1.61 / 25),
        ("hc1", 1.61 / 25 * 4 / 2),
        # Leverages .7, .3, .3, .7.
        ("hc2", (0.2025 / 0.3 + 0.0025 / 0.7 + 0.3025 / 0.7 + 1.1025 / 0.3) / 25),
        ("hc3", (0.2025 / 0.09 + 0.0025 / 0.49 + 0.3025 / 0.49 + 1.1025 / 0.09) / 25),
        # Scores -.45, -.05, -.55, 1.05: products of neighbours sum to -.5275; twice half of that.
        ("hac", (1.61 - 0.5275) / 25),
    ],
)
def test_standard_error_of_beta_worked_by_hand(
    worked: Regression, kind: str, variance: float
) -> None:
    assert standard_errors(worked, kind, 1)[1, 0] == pytest.approx(np.sqrt(variance), rel=EXACT)


def test_standard_error_of_alpha_worked_by_hand(worked: Regression) -> None:
    # s^2 (1/T + mean^2 / 5) = .9 (.25 + .05)
    assert standard_errors(worked, "classical", 0)[0, 0] == pytest.approx(np.sqrt(0.27), rel=EXACT)


def test_summaries_worked_by_hand(worked: Regression) -> None:
    assert r_squared(worked)[0] == pytest.approx(0.8, rel=EXACT)
    assert correlation(worked)[0] == pytest.approx(np.sqrt(0.8), rel=EXACT)
    assert residual_sd(worked)[0] == pytest.approx(np.sqrt(0.9), rel=EXACT)
    # (.3 x .1 - .1 x 1.1 - 1.1 x .7) / 1.8
    assert residual_autocorrelation(worked)[0] == pytest.approx(-0.85 / 1.8, rel=EXACT)


def test_a_falling_asset_has_a_negative_correlation() -> None:
    assert correlation(regress(-RETURNS, MARKET))[0] == pytest.approx(-np.sqrt(0.8), rel=EXACT)


@pytest.mark.parametrize("n_factors", [1, 3])
def test_every_asset_equals_its_own_least_squares(n_factors: int) -> None:
    returns, factors = _data(5, 70, 6, n_factors)
    found = regress(returns, factors)
    design = np.column_stack([np.ones(70), factors])
    for asset in range(6):
        expected, *_ = np.linalg.lstsq(design, returns[:, asset], rcond=None)
        np.testing.assert_allclose(found.coefficients[:, asset], expected, rtol=CLOSE)
        total = ((returns[:, asset] - returns[:, asset].mean()) ** 2).sum()
        left = ((returns[:, asset] - design @ expected) ** 2).sum()
        assert r_squared(found)[asset] == pytest.approx(1 - left / total, rel=CLOSE)
        assert residual_sd(found)[asset] == pytest.approx(
            np.sqrt(left / (69 - n_factors)), rel=CLOSE
        )
    np.testing.assert_allclose(found.bread, np.linalg.inv(design.T @ design), rtol=CLOSE)


def test_an_asset_that_is_the_market_leaves_exact_zeros() -> None:
    _, factors = _data(6, 50, 1, 1)
    found = regress(np.hstack([factors, 2.0 * factors]), factors)
    assert not found.residuals.any()
    np.testing.assert_array_equal(standard_errors(found, "hc3", 0), 0.0)
    np.testing.assert_array_equal(r_squared(found), 1.0)
    assert np.isnan(residual_autocorrelation(found)).all()


def test_a_constant_return_has_no_r_squared() -> None:
    _, factors = _data(7, 50, 1, 1)
    found = regress(np.full((50, 1), 0.1), factors)
    assert np.isnan(r_squared(found)).all()
    assert np.isnan(correlation(found)).all()


def test_too_few_months() -> None:
    with pytest.raises(Undefined, match="needs at least 3 complete periods, has 2"):
        regress(np.zeros((2, 1)), np.array([[0.1], [0.2]]))
    assert regress(RETURNS[:3], MARKET[:3]).df == 1


@pytest.mark.parametrize("constant", [0.0, 0.1])
def test_a_market_that_does_not_vary(constant: float) -> None:
    with pytest.raises(Undefined, match="the market return does not vary"):
        regress(np.zeros((9, 1)), np.full((9, 1), constant))


def test_factors_that_are_combinations_of_each_other() -> None:
    _, factors = _data(8, 50, 1, 2)
    redundant = np.column_stack([factors, factors @ [1.0, -2.0]])
    with pytest.raises(Undefined, match="combination of the others"):
        regress(np.zeros((50, 1)), redundant)


def test_faulty_calls_are_refused() -> None:
    with pytest.raises(ValueError, match="same T"):
        regress(RETURNS, MARKET[:3])
    with pytest.raises(ValueError, match="complete"):
        regress(np.where(RETURNS == 4.0, np.nan, RETURNS), MARKET)
