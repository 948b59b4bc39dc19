"""Months as dates and as numbers."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import pandas as pd


def month_number(dates: pd.Series | pd.DatetimeIndex | Sequence[pd.Timestamp]) -> np.ndarray:
    """Months since January of year 0, int64 (n,): consecutive months are consecutive numbers."""
    index = pd.DatetimeIndex(dates)
    return (index.year * 12 + index.month - 1).to_numpy(np.int64)


def month_end(month: str | pd.Period) -> pd.Timestamp:
    """The last day of a month given as `YYYY-MM`, at midnight."""
    return pd.Period(month, freq="M").to_timestamp(how="end").normalize().as_unit("ms")


def within_months(dates: pd.Series, first: str, last: str) -> pd.Series:
    """Whether each date lies in the months `first` to `last`, both included, as `YYYY-MM`."""
    return dates.between(pd.Timestamp(first), month_end(last))


def month_name(date: pd.Timestamp) -> str:
    """`YYYY-MM` of a date."""
    return pd.Timestamp(date).strftime("%Y-%m")
