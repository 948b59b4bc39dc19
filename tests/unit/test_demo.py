"""The demo market: what its files look like, and that its truth is true."""

from __future__ import annotations

import io
import re

import numpy as np
import pandas as pd
import pytest
from tests.unit.conftest import SMALL
from tests.unit.demo_examples import (
    clean_rows,
    market_return,
    riskless_return,
)

from lineproof.demo import eras, make_demo, series

# --- the shape of what is delivered -----------------------------------------------------------


def test_tables_and_columns(market: dict[str, str | pd.DataFrame]) -> None:
    headers = {
        name: text.partition("\n")[0] for name, text in market.items() if isinstance(text, str)
    }
    assert headers == {
        "returns.csv": "security,date,ret,final_ret,exit_code,price,size,sector",
        "market.csv": "month,total_return",
        "riskless.csv": "month,annual_yield",
        "sector_indices.csv": "asset,month,ret",
    }
    columns = {
        name: list(table) for name, table in market.items() if isinstance(table, pd.DataFrame)
    }
    assert columns == {
        "truth_eras": ["era", "first", "last", "intercept", "slope", "premium"],
        "truth_betas": ["security", "date", "beta", "residual_sd"],
        "truth_faults": ["fault", "kind", "line", "security", "date", "raw"],
    }


def test_clean_lines_have_the_vendor_s_format(market: dict[str, str | pd.DataFrame]) -> None:
    number = r"-?\d+\.\d"
    pattern = re.compile(
        rf"\d{{6}},\d{{4}}-\d\d-\d\d,{number}{{6}},({number}{{6}})?,(ACQ|FAIL|MOVE)?,"
        rf"\d+\.\d{{3}},\d+\.\d{{3}},[a-z]+"
    )
    marked = set(market["truth_faults"]["line"])
    lines = market["returns.csv"].splitlines()
    odd = [
        line
        for number, line in enumerate(lines, start=1)
        if number > 1 and number not in marked and not pattern.fullmatch(line)
    ]
    assert odd == []
    assert "-0.000000" not in market["returns.csv"]


def test_numbers_alive(large: dict[str, str | pd.DataFrame]) -> None:
    truth = large["truth_betas"]
    alive = truth.groupby(truth["date"].str[:7]).size()
    assert len(alive) == 900
    assert alive.min() >= 250
    assert alive.max() <= 450
    assert truth["security"].nunique() == 700
    assert truth["security"].str.fullmatch(r"0\d{5}").all()


def test_dates_are_last_weekdays(market: dict[str, str | pd.DataFrame]) -> None:
    dates = pd.to_datetime(market["truth_betas"]["date"].drop_duplicates())
    expected = pd.date_range(dates.min().replace(day=1), dates.max(), freq="BME")
    assert sorted(dates) == list(expected)


def test_truth_is_in_order_of_security_and_date(market: dict[str, str | pd.DataFrame]) -> None:
    truth = market["truth_betas"]
    assert truth.equals(truth.sort_values(["security", "date"]))


def test_screens_have_something_to_remove(market: dict[str, str | pd.DataFrame]) -> None:
    rows = clean_rows(market)
    assert 0.0 < (rows["price"] < 1.0).mean() < 0.1
    assert 0.0 < (rows["sector"] == "financials").mean() < 0.3
    # Penny shares stay penny shares: no security is on both sides of the screen.
    assert (rows["price"] < 1.0).groupby(rows["security"]).nunique().max() == 1


def test_leavers_have_codes_and_final_returns_in_their_last_row(
    market: dict[str, str | pd.DataFrame],
) -> None:
    rows, truth = clean_rows(market), market["truth_betas"]
    last = rows["date"] == rows["security"].map(truth.groupby("security")["date"].max())
    leaves = last & (rows["date"] < truth["date"].max())
    assert leaves.sum() > 10
    assert rows.loc[leaves, "exit_code"].notna().all()
    assert rows.loc[~leaves, ["exit_code", "final_ret"]].isna().all(axis=None)
    assert rows.loc[rows["final_ret"].notna(), "exit_code"].notna().all()
    assert rows.loc[rows["final_ret"].notna(), "final_ret"].between(-0.9, 0.5).all()


def test_every_sector_index_is_complete(market: dict[str, str | pd.DataFrame]) -> None:
    index = pd.read_csv(io.StringIO(market["sector_indices.csv"]))
    wide = index.pivot(index="month", columns="asset", values="ret")
    assert list(wide.index) == list(market_return(market).index)
    assert wide.shape[1] == 10
    assert wide.notna().all(axis=None)


# --- determinism ------------------------------------------------------------------------------


def test_same_arguments_give_the_same_bytes(small: dict[str, str | pd.DataFrame]) -> None:
    again = make_demo(**SMALL)
    assert list(again) == list(small)
    for name, table in small.items():
        if isinstance(table, str):
            assert again[name] == table
        else:
            pd.testing.assert_frame_equal(again[name], table, check_exact=True)


def test_another_seed_gives_another_market(small: dict[str, str | pd.DataFrame]) -> None:
    other = make_demo(**SMALL | {"seed": 8})
    for name in set(small) - {"truth_eras"}:
        assert not (
            other[name] == small[name]
            if isinstance(small[name], str)
            else other[name].equals(small[name])
        )


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"n_securities": 39}, "n_securities must be 40 to 40000, not 39"),
        ({"n_securities": 40_001}, "not 40001"),
        ({"last": "1994-11"}, "59 months; at least 60"),
        ({"last": "1980-01"}, "0 months"),
        ({"first": "a month"}, "(?i)a month"),
    ],
)
def test_impossible_requests_are_refused(change: dict[str, object], message: str) -> None:
    with pytest.raises(ValueError, match=message):
        make_demo(**SMALL | change)


# --- the truth is true ------------------------------------------------------------------------


def test_the_market_is_the_size_weighted_mean(market: dict[str, str | pd.DataFrame]) -> None:
    """In months without a faulty row, sizes in the file rebuild the market and its beta."""
    rows, truth = clean_rows(market), market["truth_betas"]
    listed = truth.groupby(truth["date"].str[:7]).size()
    sound = rows[rows["size"] > 0].groupby("month").size().reindex(listed.index) == listed
    rows["position"] = listed.index.get_indexer(rows["month"])
    before = rows[["security", "position", "size"]].assign(position=rows["position"] + 1)
    rows = rows.merge(before, on=["security", "position"], suffixes=("", "_before"))
    rows = rows[rows["month"].isin(listed.index[sound & sound.shift(fill_value=False)])]
    assert rows["month"].nunique() > 20
    month, weight = rows["month"], rows["size_before"]
    total = weight.groupby(month).sum()
    returns = (weight * rows["ret"]).groupby(month).sum() / total
    # Half a unit of the sixth decimal, in which returns are printed.
    assert (returns - market_return(market)).abs().max() < 5.1e-7
    betas = (weight * rows["beta"]).groupby(month).sum() / total
    np.testing.assert_allclose(betas, 1.0, atol=1e-12)


def test_eras_split_the_default_span_at_the_intended_years(
    large: dict[str, str | pd.DataFrame],
) -> None:
    table = large["truth_eras"]
    assert table["first"].tolist() == ["1950-01", "1972-01", "1989-01", "2007-01"]
    assert table["last"].tolist() == ["1971-12", "1988-12", "2006-12", "2024-12"]
    assert np.allclose(table["intercept"] + table["slope"], table["premium"], rtol=0, atol=1e-15)


def test_the_premium_is_positive_and_near_the_truth_in_each_era(
    large: dict[str, str | pd.DataFrame],
) -> None:
    excess = market_return(large) - riskless_return(large)
    for era in large["truth_eras"].itertuples():
        months = excess[era.first : era.last]
        assert months.mean() > 0
        # KEPT_MEAN_SHOCK of the ordinary sampling error is left.
        allowed = 3 * series.KEPT_MEAN_SHOCK * series.MARKET_SD / np.sqrt(len(months))
        assert months.mean() == pytest.approx(era.premium, abs=allowed)
    assert excess.std() == pytest.approx(series.MARKET_SD, rel=0.15)


def test_monthly_cross_sections_on_true_betas_recover_each_era(
    large: dict[str, str | pd.DataFrame],
) -> None:
    rows = clean_rows(large)
    rows["excess"] = rows["ret"] - rows["riskless"]
    lines = {}
    for month, rows_of_month in rows.groupby("month"):
        regressors = np.column_stack([np.ones(len(rows_of_month)), rows_of_month["beta"]])
        lines[month] = np.linalg.lstsq(regressors, rows_of_month["excess"], rcond=None)[0]
    lines = pd.DataFrame(lines, index=["intercept", "slope"]).T
    # The month's market return moves the slope one for one; without it the slope is known well.
    lines["beyond_market"] = lines["slope"] - (market_return(large) - riskless_return(large))
    for era in large["truth_eras"].itertuples():
        months = lines[era.first : era.last]
        se = months.std() / np.sqrt(len(months))
        truth = {
            "intercept": era.intercept,
            "slope": era.slope,
            "beyond_market": era.slope - era.premium,
        }
        for term, value in truth.items():
            assert abs(months[term].mean() - value) < 3 * se[term], (era.era, term)
        assert se["beyond_market"] < 0.001


def test_residuals_have_their_stated_risk_and_heavy_tails(
    large: dict[str, str | pd.DataFrame],
) -> None:
    rows = clean_rows(large)
    intercept = pd.Series(
        eras.by_month("intercept", 900), index=sorted(set(rows["month"])), name="zero"
    )
    rows = rows.join(intercept, on="month")
    excess = rows["market"] - rows["riskless"]
    line = rows["zero"] * (1 - rows["beta"]) + rows["beta"] * excess
    standardised = (rows["ret"] - rows["riskless"] - line) / rows["residual_sd"]
    # 290,000 draws with a kurtosis of nine: the sd has a standard error of .0026; three of them.
    assert standardised.std() == pytest.approx(1.0, abs=0.008)
    assert standardised.kurt() > 2.0
    # Residual risk rises with the size of beta, group by group.
    groups = pd.qcut(rows["beta"].abs(), 10, labels=False)
    assert rows["residual_sd"].groupby(groups).mean().is_monotonic_increasing


def test_true_betas_move_slowly_and_revert(large: dict[str, str | pd.DataFrame]) -> None:
    truth = large["truth_betas"]
    by_security = truth.groupby("security")["beta"]
    assert by_security.diff().std() < 0.06
    assert by_security.std().dropna().median() > 0.1
    assert 0.4 < truth["beta"].std() < 0.7


def test_regressions_of_long_lived_securities_find_their_mean_beta(
    large: dict[str, str | pd.DataFrame],
) -> None:
    rows = clean_rows(large)
    inside = 0
    lived = [group for _, group in rows.groupby("security") if len(group) > 600]
    for group in lived:
        regressors = np.column_stack([np.ones(len(group)), group["market"] - group["riskless"]])
        outcome = group["ret"] - group["riskless"]
        found, squares, *_ = np.linalg.lstsq(regressors, outcome, rcond=None)
        variance = squares[0] / (len(group) - 2) * np.linalg.inv(regressors.T @ regressors)
        inside += abs(found[1] - group["beta"].mean()) < 3 * np.sqrt(variance[1, 1])
    assert len(lived) > 50
    # Betas wander with the market's heavy tails, so a little under the nominal 99.7 %.
    assert inside / len(lived) > 0.95
