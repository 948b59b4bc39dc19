"""Checks of a file as a whole: does it hold what the study file says, in that unit and frequency?"""

from __future__ import annotations

from typing import Any

import numpy as np
import pandas as pd
import pyarrow as pa

from lineproof.calendar import month_number
from lineproof.intake.stopping import stop
from lineproof.intake.values import share_with_decimal_comma

_FEWEST = 30  # returns on which to judge a unit
_LARGE_MIDDLE = 0.5  # half of all monthly returns exceed 50 %: not decimal
_SMALL_TAIL = 0.005  # not 5 % of monthly returns exceed half a per cent: not in per cent
_RARELY_NEGATIVE = 0.01
_SHARE_OF_DAILY = 0.2
_QUARTER, _SHARE_OF_QUARTERLY = 3, 0.5  # months; steps from row to row that long


def check_unit(returns: np.ndarray, reading: dict[str, Any]) -> None:
    """Stop when the size of typical returns (decimal, as read) says that the unit is the other one.

    Zeros and missing values say nothing. Raises KnownProblem with the quantiles.
    """
    given = returns[np.isfinite(returns) & (returns != 0)]
    if len(given) < _FEWEST:
        return
    middle, high = np.quantile(np.abs(given), [0.5, 0.95])
    if middle > _LARGE_MIDDLE:
        unsigned = (given < 0).mean() < _RARELY_NEGATIVE
        is_decimal = reading["unit"] == "decimal"
        change = "set unit: percent" if is_decimal else "is this the column of the returns?"
        if unsigned:
            change = "hardly any is negative: does the column hold prices, or 1 + return?"
    elif high < _SMALL_TAIL and reading["unit"] == "percent":
        change = "set unit: decimal"
    else:
        return
    where = f"{reading['label']}, column {reading['columns']['return']}"
    found = (
        f"read as {reading['unit']}, half of all returns exceed {100 * middle:.3g} % in size "
        f"and one in twenty exceeds {100 * high:.3g} %"
    )
    raise stop(where, found, change)


def check_decimal_comma(text: pd.Series | pa.Array, reading: dict[str, Any]) -> None:
    """Stop when most returns are written as in 0,015. Raises KnownProblem."""
    if share_with_decimal_comma(text) > 0.5:
        where = f"{reading['label']}, column {reading['columns']['return']}"
        found = f"most numbers have a decimal comma, as in {_first_with_comma(text)}"
        raise stop(where, found, "save the file with decimal points")


def _first_with_comma(text: pd.Series | pa.Array) -> str:
    return min(value for value in text.tolist() if "," in value)


def check_frequency(
    security: pd.Series, date: pd.Series, written: pd.Series, reading: dict[str, Any]
) -> None:
    """Stop when securities typically have several dates a month, or less than one.

    The arguments have one entry a row: identifier, month end (NaT where unknown) and the date as
    it is written. Exact repetitions of a row do not count. Raises KnownProblem.
    """
    known = date.notna().to_numpy()
    name = pd.factorize(security[known])[0].astype(np.int64)
    month = month_number(date[known])
    day = pd.factorize(written[known])[0].astype(np.int64)
    if len(name) == 0:
        return
    first = month.min()
    span, n_days = month.max() - first + 1, day.max() + 1
    cells = np.unique((name * span + month - first) * n_days + day) // n_days
    cell, n_dates = np.unique(cells, return_counts=True)
    if (n_dates > 2).mean() > _SHARE_OF_DAILY:
        said = f"{len(cells):,} dates in {len(cell):,} months of single securities"
        change = "compound the returns to months first; this study is monthly"
        raise stop(reading["label"], f"{said}: are these daily or weekly data?", change)
    step = np.diff(cell)[np.diff(cell // span) == 0]
    if len(step) >= _FEWEST and (step >= _QUARTER).mean() > _SHARE_OF_QUARTERLY:
        said = f"a security's next row is typically {int(np.median(step))} months on"
        change = "deliver monthly returns; this study is monthly"
        raise stop(reading["label"], f"{said}: are these quarterly or yearly data?", change)
