"""Rolling betas of single securities, against one least-squares fit a window."""

from __future__ import annotations

import numpy as np
import pytest
from statsmodels.regression.rolling import RollingOLS

from lineproof.stats.betas import RollingBetas, rolling_ols
from lineproof.stats.windows import Sample

WINDOW, MIN_OBS = 36, 12
FIELDS = ("beta", "alpha", "se_beta", "r2", "residual_sd")


def fit(
    x: np.ndarray, y: np.ndarray, *, window: int = WINDOW, min_obs: int = MIN_OBS
) -> RollingBetas:
    sample = Sample(np.array([0, len(x)]), np.arange(len(x)), y, x[:, None])
    return rolling_ols(sample, window=window, min_obs=min_obs)


def one_fit(x: np.ndarray, y: np.ndarray) -> dict[str, float]:
    """Least squares on one window's complete pairs, the market measured from its mean."""
    n, mean = len(x), x.mean()
    design = np.column_stack([np.ones(n), x - mean])
    (level, beta), *_ = np.linalg.lstsq(design, y, rcond=None)
    residual = y - design @ [level, beta]
    variance = residual @ residual / (n - 2)
    total = ((y - y.mean()) ** 2).sum()
    return {
        "beta": beta,
        "alpha": level - beta * mean,
        "se_beta": np.sqrt(variance * np.linalg.inv(design.T @ design)[1, 1]),
        "r2": 1 - residual @ residual / total,
        "residual_sd": np.sqrt(variance),
    }


def check(found: RollingBetas, period: np.ndarray, x: np.ndarray, y: np.ndarray) -> int:
    """Compare every estimate with its own fit; the number compared.

    1e-10 relative to the size the number has by itself. A beta or alpha near zero is a difference
    of larger numbers: its size is that of a regression with a correlation of one. R² is taken from
    one, where both sides round.
    """
    row_of = dict(zip(found.row, range(len(found.row)), strict=True))
    for row in range(len(x)):
        inside = (period > period[row] - WINDOW) & (period <= period[row])
        inside &= ~(np.isnan(x) | np.isnan(y))
        assert (row in row_of) == (inside.sum() >= MIN_OBS)
        if row not in row_of:
            continue
        a, b = x[inside], y[inside]
        want, at = one_fit(a, b), row_of[row]
        steepest = b.std() / a.std()
        size = want | {"beta": steepest, "r2": 1.0}
        size["alpha"] = abs(b.mean()) + b.std() + steepest * abs(a.mean())
        for name in FIELDS:
            assert abs(getattr(found, name)[at] - want[name]) <= 1e-10 * size[name], (name, row)
        assert found.n_obs[at] == inside.sum()
    assert found.n_too_few == len(x) - len(row_of)
    assert found.n_no_variation == 0
    return len(row_of)


@pytest.mark.parametrize("unit", [1.0, 100.0], ids=["decimal", "percent"])
@pytest.mark.parametrize("kind", ["plain", "outlier", "close fit", "level", "stale"])
def test_each_window_equals_its_own_fit(kind: str, unit: float) -> None:
    rng = np.random.default_rng(sum(map(ord, kind)))
    period = np.cumsum(1 + 3 * (rng.random(180) < 0.05))  # with calendar gaps
    x = rng.normal(0.006, 0.045, 180)
    y = 0.002 + 1.2 * x + rng.normal(0.0, 0.08, 180)
    match kind:
        case "outlier":
            y[60] = 100.0  # +10,000 %, enters and leaves
        case "close fit":
            y = 0.002 + 1.2 * x + rng.normal(0.0, 1e-5, 180)
        case "level":
            x, y = x + 50.0, y + 50.0
        case "stale":
            y[70:95] = 0.0
    x[rng.random(180) < 0.05] = np.nan
    y[rng.random(180) < 0.10] = np.nan
    x, y = unit * x, unit * y
    factor = np.full(period[-1] + 1, np.nan)
    factor[period] = x
    sample = Sample(np.array([0, 180]), period, y, factor[:, None])
    found = rolling_ols(sample, window=WINDOW, min_obs=MIN_OBS)
    assert check(found, period, x, y) > 150


def test_agrees_with_a_library() -> None:
    rng = np.random.default_rng(5)
    x = rng.normal(0.005, 0.04, 200)
    y = 0.9 * x + rng.normal(0.0, 0.06, 200)
    library = RollingOLS(y, np.column_stack([np.ones(200), x]), window=WINDOW).fit()
    found = fit(x, y, min_obs=WINDOW)
    full = slice(WINDOW - 1, None)
    assert found.row.tolist() == list(range(WINDOW - 1, 200))
    # The library updates running sums from window to window, which costs it a few digits.
    pairs = {
        "alpha": library.params[full, 0],
        "beta": library.params[full, 1],
        "se_beta": library.bse[full, 1],
        "r2": library.rsquared[full],
        "residual_sd": np.sqrt(library.mse_resid[full]),
    }
    for name, expected in pairs.items():
        np.testing.assert_allclose(getattr(found, name), expected, rtol=1e-10, atol=1e-13)


def test_by_hand() -> None:
    """Market −1, 0, 1 (per cent), security 0, 1, 5: beta 5/2, alpha 2, residuals ½, −1, ½."""
    found = fit(np.array([-0.01, 0.0, 0.01]), np.array([0.0, 0.01, 0.05]), window=3, min_obs=3)
    got = [getattr(found, name)[0] for name in FIELDS]
    sd = np.sqrt(1.5) / 100  # sum of squares 1.5 (per cent squared), one degree of freedom
    want = [2.5, 0.02, sd / np.sqrt(2e-4), 12.5 / 14, sd]
    np.testing.assert_allclose(got, want, rtol=1e-13)  # a few roundings
    assert found.row.tolist() == [2]
    assert (found.n_too_few, found.n_no_variation) == (2, 0)


def test_one_pair_short_gives_no_estimate() -> None:
    rng = np.random.default_rng(6)
    x, y = rng.normal(size=(2, 40))
    y[20:] = np.nan
    found = fit(x, y, window=30, min_obs=20)
    # Row 19 is the first with 20 pairs; from row 30 on the window loses the oldest one each month.
    assert found.row.tolist() == list(range(19, 30))
    assert set(found.n_obs) == {20}
    assert found.n_too_few == 29


@pytest.mark.parametrize("level", [0.0, 0.1, -3.0])
def test_a_market_that_never_moves_gives_no_estimate(level: float) -> None:
    y = np.random.default_rng(7).normal(size=50)
    found = fit(np.full(50, level), y)
    assert len(found.row) == 0
    assert (found.n_too_few, found.n_no_variation) == (MIN_OBS - 1, 50 - MIN_OBS + 1)


def test_a_market_that_only_rounds_gives_no_estimate() -> None:
    """A total return less a riskless rate that differs from it by a constant, up to rounding."""
    riskless = np.random.default_rng(8).uniform(0.001, 0.01, 50)
    market = (riskless + 0.004) - riskless
    assert market.std() > 0
    assert fit(market, riskless).n_no_variation == 50 - MIN_OBS + 1


def test_a_market_stuck_for_a_window() -> None:
    rng = np.random.default_rng(9)
    x, y = rng.normal(size=(2, 120))
    x[30:80] = 0.1
    found = fit(x, y)
    stuck = np.arange(30 + WINDOW - 1, 80)
    assert found.n_no_variation == len(stuck)
    assert not np.isin(stuck, found.row).any()
    assert np.isfinite([getattr(found, name) for name in FIELDS]).all()


def test_a_security_that_never_moves() -> None:
    x = np.random.default_rng(10).normal(0.0, 0.04, 60)
    found = fit(x, np.full(60, -0.0031))
    assert (found.alpha == -0.0031).all()
    for name in ("beta", "se_beta", "r2", "residual_sd"):
        assert not getattr(found, name).any()


def test_a_perfect_fit() -> None:
    x = np.random.default_rng(11).normal(0.0, 0.04, 60)
    found = fit(x, 0.25 + 2 * x)
    np.testing.assert_allclose(found.beta, 2.0, rtol=1e-13)
    assert (found.r2 <= 1).all()
    assert found.r2.min() > 1 - 1e-13
    assert found.residual_sd.max() < 1e-15  # rounding of returns near 0.25, 5.6e-17 each


@pytest.mark.parametrize("min_obs", [0, 2])
def test_a_standard_error_takes_three_observations(min_obs: int) -> None:
    with pytest.raises(ValueError, match="at least 3 observations"):
        fit(np.ones(5), np.ones(5), min_obs=min_obs)
