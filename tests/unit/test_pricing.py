"""The pricing analyses of a subperiod: which rows, which numbers, and what is undefined."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
from scipy import stats

from lineproof.addresses import COLUMNS, KEY_COLUMNS, address
from lineproof.analyses import ANALYSES
from lineproof.pricing import price_subperiod
from lineproof.stats.covariance import COEFFICIENT_COVARIANCES
from lineproof.stats.joint_alpha import exact_f, measure_alphas
from lineproof.stats.market_line import LINE_COVARIANCES, WEIGHTINGS, draw_line
from lineproof.stats.time_series import regress, standard_errors

NUMBERS = ["estimate", "se", "statistic", "df1", "df2"]
NUMBERS += ["p", "p_one_sided", "critical", "critical_one_sided"]
ASSETS = ("low", "middle", "high", "top")


def _cut(n_periods: int = 60, assets: tuple[str, ...] = ASSETS, seed: int = 1) -> pd.DataFrame:
    rng = np.random.default_rng(seed)
    n_assets = len(assets)
    market = rng.normal(0.006, 0.045, n_periods)
    betas = np.linspace(0.5, 1.5, n_assets)
    excess = 0.001 + np.outer(market, betas) + rng.normal(0.0, 0.02, (n_periods, n_assets))
    months = pd.date_range("1960-01-31", periods=n_periods, freq="ME")
    return pd.DataFrame(
        {
            "sort": "ten",
            "asset": np.tile(assets, n_periods),
            "date": np.repeat(months, n_assets),
            "excess_return": excess.ravel(),
            "n_members": np.tile(np.arange(10.0, 10.0 + n_assets), n_periods),
            "mean_size": 250.0,
            "ante_beta": np.tile(betas, n_periods),
            "market_excess": np.repeat(market, n_assets),
            "riskless": np.repeat(rng.uniform(0.002, 0.004, n_periods), n_assets),
        }
    )


def _price(cut: pd.DataFrame, *analyses: str, level: float = 0.05, hac_lag: int | None = None):
    return price_subperiod(
        cut,
        subperiod="early",
        level=level,
        hac_lag=hac_lag,
        analyses=analyses or list(ANALYSES),
    )


def _wide(cut: pd.DataFrame) -> tuple[np.ndarray, np.ndarray]:
    returns = cut.set_index(["date", "asset"])["excess_return"].unstack()
    market = cut.groupby("date")["market_excess"].first()
    return returns[list(dict.fromkeys(cut["asset"]))].to_numpy(), market.to_numpy()[:, None]


def _number(priced: pd.DataFrame, tail: str) -> pd.Series:
    """The one row whose address ends so."""
    found = priced[address(priced) == f"ten/early/{tail}"]
    assert len(found) == 1
    return found.iloc[0]


def _undefined_reason(priced: pd.DataFrame) -> str:
    """The one reason of rows that are all undefined."""
    assert (priced["status"] == "undefined").all()
    assert priced[NUMBERS].isna().all(axis=None)
    (reason,) = set(priced["reason"])
    return reason


def _but_market_mean(priced: pd.DataFrame) -> pd.DataFrame:
    """Without the mean of the market, which is defined where the line is not."""
    return priced[priced["term"] != "market_mean"]


# --- shape ---------------------------------------------------------------------------------------


def test_columns_and_types() -> None:
    priced = _price(_cut())
    assert list(priced.columns) == COLUMNS == [*KEY_COLUMNS, *NUMBERS, *COLUMNS[-4:]]
    assert COLUMNS[-4:] == ["n_periods", "n_assets", "status", "reason"]
    assert (priced[NUMBERS].dtypes == "float64").all()
    assert (priced[["n_periods", "n_assets"]].dtypes == "int64").all()
    assert (priced[[*KEY_COLUMNS, "status", "reason"]].dtypes == "str").all()
    assert (priced["status"] == "ok").all()
    assert (priced["reason"] == "").all()


def test_every_number_that_is_promised() -> None:
    fits = ["r2", "correlation", "residual_sd", "residual_ac1", "alpha_year"]
    extras = ["mean", "sd", "n_members", "mean_size", "ante_beta"]
    expected = [f"describe/-/{a}/{term}/-" for a in ASSETS for term in extras]
    expected += [f"describe/-/{a}/{t}/-" for a in ("market", "riskless") for t in ("mean", "sd")]
    for asset in ASSETS:
        for term in ("alpha", "beta"):
            for kind in ("classical", "hc0", "hc1", "hc2", "hc3", "hac"):
                expected.append(f"time_series/market/{asset}/{term}/{kind}")
        expected += [f"time_series/market/{asset}/{term}/-" for term in fits]
    variants = ["f", "wald", "lr", "lr_corrected", "lm", "hac_wald"]
    expected += [f"joint_alpha/{variant}/all/alpha/-" for variant in variants]
    measures = ["sharpe2_market", "sharpe2_best", "mean_abs_alpha", "rms_alpha"]
    expected += [f"joint_alpha/-/all/{term}/-" for term in measures]
    terms = ["intercept", "slope", "slope_minus_market", "intercept_and_slope_minus_market"]
    kinds = ["textbook", "monthly_slopes", "monthly_slopes_hac", "errors_in_variables"]
    kinds += ["misspecification_robust", "misspecification_robust_hac"]
    expected += ["market_line/-/all/market_mean/-"]
    for variant in ("ols", "wls", "gls"):
        expected += [f"market_line/{variant}/all/{t}/{kind}" for t in terms for kind in kinds]
        expected += [f"market_line/{variant}/all/pricing_errors/chi2"]
        expected += ["market_line/gls/all/pricing_errors/f"] if variant == "gls" else []
        expected += [f"market_line/{variant}/all/r2/-"]
    assert address(_price(_cut())).tolist() == [f"ten/early/{tail}" for tail in expected]


def test_order_is_that_of_the_registry_and_of_the_cut() -> None:
    cut = pd.concat([_cut().assign(sort="zeta"), _cut().assign(sort="alpha")])
    priced = _price(cut, "time_series", "describe")
    blocks = priced[["sort", "analysis"]].drop_duplicates().to_numpy().tolist()
    assert blocks == [
        ["zeta", "describe"],
        ["zeta", "time_series"],
        ["alpha", "describe"],
        ["alpha", "time_series"],
    ]
    assert list(dict.fromkeys(priced["asset"]))[:4] == list(ASSETS)


def test_rows_of_the_cut_in_another_order_of_dates_give_the_same_numbers() -> None:
    cut = _cut()
    later_first = cut.sort_values("date", ascending=False, kind="stable")
    pd.testing.assert_frame_equal(_price(later_first), _price(cut), check_exact=True)


def test_an_empty_cut_gives_an_empty_frame_of_the_same_shape() -> None:
    empty, full = _price(_cut().iloc[:0]), _price(_cut())
    assert len(empty) == 0
    pd.testing.assert_series_equal(empty.dtypes, full.dtypes)


# --- numbers -------------------------------------------------------------------------------------


def test_description() -> None:
    cut = _cut()
    returns, market = _wide(cut)
    priced = _price(cut, "describe")
    mean = _number(priced, "describe/-/high/mean/-")
    # General routines for the same sums.
    expected = stats.ttest_1samp(returns[:, 2], 0.0)
    assert mean["estimate"] == pytest.approx(returns[:, 2].mean(), rel=1e-12)
    assert mean["se"] == pytest.approx(returns[:, 2].std(ddof=1) / np.sqrt(60), rel=1e-12)
    assert mean["statistic"] == pytest.approx(expected.statistic, rel=1e-12)
    assert mean["p"] == pytest.approx(expected.pvalue, rel=1e-9)
    assert (mean["df1"], mean["n_periods"], mean["n_assets"]) == (59, 60, 1)
    sd = _number(priced, "describe/-/market/sd/-")
    assert sd["estimate"] == pytest.approx(market.std(ddof=1), rel=1e-12)
    assert np.isnan(sd["p"])
    assert _number(priced, "describe/-/high/n_members/-")["estimate"] == 12.0
    riskless = _number(priced, "describe/-/riskless/mean/-")
    assert np.isfinite(riskless["estimate"])
    assert riskless[["se", "statistic", "df1", "p"]].isna().all()


def test_time_series_rows_are_the_library_s_numbers() -> None:
    cut = _cut()
    fit = regress(*_wide(cut))
    priced = _price(cut, "time_series", hac_lag=2)
    for kind in COEFFICIENT_COVARIANCES:
        errors = standard_errors(fit, kind, 2)
        for term, row in (("alpha", 0), ("beta", 1)):
            for column, asset in enumerate(ASSETS):
                found = _number(priced, f"time_series/market/{asset}/{term}/{kind}")
                assert found["estimate"] == pytest.approx(fit.coefficients[row, column], rel=1e-12)
                assert found["se"] == pytest.approx(errors[row, column], rel=1e-12)
                assert found["df1"] == 58
    alpha = _number(priced, "time_series/market/top/alpha/classical")["estimate"]
    year = _number(priced, "time_series/market/top/alpha_year/-")
    assert year["estimate"] == pytest.approx(12 * alpha, rel=1e-14)
    assert year[["se", "statistic", "p"]].isna().all()


def test_the_automatic_lag_follows_the_number_of_months() -> None:
    cut = _cut(n_periods=60)
    # floor(4 x .6^(2/9)) = floor(3.57).
    pd.testing.assert_frame_equal(_price(cut), _price(cut, hac_lag=3))
    assert not _price(cut).equals(_price(cut, hac_lag=4))


def test_joint_and_line_rows_are_the_library_s_numbers() -> None:
    cut = _cut()
    fit = regress(*_wide(cut))
    priced = _price(cut, "joint_alpha", "market_line", hac_lag=3)
    expected = exact_f(measure_alphas(fit).distance, 60, 4, 1)
    found = _number(priced, "joint_alpha/f/all/alpha/-")
    assert found["statistic"] == pytest.approx(expected.value, rel=1e-12)
    assert (found["df1"], found["df2"], found["n_periods"], found["n_assets"]) == (4, 55, 60, 4)
    assert np.isnan(found["estimate"])
    assert np.isnan(found["p_one_sided"])
    for variant, weighting in WEIGHTINGS.items():
        drawn = draw_line(fit, weighting)
        for kind, covariance in LINE_COVARIANCES.items():
            spread = covariance(drawn, 3)
            for term, estimate, variance in (
                ("intercept", drawn.line.coefficients[0], spread.coefficients[0, 0]),
                ("slope", drawn.line.coefficients[1], spread.coefficients[1, 1]),
                ("slope_minus_market", drawn.against_market[1], spread.against_market[1, 1]),
            ):
                found = _number(priced, f"market_line/{variant}/all/{term}/{kind}")
                assert found["estimate"] == pytest.approx(estimate, rel=1e-12)
                assert found["se"] == pytest.approx(np.sqrt(variance), rel=1e-12)


@pytest.mark.parametrize(
    ("kind", "df"),
    [
        ("textbook", 2),
        ("monthly_slopes", 59),
        ("monthly_slopes_hac", 59),
        ("errors_in_variables", None),
        ("misspecification_robust", None),
        ("misspecification_robust_hac", None),
    ],
)
def test_reference_distribution_of_the_line(kind: str, df: int | None) -> None:
    found = _number(_price(_cut(), "market_line", level=0.1), f"market_line/ols/all/slope/{kind}")
    law = stats.norm if df is None else stats.t(df)
    assert np.isnan(found["df1"]) if df is None else found["df1"] == df
    assert found["statistic"] == pytest.approx(found["estimate"] / found["se"], rel=1e-15)
    assert found["p"] == pytest.approx(2 * law.sf(abs(found["statistic"])), rel=1e-9)
    assert found["p_one_sided"] == pytest.approx(law.sf(found["statistic"]), rel=1e-9)
    assert found["critical"] == pytest.approx(law.isf(0.05), rel=1e-9)
    assert found["critical_one_sided"] == pytest.approx(law.isf(0.1), rel=1e-9)


def test_reference_distribution_of_joint_statistics() -> None:
    priced = _price(_cut(), level=0.1)
    f = _number(priced, "market_line/gls/all/pricing_errors/f")
    assert f["p"] == pytest.approx(stats.f.sf(f["statistic"], 2, 57), rel=1e-9)
    assert f["critical"] == pytest.approx(stats.f.isf(0.1, 2, 57), rel=1e-9)
    chi2 = _number(priced, "joint_alpha/wald/all/alpha/-")
    assert chi2["p"] == pytest.approx(stats.chi2.sf(chi2["statistic"], 4), rel=1e-9)
    assert chi2["critical"] == pytest.approx(stats.chi2.isf(0.1, 4), rel=1e-9)
    assert np.isnan(chi2["df2"])


# --- missing months ------------------------------------------------------------------------------


def test_each_asset_keeps_its_own_months_and_joint_tests_the_common_ones() -> None:
    cut = _cut()
    first, last = cut["date"].unique()[[0, -1]]
    holes = cut.copy()
    holes.loc[(holes["asset"] == "low") & (holes["date"] == first), "excess_return"] = np.nan
    holes = holes[~((holes["asset"] == "top") & (holes["date"] == last))]
    priced, inner = _price(holes), cut[~cut["date"].isin([first, last])]

    months = priced[priced["analysis"] == "time_series"].groupby("asset")["n_periods"].unique()
    assert {asset: list(each) for asset, each in months.items()} == {
        "low": [59],
        "middle": [60],
        "high": [60],
        "top": [59],
    }
    without_first = _price(cut[cut["date"] != first], "time_series")
    for part, whole in ((priced, without_first), (priced, _price(inner))):
        analysis = ["joint_alpha", "market_line"] if whole is not without_first else ["time_series"]
        pick = [
            each[each["analysis"].isin(analysis) & each["asset"].isin(["low", "all"])]
            for each in (part, whole)
        ]
        # The same months in another memory layout: sums may round differently.
        pd.testing.assert_frame_equal(
            *(each.reset_index(drop=True) for each in pick), check_exact=False, rtol=1e-10
        )


def test_a_month_without_market_counts_for_nothing_but_the_asset_s_own_mean() -> None:
    cut = _cut()
    cut.loc[cut["date"] == cut["date"].min(), "market_excess"] = np.nan
    months = _price(cut).groupby("analysis")["n_periods"].unique()
    assert list(months["time_series"]) == list(months["market_line"]) == [59]
    assert sorted(months["describe"]) == [59, 60]


def test_characteristics_may_be_missing() -> None:
    cut = _cut()
    cut.loc[cut["asset"] == "low", "ante_beta"] = np.nan
    cut = cut.drop(columns=["n_members", "mean_size"])
    priced = _price(cut, "describe")
    assert set(priced["term"]) == {"mean", "sd", "ante_beta"}
    assert set(priced.loc[priced["term"] == "ante_beta", "asset"]) == set(ASSETS) - {"low"}


# --- undefined -----------------------------------------------------------------------------------


def test_an_asset_without_returns() -> None:
    cut = _cut()
    cut.loc[cut["asset"] == "low", "excess_return"] = np.nan
    priced = _price(cut)
    own = priced["asset"] == "low"
    moments = priced["term"].isin(["mean", "sd"])
    assert _undefined_reason(priced[own & moments]) == "needs at least 2 months, has 0"
    series = priced[own & (priced["analysis"] == "time_series")]
    assert "has 0" in _undefined_reason(series)
    assert "low" in _undefined_reason(_but_market_mean(priced[priced["asset"] == "all"]))
    others = priced["asset"].isin(["middle", "high", "top", "market", "riskless"])
    assert (priced.loc[others, "status"] == "ok").all()
    assert len(priced) == len(_price(_cut()))


def test_the_line_is_compared_with_the_market_of_its_own_months() -> None:
    cut = _cut()
    hole = (cut["asset"] == "low") & (cut["date"] == cut["date"].min())
    cut.loc[hole, "excess_return"] = np.nan
    _, market = _wide(cut)
    mean = _number(_price(cut), "market_line/-/all/market_mean/-")
    assert mean["n_periods"] == len(market) - 1
    # Both sides sum the same months in the same order: only the last bit may differ.
    assert mean["estimate"] == pytest.approx(market[1:].mean(), rel=1e-14)
    assert mean["se"] == pytest.approx(market[1:].std(ddof=1) / np.sqrt(len(market) - 1), rel=1e-13)


@pytest.mark.fault(34)
def test_too_few_months_for_anything() -> None:
    priced = _price(_cut(n_periods=2), "time_series", "joint_alpha", "market_line")
    assert _undefined_reason(_but_market_mean(priced)) == "needs at least 3 complete months, has 2"
    assert set(priced["n_periods"]) == {2}


@pytest.mark.fault(34)
def test_too_few_months_for_the_joint_tests_only() -> None:
    # T = N + K = 5: below the six months that four assets and the market need.
    priced = _price(_cut(n_periods=5), "joint_alpha", "market_line")
    alpha = priced[priced["term"].isin(["alpha", "sharpe2_best"])]
    assert _undefined_reason(alpha) == "needs at least 6 months for 4 assets, has 5"
    assert "6 months" in _undefined_reason(priced[priced["term"] == "pricing_errors"])
    assert "6 months" in _undefined_reason(priced[priced["variant"] == "gls"])
    line = priced[priced["variant"].isin(["ols", "wls"]) & (priced["term"] == "slope")]
    assert (line["status"] == "ok").all()
    assert (_price(_cut(n_periods=6), "joint_alpha")["status"] == "ok").all()


def test_two_assets_make_no_line() -> None:
    priced = _price(_cut(assets=("a", "b")), "joint_alpha", "market_line")
    line = priced["analysis"] == "market_line"
    assert "at least 3 assets, has 2" in _undefined_reason(_but_market_mean(priced[line]))
    assert (priced.loc[~line, "status"] == "ok").all()


def test_a_market_that_does_not_vary() -> None:
    cut = _cut().assign(market_excess=0.003)
    priced = _price(cut)
    tests = _but_market_mean(priced[priced["analysis"] != "describe"])
    assert "market" in _undefined_reason(tests)
    mean = _number(priced, "describe/-/market/mean/-")
    assert mean["reason"] == "its standard error is zero"


def test_identical_assets() -> None:
    cut = _cut()
    one = cut.loc[cut["asset"] == "low", "excess_return"].to_numpy()
    priced = _price(cut.assign(excess_return=np.repeat(one, 4)), "joint_alpha", "market_line")
    assert "singular" in _undefined_reason(priced[priced["variant"] == "gls"])
    lines = priced["variant"].isin(["ols", "wls"])
    assert _undefined_reason(priced[lines]) == "all betas are equal"
    statistics = priced["term"].isin(["alpha", "sharpe2_best"])
    assert "singular" in _undefined_reason(priced[statistics])
    assert _number(priced, "joint_alpha/-/all/rms_alpha/-")["status"] == "ok"


def test_an_asset_that_is_the_market() -> None:
    cut = _cut()
    own = cut["asset"] == "high"
    cut.loc[own, "excess_return"] = cut.loc[own, "market_excess"]
    priced = _price(cut, "time_series", "joint_alpha")
    series = priced[priced["asset"] == "high"]
    tested = series["term"].isin(["alpha", "beta"])
    assert _undefined_reason(series[tested]) == "its standard error is zero"
    assert _number(priced, "time_series/market/high/r2/-")["estimate"] == 1.0
    assert _number(priced, "time_series/market/high/residual_sd/-")["estimate"] == 0.0
    assert _number(priced, "time_series/market/high/residual_ac1/-")["status"] == "undefined"
    assert _number(priced, "joint_alpha/f/all/alpha/-")["status"] == "undefined"


def test_a_constant_asset() -> None:
    cut = _cut()
    cut.loc[cut["asset"] == "high", "excess_return"] = 0.004
    priced = _price(cut, "describe", "time_series")
    for tail in ("describe/-/high/mean/-", "time_series/market/high/correlation/-"):
        assert _number(priced, tail)["status"] == "undefined"
    assert _number(priced, "describe/-/high/sd/-")["estimate"] == 0.0


def test_returns_that_lie_on_the_line_leave_no_textbook_error() -> None:
    cut = _cut()
    returns, market = _wide(cut)
    fit = regress(returns, market)
    exact = returns - returns.mean(axis=0) + 0.002 + 0.01 * fit.betas[0]
    priced = _price(cut.assign(excess_return=exact.ravel()), "market_line")
    textbook = priced[priced["se_kind"].eq("textbook") & priced["term"].eq("slope")]
    assert _undefined_reason(textbook) == "its standard error is zero"
    other = _number(priced, "market_line/ols/all/slope/errors_in_variables")
    assert other["estimate"] == pytest.approx(0.01, rel=1e-10)
    # The means are rebuilt only up to rounding: the pricing errors are zero or next to it.
    assert _number(priced, "market_line/ols/all/pricing_errors/chi2")["p"] == pytest.approx(1.0)


# --- faulty calls --------------------------------------------------------------------------------


def test_unknown_analyses_and_levels_are_refused() -> None:
    with pytest.raises(ValueError, match="unknown analyses \\['momentum'\\]"):
        _price(_cut(), "momentum")
    for level in (0.0, 1.0):
        with pytest.raises(ValueError, match="level"):
            _price(_cut(), level=level)


@pytest.mark.parametrize("name", ["all", "market", "riskless", "-", "a/b"])
def test_assets_that_would_share_an_address_are_refused(name: str) -> None:
    with pytest.raises(ValueError, match="assets may not be called"):
        _price(_cut(assets=("a", "b", name)))


def test_malformed_cuts_are_refused() -> None:
    cut = _cut()
    with pytest.raises(ValueError, match="two rows in one month"):
        _price(pd.concat([cut, cut.iloc[:1]]))
    for column in ("market_excess", "riskless"):
        other = cut.copy()
        other.loc[0, column] += 0.001
        with pytest.raises(ValueError, match=f"{column} differs between assets"):
            _price(other)


def _in_days(cut: pd.DataFrame) -> pd.DataFrame:
    """The same returns dated by consecutive weekdays instead of months."""
    days = pd.bdate_range("1960-01-04", periods=cut["date"].nunique())
    return cut.assign(date=np.repeat(days, cut["asset"].nunique()))


def _price_days(cut: pd.DataFrame) -> pd.DataFrame:
    return price_subperiod(
        _in_days(cut),
        subperiod="early",
        level=0.05,
        hac_lag=None,
        analyses=list(ANALYSES),
        frequency="daily",
    )


def test_days_are_priced_as_months_are_but_for_the_year() -> None:
    """No statistic knows how long a period is, except an alpha a year: 252 trading days, not 12 months."""
    monthly, daily = _price(_cut()), _price_days(_cut())
    a_year = monthly["term"] == "alpha_year"
    pd.testing.assert_frame_equal(daily[~a_year], monthly[~a_year], check_exact=True)
    # One multiplication each.
    np.testing.assert_allclose(
        daily.loc[a_year, "estimate"], monthly.loc[a_year, "estimate"] * (252 / 12), rtol=1e-15
    )


def test_reasons_speak_of_days() -> None:
    reasons = set(_price_days(_cut(n_periods=2))["reason"]) - {""}
    assert "needs at least 3 complete days, has 2" in reasons
    assert not any("month" in reason or "period" in reason for reason in reasons)
    one = set(_price_days(_cut(n_periods=1))["reason"])
    assert "needs at least 2 days, has 1" in one
    absent = _cut()
    absent.loc[absent["asset"] == "top", "excess_return"] = np.nan
    assert "no day has returns of both the market and top" in set(_price_days(absent)["reason"])


def test_two_rows_of_one_day_are_refused() -> None:
    cut = _in_days(_cut())
    with pytest.raises(ValueError, match="two rows in one day"):
        price_subperiod(
            pd.concat([cut, cut.iloc[:1]]),
            subperiod="early",
            level=0.05,
            hac_lag=None,
            analyses=["describe"],
            frequency="daily",
        )


def test_without_a_riskless_rate_everything_else_is_the_same() -> None:
    cut = _cut()
    usual, without = _price(cut), _price(cut.assign(riskless=np.nan))
    is_riskless = without["asset"] == "riskless"
    assert is_riskless.sum() == 2
    assert set(without.loc[is_riskless, "status"]) == {"undefined"}
    assert set(without.loc[is_riskless, "reason"]) == {
        "the study has returns in excess of a riskless rate that is not known"
    }
    pd.testing.assert_frame_equal(without[~is_riskless], usual[~is_riskless])


def test_a_spread_has_a_time_series_of_its_own_and_no_part_in_joint_tests_and_the_line() -> None:
    cut = _cut()
    wide = cut.pivot(index="date", columns="asset", values="excess_return")
    spread = cut[cut["asset"] == ASSETS[0]].copy()
    spread["asset"] = "spread"
    spread["excess_return"] = (wide[ASSETS[-1]] - wide[ASSETS[0]]).to_numpy()
    without, beside = _price(cut), _price(pd.concat([cut, spread], ignore_index=True))
    alone = beside["asset"] == "spread"
    assert {"describe", "time_series"} == set(beside.loc[alone, "analysis"])
    pd.testing.assert_frame_equal(beside[~alone].reset_index(drop=True), without, check_exact=True)
