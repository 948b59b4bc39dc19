"""The market and the riskless return side by side, in the periods of the study."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd

from lineproof.intake.riskless import (
    check_riskless,
    daily_from_daily,
    daily_from_monthly,
    riskless_return,
)
from lineproof.intake.series import read_series
from lineproof.problems import KnownProblem, Problem

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

    @property
    def label(self) -> str:
        return self.reading["label"]


def read_riskless(
    files: list[str], reading: dict[str, Any], quoted: str, frequency: str = "monthly"
) -> RisklessRate:
    """Read a riskless rate; `frequency` is that of the file. Raises KnownProblem."""
    rates = read_series(files, reading, "rate", frequency)
    if frequency == "monthly":
        rates["riskless"] = riskless_return(rates["rate"], quoted)
        check_riskless(rates, reading, quoted)
    return RisklessRate(rates, reading, quoted, frequency)


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
    found = pd.DataFrame({"date": quoted_on["date"].to_numpy(), "rate": quoted_on["rate"].to_numpy()})
    found["riskless"] = riskless
    check_riskless(found, rate.reading, rate.quoted, "daily")
    return found[["date", "riskless"]]


def join_factor(
    market: pd.DataFrame,
    riskless: pd.DataFrame | None,
    market_is: str,
    market_label: str,
    riskless_label: str,
) -> Factor:
    """The periods that both series have: one stretch, as neither has gaps.

    `market` has date and return, `riskless` date and riskless, or is None: then `market_is` must be "excess".
    Raises KnownProblem when they have no period in common.
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
        found = f"it has no period in common with {riskless_label}"
        raise KnownProblem(_NOTHING_LEFT, [Problem(market_label, found, "compare the dates")])
    both["market_excess"] = both["return"] - (both["riskless"] if market_is == "total" else 0.0)
    first, last = both["date"].min(), both["date"].max()
    return Factor(
        periods=both[["date", "market_excess", "riskless"]].reset_index(drop=True),
        begins=" and ".join(label for label, date in dates.items() if date.min() == first),
        ends=" and ".join(label for label, date in dates.items() if date.max() == last),
    )
