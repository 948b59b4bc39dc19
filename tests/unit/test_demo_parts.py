"""Parts of the demo market, by hand."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from lineproof.demo import eras, exits, files, securities, series


def test_zero_beta_line_by_hand() -> None:
    # intercept .004 + slope .001 = premium .005; market excess .02, so a shock of .015:
    # beta 0: .004; beta 1: .02; beta 2: .004 + 2 * .001 + 2 * .015 = .036; plus riskless .003.
    line = securities.zero_beta_line(np.array([0.0, 1.0, 2.0]), 0.023, 0.003, 0.004)
    np.testing.assert_allclose(line, [0.007, 0.023, 0.039], rtol=0, atol=1e-15)


def test_offset_residuals_by_hand() -> None:
    # Equal weights and risk: each loses the mean; variance 1 - (1/2)^2 / (2 (1/2)^2) = 1/2.
    residual, sd = securities.offset_residuals(
        np.array([0.3, -0.1, 0.7]), np.ones(3), np.array([0.5, 0.5, 0.0])
    )
    np.testing.assert_allclose(residual, [0.2, -0.2, 0.7], rtol=0, atol=1e-15)
    np.testing.assert_allclose(sd, [np.sqrt(0.5), np.sqrt(0.5), 1.0], rtol=1e-15)


def test_offset_residuals_have_the_stated_risk_in_simulation() -> None:
    rng = np.random.default_rng(5)
    sd, weight = np.array([0.1, 0.2, 0.3, 0.1]), np.array([0.5, 0.3, 0.2, 0.0])
    draws = rng.standard_normal((40_000, 4)) * sd
    pairs = [securities.offset_residuals(draw, sd, weight) for draw in draws]
    kept = np.array([residual for residual, _ in pairs])
    np.testing.assert_allclose(kept @ weight, 0.0, atol=1e-15)
    # A standard deviation from 40,000 normal draws has a relative error of 1/sqrt(80,000); three.
    np.testing.assert_allclose(kept.std(axis=0), pairs[0][1], rtol=3 / np.sqrt(80_000))


def test_prices_split_and_consolidate() -> None:
    np.testing.assert_array_equal(
        securities.next_price(np.array([1.5, 2.0, 120.0, 130.0])), [15.0, 2.0, 120.0, 65.0]
    )


def test_sizes_move_towards_the_usual_one() -> None:
    moved = securities.next_size(np.array([100.0, 50.0, 1e-9]), np.array([100.0, 100.0, 1e-9]))
    np.testing.assert_array_equal(moved, [100.0, round(50.0 * 2.0**0.02, 3), 0.001])


def test_era_of_month_on_a_short_calendar() -> None:
    # 10 months: boundaries at 2.93, 5.2 and 7.6, rounded to 3, 5 and 8.
    np.testing.assert_array_equal(eras.era_of_month(10), [0, 0, 0, 1, 1, 2, 2, 2, 3, 3])


def test_mean_reverting_paths_have_the_stated_moments() -> None:
    paths = series.mean_reverting(np.random.default_rng(3), (50, 20_000), persistence=0.9, sd=0.2)
    # 20,000 independent paths: relative error of a standard deviation 1/sqrt(40,000); three.
    np.testing.assert_allclose(paths.std(axis=1)[[0, 24, 49]], 0.2, rtol=0.015)
    assert np.corrcoef(paths[20], paths[21])[0, 1] == pytest.approx(0.9, abs=0.005)


def test_decimals_are_plain() -> None:
    assert files.decimals(np.array([-1e-9, 0.1234565, np.nan, -2.0, 1234567.0]), 3) == [
        "0.000", "0.123", "", "-2.000", "1234567.000",
    ]  # fmt: skip


def test_sector_index_against_a_loop() -> None:
    months = pd.period_range("2001-01", periods=60, freq="M")
    rng = np.random.default_rng(2)
    whole = series.draw_market(rng, months)
    panel = securities.draw_panel(rng, whole, 50)
    lines = files.sector_text(panel, whole).splitlines()[1:]
    for position, name in enumerate(securities.SECTORS):
        top = bottom = 0.0
        for who in range(50):
            held = panel.listed[40, who] and panel.listed[39, who]
            if held and panel.traits.sector[who] == position:
                top += panel.size[39, who] * panel.ret[40, who]
                bottom += panel.size[39, who]
        asset, month, value = lines[position * 60 + 40].split(",")
        assert (asset, month) == (name, "2004-05")
        # Half a unit of the last printed place.
        assert float(value) == pytest.approx(100 * top / bottom, abs=5.1e-5)


def test_cheap_securities_fail_and_dear_ones_are_acquired() -> None:
    rng = np.random.default_rng(1)
    code, final = exits.draw_exits(rng, np.repeat([1.0, 50.0], 5_000))
    failed = code == "FAIL"
    # Probabilities .7 and .15; 5,000 draws have a standard error of .0065 at most; three.
    assert failed[:5_000].mean() == pytest.approx(0.70, abs=0.02)
    assert failed[5_000:].mean() == pytest.approx(0.15, abs=0.02)
    assert final[failed].min() >= -0.9
    assert final[failed].max() <= -0.2
    assert final[code == "ACQ"].mean() == pytest.approx(0.03, abs=0.003)


@settings(max_examples=12, deadline=None, derandomize=True)
@given(n_securities=st.integers(20, 60), seed=st.integers(0, 2**32 - 1))
def test_weighted_means_are_exact_in_any_panel(n_securities: int, seed: int) -> None:
    rng = np.random.default_rng(seed)
    whole = series.draw_market(rng, pd.period_range("1990-01", periods=60, freq="M"))
    panel = securities.draw_panel(rng, whole, n_securities)
    # Sums of some tens of float64 products.
    np.testing.assert_allclose((panel.weight * panel.ret).sum(axis=1), whole.market, atol=1e-13)
    np.testing.assert_allclose((panel.weight * panel.beta).sum(axis=1), 1.0, atol=1e-13)
    assert (panel.ret[panel.listed] > -1.0).all()
    assert (panel.size[panel.listed] > 0).all()
