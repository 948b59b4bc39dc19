"""The table of estimates: keys, alignment with the market, holes, and what a user is told."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from lineproof import store
from lineproof.estimation import estimate_betas, estimates_of
from lineproof.frames import BETAS, contract
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
    table = estimates_of(
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
    table = estimates_of(panel_of({"A": series}), short, **OPTIONS).set_index("date")
    assert table.loc[MONTHS[9], "n_obs"] == 10
    assert table.loc[MONTHS[10], "n_obs"] == 10  # a row at the date, without its own pair
    assert table.loc[MONTHS[11], "n_obs"] == 11


def test_an_estimate_is_made_at_a_row_without_a_return() -> None:
    market, series = draw(3)
    series.iloc[30] = np.nan
    table = estimates_of(panel_of({"A": series}), market_of(market), **OPTIONS)
    assert table.set_index("date").loc[MONTHS[30], "n_obs"] == 11


def test_a_market_longer_than_the_panel_changes_nothing() -> None:
    market, series = draw(4)
    panel = panel_of({"A": series.iloc[12:30]})
    whole = estimates_of(panel, market_of(market), **OPTIONS)
    cut = estimates_of(panel, market_of(market).iloc[12:30], **OPTIONS)
    pd.testing.assert_frame_equal(whole, cut, check_exact=True)


def test_no_estimate_at_all_says_what_to_change() -> None:
    market, series = draw(5)
    with pytest.raises(KnownProblem) as short:
        estimates_of(panel_of({"A": series.iloc[:5]}), market_of(market), **OPTIONS)
    assert "betas.short: no security has 6 months of returns within 12 months" in str(short.value)
    with pytest.raises(KnownProblem) as flat:
        estimates_of(panel_of({"A": series}), market_of(np.full(40, 0.1)), **OPTIONS)
    assert "the market's return is the same in every month" in str(flat.value)


def test_what_an_estimator_cannot_use_is_said() -> None:
    market, series = draw(5)
    panel, table = panel_of({"A": series}), market_of(market)
    sample = {"name": "short", "window": 12}
    with pytest.raises(KnownProblem, match="12 months of returns that downside can use within 12"):
        estimates_of(panel, table, estimator="downside", min_obs=12, **sample)
    brief = {"estimator": "exponential", "min_obs": 6, "own": {"half_life": 0.01}}
    with pytest.raises(KnownProblem, match="does not vary among the months that count"):
        estimates_of(panel, table, **brief, **sample)


def test_pieces_without_an_estimate_are_passed_over(tmp_path: Path) -> None:
    market, series = draw(8)
    young, old = panel_of({"A": series.iloc[:5]}), panel_of({"B": series})
    pieces = estimate_betas([young, old, young.assign(security="C")], market_of(market), **OPTIONS)
    store.write_together(pieces, {"betas": tmp_path / "betas.parquet"})
    found = store.read_table(tmp_path / "betas.parquet")
    assert found["security"].unique().tolist() == ["B"]
    alone = estimate_betas([young], market_of(market), **OPTIONS)
    with pytest.raises(KnownProblem, match="no security has 6 months of returns"):
        store.write_together(alone, {"betas": tmp_path / "none.parquet"})
    assert not (tmp_path / "none.parquet").exists()


DAYS = pd.bdate_range("2001-01-02", "2001-08-31", unit="ms").delete([30, 31, 77])
IN_DAYS = {"name": "short", "estimator": "ols", "window": 50, "min_obs": 20, "returns": "daily"}


def draw_days(seed: int) -> tuple[np.ndarray, dict[str, pd.Series]]:
    """A market of days and three securities: one whole, one with holes, one that leaves within a month."""
    rng = np.random.default_rng(seed)
    market = rng.normal(0.0004, 0.01, len(DAYS))
    own = pd.Series(0.0001 + 1.2 * market + rng.normal(0, 0.02, len(DAYS)), DAYS)
    missing = (0.3 * own).mask(rng.random(len(DAYS)) < 0.1)
    holes = missing[rng.random(len(DAYS)) > 0.2]
    return market, {"A": own, "B": holes, "C": own[DAYS <= "2001-06-11"]}


def fit_slowly(
    series: pd.Series, factor: pd.Series, until: pd.Timestamp
) -> tuple[float, float, int] | None:
    """Slope, intercept and number of days over the last trading days up to `until`."""
    days = DAYS[until >= DAYS][-IN_DAYS["window"] :]
    seen = series[series.index.isin(days)].dropna()
    if len(seen) < IN_DAYS["min_obs"]:
        return None
    return (*np.polyfit(factor[seen.index], seen, 1), len(seen))


@pytest.mark.parametrize("dated", ["daily", "monthly"])
@pytest.mark.parametrize("seed", range(5))
def test_daily_returns_give_estimates_at_ends_of_months(dated: str, seed: int) -> None:
    market, securities = draw_days(seed)
    table = estimates_of(panel_of(securities), market_of(market, DAYS), dated=dated, **IN_DAYS)
    contract("betas", dated).validate(table)
    factor = pd.Series(market, DAYS)
    expected = []
    for name, series in securities.items():
        for month in pd.period_range("2001-01", "2001-08", freq="M"):
            last = max(day for day in DAYS if day.to_period("M") == month)
            there = (
                (series.index == last) if dated == "daily" else series.index.to_period("M") == month
            )
            found = fit_slowly(series, factor, last) if there.any() else None
            if found is not None:
                date = last if dated == "daily" else month.end_time.normalize()
                expected.append((name, date, *found))
    want = pd.DataFrame(expected, columns=["security", "date", "beta", "alpha", "n_obs"])
    for column in ("security", "date", "n_obs"):
        assert table[column].tolist() == want[column].tolist(), column
    # Rounding of a least-squares fit on 20 to 50 well-spread days.
    np.testing.assert_allclose(table["beta"], want["beta"], rtol=1e-10)
    np.testing.assert_allclose(table["alpha"], want["alpha"], rtol=1e-8, atol=1e-14)


def test_securities_may_be_categories() -> None:
    market, securities = draw_days(6)
    panel, factor = panel_of(securities), market_of(market, DAYS)
    plain = estimates_of(panel, factor, dated="daily", **IN_DAYS)
    names = pd.CategoricalDtype(pd.Index(["Z", "C", "B", "A"], dtype="str"))
    coded = estimates_of(panel.astype({"security": names}), factor, dated="daily", **IN_DAYS)
    assert isinstance(coded["security"].dtype, pd.CategoricalDtype)
    pd.testing.assert_frame_equal(coded.astype({"security": str}), plain, check_exact=True)


def test_a_day_on_which_the_market_is_closed_is_no_period() -> None:
    market, securities = draw_days(7)
    odd = pd.Series([9.0, 9.0], pd.to_datetime(["2001-03-03", "2001-09-03"]))
    more = {"A": pd.concat([securities["A"], odd]).sort_index()}
    with_odd, without = (
        estimates_of(panel_of(each), market_of(market, DAYS), dated="daily", **IN_DAYS)
        for each in (more, {"A": securities["A"]})
    )
    pd.testing.assert_frame_equal(with_odd, without, check_exact=True)


def test_messages_about_days_speak_of_days() -> None:
    market, securities = draw_days(8)
    short = panel_of({"A": securities["A"].iloc[:10]})
    with pytest.raises(KnownProblem) as caught:
        estimates_of(short, market_of(market, DAYS), dated="daily", **IN_DAYS)
    assert "no security has 20 days of returns within 50 days" in str(caught.value)


@pytest.mark.fault(33)
def test_a_window_longer_than_the_sample_is_refused() -> None:
    market, series = draw(6)
    panel = panel_of({"A": series})
    assert len(estimates_of(panel, market_of(market), **{**OPTIONS, "window": 40})) > 0
    with pytest.raises(KnownProblem) as told:
        estimates_of(panel, market_of(market), **{**OPTIONS, "window": 41})
    assert str(told.value) == (
        "No beta can be estimated.\n"
        "  betas.short.window: a window of 41 months is longer than the sample, which has 40\n"
        "    → shorten window"
    )
