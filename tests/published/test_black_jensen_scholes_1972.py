"""Black, Jensen and Scholes 1972, "The Capital Asset Pricing Model: Some Empirical Tests", table 2.

Ten portfolios ranked on past beta, 1931-1965. All printed values here are from memory; they agree
with each other: alpha equals the mean less beta times the market's mean, and the line through the
ten points is the printed one.
"""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest

from lineproof.pricing import price_subperiod
from lineproof.stats.market_line import fit_line, textbook_covariance

BETAS = np.array([1.5614, 1.3838, 1.2483, 1.1625, 1.0572, 0.9229, 0.8531, 0.7534, 0.6291, 0.4992])
MEANS = np.array([0.0213, 0.0177, 0.0171, 0.0163, 0.0145, 0.0137, 0.0126, 0.0115, 0.0109, 0.0091])
ALPHAS = (
    np.array([-0.0829, -0.1938, -0.0649, -0.0167, -0.0543, 0.0593, 0.0462, 0.0812, 0.1968, 0.2012])
    / 100
)
T_OF_ALPHAS = np.array([-0.43, -1.99, -0.76, -0.25, -0.89, 0.79, 0.71, 1.18, 2.31, 1.87])
MARKET = 0.0142

# Means are printed to four decimals, so each is off by up to .00005, and coefficients, which
# average them, by less; the printed coefficients add half a unit of their fifth decimal.
ROUNDED_INPUTS = 0.00005


def _returns(n_periods: int = 420) -> tuple[np.ndarray, np.ndarray]:
    """Returns whose means, betas and alphas' t statistics are exactly the printed ones."""
    rng = np.random.default_rng(19311965)
    moves = rng.standard_normal(n_periods)
    moves -= moves.mean()
    moves *= 0.089 / moves.std()
    design = np.column_stack([np.ones(n_periods), moves])
    noise = rng.standard_normal((n_periods, len(BETAS)))
    noise -= design @ np.linalg.lstsq(design, noise, rcond=None)[0]
    # Student's t of alpha is alpha over s times the root of 1/T + mean^2 / (T variance).
    errors = (MEANS - MARKET * BETAS) / T_OF_ALPHAS
    wanted = errors / np.sqrt((1 + (MARKET / moves.std()) ** 2) / n_periods)
    noise *= np.abs(wanted) / np.sqrt((noise**2).sum(axis=0) / (n_periods - 2))
    return MEANS + np.outer(moves, BETAS) + noise, MARKET + moves


@pytest.fixture(scope="module")
def priced() -> pd.DataFrame:
    returns, market = _returns()
    n_periods, n_assets = returns.shape
    cut = pd.DataFrame(
        {
            "sort": "supplied",
            "asset": np.tile([str(number) for number in range(1, n_assets + 1)], n_periods),
            "date": np.repeat(pd.date_range("1931-01-31", periods=n_periods, freq="ME"), n_assets),
            "excess_return": returns.ravel(),
            "n_members": np.nan,
            "mean_size": np.nan,
            "ante_beta": np.nan,
            "market_excess": np.repeat(market, n_assets),
            "riskless": 0.001,
        }
    )
    analyses = ["time_series", "market_line"]
    return price_subperiod(cut, subperiod="full", level=0.05, hac_lag=None, analyses=analyses)


def _line(priced: pd.DataFrame, term: str) -> pd.Series:
    rows = priced[(priced["variant"] == "ols") & (priced["se_kind"] == "textbook")]
    return rows.set_index("term").loc[term]


def test_the_line_through_the_printed_points() -> None:
    line = fit_line(BETAS, MEANS)
    np.testing.assert_allclose(line.coefficients, [0.00359, 0.01080], atol=ROUNDED_INPUTS)
    errors = np.sqrt(np.diag(textbook_covariance(line)))
    np.testing.assert_allclose(errors, [0.00055, 0.00052], atol=ROUNDED_INPUTS)
    # Worked out once, apart from this program, from the same rounded inputs.
    np.testing.assert_allclose(line.coefficients, [0.00361, 0.01078], atol=0.000005)
    np.testing.assert_allclose(errors, [0.00053, 0.00050], atol=0.000005)


@pytest.mark.parametrize(
    ("term", "estimate", "error", "t"),
    [
        ("intercept", 0.00359, 0.00055, 6.52),
        ("slope_minus_market", 0.01080 - MARKET, 0.00052, -6.53),
    ],
)
def test_the_line_from_returns(
    priced: pd.DataFrame, term: str, estimate: float, error: float, t: float
) -> None:
    found = _line(priced, term)
    assert found["estimate"] == pytest.approx(estimate, abs=ROUNDED_INPUTS)
    assert found["se"] == pytest.approx(error, abs=ROUNDED_INPUTS)
    # The allowances of estimate and error, carried to their ratio.
    allowed = abs(t) * (ROUNDED_INPUTS / abs(estimate) + ROUNDED_INPUTS / error)
    assert found["statistic"] == pytest.approx(t, abs=allowed)
    assert found["p"] < 0.001


def test_returns_and_table_give_the_same_line(priced: pd.DataFrame) -> None:
    line = fit_line(BETAS, MEANS)
    errors = np.sqrt(np.diag(textbook_covariance(line)))
    for place, term in enumerate(("intercept", "slope")):
        found = _line(priced, term)
        # The returns' means and betas are the printed ones up to rounding.
        assert found["estimate"] == pytest.approx(line.coefficients[place], rel=1e-10)
        assert found["se"] == pytest.approx(errors[place], rel=1e-10)


def test_alphas_and_their_t_statistics(priced: pd.DataFrame) -> None:
    rows = priced[(priced["term"] == "alpha") & (priced["se_kind"] == "classical")]
    # Half a unit of the means' last digit; betas and alphas are printed finer.
    np.testing.assert_allclose(rows["estimate"], ALPHAS, atol=ROUNDED_INPUTS)
    np.testing.assert_allclose(rows["statistic"], T_OF_ALPHAS, rtol=1e-9)
    exceeding = rows.loc[rows["statistic"].abs() > 1.85, "asset"]
    assert exceeding.tolist() == ["2", "9", "10"]
