"""The table of estimates: keys, alignment with the market, holes, and what a user is told."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest

from lineproof.estimation import estimate_betas
from lineproof.frames import BETAS
from lineproof.problems import KnownProblem

MONTHS = pd.date_range("2001-01-31", periods=40, freq="ME", unit="ms")
OPTIONS = {"name": "short", "estimator": "ols", "window": 12, "min_obs": 6}


def market_of(returns: np.ndarray, dates: pd.DatetimeIndex = MONTHS) -> pd.DataFrame:
    return pd.DataFrame({"date": dates, "market_excess": returns, "riskless": 0.002})


def panel_of(securities: dict[str, pd.Series]) -> pd.DataFrame:
    """Excess returns by date for each security, in the layout of the panel."""
    parts = [
        pd.DataFrame({"security": name, "date": series.index, "excess_return": series.to_numpy()})
        for name, series in securities.items()
    ]
    return pd.concat(parts, ignore_index=True).astype({"date": "datetime64[ms]"})


def draw(seed: int) -> tuple[np.ndarray, pd.Series]:
    rng = np.random.default_rng(seed)
    market = rng.normal(0.005, 0.04, len(MONTHS))
    return market, pd.Series(0.001 + 1.1 * market + rng.normal(0, 0.05, len(MONTHS)), MONTHS)


def test_each_estimate_uses_the_months_up_to_its_date() -> None:
    market, first = draw(1)
    late = (0.5 * first).iloc[15:]
    holes = first.drop(MONTHS[[20, 21, 22]])
    table = estimate_betas(
        panel_of({"A": first, "B": late, "C": holes}), market_of(market), **OPTIONS
    )
    BETAS.validate(table)
    factor = pd.Series(market, MONTHS)
    expected = []
    for name, series in (("A", first), ("B", late), ("C", holes)):
        for date in series.index:
            since = date - pd.offsets.MonthEnd(OPTIONS["window"])
            seen = series[(series.index > since) & (series.index <= date)]
            if len(seen) >= OPTIONS["min_obs"]:
                slope, intercept = np.polyfit(factor[seen.index], seen, 1)
                expected.append((name, date, slope, intercept, len(seen)))
    want = pd.DataFrame(expected, columns=["security", "date", "beta", "alpha", "n_obs"])
    assert table["security"].tolist() == want["security"].tolist()
    assert table["date"].tolist() == want["date"].tolist()
    assert table["n_obs"].tolist() == want["n_obs"].tolist()
    # Rounding of a least-squares fit on 6 to 12 well-spread months.
    np.testing.assert_allclose(table["beta"], want["beta"], rtol=1e-10)
    np.testing.assert_allclose(table["alpha"], want["alpha"], rtol=1e-8, atol=1e-14)


def test_a_month_the_market_lacks_does_not_count() -> None:
    market, series = draw(2)
    short = market_of(market).drop(index=[10])
    table = estimate_betas(panel_of({"A": series}), short, **OPTIONS).set_index("date")
    assert table.loc[MONTHS[9], "n_obs"] == 10
    assert table.loc[MONTHS[10], "n_obs"] == 10  # a row at the date, without its own pair
    assert table.loc[MONTHS[11], "n_obs"] == 11


def test_an_estimate_is_made_at_a_row_without_a_return() -> None:
    market, series = draw(3)
    series.iloc[30] = np.nan
    table = estimate_betas(panel_of({"A": series}), market_of(market), **OPTIONS)
    assert table.set_index("date").loc[MONTHS[30], "n_obs"] == 11


def test_a_market_longer_than_the_panel_changes_nothing() -> None:
    market, series = draw(4)
    panel = panel_of({"A": series.iloc[12:30]})
    whole = estimate_betas(panel, market_of(market), **OPTIONS)
    cut = estimate_betas(panel, market_of(market).iloc[12:30], **OPTIONS)
    pd.testing.assert_frame_equal(whole, cut, check_exact=True)


def test_no_estimate_at_all_says_what_to_change() -> None:
    market, series = draw(5)
    with pytest.raises(KnownProblem) as short:
        estimate_betas(panel_of({"A": series.iloc[:5]}), market_of(market), **OPTIONS)
    assert "betas.short: no security has 6 months of returns within 12 months" in str(short.value)
    with pytest.raises(KnownProblem) as flat:
        estimate_betas(panel_of({"A": series}), market_of(np.full(40, 0.1)), **OPTIONS)
    assert "the market's return is the same in every month" in str(flat.value)


@pytest.mark.fault(33)
def test_a_window_longer_than_the_sample_is_refused() -> None:
    market, series = draw(6)
    panel = panel_of({"A": series})
    assert len(estimate_betas(panel, market_of(market), **{**OPTIONS, "window": 40})) > 0
    with pytest.raises(KnownProblem) as told:
        estimate_betas(panel, market_of(market), **{**OPTIONS, "window": 41})
    assert str(told.value) == (
        "No beta can be estimated.\n"
        "  betas.short.window: a window of 41 months is longer than the sample, which has 40\n"
        "    → shorten window"
    )
