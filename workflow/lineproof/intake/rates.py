"""What each period earns: the riskless return and the market's, numbered as the panel's rows are."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd

from lineproof.intake.factor import (
    Factor,
    RisklessRate,
    join_factor,
    months_of_days,
    on_days,
    on_months,
    read_riskless,
)
from lineproof.intake.second_pass import Span
from lineproof.intake.series import Series, read_series
from lineproof.intake.series_record import UsedDays, file_records, series_record
from lineproof.intake.trading_days import check_calendar, days_of_panel
from lineproof.periods import Months, Periods, TradingDays
from lineproof.quotings import BUILDS, QUOTINGS


@dataclass(frozen=True)
class Rates:
    """`riskless` and `market_excess` (n_periods,), decimal, for each period of `span`; NaN where the study has none.

    `market_excess` is None where the market is built from the panel. `begins` and `ends` name the files that bound the
    span.
    """

    span: Span
    riskless: np.ndarray
    market_excess: np.ndarray | None
    begins: str
    ends: str

    def riskless_of(self, periods: np.ndarray) -> np.ndarray:
        """The riskless return of each of some periods, by number."""
        return self.riskless[periods - self.span.first]

    def table(self, first: int, last: int, built: pd.DataFrame | None) -> pd.DataFrame:
        """Date, market_excess and riskless of the periods from `first` to `last`.

        `built` is the market made from the panel, with date and return, in excess already or total.
        """
        numbers = np.arange(first, last + 1)
        dates = self.span.periods.date(numbers).astype("datetime64[ms]")
        table = pd.DataFrame({"date": dates, "riskless": self.riskless_of(numbers)})
        if built is not None:
            table = table.merge(built, on="date")
        else:
            assert self.market_excess is not None
            table["market_excess"] = self.market_excess[numbers - self.span.first]
        return table[["date", "market_excess", "riskless"]]


@dataclass(frozen=True)
class Supplied:
    """The series of a study as read; `market` is None where it is built, `rate` where returns are in excess of it."""

    market: Series | None
    market_frequency: str
    market_is: str
    market_label: str
    rate: RisklessRate | None

    def delivered(self, frequency: str, days: np.ndarray, counts: np.ndarray) -> Rates:
        """Rates for raw returns of a frequency, of which `days` have so many rows each.

        Raises KnownProblem where a series has gaps, or there is no period in common.
        """
        if frequency == "monthly":
            return self.monthly(days)
        if self.market is None or self.market_frequency == "monthly":
            calendar = days_of_panel(days, counts)
            riskless = None if self.rate is None else on_days(self.rate, calendar)
            return _alone(riskless, calendar, self._riskless_label)
        factor = self._daily_factor()
        calendar = factor.periods["date"].to_numpy().astype("datetime64[D]")
        check_calendar(days, counts, calendar, self.market_label)
        return _from_factor(factor, TradingDays(calendar))

    def monthly(self, days: np.ndarray) -> Rates:
        """Rates by month; `days` are those of the raw returns."""
        if self.market is None:
            riskless = None if self.rate is None else on_months(self.rate)
            return _alone(riskless, days, self._riskless_label, Months())
        if self.market_frequency == "daily":
            factor = self._daily_factor()
            months = Factor(months_of_days(factor), factor.begins, factor.ends)
            return _from_factor(months, Months())
        riskless = None if self.rate is None else on_months(self.rate)
        return _from_factor(self._joined(riskless, "month"), Months())

    def files(self, used: UsedDays) -> list[dict[str, Any]]:
        """The rows of each raw file of a series, and how many of them are used: see `record.FileRecord`."""
        found = []
        if self.market is not None:
            found += file_records("data.market", self.market.files, self.market_frequency, used)
        if self.rate is not None:
            found += file_records("data.riskless", self.rate.files, self.rate.frequency, used)
        return found

    def records(self, market: pd.DataFrame, period: str, build: str | None) -> list[dict[str, Any]]:
        """What the series are, and their numbers in the periods of the study's market: see `record.SeriesRecord`."""
        source = f"{self.market_label}: {self.market_is} returns"
        if build is not None:
            source = f"built from the panel: {BUILDS[build]}"
        date = market["date"]
        found = [series_record("data.market", source, period, date, market["market_excess"])]
        if self.rate is not None:
            source = f"{self.rate.label}: {QUOTINGS[self.rate.quoted].label}"
            found.append(series_record("data.riskless", source, period, date, market["riskless"]))
        return found

    @property
    def _riskless_label(self) -> str:
        return "" if self.rate is None else self.rate.label

    def _daily_factor(self) -> Factor:
        assert self.market is not None
        days = self.market.values["date"].to_numpy().astype("datetime64[D]")
        return self._joined(None if self.rate is None else on_days(self.rate, days), "day")

    def _joined(self, riskless: pd.DataFrame | None, noun: str) -> Factor:
        assert self.market is not None
        return join_factor(
            self.market.values,
            riskless,
            self.market_is,
            self.market_label,
            self._riskless_label,
            noun,
        )


def read_supplied(
    files: Mapping[str, list[str]],
    *,
    market: dict[str, Any] | None,
    market_is: str,
    market_frequency: str,
    riskless: dict[str, Any] | None,
    riskless_quoted: str,
    riskless_frequency: str,
) -> Supplied:
    """Read the market and the riskless rate. Raises KnownProblem."""
    rate = returns = None
    if riskless is not None:
        rate = read_riskless(files["riskless"], riskless, riskless_quoted, riskless_frequency)
    if market is not None:
        returns = read_series(files["market"], market, "return", market_frequency)
    label = "" if market is None else market["label"]
    return Supplied(returns, market_frequency, market_is, label, rate)


def _from_factor(factor: Factor, periods: Periods) -> Rates:
    numbers = periods.number(factor.periods["date"].to_numpy().astype("datetime64[D]"))
    return Rates(
        span=Span(periods, int(numbers[0]), int(numbers[-1])),
        riskless=factor.periods["riskless"].to_numpy(float),
        market_excess=factor.periods["market_excess"].to_numpy(float),
        begins=factor.begins,
        ends=factor.ends,
    )


def _alone(
    riskless: pd.DataFrame | None, days: np.ndarray, label: str, periods: Periods | None = None
) -> Rates:
    """Rates without a market: the riskless rate's periods or, without that, those of the days."""
    dates = days if riskless is None else riskless["date"].to_numpy().astype("datetime64[D]")
    periods = periods or TradingDays(dates)
    first, last = periods.number(dates[[0, -1]]).tolist()
    none = np.full(last - first + 1, np.nan)
    rate = none if riskless is None else riskless["riskless"].to_numpy(float)
    return Rates(Span(periods, first, last), rate, None, label, label)
