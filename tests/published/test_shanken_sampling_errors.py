"""Do the market line's standard errors match how much the line varies from sample to sample?

Shanken 1985 and 1992, and Kan, Robotti and Shanken 2013: 2,000 simulated samples of 360 months and
ten assets with betas .5 to 1.5. The premium is large beside the market's volatility, so that
estimated betas add a quarter to the variance and a missing correction shows.

Of 2,000 samples the standard deviation has itself a standard error of 1.6 per cent; a twentieth is
three of those.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from lineproof.stats.distributions import joint_p
from lineproof.stats.fitted_line import fit_line
from lineproof.stats.market_line import (
    LINE_COVARIANCES,
    WEIGHTINGS,
    draw_line,
    pricing_error_chi2,
    pricing_error_f,
    sharpe_lintner_wald,
)
from lineproof.stats.time_series import regress

N_SAMPLES, N_MONTHS, N_ASSETS = 2000, 360, 10
MARKET_MEAN, MARKET_SD = 0.020, 0.030
BETAS = np.linspace(0.5, 1.5, N_ASSETS)
RESIDUAL_SDS = 0.01 * np.linspace(0.7, 1.3, N_ASSETS)
TWENTIETH = 0.05
KINDS = ("textbook", "monthly_slopes", "errors_in_variables", "misspecification_robust")
TERMS = ("intercept", "slope", "slope_minus_market")


def _simulate(means: np.ndarray, name: str, seed: int) -> dict[str, np.ndarray]:
    """By kind of standard error (samples, 3), the estimates themselves, and tests' p values."""
    rng = np.random.default_rng(seed)
    tests = ("f", "chi2", *(f"joint {kind}" for kind in KINDS))
    found: dict[str, list] = {each: [] for each in ("estimate", *KINDS, *tests)}
    for _ in range(N_SAMPLES):
        market = MARKET_MEAN + MARKET_SD * rng.standard_normal((N_MONTHS, 1))
        noise = RESIDUAL_SDS * rng.standard_normal((N_MONTHS, N_ASSETS))
        returns = means + (market - MARKET_MEAN) * BETAS + noise
        drawn = draw_line(regress(returns, market), WEIGHTINGS[name])
        found["estimate"].append([*drawn.line.coefficients, drawn.against_market[1]])
        statistics = {"f": pricing_error_f(drawn), "chi2": pricing_error_chi2(drawn)}
        for kind in KINDS:
            spread = LINE_COVARIANCES[kind](drawn, 0)
            statistics[f"joint {kind}"] = sharpe_lintner_wald(drawn, spread)
            variances = [*np.diag(spread.coefficients), spread.against_market[1, 1]]
            found[kind].append(np.sqrt(variances))
        for test, statistic in statistics.items():
            found[test].append(float(joint_p(statistic.value, statistic.df1, statistic.df2)))
    return {each: np.array(values) for each, values in found.items()}


def _ratios(found: dict[str, np.ndarray], kind: str) -> np.ndarray:
    """Mean standard error over the spread of the estimates, for TERMS."""
    return found[kind].mean(axis=0) / found["estimate"].std(axis=0)


@pytest.fixture(scope="module")
def zero_beta() -> dict[str, np.ndarray]:
    return _simulate(0.005 + 0.015 * BETAS, "gls", seed=19850901)


def test_errors_in_variables_and_robust_errors_match(zero_beta: dict[str, np.ndarray]) -> None:
    for kind in ("errors_in_variables", "misspecification_robust"):
        np.testing.assert_allclose(_ratios(zero_beta, kind), 1.0, atol=TWENTIETH, err_msg=kind)


def test_the_textbook_error_of_the_slope_is_far_too_small(
    zero_beta: dict[str, np.ndarray],
) -> None:
    # It leaves out the market's own variation, which here is most of the slope's: about a third.
    assert 0.25 < _ratios(zero_beta, "textbook")[1] < 0.42


def test_the_f_of_pricing_errors_rejects_as_often_as_it_says(
    zero_beta: dict[str, np.ndarray],
) -> None:
    # Three Monte-Carlo standard errors of a rate of .05 in 2,000 samples.
    assert (zero_beta["f"] < 0.05).mean() == pytest.approx(0.05, abs=0.015)


@pytest.fixture(scope="module")
def capm() -> dict[str, np.ndarray]:
    return _simulate(MARKET_MEAN * BETAS, "ols", seed=19640701)


@pytest.mark.parametrize("kind", ["errors_in_variables", "misspecification_robust"])
def test_the_joint_hypothesis_rejects_as_often_as_it_says(
    capm: dict[str, np.ndarray], kind: str
) -> None:
    # As above.
    assert (capm[f"joint {kind}"] < 0.05).mean() == pytest.approx(0.05, abs=0.015)


def test_monthly_slopes_reject_more_often_as_they_take_betas_for_known(
    capm: dict[str, np.ndarray],
) -> None:
    # Variances too small by 1 + c = 1 + (.02/.03)^2: chi-square(2) beyond 5.991 / 1.444 has
    # probability .126; four Monte-Carlo standard errors.
    assert (capm["joint monthly_slopes"] < 0.05).mean() == pytest.approx(0.126, abs=0.030)


@pytest.mark.parametrize("n_assets", [5, 10, 25])
def test_size_under_the_assumptions_of_textbook_errors(n_assets: int) -> None:
    """Known betas and market mean, errors of the means independent and equally varied."""
    rng, rejected = np.random.default_rng(19340601), 0
    market = np.array([[MARKET_MEAN - 0.03], [MARKET_MEAN], [MARKET_MEAN + 0.03]])
    betas = np.linspace(0.5, 1.5, n_assets)
    for _ in range(N_SAMPLES):
        # Errors that are the same in all months leave betas alone and move means.
        errors = 0.01 * rng.standard_normal(n_assets)
        drawn = draw_line(regress(market * betas + errors, market), WEIGHTINGS["ols"])
        found = sharpe_lintner_wald(drawn, LINE_COVARIANCES["textbook"](drawn, 0))
        rejected += joint_p(found.value, found.df1, found.df2) < 0.05
    # Three Monte-Carlo standard errors; chi-square(2) would reject in .193, .107 and .072.
    assert rejected / N_SAMPLES == pytest.approx(0.05, abs=0.015)


@pytest.mark.parametrize("n_months", [8, 24])
def test_size_under_the_assumptions_of_monthly_slopes(n_months: int) -> None:
    """The line is drawn through the true betas."""
    rng, rejected = np.random.default_rng(19730501), 0
    market = (MARKET_MEAN + MARKET_SD * rng.standard_normal(n_months))[:, None]
    for _ in range(N_SAMPLES):
        noise = RESIDUAL_SDS * rng.standard_normal((n_months, N_ASSETS))
        drawn = draw_line(regress(market * BETAS + noise, market), WEIGHTINGS["ols"])
        drawn = replace(drawn, line=fit_line(BETAS, drawn.line.means))
        found = sharpe_lintner_wald(drawn, LINE_COVARIANCES["monthly_slopes"](drawn, 0))
        rejected += joint_p(found.value, found.df1, found.df2) < 0.05
    # As above.
    assert rejected / N_SAMPLES == pytest.approx(0.05, abs=0.015)


@pytest.mark.parametrize("name", list(WEIGHTINGS))
def test_robust_errors_match_when_no_line_fits(name: str) -> None:
    # Alternating pricing errors of up to one per cent a month: no line fits, whatever its slope.
    errors = 0.01 * np.array([1, -1, -1, 1, 0.5, -0.5, 1, -1, -1, 1])
    found = _simulate(0.005 + 0.015 * BETAS + errors, name, seed=20130401)
    np.testing.assert_allclose(
        _ratios(found, "misspecification_robust"), 1.0, atol=TWENTIETH, err_msg=name
    )
