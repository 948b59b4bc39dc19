"""Do the market line's standard errors match how much the line varies from sample to sample?

Shanken 1985 and 1992, and Kan, Robotti and Shanken 2013: 2,000 simulated samples of 360 months and
ten assets with betas .5 to 1.5. The premium is large beside the market's volatility, so that
estimated betas add a quarter to the variance and a missing correction shows.

Of 2,000 samples the standard deviation has itself a standard error of 1.6 per cent; a twentieth is
three of those.
"""

from __future__ import annotations

import numpy as np
import pytest

from lineproof.stats.distributions import joint_p
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
TERMS = ("intercept", "slope", "slope_minus_market")


def _simulate(means: np.ndarray, name: str, seed: int) -> dict[str, np.ndarray]:
    """By kind of standard error (samples, 3), the estimates themselves, and tests' p values."""
    rng = np.random.default_rng(seed)
    kinds = ("textbook", "errors_in_variables", "misspecification_robust")
    found: dict[str, list] = {each: [] for each in ("estimate", *kinds, "f", "chi2", "joint")}
    for _ in range(N_SAMPLES):
        market = MARKET_MEAN + MARKET_SD * rng.standard_normal((N_MONTHS, 1))
        noise = RESIDUAL_SDS * rng.standard_normal((N_MONTHS, N_ASSETS))
        returns = means + (market - MARKET_MEAN) * BETAS + noise
        drawn = draw_line(regress(returns, market), WEIGHTINGS[name])
        found["estimate"].append([*drawn.line.coefficients, drawn.against_market[1]])
        for kind in kinds:
            spread = LINE_COVARIANCES[kind](drawn, 0)
            variances = [*np.diag(spread.coefficients), spread.against_market[1, 1]]
            found[kind].append(np.sqrt(variances))
        for test, statistic in (
            ("f", pricing_error_f(drawn)),
            ("chi2", pricing_error_chi2(drawn)),
            ("joint", sharpe_lintner_wald(drawn, spread)),
        ):
            found[test].append(float(joint_p(statistic.value, statistic.df1, statistic.df2)))
    return {name: np.array(values) for name, values in found.items()}


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


def test_the_joint_hypothesis_rejects_as_often_as_it_says() -> None:
    capm = _simulate(MARKET_MEAN * BETAS, "ols", seed=19640701)
    # As above.
    assert (capm["joint"] < 0.05).mean() == pytest.approx(0.05, abs=0.015)


@pytest.mark.parametrize("name", list(WEIGHTINGS))
def test_robust_errors_match_when_no_line_fits(name: str) -> None:
    # Alternating pricing errors of up to one per cent a month: no line fits, whatever its slope.
    errors = 0.01 * np.array([1, -1, -1, 1, 0.5, -0.5, 1, -1, -1, 1])
    found = _simulate(0.005 + 0.015 * BETAS + errors, name, seed=20130401)
    np.testing.assert_allclose(
        _ratios(found, "misspecification_robust"), 1.0, atol=TWENTIETH, err_msg=name
    )
