"""Riskless returns from rates as they are quoted: of a month, or of each trading day.

Every quoting gives the return over a length of time in years: 1/12 for a month, whatever its days; calendar days / 365
for a day of trading, counted from the trading day before, so that a weekend earns three days. A year of either earns
the same.
"""

from __future__ import annotations

from typing import Any

import numpy as np
import pandas as pd

from lineproof import catalog
from lineproof.calendar import month_name
from lineproof.intake.stopping import counted, few, stop
from lineproof.quotings import QUOTINGS

MONTH = 1 / 12  # years
_DAYS_A_YEAR = 365
_BILL_DAYS, _DISCOUNT_YEAR = 91, 360
_MOST_PLAUSIBLE = 0.03  # return of one month
_DAYS_OF_TRADING = 252  # a year
_MISSING_WEEKDAYS = 3  # a month that lacks more at its end is cut off there


def period_return(rate: np.ndarray, years: np.ndarray | float) -> np.ndarray:
    """The rate is the return of its period, whatever the period's length."""
    return rate


def annual_yield(rate: np.ndarray, years: np.ndarray | float) -> np.ndarray:
    """A yield y compounded once a year earns (1 + y)^years − 1; NaN below −100 %.

    The definition of a compound rate, as in Campbell, Lo and MacKinlay 1997, section 1.4.
    """
    with np.errstate(invalid="ignore"):
        return (1 + rate) ** years - 1


def simple_annual_yield(rate: np.ndarray, years: np.ndarray | float) -> np.ndarray:
    """A yield y without compounding earns y · years: y/12 a month; money-market convention on a year of 365 days."""
    return rate * years


def discount_91_days(rate: np.ndarray, years: np.ndarray | float) -> np.ndarray:
    """A bill of 91 days sold at the discount d costs 1 − 91 d/360 and pays 1.

    Its gain, 1/price − 1 in 91 days, is compounded to the period: (1/price)^(365 · years/91) − 1, for a month the
    exponent (365/12)/91. Price by the bill formula of 31 CFR Part 356, Appendix B. NaN where the price would not be
    above zero.
    """
    price = bill_price(rate, _BILL_DAYS)
    price = np.where(price > 0, price, np.nan)
    return price ** (-_DAYS_A_YEAR * years / _BILL_DAYS) - 1


def bill_price(discount: np.ndarray, days: int) -> np.ndarray:
    """Price of 1 paid in so many days: 1 − d · days/360 (31 CFR Part 356, Appendix B)."""
    return 1 - np.asarray(discount, float) * days / _DISCOUNT_YEAR


def riskless_return(rate: Any, quoted: str, years: np.ndarray | float = MONTH) -> Any:
    """Return of a period so many years long, from the rate as quoted: decimal, shape as `rate`."""
    return catalog.load(QUOTINGS[quoted])(rate, years)


def years_since(days: np.ndarray) -> np.ndarray:
    """Calendar time from each trading day to the one before, in years; the first day counts one calendar day.

    `days` is ascending, datetime64[D] (n,).
    """
    return np.diff(days, prepend=days[:1] - 1).astype(np.int64) / _DAYS_A_YEAR


def daily_from_daily(rates: pd.DataFrame, quoted: str, days: np.ndarray, label: str) -> np.ndarray:
    """Riskless return of each trading day, from a rate a day: (n_days,).

    `rates` has date and rate (decimal), sorted; `days` is ascending, datetime64[D], inside the span of the rates. An
    annual rate holds for the calendar days since the trading day before. Period returns of days without trading are
    compounded into the next trading day; annual rates quoted on such days are not needed.

    Raises KnownProblem listing the trading days that have no rate (fault 27).
    """
    quoted_on = rates["date"].to_numpy().astype("datetime64[D]")
    rate = rates["rate"].to_numpy(float)
    absent = days[~np.isin(days, quoted_on)]
    if len(absent):
        found = f"no rate on {counted(len(absent), 'day')} on which the market trades: {few(map(str, absent))}"
        raise stop(label, found, "deliver them, or shorten the series")
    if quoted != "period_return":
        return riskless_return(rate[np.isin(quoted_on, days)], quoted, years_since(days))
    into = np.searchsorted(days, quoted_on)
    since = (quoted_on >= days[0]) & (into < len(days))
    growth = np.ones(len(days))
    np.multiply.at(growth, into[since], 1 + rate[since])
    alone = np.bincount(into[since], minlength=len(days)) == 1
    return np.where(alone, rate[np.isin(quoted_on, days)], growth - 1)


def daily_from_monthly(rates: pd.DataFrame, days: np.ndarray, label: str) -> np.ndarray:
    """Riskless return of each trading day, from returns of months: (1 + r)^(1/n) − 1, n the month's trading days.

    `rates` has date (month end) and riskless (decimal), sorted; `days` is ascending, datetime64[D], inside the months
    of the rates. The days of a whole month compound to exactly its return. A first or last month of which more than
    three weekdays are missing is cut off by the data: there the missing weekdays count in n.

    Raises KnownProblem listing the months that have trading days and no rate (fault 27).
    """
    month_of_rate = rates["date"].to_numpy().astype("datetime64[M]")
    month, of_month, n = np.unique(
        days.astype("datetime64[M]"), return_inverse=True, return_counts=True
    )
    absent = month[~np.isin(month, month_of_rate)]
    if len(absent):
        found = f"no rate in {counted(len(absent), 'month')} in which the market trades: {few(map(str, absent))}"
        raise stop(label, found, "deliver them, or shorten the series")
    n[0] += cut_off(month[0].astype("datetime64[D]"), days[0])
    n[-1] += cut_off(days[-1] + 1, (month[-1] + 1).astype("datetime64[D]"))
    monthly = rates["riskless"].to_numpy(float)[np.searchsorted(month_of_rate, month)]
    return np.expm1(np.log1p(monthly) / n)[of_month]


def cut_off(first: np.datetime64, end: np.datetime64) -> int:
    """Weekdays from `first` to before `end`, both datetime64[D]; 0 where there are few enough to be holidays."""
    n = int(np.busday_count(first, end))
    return n if n > _MISSING_WEEKDAYS else 0


def check_riskless(
    series: pd.DataFrame, reading: dict[str, Any], quoted: str, frequency: str = "monthly"
) -> None:
    """Stop when a period's riskless return is beyond what any rate so quoted could be (fault 29).

    `series` has date, rate and riskless, decimal: returns of months or, where `frequency` is "daily", of trading days.
    The limit of 3 % a month is far above the bill rates of any market with a stable currency; a day's is the same
    rate spread over 252 trading days a year, times the calendar days since the day before.

    Raises KnownProblem.
    """
    noun, limit = "month", np.full(len(series), _MOST_PLAUSIBLE)
    if frequency == "daily":
        days = series["date"].to_numpy().astype("datetime64[D]")
        noun = "day"
        limit = 12 * _MOST_PLAUSIBLE / _DAYS_OF_TRADING * _DAYS_A_YEAR * years_since(days)
    beyond = series[~(series["riskless"].abs().to_numpy() <= limit)]
    if beyond.empty:
        return
    worst = beyond.loc[beyond["rate"].abs().idxmax()]
    when = month_name(worst["date"]) if noun == "month" else f"{worst['date']:%Y-%m-%d}"
    found = (
        f"read as {quoted} in {reading['unit']}, {counted(len(beyond), noun)} would earn beyond 3 % "
        f"{'' if noun == 'month' else 'a month '}without risk; the rate of {when} would be {100 * worst['rate']:.4g} %"
    )
    where = f"{reading['label']}, column {reading['columns']['rate']}"
    raise stop(where, found, "check unit: and quoted:")
