"""The market and the riskless return side by side, in months and on trading days."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
from tests.unit import intake_examples as examples

from lineproof.frames import CONTRACTS
from lineproof.intake.factor import (
    RisklessRate,
    join_factor,
    months_of_days,
    on_days,
    on_months,
    read_riskless,
    total_and_excess,
)
from lineproof.problems import KnownProblem

EVERY = np.arange("2001-01-01", "2001-05-01", dtype="datetime64[D]")
WEEKDAYS = EVERY[np.is_busday(EVERY)]


def rate(folder: Path, values: dict[str, float], frequency: str, **changes: Any) -> RisklessRate:
    lines = [f"{date},{value}" for date, value in values.items()]
    file = examples.write(folder / "bills.csv", "\n".join(["date,rf", *lines]) + "\n")
    form = "%Y-%m-%d" if frequency == "daily" else "%Y-%m"
    quoted = changes.pop("quoted", "period_return")
    columns = {"date": "date", "rate": "rf"}
    reading = examples.reading("raw/bills.csv", columns, dates=form, **changes)
    return read_riskless([file], reading, quoted, frequency)


def series(days: np.ndarray, values: Any, name: str = "return") -> pd.DataFrame:
    return pd.DataFrame({"date": days.astype("datetime64[ms]"), name: values})


def test_a_monthly_rate_on_trading_days(tmp_path: Path) -> None:
    monthly = rate(tmp_path, {"2001-01": 0.01, "2001-02": 0.02, "2001-03": 0.03}, "monthly")
    found = on_days(monthly, WEEKDAYS)
    assert found["date"].iloc[[0, -1]].dt.strftime("%Y-%m-%d").tolist() == [
        "2001-01-01",
        "2001-03-30",
    ]
    by_month = (1 + found["riskless"]).groupby(found["date"].dt.month).prod() - 1
    np.testing.assert_allclose(
        by_month, [0.01, 0.02, 0.03], rtol=0, atol=6e-15
    )  # 23 roundings at 1


def test_a_daily_rate_on_trading_days(tmp_path: Path) -> None:
    values = {str(day): 5.0 for day in WEEKDAYS[10:60]}
    daily = rate(tmp_path, values, "daily", quoted="simple_annual_yield", unit="percent")
    found = on_days(daily, WEEKDAYS[5:40])
    assert len(found) == 30
    span = (WEEKDAYS[39] - WEEKDAYS[10]).astype(int) + 1  # the first day counts one
    assert found["riskless"].sum() == pytest.approx(0.05 * span / 365, abs=1e-15)  # 30 roundings
    assert on_days(daily, WEEKDAYS[:5]).empty


def test_an_implausible_daily_rate_stops(tmp_path: Path) -> None:
    daily = rate(tmp_path, {str(day): 5.0 for day in WEEKDAYS}, "daily", quoted="annual_yield")
    with pytest.raises(KnownProblem, match="86 days would earn beyond 3 % a month without risk"):
        on_days(daily, WEEKDAYS)


def test_periods_that_both_have() -> None:
    market = series(WEEKDAYS[3:9], 0.01)
    riskless = series(WEEKDAYS[:6], 0.001, "riskless")
    found = join_factor(market, riskless, "total", "m", "f")
    assert len(found.periods) == 3
    assert (found.begins, found.ends) == ("m", "f")
    np.testing.assert_allclose(found.periods["market_excess"], 0.009, rtol=1e-15)  # one rounding
    excess = join_factor(market, riskless, "excess", "m", "f")
    assert excess.periods["market_excess"].tolist() == [0.01] * 3


def test_without_a_riskless_rate_the_market_alone_bounds_the_study() -> None:
    found = join_factor(series(WEEKDAYS[3:9], 0.01), None, "excess", "m", "")
    assert (found.begins, found.ends) == ("m", "m")
    assert found.periods["riskless"].isna().all()
    assert found.periods["market_excess"].tolist() == [0.01] * 6
    with pytest.raises(ValueError, match="a total return needs a riskless rate"):
        join_factor(series(WEEKDAYS, 0.01), None, "total", "m", "")


def test_nothing_in_common_stops() -> None:
    with pytest.raises(KnownProblem) as caught:
        join_factor(
            series(WEEKDAYS[:3], 0.01),
            series(WEEKDAYS[5:], 0.0, "riskless"),
            "total",
            "m",
            "f",
            "day",
        )
    assert str(caught.value) == (
        "Nothing is left to study.\n  m: it has no day in common with f\n    → compare the dates"
    )


def test_days_compounded_to_months_against_an_obvious_loop() -> None:
    """January is cut off at its start and left out; April ends with its last weekday and counts."""
    rng = np.random.default_rng(9)
    days = WEEKDAYS[8:]
    market, riskless = rng.normal(0, 0.01, len(days)), rng.uniform(0, 2e-4, len(days))
    factor = join_factor(
        series(days, market), series(days, riskless, "riskless"), "total", "m", "f"
    )
    found = months_of_days(factor)
    CONTRACTS["market"].validate(found)
    expected = []
    for month in ("2001-02", "2001-03", "2001-04"):
        total = safe = 1.0
        for day, m, f in zip(days, market, riskless, strict=True):
            if str(day).startswith(month):
                total, safe = total * (1 + m), safe * (1 + f)
        expected.append((total - safe, safe - 1))
    # Some twenty factors are rounded at 1 each.
    np.testing.assert_allclose(found[["market_excess", "riskless"]], expected, rtol=0, atol=1e-14)
    assert found["date"].dt.strftime("%Y-%m-%d").tolist() == [
        "2001-02-28",
        "2001-03-31",
        "2001-04-30",
    ]


def test_excess_returns_of_days_without_a_riskless_rate() -> None:
    found = months_of_days(join_factor(series(WEEKDAYS, 0.01), None, "excess", "m", ""))
    CONTRACTS["market"].validate(found)
    n = [np.sum(WEEKDAYS.astype("datetime64[M]").astype(str) == f"2001-0{m}") for m in (1, 2, 3, 4)]
    np.testing.assert_allclose(
        found["market_excess"], 1.01 ** np.array(n) - 1, rtol=1e-13
    )  # 23 roundings
    assert found["riskless"].isna().all()


def test_a_total_loss_of_the_market_compounds() -> None:
    factor = join_factor(
        series(WEEKDAYS, np.where(np.arange(len(WEEKDAYS)) == 30, -1.0, 0.01)),
        None,
        "excess",
        "m",
        "",
    )
    assert months_of_days(factor)["market_excess"].iloc[1] == -1


def test_a_daily_rate_in_months(tmp_path: Path) -> None:
    """January is cut off and left out; each later month earns its calendar days, from last day to last day."""
    values = {str(day): 3.65 for day in WEEKDAYS[10:]}
    daily = rate(tmp_path, values, "daily", quoted="annual_yield", unit="percent")
    found = on_months(daily)
    assert found["date"].dt.strftime("%Y-%m-%d").tolist() == [
        "2001-02-28",
        "2001-03-31",
        "2001-04-30",
    ]
    # 31 Jan to 28 Feb, to 30 Mar (a Friday), to 30 Apr
    expected = 1.0365 ** (np.array([28, 30, 31]) / 365) - 1
    np.testing.assert_allclose(found["riskless"], expected, rtol=0, atol=6e-15)  # 23 roundings at 1


def test_a_monthly_rate_stays_as_it_is_in_months(tmp_path: Path) -> None:
    monthly = rate(tmp_path, {"2001-01": 0.01, "2001-02": 0.02}, "monthly")
    assert on_months(monthly)["riskless"].tolist() == [0.01, 0.02]


def test_total_and_excess_returns_from_either() -> None:
    given, riskless = np.array([0.05, np.nan, -1.0]), np.array([0.01, 0.01, 0.003])
    total, excess = total_and_excess(given, riskless, "total")
    assert total is given
    np.testing.assert_array_equal(excess, [0.05 - 0.01, np.nan, -1.0 - 0.003])
    again, same = total_and_excess(excess, riskless, "excess")
    np.testing.assert_allclose(again, total, rtol=1e-15)  # one rounding
    assert again[2] == -1
    np.testing.assert_array_equal(same, excess)


def test_without_a_riskless_rate_no_total_return_is_known() -> None:
    total, excess = total_and_excess(np.array([0.05, -1.0]), np.full(2, np.nan), "excess")
    assert np.isnan(total).all()
    assert excess.tolist() == [0.05, -1.0]
