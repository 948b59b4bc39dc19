"""Rolling betas against general libraries and formulas worked by hand, one check or more an estimator."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm
from statsmodels.regression.rolling import RollingOLS

from lineproof.stats import betas
from lineproof.stats.shrinkage import to_cross_section, to_fixed
from lineproof.stats.windows import Sample

WINDOW = 48
FULL = {"window": WINDOW, "min_obs": WINDOW}


def draw(n: int = 120) -> Sample:
    rng = np.random.default_rng(21)
    factors = rng.normal(0.005, 0.04, (n, 3))
    own = factors @ [0.9, 0.4, -0.2] + rng.normal(0.0, 0.06, n)
    return Sample(np.array([0, n]), np.arange(n), own, factors)


def test_several_factors_as_a_rolling_regression() -> None:
    sample = draw()
    library = RollingOLS(sample.excess, sm.add_constant(sample.factors), window=WINDOW).fit()
    found = betas.rolling_multi_factor(sample, **FULL)
    # The library updates running sums from window to window, which costs it a few digits.
    np.testing.assert_allclose(found.beta, library.params[WINDOW - 1 :, 1], rtol=1e-9)
    np.testing.assert_allclose(found.se_beta, library.bse[WINDOW - 1 :, 1], rtol=1e-9)


def test_lags_and_leads_as_one_regression() -> None:
    """The last window of returns ends two periods before the end, so that two leads are known."""
    sample, n = draw(), 120
    found = betas.rolling_lagged(sample, lags=1, leads=2, **FULL)
    at = np.arange(n - 2 - WINDOW, n - 2)
    market = sample.factors[:, 0]
    design = sm.add_constant(np.column_stack([market[at + shift] for shift in (-1, 0, 1, 2)]))
    total = sm.OLS(sample.excess[at], design).fit().t_test([0, 1, 1, 1, 1])
    assert found.beta[-1] == pytest.approx(total.effect[0], rel=1e-10)
    assert found.se_beta[-1] == pytest.approx(total.sd.item(), rel=1e-10)


def test_weights_as_weighted_least_squares() -> None:
    sample = draw()
    found = betas.rolling_exponential(sample, half_life=10, **FULL)
    at = np.arange(120 - WINDOW, 120)
    weights = 0.5 ** ((119 - at) / 10)
    design = sm.add_constant(sample.factors[at, 0])
    library = sm.WLS(sample.excess[at], design, weights / weights.mean()).fit()
    got = [found.alpha[-1], found.beta[-1], found.se_beta[-1], found.r2[-1], found.residual_sd[-1]]
    want = [*library.params, library.bse[1], library.rsquared, np.sqrt(library.mse_resid)]
    np.testing.assert_allclose(got, want, rtol=1e-10)


def test_weights_as_covariances_of_a_library() -> None:
    """pandas weighs by (1 − a)^age from the first row on: a window as long as the sample has the same weights."""
    sample = draw()
    frame = pd.DataFrame({"x": sample.factors[:, 0], "y": sample.excess})
    cov = frame.ewm(halflife=10).cov(bias=True)
    found = betas.rolling_exponential(sample, half_life=10, window=120, min_obs=3)
    for row, beta in zip(found.row, found.beta, strict=True):
        want = cov.loc[(row, "x"), "y"] / cov.loc[(row, "x"), "x"]
        assert beta == pytest.approx(want, rel=1e-9, abs=1e-12)


def test_neighbours_by_hand() -> None:
    """Scholes and Williams 1977: (b₋₁ + b₀ + b₊₁) / (1 + 2ρ), returns the fifth period of which is not used yet.

    Market 1, −1, 2, 0, 3 at 0 … 4; the returns 2, 5, −1 are those of periods 1 to 3. Market before 1, −1, 2, the same
    −1, 2, 0, after 2, 0, 3. About the means 2/3, 1/3, 5/3 and 2, squares are 14/3 each; products with the returns
    (0, 3, −3) are −9, 6 and −9; and market with market before has −1·1 + 2·(−1) + 0·2 − 3·(2/3)(1/3) = −11/3.
    ρ = −11/14 gives 1 + 2ρ = −4/7: not defined. With the returns' order kept and the market 1, 1, 2, 4, 3:
    before 1, 1, 2; same 1, 2, 4; after 2, 4, 3. Squares 2/3, 14/3, 2; products with (0, 3, −3): −3, −6, 3;
    before with same: 11 − 28/3 = 5/3, ρ = (5/3)/√(28/9) = 5/√28.
    """
    market = np.array([1.0, -1.0, 2.0, 0.0, 3.0])
    own = np.array([9.0, 2.0, 5.0, -1.0, 9.0])
    options = {"window": 3, "min_obs": 3}
    sample = Sample(np.array([0, 5]), np.arange(5), own, market[:, None])
    assert betas.rolling_scholes_williams(sample, **options).n_no_variation == 1
    market = np.array([1.0, 1.0, 2.0, 4.0, 3.0])
    sample = Sample(np.array([0, 5]), np.arange(5), own, market[:, None])
    found = betas.rolling_scholes_williams(sample, **options)
    want = (-3 / (2 / 3) - 6 / (14 / 3) + 3 / 2) / (1 + 2 * 5 / np.sqrt(28))
    assert found.row.tolist() == [4]
    assert found.beta[0] == pytest.approx(want, rel=1e-13)


def test_one_window_for_all_makes_correlation_and_volatility_least_squares() -> None:
    """ρ σ / σ_m is the slope, and the standard error by the delta method the classical one."""
    sample = draw()
    same = {"volatility_window": WINDOW, "volatility_min_obs": WINDOW}
    found = betas.rolling_correlation_volatility(sample, **FULL, **same)
    want = betas.rolling_ols(sample, **FULL)
    for name in ("row", "beta", "alpha", "se_beta", "r2", "residual_sd", "n_obs"):
        np.testing.assert_allclose(getattr(found, name), getattr(want, name), rtol=1e-10)


def test_falling_markets_as_a_regression() -> None:
    sample = draw()
    found = betas.rolling_downside(sample, below="mean", window=WINDOW, min_obs=5)
    market, own = sample.factors[-WINDOW:, 0], sample.excess[-WINDOW:]
    falls = market < market.mean()
    library = sm.OLS(own[falls], sm.add_constant(market[falls])).fit()
    assert found.beta[-1] == pytest.approx(library.params[1], rel=1e-10)
    assert found.se_beta[-1] == pytest.approx(library.bse[1], rel=1e-10)
    assert found.n_obs[-1] == falls.sum()


def test_the_cross_section_by_hand() -> None:
    """Vasicek 1973. Betas 0, 1, 2 have mean 1 and variance 1; with se 1, 2, 3 they keep 1/2, 1/5, 1/10 of the way."""
    beta, se = np.array([0.0, 1.0, 2.0, 7.0]), np.array([1.0, 2.0, 3.0, 4.0])
    shrunk, posterior = to_cross_section(beta, se, np.array([1, 1, 1, 2]))
    np.testing.assert_allclose(shrunk, [0.5, 1.0, 1.1, 7.0], rtol=1e-15)
    np.testing.assert_allclose(posterior, [np.sqrt(0.5), np.sqrt(0.8), np.sqrt(0.9), 4], rtol=1e-15)


def test_exact_betas_stay_and_equal_ones_meet() -> None:
    beta = np.array([0.0, 2.0, 3.0, 3.0])
    shrunk, posterior = to_cross_section(beta, np.array([0, 0, 1, 1.0]), np.array([1, 1, 2, 2]))
    assert shrunk.tolist() == beta.tolist()
    assert posterior.tolist() == [0, 0, 0, 0]


def test_a_fixed_value_by_hand() -> None:
    shrunk, se = to_fixed(
        np.array([1.3, 0.4]), np.array([0.3, 0.6]), np.zeros(2), weight=2 / 3, to=1.0
    )
    np.testing.assert_allclose(shrunk, [1.2, 0.6], rtol=1e-15)
    np.testing.assert_allclose(se, [0.2, 0.4], rtol=1e-15)
