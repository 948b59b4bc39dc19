"""The demo market: what its files look like, that its truth is true, and where its faults lie."""

from __future__ import annotations

import io
import re

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from lineproof.demo import eras, exits, faults, files, make_demo, securities, series

LARGE = {"n_securities": 700, "first": "1950-01", "last": "2024-12", "seed": 20260101}
SMALL = {"n_securities": 60, "first": "1990-01", "last": "2004-12", "seed": 7}
LISTED_FAULTS = {5, 7, 8, 12, 13, 14, 15, 16, 19, 20, 21, 22, 23, 24, 25}
# Faults after which the row still says what the market did.
HARMLESS = {7, 20, 24, 25}


@pytest.fixture(scope="module")
def large() -> dict[str, str | pd.DataFrame]:
    return make_demo(**LARGE)


@pytest.fixture(scope="module")
def small() -> dict[str, str | pd.DataFrame]:
    return make_demo(**SMALL)


@pytest.fixture(scope="module", params=["large", "small"])
def market(request: pytest.FixtureRequest) -> dict[str, str | pd.DataFrame]:
    return request.getfixturevalue(request.param)


def clean_rows(demo: dict[str, str | pd.DataFrame]) -> pd.DataFrame:
    """Rows of returns.csv that carry the truth, joined with it and with the riskless rate."""
    lines = demo["returns.csv"].splitlines()
    spoilt = demo["truth_faults"]
    skip = set(spoilt.loc[~spoilt["fault"].isin(HARMLESS), "line"])
    # A run has up to eight lines and a jump two, though only the first is recorded.
    for fault, length in ((21, 8), (22, 2)):
        for line in spoilt.loc[spoilt["fault"] == fault, "line"]:
            skip |= set(range(line, line + length))
    kept = [line for number, line in enumerate(lines, start=1) if number not in skip]
    rows = pd.read_csv(io.StringIO("\n".join(kept)), dtype={"security": str}, na_values=["NA"])
    rows = rows.drop_duplicates(["security", "date"])
    rows = rows.merge(demo["truth_betas"], on=["security", "date"], validate="one_to_one")
    rows["month"] = rows["date"].str[:7]
    monthly = pd.DataFrame({"market": market_return(demo), "riskless": riskless_return(demo)})
    return rows.join(monthly, on="month")


def market_return(demo: dict[str, str | pd.DataFrame]) -> pd.Series:
    return pd.read_csv(io.StringIO(demo["market.csv"]), index_col="month")["total_return"] / 100


def riskless_return(demo: dict[str, str | pd.DataFrame]) -> pd.Series:
    table = pd.read_csv(io.StringIO(demo["riskless.csv"]), index_col="month")
    return (1.0 + table["annual_yield"] / 100) ** (1 / 12) - 1.0


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


# --- parts, by hand ---------------------------------------------------------------------------


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


# --- the faults -------------------------------------------------------------------------------

LINE = "000417,1987-03-31,-0.012300,,,12.500,250.000,retail"


@pytest.mark.parametrize(
    ("kind", "raw"),
    [
        ("too many fields", "000417,1987-03-31,-0.012300,,,12.500,250.000,retail,revised"),
        ("decimal comma", "000417,1987-03-31,-0,012300,,,12.500,250.000,retail"),
        ("too few fields", "000417,1987-03-31,-0.012300,,"),
        ("trailing blanks", "000417,1987-03-31,-0.012300,,,12.500,250.000,retail   "),
        ("impossible day", "000417,1987-02-30,-0.012300,,,12.500,250.000,retail"),
        ("text as price", "000417,1987-03-31,-0.012300,,,see note,250.000,retail"),
        ("overflow", "000417,1987-03-31,1e400,,,12.500,250.000,retail"),
        ("blanks around", " 000417 ,1987-03-31,-0.012300,,,12.500,250.000,retail"),
        ("blank identifier", ",1987-03-31,-0.012300,,,12.500,250.000,retail"),
        ("negative", "000417,1987-03-31,-0.012300,,,12.500,-12.500,retail"),
    ],
)
def test_a_spoilt_line_by_hand(kind: str, raw: str) -> None:
    spoil = next(fault.spoil for fault in faults.INSIDE if fault.kind == kind)
    spoilt = spoil([LINE, "next"])
    assert spoilt.lines == [raw, "next"]
    assert spoilt.marks == ((0, 0),)


def test_spoilt_stretches_by_hand() -> None:
    stretch = [f"a,2001-0{month}-28,0.010000,,,{month}.000,9.000,x" for month in range(1, 7)]
    assert faults.repeat(stretch).lines == [stretch[0], *stretch]
    assert faults.contradict(stretch).lines[:2] == [
        stretch[0], "a,2001-01-28,0.060000,,,1.000,9.000,x",
    ]  # fmt: skip
    assert faults.hole(2)(stretch).lines == [stretch[0], *stretch[3:]]
    assert faults.hole(2)(stretch).marks == ((1, 3),)
    assert faults.stale(2)(stretch).lines == [
        stretch[0],
        "a,2001-02-28,0.000000,,,1.000,9.000,x",
        "a,2001-03-28,0.000000,,,1.000,9.000,x",
        *stretch[3:],
    ]
    assert faults.jump(stretch).lines == [
        stretch[0],
        "a,2001-02-28,4.000000,,,5.000,9.000,x",
        "a,2001-03-28,-0.800000,,,1.000,9.000,x",
        *stretch[3:],
    ]


def test_every_fault_is_planted_where_the_record_says(
    market: dict[str, str | pd.DataFrame],
) -> None:
    lines = market["returns.csv"].splitlines()
    record = market["truth_faults"]
    assert set(record["fault"]) == LISTED_FAULTS
    kinds = {(fault.number, fault.kind) for fault in (*faults.INSIDE, *faults.AT_EXIT)}
    assert set(zip(record["fault"], record["kind"], strict=True)) == kinds
    assert record["line"].is_monotonic_increasing
    assert record["line"].is_unique
    assert record["raw"].tolist() == [lines[line - 1] for line in record["line"]]


def test_spoilt_lines_show_their_fault(market: dict[str, str | pd.DataFrame]) -> None:
    lines = [line.split(",") for line in market["returns.csv"].splitlines()]
    for row in market["truth_faults"].itertuples():
        at = row.line - 1
        assert SHOWS[row.fault](lines[at - 1 : at + 4], row), row
        if row.fault not in {5, 8, 23}:
            assert lines[at][:2] == [row.security, row.date]


# What shows each fault, given the fields of the line before it, of its own and of three more.
SHOWS = {
    5: lambda near, row: len(near[1]) != 8,
    7: lambda near, row: row.raw != row.raw.rstrip(),
    8: lambda near, row: near[1][1] in {row.date[:4] + "-02-30", "9999-12-31"},
    12: lambda near, row: near[1][2] in {"", "NA", "-99"},
    13: lambda near, row: near[1][2] == "halted" or near[1][5] == "see note",
    14: lambda near, row: near[1][2] in {"inf", "nan", "1e400"},
    15: lambda near, row: near[1][2] in {"-66", "-77", "-88", "-1.400000"},
    16: lambda near, row: "-1.000000" in near[1][2:4],
    19: lambda near, row: near[1][:2] in (near[0][:2], near[2][:2]),
    20: lambda near, row: near[0][0] == near[1][0] and months_apart(near[0][1], row.date) > 1,
    21: lambda near, row: [fields[2] for fields in near[1:]] == ["0.000000"] * 4,
    22: lambda near, row: (near[1][2], near[2][2]) == ("4.000000", "-0.800000"),
    23: lambda near, row: near[1][0] in {"", f" {row.security} "},
    24: lambda near, row: near[1][6] in {"", "0", "-12.500"},
    25: lambda near, row: near[1][4] != "" and near[1][3] == "",
}


def months_apart(earlier: str, later: str) -> int:
    return (pd.Period(later, "M") - pd.Period(earlier, "M")).n


def test_nothing_is_wrong_but_what_is_recorded(market: dict[str, str | pd.DataFrame]) -> None:
    """Undoing the record leaves exactly the truth's rows."""
    assert clean_rows(market)["ret"].between(-0.99, 3.0).all()
    record, truth = market["truth_faults"], market["truth_betas"]
    unreadable = record[record["fault"].isin({5, 8, 19, 23})]
    lines = market["returns.csv"].splitlines()[1:]
    kept = [line.split(",")[:2] for line in np.delete(lines, unreadable["line"] - 2).tolist()]
    assert len(kept) == len(set(map(tuple, kept)))
    restored = unreadable[["security", "date"]].itertuples(index=False, name=None)
    found = {*map(tuple, kept), *restored}
    listed = set(truth[["security", "date"]].itertuples(index=False, name=None))
    assert found <= listed
    in_holes = record["kind"].map({"hole of 1": 1, "hole of 4": 4}).fillna(0).sum()
    assert len(listed) - len(found) == in_holes


def test_faults_grow_with_the_market(
    large: dict[str, str | pd.DataFrame], small: dict[str, str | pd.DataFrame]
) -> None:
    counts = large["truth_faults"]["fault"].value_counts()
    n_lines = len(large["truth_betas"])
    assert counts[12] == round(faults.RATE * n_lines)
    assert counts[22] == round(faults.RARE * n_lines)
    assert small["truth_faults"]["fault"].value_counts()[22] == 1


@settings(max_examples=12, deadline=None, derandomize=True)
@given(
    n_securities=st.integers(40, 90),
    n_months=st.integers(60, 150),
    seed=st.integers(0, 2**32 - 1),
)
def test_any_small_market_is_sound(n_securities: int, n_months: int, seed: int) -> None:
    first = pd.Period("1990-03", "M")
    demo = make_demo(
        n_securities=n_securities, first=str(first), last=str(first + n_months - 1), seed=seed
    )
    lines = demo["returns.csv"].splitlines()
    record = demo["truth_faults"]
    assert set(record["fault"]) == LISTED_FAULTS
    assert record["raw"].tolist() == [lines[line - 1] for line in record["line"]]
    assert demo["truth_betas"]["security"].nunique() == n_securities
    assert demo["truth_betas"]["residual_sd"].min() > 0
    assert len(demo["truth_eras"]) == 4
    assert demo["market.csv"].count("\n") == n_months + 1


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
