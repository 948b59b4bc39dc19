"""Covariances of coefficients against slow loops and hand-worked sums."""

from __future__ import annotations

import numpy as np
import pytest

from lineproof.stats import Undefined
from lineproof.stats.covariance import (
    COEFFICIENT_COVARIANCES,
    automatic_lag,
    deviations,
    inverse,
    long_run_sum,
)

# Sums of some dozens of products in another order.
CLOSE = 1e-11


def _problem(seed: int, n_periods: int = 40, n_factors: int = 2, n_assets: int = 3) -> tuple:
    rng = np.random.default_rng(seed)
    design = np.column_stack([np.ones(n_periods), rng.normal(0.5, 1.0, (n_periods, n_factors))])
    residuals = rng.normal(size=(n_periods, n_assets)) * np.abs(design[:, 1:2])
    return design, np.linalg.inv(design.T @ design), residuals


def _scale(kind: str, leverage: float, n_periods: int, n_coefficients: int) -> float:
    """Factor of a month's squared residual, as MacKinnon and White 1985 define the kinds."""
    return {
        "hc0": 1.0,
        "hc1": n_periods / (n_periods - n_coefficients),
        "hc2": 1.0 / (1.0 - leverage),
        "hc3": 1.0 / (1.0 - leverage) ** 2,
    }[kind]


@pytest.mark.parametrize("kind", ["hc0", "hc1", "hc2", "hc3"])
def test_white_covariances_equal_a_loop_over_months(kind: str) -> None:
    design, bread, residuals = _problem(1)
    n_periods, n_coefficients = design.shape
    found = COEFFICIENT_COVARIANCES[kind](design, bread, residuals, 0)
    for asset in range(residuals.shape[1]):
        meat = np.zeros_like(bread)
        for x, e in zip(design, residuals[:, asset], strict=True):
            factor = _scale(kind, float(x @ bread @ x), n_periods, n_coefficients)
            meat += factor * e**2 * np.outer(x, x)
        np.testing.assert_allclose(found[asset], bread @ meat @ bread, rtol=CLOSE)


@pytest.mark.parametrize("lag", [0, 1, 5])
def test_hac_equals_a_double_loop_over_months(lag: int) -> None:
    design, bread, residuals = _problem(2)
    found = COEFFICIENT_COVARIANCES["hac"](design, bread, residuals, lag)
    for asset in range(residuals.shape[1]):
        scores = design * residuals[:, [asset]]
        meat = np.zeros_like(bread)
        for t, left in enumerate(scores):
            for s, right in enumerate(scores):
                meat += max(0.0, 1.0 - abs(t - s) / (lag + 1)) * np.outer(left, right)
        np.testing.assert_allclose(found[asset], bread @ meat @ bread, rtol=CLOSE, atol=1e-14)


def test_hac_without_lags_is_the_white_covariance() -> None:
    problem = _problem(3)
    np.testing.assert_allclose(
        COEFFICIENT_COVARIANCES["hac"](*problem, 0),
        COEFFICIENT_COVARIANCES["hc0"](*problem, 0),
        rtol=CLOSE,
    )


def test_classical_covariance_divides_by_the_degrees_of_freedom() -> None:
    design, bread, residuals = _problem(4)
    found = COEFFICIENT_COVARIANCES["classical"](design, bread, residuals, 0)
    variance = (residuals[:, 1] ** 2).sum() / (40 - 3)
    np.testing.assert_allclose(found[1], variance * bread, rtol=CLOSE)


def test_a_month_that_decides_the_fit_leaves_hc3_undefined() -> None:
    design = np.column_stack([np.ones(5), [0.0, 0.0, 0.0, 0.0, 1.0]])
    bread = np.linalg.inv(design.T @ design)
    residuals = np.array([[1.0], [-1.0], [1.0], [-1.0], [0.0]])
    for kind in ("hc2", "hc3"):
        with pytest.raises(Undefined, match="one period alone"):
            COEFFICIENT_COVARIANCES[kind](design, bread, residuals, 0)


def test_long_run_sum_worked_by_hand() -> None:
    # Scores 1, 2, -1: own products 6, neighbours 1*2 + 2*(-1) = 0, two apart -1.
    scores = np.array([[1.0], [2.0], [-1.0]])
    assert long_run_sum(scores, 0)[0, 0] == 6.0
    assert long_run_sum(scores, 1)[0, 0] == pytest.approx(6.0 + 2 * 0.5 * 0.0)
    assert long_run_sum(scores, 2)[0, 0] == pytest.approx(6.0 + 2 * (1 / 3) * -1.0)
    # Beyond the sample only the weights change.
    assert long_run_sum(scores, 9)[0, 0] == pytest.approx(6.0 + 2 * 0.8 * -1.0)


def test_long_run_sum_of_two_series_is_symmetric_and_right() -> None:
    scores = np.array([[1.0, 0.0], [0.0, 2.0], [3.0, 1.0]])
    # Cross products of neighbours: (0,2)x(1,0) + (3,1)x(0,2) = [[0, 6], [2, 2]].
    expected = scores.T @ scores + 0.5 * np.array([[0.0, 8.0], [8.0, 4.0]])
    np.testing.assert_allclose(long_run_sum(scores, 1), expected, rtol=1e-15)


@pytest.mark.parametrize(("n_periods", "lag"), [(60, 3), (100, 4), (120, 4), (420, 5), (840, 6)])
def test_automatic_lag(n_periods: int, lag: int) -> None:
    # 4 (T/100)^(2/9): 3.57, 4, 4.17, 5.50, 6.42.
    assert automatic_lag(n_periods) == lag


def test_deviations_of_a_constant_are_exactly_zero() -> None:
    values = np.column_stack([np.full(7, 0.1), np.arange(7.0)])
    found = deviations(values)
    assert (found[:, 0] == 0.0).all()
    np.testing.assert_array_equal(found[:, 1], np.arange(7.0) - 3.0)


def test_inverse_of_a_badly_scaled_matrix() -> None:
    matrix = np.array([[1e-8, 2e-5], [2e-5, 1.0]])
    # Determinant 1e-8 - 4e-10 = 9.6e-9.
    expected = np.array([[1.0, -2e-5], [-2e-5, 1e-8]]) / 9.6e-9
    np.testing.assert_allclose(inverse(matrix, reason=""), expected, rtol=1e-12)


@pytest.mark.parametrize(
    ("matrix", "scale"),
    [
        (np.ones((2, 2)), None),
        (np.diag([1.0, 0.0]), None),
        (np.diag([1.0, 1e-14]), np.ones(2)),
        (np.diag([1.0, 1.0]), np.array([1.0, 0.0])),
    ],
)
def test_a_singular_matrix_gives_the_reason(matrix: np.ndarray, scale: np.ndarray | None) -> None:
    with pytest.raises(Undefined, match="as said"):
        inverse(matrix, scale=scale, reason="as said")


def test_the_scale_decides_what_is_small() -> None:
    tiny = np.diag([1.0, 1e-14])
    np.testing.assert_allclose(inverse(tiny, reason=""), np.diag([1.0, 1e14]), rtol=1e-12)
