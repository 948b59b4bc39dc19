"""The market and the riskless return side by side, in the periods of the study."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd

from lineproof.intake.riskless import (
    check_riskless,
    cut_off,
    daily_from_daily,
    daily_from_monthly,
    riskless_return,
)
from lineproof.intake.series import FileOfSeries, read_series
from lineproof.problems import KnownProblem, Problem

_ROUNDING = 1e-6  # of a sum of two returns delivered with six decimals
_NOTHING_LEFT = "Nothing is left to study."


@dataclass(frozen=True)
class Factor:
    """`periods` has date, market_excess and riskless, sorted; `begins` and `ends` name the files that bound them.

    `riskless` is NaN throughout where the study has none.
    """

    periods: pd.DataFrame
    begins: str
    ends: str


@dataclass(frozen=True)
class RisklessRate:
    """A riskless rate as read: `rates` has date and rate and, where months are delivered, riskless; all decimal."""

    rates: pd.DataFrame
    reading: dict[str, Any]
    quoted: str
    frequency: str
    files: list[FileOfSeries]

    @property
    def label(self) -> str:
        return self.reading["label"]


def read_riskless(
    files: list[str], reading: dict[str, Any], quoted: str, frequency: str = "monthly"
) -> RisklessRate:
    """Read a riskless rate; `frequency` is that of the file. Raises KnownProblem."""
    series = read_series(files, reading, "rate", frequency)
    rates = series.values
    if frequency == "monthly":
        rates["riskless"] = riskless_return(rates["rate"], quoted)
        check_riskless(rates, reading, quoted)
    return RisklessRate(rates, reading, quoted, frequency, series.files)


def on_days(rate: RisklessRate, days: np.ndarray) -> pd.DataFrame:
    """`date` and `riskless` on those trading days (ascending, datetime64[D]) that lie inside the span of the rate.

    Raises KnownProblem where a rate is missing inside, or implausible.
    """
    known = rate.rates["date"].to_numpy().astype("datetime64[D]")
    first, last = known[[0, -1]]
    if rate.frequency == "monthly":
        first = first.astype("datetime64[M]").astype("datetime64[D]")
    within = days[(days >= first) & (days <= last)]
    if len(within) == 0:
        return pd.DataFrame({"date": within.astype("datetime64[ms]"), "riskless": np.zeros(0)})
    if rate.frequency == "monthly":
        riskless = daily_from_monthly(rate.rates, within, rate.label)
        return pd.DataFrame({"date": within.astype("datetime64[ms]"), "riskless": riskless})
    riskless = daily_from_daily(rate.rates, rate.quoted, within, rate.label)
    quoted_on = rate.rates[np.isin(known, within)]
    found = pd.DataFrame(
        {"date": quoted_on["date"].to_numpy(), "rate": quoted_on["rate"].to_numpy()}
    )
    found["riskless"] = riskless
    check_riskless(found, rate.reading, rate.quoted, "daily")
    return found[["date", "riskless"]]


def on_months(rate: RisklessRate) -> pd.DataFrame:
    """`date` (month end) and `riskless`; a rate a day is compounded over the days that have one.

    A first or last month of which more than three weekdays are missing is left out. Raises KnownProblem where a rate is
    implausible.
    """
    if rate.frequency == "monthly":
        return rate.rates[["date", "riskless"]]
    daily = on_days(rate, rate.rates["date"].to_numpy().astype("datetime64[D]"))
    growth = _growth_of_months(daily["date"], {"riskless": daily["riskless"]})
    return growth.assign(riskless=growth["riskless"] - 1)


def join_factor(
    market: pd.DataFrame,
    riskless: pd.DataFrame | None,
    market_is: str,
    market_label: str,
    riskless_label: str,
    noun: str = "month",
) -> Factor:
    """The periods that both series have: one stretch, as neither has gaps.

    `market` has date and return, `riskless` date and riskless, or is None: then `market_is` must be "excess".
    `noun` is what a period is called. Raises KnownProblem when they have none in common.
    """
    if riskless is None:
        if market_is != "excess":
            raise ValueError("a total return needs a riskless rate")
        both = market.assign(riskless=np.nan)
        dates = {market_label: market["date"]}
    else:
        both = market.merge(riskless, on="date")
        dates = {market_label: market["date"], riskless_label: riskless["date"]}
    if both.empty:
        found = f"it has no {noun} in common with {riskless_label}"
        raise KnownProblem(_NOTHING_LEFT, [Problem(market_label, found, "compare the dates")])
    both["market_excess"] = both["return"] - (both["riskless"] if market_is == "total" else 0.0)
    first, last = both["date"].min(), both["date"].max()
    return Factor(
        periods=both[["date", "market_excess", "riskless"]].reset_index(drop=True),
        begins=" and ".join(label for label, date in dates.items() if date.min() == first),
        ends=" and ".join(label for label, date in dates.items() if date.max() == last),
    )


def months_of_days(factor: Factor) -> pd.DataFrame:
    """A factor of trading days compounded to months: date (month end), market_excess, riskless.

    Total returns are compounded, day by day, and the riskless return likewise; the market's excess return of the month
    is their difference. Without a riskless rate the daily excess returns themselves are compounded. A first or last
    month of which more than three weekdays are missing is left out. An empty frame where no month is whole.
    """
    periods = factor.periods
    riskless = periods["riskless"].fillna(0.0)
    returns = {"total": periods["market_excess"] + riskless, "riskless": riskless}
    of_month = _growth_of_months(periods["date"], returns)
    no_riskless = periods["riskless"].isna().all()
    return pd.DataFrame(
        {
            "date": of_month["date"],
            "market_excess": of_month["total"] - of_month["riskless"],
            "riskless": np.nan if no_riskless else of_month["riskless"] - 1,
        }
    )


def _growth_of_months(date: pd.Series, returns: dict[str, pd.Series]) -> pd.DataFrame:
    """`date` (month end) and the growth of one unit in each whole month, from returns of days."""
    day = date.to_numpy().astype("datetime64[D]")
    month = day.astype("datetime64[M]")
    growth = (1 + pd.DataFrame(returns)).groupby(month).prod()
    whole = np.ones(len(growth), bool)
    whole[0] &= cut_off(month[0].astype("datetime64[D]"), day[0]) == 0
    whole[-1] &= cut_off(day[-1] + 1, (month[-1] + 1).astype("datetime64[D]")) == 0
    following = (growth.index.to_numpy().astype("datetime64[M]") + 1).astype("datetime64[D]")
    growth.insert(0, "date", (following - 1).astype("datetime64[ms]"))
    return growth[whole].reset_index(drop=True)


def total_and_excess(
    returns: np.ndarray, riskless: np.ndarray, returns_are: str
) -> tuple[np.ndarray, np.ndarray]:
    """Total and excess returns of securities from either, and the riskless return of each row's period: (n_rows,) all.

    `returns_are` is "total" or "excess". Without a riskless rate (NaN) the other of the two is not known. The loss of
    everything is a total return of exactly −1, which an excess return gives up to rounding only.
    """
    if returns_are == "total":
        return returns, returns - riskless
    total = returns + riskless
    return np.where(np.abs(total + 1) < _ROUNDING, -1.0, total), returns
