"""Riskless returns of months and of trading days: by hand, what they conserve, and when they stop."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st
from tests.unit import intake_examples as examples

from lineproof import catalog
from lineproof.intake.riskless import (
    check_riskless,
    daily_from_daily,
    daily_from_monthly,
    riskless_return,
    years_since,
)
from lineproof.problems import KnownProblem
from lineproof.quotings import QUOTINGS

HEAD = "The raw data cannot be used; nothing was written.\n"


def days(*text: str) -> np.ndarray:
    return np.array(text, "datetime64[D]")


def weekdays(first: str, end: str) -> np.ndarray:
    every = np.arange(first, end, dtype="datetime64[D]")
    return every[np.is_busday(every)]


def rates(*pairs: tuple[str, float], value: str = "rate") -> pd.DataFrame:
    date = pd.to_datetime([date for date, _ in pairs]).as_unit("ms")
    return pd.DataFrame({"date": date, value: [rate for _, rate in pairs]})


@pytest.mark.parametrize("quoted", QUOTINGS)
def test_every_quoting_gives_nothing_for_nothing_and_grows_with_the_rate(quoted: str) -> None:
    quoting = catalog.load(QUOTINGS[quoted])
    found = quoting(np.array([0.0, 0.01, 0.05, 0.2]), 1 / 12)
    assert found[0] == 0
    assert (np.diff(found) > 0).all()


@pytest.mark.parametrize(
    ("quoted", "rate", "month", "weekend"),
    [
        ("period_return", 0.004, 0.004, 0.004),
        # 1.06^(1/12) − 1 and 1.06^(3/365) − 1, by ln 1.06 = 0.0582689081239758
        (
            "annual_yield",
            0.06,
            np.expm1(0.0582689081239758 / 12),
            np.expm1(0.0582689081239758 * 3 / 365),
        ),
        ("simple_annual_yield", 0.06, 0.005, 0.18 / 365),
        # d = 360/91 · 1 % is a price of 0.99: −ln 0.99 = 0.01005033585350145
        (
            "discount_91_days",
            3.6 / 91,
            np.expm1(0.01005033585350145 * 365 / (12 * 91)),
            np.expm1(0.01005033585350145 * 3 / 91),
        ),
    ],
)
def test_quotings_by_hand(quoted: str, rate: float, month: float, weekend: float) -> None:
    value = np.array([rate])
    # A power close to one is right to a unit or two of 2.2e-16.
    np.testing.assert_allclose(riskless_return(value, quoted), month, rtol=0, atol=5e-16)
    np.testing.assert_allclose(riskless_return(value, quoted, 3 / 365), weekend, rtol=0, atol=5e-16)


@given(st.floats(-0.02, 0.25))
def test_a_bill_held_for_91_days_pays_its_discount(discount: float) -> None:
    held = riskless_return(np.array([discount]), "discount_91_days", 91 / 365)[0]
    exact = 1 / (1 - Fraction(discount) * 91 / 360) - 1
    assert held == pytest.approx(float(exact), abs=1e-15)  # a few roundings near one


def test_rates_without_a_return_are_missing() -> None:
    assert np.isnan(riskless_return(np.array([-1.5]), "annual_yield"))
    assert np.isnan(riskless_return(np.array([5.25, 360 / 91]), "discount_91_days")).all()


def test_calendar_days_between_trading_days() -> None:
    found = 365 * years_since(days("2001-05-31", "2001-06-01", "2001-06-04"))
    np.testing.assert_allclose(found, [1, 1, 3], rtol=1e-15)  # one rounding


@given(
    st.lists(st.floats(-0.01, 0.03), min_size=24, max_size=24),
    st.integers(0, 2**32),
)
def test_days_compound_to_the_month_they_are_taken_from(monthly: list[float], seed: int) -> None:
    calendar = weekdays("2001-01-01", "2003-01-01")
    inside = np.isin(calendar.astype("datetime64[M]"), calendar.astype("datetime64[M]")[[0, -1]])
    calendar = calendar[inside | (np.random.default_rng(seed).random(len(calendar)) < 0.9)]
    dates = pd.date_range("2001-01-31", periods=24, freq="ME", unit="ms")
    found = daily_from_monthly(pd.DataFrame({"date": dates, "riskless": monthly}), calendar, "f")
    growth = pd.Series(1 + found).groupby(calendar.astype("datetime64[M]")).prod()
    # Each of some twenty factors is rounded at 1: an error of 20 · 1.1e-16, and as much from the product.
    np.testing.assert_allclose(growth - 1, monthly, rtol=0, atol=6e-15)
    n_distinct = pd.Series(found).groupby(calendar.astype("datetime64[M]")).nunique()
    assert (n_distinct == 1).all()


def test_a_month_that_is_cut_off_does_not_earn_its_whole_return() -> None:
    """June 2001 has 21 weekdays; the data begin with the last 10 of May's 23 and end with the first 6 of June."""
    calendar = weekdays("2001-05-18", "2001-06-09")
    monthly = rates(("2001-05-31", 0.023), ("2001-06-30", 0.0105), value="riskless")
    found = daily_from_monthly(monthly, calendar, "f")
    expected = [np.log1p(0.023) / 23] * 10 + [np.log1p(0.0105) / 21] * 6
    np.testing.assert_allclose(np.log1p(found), expected, rtol=1e-12)  # log1p of 1e-3: 12 digits


def test_holidays_at_the_ends_are_no_cut() -> None:
    """January 2001 without New Year's Day, a Monday, has 22 trading days, and they earn the whole month."""
    calendar = weekdays("2001-01-02", "2001-02-01")
    found = daily_from_monthly(rates(("2001-01-31", 0.01), value="riskless"), calendar, "f")
    assert len(found) == 22
    assert np.prod(1 + found) - 1 == pytest.approx(0.01, abs=6e-15)  # 22 roundings at 1


def test_months_without_a_rate_stop() -> None:
    monthly = rates(("2001-05-31", 0.01), ("2001-07-31", 0.01), value="riskless")
    with pytest.raises(KnownProblem) as caught:
        daily_from_monthly(monthly, weekdays("2001-05-01", "2001-08-01"), "raw/bills.csv")
    assert str(caught.value) == (
        f"{HEAD}  raw/bills.csv: no rate in 1 month in which the market trades: 2001-06\n"
        "    → deliver them, or shorten the series"
    )


def test_days_without_a_rate_stop() -> None:
    daily = rates(("2001-06-01", 0.05), ("2001-06-05", 0.05))
    trading = days("2001-06-01", "2001-06-04", "2001-06-05")
    with pytest.raises(KnownProblem) as caught:
        daily_from_daily(daily, "annual_yield", trading, "raw/bills.csv")
    assert str(caught.value) == (
        f"{HEAD}  raw/bills.csv: no rate on 1 day on which the market trades: 2001-06-04\n"
        "    → deliver them, or shorten the series"
    )


def test_annual_rates_hold_for_the_calendar_days_since_the_trading_day_before() -> None:
    daily = rates(*((f"2001-06-0{d}", 0.0365 * d) for d in range(1, 6)))
    found = daily_from_daily(
        daily, "simple_annual_yield", days("2001-06-01", "2001-06-04", "2001-06-05"), "f"
    )
    # The rates of the 2nd and 3rd, a weekend, are not needed.
    np.testing.assert_allclose(found, [0.0001, 3 * 0.0004, 0.0005], rtol=1e-15, atol=0)


def test_period_returns_between_trading_days_are_not_lost() -> None:
    daily = rates(*((f"2001-06-0{d}", d / 1e4) for d in range(1, 7)))
    found = daily_from_daily(daily, "period_return", days("2001-06-02", "2001-06-05"), "f")
    assert found[0] == 2e-4  # what came before the market begins is not its first day’s
    assert found[1] == pytest.approx(1.0003 * 1.0004 * 1.0005 - 1, abs=3e-16)  # roundings at 1


def test_an_implausible_day_stops_and_a_long_weekend_does_not() -> None:
    reading = examples.reading("raw/bills.csv", {"date": "day", "rate": "rf"}, unit="percent")
    series = rates(("2001-06-01", 0.0004), ("2001-06-04", 0.0016), ("2001-06-05", 0.0004))
    series["riskless"] = series["rate"]
    check_riskless(series, reading, "period_return", "daily")
    series.loc[2, ["rate", "riskless"]] = 0.0016
    with pytest.raises(KnownProblem) as caught:
        check_riskless(series, reading, "period_return", "daily")
    assert str(caught.value) == (
        f"{HEAD}  raw/bills.csv, column rf: read as period_return in percent, 1 day would earn beyond 3 % a month "
        "without risk; the rate of 2001-06-05 would be 0.16 %\n    → check unit: and quoted:"
    )


def test_a_discount_in_another_unit_stops() -> None:
    reading = examples.reading("raw/bills.csv", {"date": "day", "rate": "rf"})
    series = rates(("2001-06-30", 0.05), ("2001-07-31", 5.25))
    series["riskless"] = riskless_return(series["rate"].to_numpy(), "discount_91_days")
    with pytest.raises(KnownProblem) as caught:
        check_riskless(series, reading, "discount_91_days")
    assert str(caught.value) == (
        f"{HEAD}  raw/bills.csv, column rf: read as discount_91_days in decimal, 1 month would earn beyond 3 % "
        "without risk; the rate of 2001-07 would be 525 %\n    → check unit: and quoted:"
    )
