"""Joint pricing tests of the alphas: identities, slow oracles and the limits of definition."""

from __future__ import annotations

import numpy as np
import pytest

from lineproof.stats import Undefined
from lineproof.stats.distributions import JointStatistic
from lineproof.stats.joint_alpha import (
    ALPHA_MEASURES,
    ALPHA_STATISTICS,
    exact_f,
    hac_wald,
    measure_alphas,
    sharpe2_factors,
)
from lineproof.stats.time_series import Regression, regress, standard_errors

# Inverses of well-conditioned matrices by two routes.
CLOSE = 1e-9


def _fit(seed: int, n_periods: int = 60, n_assets: int = 5, n_factors: int = 1) -> Regression:
    rng = np.random.default_rng(seed)
    factors = rng.normal(0.006, 0.045, (n_periods, n_factors))
    noise = rng.normal(0.0, 0.02, (n_periods, n_assets)) @ rng.normal(size=(n_assets, n_assets))
    return regress(0.002 + factors.sum(axis=1, keepdims=True) + noise, factors)


@pytest.mark.parametrize(
    ("name", "value", "df2"),
    [
        ("f", 49 / 10 * 0.1, 49),
        ("wald", 6.0, None),
        ("lr", 60 * np.log(1.1), None),
        ("lr_corrected", (60 - 5 - 1 - 1) * np.log(1.1), None),
        ("lm", 60 * 0.1 / 1.1, None),
    ],
)
def test_statistics_worked_by_hand(name: str, value: float, df2: int | None) -> None:
    found = ALPHA_STATISTICS[name](0.1, 60, 10, 1)
    assert found.value == pytest.approx(value, rel=1e-14)
    assert found.df1 == 10
    assert np.isnan(found.df2) if df2 is None else found.df2 == df2


def test_factors_cost_degrees_of_freedom() -> None:
    assert ALPHA_STATISTICS["f"](0.1, 60, 10, 3) == JointStatistic(47 / 10 * 0.1, 10, 47)
    corrected = ALPHA_STATISTICS["lr_corrected"](0.1, 60, 10, 3).value
    assert corrected == pytest.approx((60 - 5 - 3 - 1) * np.log(1.1), rel=1e-14)


def test_of_one_asset_the_f_is_the_squared_t_of_its_alpha() -> None:
    fit = _fit(1, n_assets=1)
    t = fit.alphas[0] / standard_errors(fit, "classical", 0)[0, 0]
    f = exact_f(measure_alphas(fit).distance, fit.n_periods, 1, 1)
    assert f.value == pytest.approx(t**2, rel=CLOSE)
    assert (f.df1, f.df2) == (1, 58)


@pytest.mark.parametrize("n_factors", [1, 3])
def test_distance_equals_its_definition(n_factors: int) -> None:
    fit = _fit(2, n_factors=n_factors)
    sigma = np.cov(fit.residuals.T, bias=True)
    omega = np.cov(fit.factors.T, bias=True).reshape(n_factors, n_factors)
    means = fit.factors.mean(axis=0)
    theta2 = means @ np.linalg.solve(omega, means)
    expected = fit.alphas @ np.linalg.solve(sigma, fit.alphas) / (1 + theta2)
    assert measure_alphas(fit).distance == pytest.approx(expected, rel=CLOSE)
    assert sharpe2_factors(fit) == pytest.approx(theta2, rel=CLOSE)


def test_the_best_sharpe_ratio_is_that_of_market_and_assets_together() -> None:
    fit = _fit(3)
    everything = np.hstack([fit.factors, fit.returns])
    means = everything.mean(axis=0)
    expected = means @ np.linalg.solve(np.cov(everything.T, bias=True), means)
    assert measure_alphas(fit).sharpe2_best == pytest.approx(expected, rel=CLOSE)
    assert measure_alphas(fit).sharpe2_market == pytest.approx(
        fit.factors.mean() ** 2 / fit.factors.var(), rel=CLOSE
    )


def test_sizes_of_the_alphas() -> None:
    fit = _fit(4)
    assert ALPHA_MEASURES["mean_abs_alpha"](fit) == pytest.approx(
        sum(abs(alpha) for alpha in fit.alphas) / 5, rel=1e-14
    )
    assert ALPHA_MEASURES["rms_alpha"](fit) == pytest.approx(
        (sum(alpha**2 for alpha in fit.alphas) / 5) ** 0.5, rel=1e-14
    )
    assert ALPHA_MEASURES["sharpe2_best"](fit) > ALPHA_MEASURES["sharpe2_market"](fit) > 0


@pytest.mark.parametrize("lag", [0, 3])
@pytest.mark.parametrize("n_factors", [1, 2])
def test_hac_wald_equals_the_stacked_moments(lag: int, n_factors: int) -> None:
    fit = _fit(5, n_assets=3, n_factors=n_factors)
    stacked = np.array([np.kron(e, x) for e, x in zip(fit.residuals, fit.design, strict=True)])
    long_run = np.zeros((stacked.shape[1], stacked.shape[1]))
    for t, left in enumerate(stacked):
        for s, right in enumerate(stacked):
            long_run += max(0.0, 1 - abs(t - s) / (lag + 1)) * np.outer(left, right)
    slopes = np.kron(np.eye(3), np.linalg.inv(fit.design.T @ fit.design))
    alphas = np.arange(3) * (n_factors + 1)
    variance = (slopes @ long_run @ slopes.T)[np.ix_(alphas, alphas)]
    found = hac_wald(fit, lag)
    assert found.value == pytest.approx(
        fit.alphas @ np.linalg.solve(variance, fit.alphas), rel=CLOSE
    )
    assert found.df1 == 3


def test_hac_wald_of_one_asset_is_its_squared_hac_t() -> None:
    fit = _fit(6, n_assets=1)
    t = fit.alphas[0] / standard_errors(fit, "hac", 4)[0, 0]
    assert hac_wald(fit, 4).value == pytest.approx(t**2, rel=CLOSE)


@pytest.mark.parametrize("n_factors", [1, 2])
def test_months_needed(n_factors: int) -> None:
    enough = 5 + n_factors + 1
    assert measure_alphas(_fit(7, n_periods=enough, n_factors=n_factors)).distance > 0
    short = _fit(7, n_periods=enough - 1, n_factors=n_factors)
    for measure in (measure_alphas, lambda fit: hac_wald(fit, 1)):
        with pytest.raises(Undefined, match=f"at least {enough} periods for 5 assets, has"):
            measure(short)


@pytest.mark.parametrize(
    "redundant", ["the market", "almost the market", "a copy", "a mixture with the market"]
)
def test_redundant_assets_make_it_undefined(redundant: str) -> None:
    fit = _fit(8)
    noise = np.random.default_rng(9).standard_normal(fit.n_periods)
    extra = {
        "the market": fit.factors[:, 0],
        # Residuals of a hundred-millionth: no rounding, and yet no return that anyone records.
        "almost the market": fit.factors[:, 0] + 1e-8 * noise,
        "a copy": fit.returns[:, 0],
        "a mixture with the market": fit.returns @ [0.2, 0.1, 0.3, 0.1, 0.3] + fit.factors[:, 0],
    }[redundant]
    redundant_fit = regress(np.column_stack([fit.returns, extra]), fit.factors)
    for measure in (measure_alphas, lambda each: hac_wald(each, 1)):
        with pytest.raises(Undefined, match="singular"):
            measure(redundant_fit)
