"""Black, Jensen and Scholes 1972, "The Capital Asset Pricing Model: Some Empirical Tests", table 2.

Ten portfolios ranked on past beta, 1931-1965. All printed values here are from memory; they agree
with each other: alpha equals the mean less beta times the market's mean, and the line through the
ten points is the printed one.
"""

from __future__ import annotations

from dataclasses import asdict

import numpy as np
import pandas as pd
import pytest

from lineproof.forming import form_portfolios
from lineproof.pricing import price_subperiod
from lineproof.stats.fitted_line import fit_line, textbook_covariance
from lineproof.study import load_study
from lineproof.subperiods import cut_subperiods
from lineproof.wiring import Wiring

BETAS = np.array([1.5614, 1.3838, 1.2483, 1.1625, 1.0572, 0.9229, 0.8531, 0.7534, 0.6291, 0.4992])
MEANS = np.array([0.0213, 0.0177, 0.0171, 0.0163, 0.0145, 0.0137, 0.0126, 0.0115, 0.0109, 0.0091])
ALPHAS = (
    np.array([-0.0829, -0.1938, -0.0649, -0.0167, -0.0543, 0.0593, 0.0462, 0.0812, 0.1968, 0.2012])
    / 100
)
MARKET = 0.0142

# Means are printed to four decimals, so each is off by up to .00005, and coefficients, which
# average them, by less; the printed coefficients add half a unit of their fifth decimal.
ROUNDED_INPUTS = 0.00005


STUDY = """\
study: {name: printed, title: Ten portfolios of 1931 to 1965}
data:
  returns: {file: printed.csv, columns: {security: portfolio, date: month, return: total}}
  market: {file: printed.csv, columns: {date: month, return: total}}
  riskless: {file: printed.csv, columns: {date: month, rate: total}}
portfolios:
  printed: {design: supplied, file: printed.csv, columns: {asset: portfolio, date: month, return: total},
            unit: percent, dates: "%Y-%m"}
subperiods:
  full: {}
"""
RISKLESS = 0.001


def _returns(n_periods: int = 420) -> tuple[np.ndarray, np.ndarray]:
    """Excess returns whose means and betas are exactly the printed ones; the residuals are of any size."""
    rng = np.random.default_rng(19311965)
    moves = rng.standard_normal(n_periods)
    moves -= moves.mean()
    moves *= 0.089 / moves.std()
    design = np.column_stack([np.ones(n_periods), moves])
    noise = 0.02 * rng.standard_normal((n_periods, len(BETAS)))
    noise -= design @ np.linalg.lstsq(design, noise, rcond=None)[0]
    return MEANS + np.outer(moves, BETAS) + noise, MARKET + moves


@pytest.fixture(scope="module")
def priced(tmp_path_factory: pytest.TempPathFactory) -> pd.DataFrame:
    """As a user would supply the ten portfolios: a file of total returns in per cent, and a study file."""
    folder = tmp_path_factory.mktemp("printed")
    returns, market = _returns()
    months = pd.period_range("1931-01", "1965-12", freq="M")
    assets = [f"{number:02d}" for number in range(1, len(BETAS) + 1)]
    lines = [
        f"{asset},{month},{float(100 * (value + RISKLESS))!r}"
        for month, row in zip(months, returns, strict=True)
        for asset, value in zip(assets, row, strict=True)
    ]
    (folder / "printed.csv").write_text("\n".join(["portfolio,month,total", *lines, ""]))
    (folder / "study.yaml").write_text(STUDY)
    wiring = Wiring(load_study(folder / "study.yaml"))
    factor = pd.DataFrame(
        {
            "date": months.to_timestamp(how="end").normalize().as_unit("ms"),
            "market_excess": market,
            "riskless": RISKLESS,
        }
    )
    formed = form_portfolios(
        [str(folder / "printed.csv")], factor, **wiring.options("form_portfolios-printed")
    )
    specs = {"full": asdict(wiring.study.subperiods["full"])}
    _, cuts = cut_subperiods({"printed": formed.returns}, factor, main="printed", specs=specs)
    return price_subperiod(cuts["full"], subperiod="full", **wiring.options("price_subperiod"))


def _line(priced: pd.DataFrame, term: str) -> pd.Series:
    line = priced["analysis"] == "market_line"
    rows = priced[line & (priced["variant"] == "ols") & (priced["se_kind"] == "textbook")]
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
        # The returns' means and betas are the printed ones up to rounding, that of per cent in a file included.
        assert found["estimate"] == pytest.approx(line.coefficients[place], rel=1e-10)
        assert found["se"] == pytest.approx(errors[place], rel=1e-10)


def test_alphas(priced: pd.DataFrame) -> None:
    alphas = (priced["analysis"] == "time_series") & (priced["term"] == "alpha")
    rows = priced[alphas & (priced["se_kind"] == "classical")]
    assert rows["asset"].tolist() == [f"{number:02d}" for number in range(1, 11)]
    # Half a unit of the means' last digit; betas and alphas are printed finer.
    np.testing.assert_allclose(rows["estimate"], ALPHAS, atol=ROUNDED_INPUTS)
