"""What must hold of the pricing analyses for any returns whatever."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from tests.thorough import examples

from lineproof.addresses import address
from lineproof.analyses import ANALYSES
from lineproof.pricing import price_subperiod
from lineproof.stats.covariance import long_run_sum
from lineproof.stats.fitted_line import fit_line
from lineproof.stats.joint_alpha import ALPHA_STATISTICS, hac_wald, measure_alphas
from lineproof.stats.market_line import (
    LINE_COVARIANCES,
    WEIGHTINGS,
    draw_line,
    pricing_error_chi2,
    sharpe_lintner_wald,
)
from lineproof.stats.time_series import Regression, regress, standard_errors

SEEDS = st.integers(0, 2**32 - 1)
MANY = settings(max_examples=examples(40), deadline=None, derandomize=True)
FEW = settings(max_examples=25, deadline=None, derandomize=True)
# Well-conditioned random samples through another order of operations.
CLOSE = 1e-7


def _fit(seed: int, n_factors: int = 1) -> Regression:
    rng = np.random.default_rng(seed)
    n_periods, n_assets = int(rng.integers(40, 90)), int(rng.integers(3, 8))
    factors = rng.normal(0.005, 0.04, (n_periods, n_factors))
    betas = rng.uniform(0.3, 1.7, (n_factors, n_assets))
    noise = rng.normal(0.0, 0.03, (n_periods, n_assets))
    return regress(0.003 + factors @ betas + noise, factors)


@MANY
@given(SEEDS, st.floats(0.01, 100.0))
def test_statistics_do_not_depend_on_the_unit(seed: int, unit: float) -> None:
    fit = _fit(seed)
    scaled = regress(unit * fit.returns, unit * fit.factors)
    assert measure_alphas(scaled).distance == pytest.approx(measure_alphas(fit).distance, rel=CLOSE)
    for name, weighting in WEIGHTINGS.items():
        one, other = draw_line(fit, weighting), draw_line(scaled, weighting)
        np.testing.assert_allclose(
            other.line.coefficients, unit * one.line.coefficients, rtol=CLOSE, atol=1e-9 * unit
        )
        for kind, covariance in LINE_COVARIANCES.items():
            walds = [sharpe_lintner_wald(each, covariance(each, 3)).value for each in (one, other)]
            assert walds[1] == pytest.approx(walds[0], rel=CLOSE), (name, kind)


@MANY
@given(SEEDS, st.integers(1, 3))
def test_joint_alpha_does_not_depend_on_how_assets_are_combined(seed: int, n_factors: int) -> None:
    fit = _fit(seed, n_factors)
    rng = np.random.default_rng(seed)
    n_assets = fit.n_assets
    mix = np.linalg.qr(rng.normal(size=(n_assets, n_assets)))[0] * rng.uniform(0.5, 2.0, n_assets)
    mixed = regress(fit.returns @ mix, fit.factors)
    assert measure_alphas(mixed).distance == pytest.approx(measure_alphas(fit).distance, rel=CLOSE)
    assert hac_wald(mixed, 3).value == pytest.approx(hac_wald(fit, 3).value, rel=CLOSE)


@MANY
@given(SEEDS)
def test_factors_added_to_the_assets_change_no_alpha(seed: int) -> None:
    fit = _fit(seed)
    hedged = regress(fit.returns - 0.7 * fit.factors, fit.factors)
    np.testing.assert_allclose(hedged.alphas, fit.alphas, atol=1e-15)
    np.testing.assert_allclose(
        standard_errors(hedged, "hc3", 0)[0], standard_errors(fit, "hc3", 0)[0], rtol=CLOSE
    )


@MANY
@given(st.floats(1e-6, 10.0), st.integers(2, 30), st.integers(1, 3), st.integers(1, 200))
def test_large_sample_statistics_are_ordered(
    distance: float, n_assets: int, n_factors: int, spare: int
) -> None:
    n_periods = n_assets + n_factors + spare
    values = {
        name: statistic(distance, n_periods, n_assets, n_factors).value
        for name, statistic in ALPHA_STATISTICS.items()
    }
    assert values["lm"] <= values["lr"] <= values["wald"]
    assert values["lr_corrected"] < values["lr"]


@MANY
@given(SEEDS, st.integers(0, 60))
def test_bartlett_weights_keep_variances_positive(seed: int, lag: int) -> None:
    scores = np.random.default_rng(seed).standard_cauchy((50, 3))
    values = np.linalg.eigvalsh(long_run_sum(scores, lag))
    # Below zero by no more than rounding of the largest.
    assert values[0] >= -1e-12 * values[-1]


@MANY
@given(SEEDS, st.floats(-0.02, 0.02), st.floats(-0.02, 0.02))
def test_a_line_through_points_on_a_line_is_that_line(
    seed: int, intercept: float, slope: float
) -> None:
    fit = _fit(seed)
    betas = fit.betas[0]
    for weighting in WEIGHTINGS.values():
        line = fit_line(betas, intercept + slope * betas, weighting.weights(fit))
        np.testing.assert_allclose(line.coefficients, [intercept, slope], rtol=1e-9, atol=1e-13)


@MANY
@given(SEEDS)
def test_pricing_errors_weigh_the_same_contrasts_whatever_the_weights(seed: int) -> None:
    fit = _fit(seed)
    drawn = [draw_line(fit, weighting) for weighting in WEIGHTINGS.values()]
    values = [pricing_error_chi2(each).value * (1 + each.correction) for each in drawn]
    np.testing.assert_allclose(values, values[0], rtol=CLOSE)
    gls = drawn[-1].line
    quadratic = fit.n_periods * gls.residuals @ gls.weights @ gls.residuals
    assert values[0] == pytest.approx(quadratic, rel=CLOSE)


@MANY
@given(SEEDS)
def test_the_market_s_own_error_cancels_from_the_slope_less_its_mean(seed: int) -> None:
    fit = _fit(seed)
    for weighting in WEIGHTINGS.values():
        drawn = draw_line(fit, weighting)
        found = LINE_COVARIANCES["errors_in_variables"](drawn, 0)
        difference = found.coefficients - found.against_market
        market = np.diag([0.0, fit.factors.var() / fit.n_periods])
        np.testing.assert_allclose(difference, market, rtol=CLOSE, atol=1e-18)


def _cut(seed: int, n_periods: int, n_assets: int, share_missing: float) -> pd.DataFrame:
    rng = np.random.default_rng(seed)
    # Coarse returns: ties, constants and copies happen.
    returns = np.round(rng.normal(0.005, 0.05, (n_periods, n_assets)), int(rng.integers(1, 6)))
    returns[rng.random(returns.shape) < share_missing] = np.nan
    if n_assets > 1 and rng.random() < 0.3:
        returns[:, -1] = returns[:, 0]
    market = np.round(rng.normal(0.005, 0.05, n_periods), int(rng.integers(1, 6)))
    market[rng.random(n_periods) < share_missing / 4] = np.nan
    dates = pd.date_range("1970-01-31", periods=n_periods, freq="ME")
    return pd.DataFrame(
        {
            "sort": "some",
            "asset": np.tile([f"p{number}" for number in range(n_assets)], n_periods),
            "date": np.repeat(dates, n_assets),
            "excess_return": returns.ravel(),
            "market_excess": np.repeat(market, n_assets),
            "riskless": 0.003,
        }
    )


@settings(max_examples=80, deadline=None, derandomize=True)
@given(SEEDS, st.integers(1, 14), st.integers(1, 6), st.sampled_from([0.0, 0.1, 0.5]))
def test_any_sample_gives_numbers_or_reasons(
    seed: int, n_periods: int, n_assets: int, share_missing: float
) -> None:
    cut = _cut(seed, n_periods, n_assets, share_missing)
    priced = price_subperiod(
        cut, subperiod="full", level=0.05, hac_lag=None, analyses=list(ANALYSES)
    )
    defined = priced["status"] == "ok"
    numbers = priced.select_dtypes("float64")
    assert address(priced).is_unique
    assert (defined == (priced["reason"] == "")).all()
    assert numbers[~defined].isna().all(axis=None)
    assert not np.isinf(numbers.to_numpy()).any()
    headline = priced["estimate"].fillna(priced["statistic"])
    assert (headline.notna() == defined).all()
    probabilities = priced[["p", "p_one_sided"]].to_numpy()
    probabilities = probabilities[~np.isnan(probabilities)]
    assert ((probabilities >= 0.0) & (probabilities <= 1.0)).all()
    # A statistic comes with its p value and its critical value, and neither without it.
    for column in ("p", "critical"):
        assert (priced[column].notna() == priced["statistic"].notna()).all()


@FEW
@given(SEEDS)
def test_the_order_of_assets_changes_no_joint_number(seed: int) -> None:
    cut = _cut(seed, 30, 5, 0.02)
    analyses = ["joint_alpha", "market_line"]
    one, other = (
        price_subperiod(each, subperiod="full", level=0.05, hac_lag=2, analyses=analyses)
        for each in (cut, cut.sort_values("asset", ascending=False, kind="stable"))
    )
    # Samples here may be near-singular, where the order of sums shows in more digits.
    pd.testing.assert_frame_equal(one, other, check_exact=False, rtol=1e-6, atol=1e-12)
