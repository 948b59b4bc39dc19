"""The stage that estimates betas: panel and market in, one table of estimates out."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd

from lineproof import catalog
from lineproof.estimators import ESTIMATORS
from lineproof.frequency import FREQUENCIES
from lineproof.periods import ABSENT, Months, Periods, TradingDays, periods_of
from lineproof.problems import KnownProblem, Problem
from lineproof.securities import coded, starts_of
from lineproof.stats.betas import RollingBetas
from lineproof.stats.windows import WindowEnds

_NONE = "No beta can be estimated."


def estimate_betas(
    panel: pd.DataFrame,
    market: pd.DataFrame,
    *,
    name: str,
    estimator: str,
    window: int,
    min_obs: int,
    returns: str = "monthly",
    dated: str = "monthly",
) -> pd.DataFrame:
    """Estimates of every security, by one estimator of the registry.

    `panel` is sorted by security and date. `returns` is the frequency of both tables, by whose
    periods `window` and `min_obs` count; the calendar of days is that of the market. `dated` is
    the frequency of the study. An estimate dated t uses returns dated t and before, and there is
    one

    - from monthly returns: at each month in which the security has a row, with a return or without;
    - from daily returns in a daily study: at the last trading day of each month, when groups can be
      formed, if the security has a row on that day;
    - from daily returns in a monthly study: at the end of each month in which the security has a
      row, over the window that ends with the last trading day of the month.

    Where there are too few returns there is no row.

    Raises KnownProblem when the window is longer than the sample, no security has enough periods for
    a single estimate, or the market's return never changes.
    """
    if window > len(market):
        nouns = FREQUENCIES[returns].nouns
        found = f"a window of {window} {nouns} is longer than the sample, which has {len(market)}"
        raise KnownProblem(_NONE, [Problem(f"betas.{name}.window", found, "shorten window")])
    periods = periods_of(returns, market["date"].to_numpy())
    rows = _rows(panel, market, periods)
    marks = _marks(rows, periods, dated)
    estimate = catalog.load(ESTIMATORS[estimator])(
        rows.starts,
        rows.number,
        rows.excess,
        rows.factor,
        window=window,
        min_obs=min_obs,
        ends=WindowEnds(marks.starts, marks.number),
    )
    if len(estimate.row) == 0:
        raise KnownProblem(_NONE, [_why_none(name, estimate, window, min_obs, returns)])
    row = marks.row[estimate.row]
    keys = pd.DataFrame(
        {
            "security": rows.security.iloc[row].reset_index(drop=True),
            "date": marks.date[estimate.row].astype("datetime64[ms]"),
        }
    )
    columns = ("beta", "alpha", "se_beta", "r2", "residual_sd", "n_obs")
    return keys.assign(**{column: getattr(estimate, column) for column in columns})


@dataclass(frozen=True)
class _Rows:
    """The rows of the panel that lie in periods of the market, (n_rows,) each."""

    security: pd.Series
    starts: np.ndarray
    number: np.ndarray
    excess: np.ndarray
    factor: np.ndarray


@dataclass(frozen=True)
class _Marks:
    """Where estimates are wanted, (n_marks,) each: a row of the security, the period at which the window ends, and
    the date it gets; `starts` (n_securities + 1,) parts them by security."""

    row: np.ndarray
    number: np.ndarray
    date: np.ndarray
    starts: np.ndarray


def _rows(panel: pd.DataFrame, market: pd.DataFrame, periods: Periods) -> _Rows:
    number = periods.number(panel["date"].to_numpy())
    if (number == ABSENT).any():  # days on which the market has no return
        panel, number = panel[number != ABSENT], number[number != ABSENT]
    at = periods.number(market["date"].to_numpy())
    low = min(at.min(), number.min(initial=at.min()))
    by_number = np.full(max(at.max(), number.max(initial=at.max())) - low + 1, np.nan)
    by_number[at - low] = market["market_excess"].to_numpy()
    return _Rows(
        security=panel["security"],
        starts=starts_of(coded(panel["security"])[0]),
        number=number,
        excess=panel["excess_return"].to_numpy(),
        factor=by_number[number - low],
    )


def _marks(rows: _Rows, periods: Periods, dated: str) -> _Marks:
    if isinstance(periods, TradingDays) and dated == "monthly":
        month = periods.month(rows.number)
        ends = np.zeros(len(month), bool)
        ends[:-1] = month[1:] != month[:-1]
        ends[rows.starts[1:] - 1] = True
        row = np.flatnonzero(ends)
        number, date = periods.last_of_month(rows.number[row]), Months().date(month[row])
    else:
        row = np.flatnonzero(periods.closes_month(rows.number))
        number, date = rows.number[row], periods.date(rows.number[row])
    return _Marks(row, number, date, np.searchsorted(row, rows.starts))


def _why_none(
    name: str, estimate: RollingBetas, window: int, min_obs: int, returns: str
) -> Problem:
    words = FREQUENCIES[returns]
    if estimate.n_no_variation:
        found = f"the market's return is the same in every {words.noun}"
        change = "check the market's file"
    else:
        found = f"no security has {min_obs} {words.nouns} of returns within {window} {words.nouns}"
        change = "lower min or lengthen window"
    return Problem(f"betas.{name}", found, change)
