"""The stage that estimates betas: panel, market and further factors in, one table of estimates out."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd
import pyarrow as pa

from lineproof import catalog
from lineproof.estimators import ESTIMATORS, SHRINKAGES
from lineproof.frequency import FREQUENCIES
from lineproof.periods import ABSENT, Months, Periods, TradingDays, periods_of
from lineproof.problems import KnownProblem, Problem
from lineproof.securities import coded, starts_of
from lineproof.stats.windows import Sample, WindowEnds

_NONE = "No beta can be estimated."
_COLUMNS = ("beta", "alpha", "se_beta", "r2", "residual_sd", "n_obs")


class Estimation:
    """Estimates by one estimator of the registry, a piece of whole securities at a time.

    `market` and `factors` are tables by date, `beside` names columns of the latter. `returns` is the frequency of all
    tables, by whose periods `window` and `min_obs` count; the calendar of days is that of the market. `dated` is the
    frequency of the study, and `own` are the estimator's own keyword arguments. An estimate dated t uses returns dated
    t and before, and there is one

    - from monthly returns: at each month in which the security has a row, with a return or without;
    - from daily returns in a daily study: at the last trading day of each month, when groups can be
      formed, if the security has a row on that day;
    - from daily returns in a monthly study: at the end of each month in which the security has a
      row, over the window that ends with the last trading day of the month.

    Where there are too few returns there is no row. Raises KnownProblem when the window is longer than the sample.
    """

    def __init__(
        self,
        market: pd.DataFrame,
        factors: pd.DataFrame | None = None,
        *,
        name: str,
        estimator: str,
        window: int,
        min_obs: int,
        returns: str = "monthly",
        dated: str = "monthly",
        beside: Sequence[str] = (),
        own: Mapping[str, Any] | None = None,
    ) -> None:
        if window > len(market):
            nouns = FREQUENCIES[returns].nouns
            found = (
                f"a window of {window} {nouns} is longer than the sample, which has {len(market)}"
            )
            raise KnownProblem(_NONE, [Problem(f"betas.{name}.window", found, "shorten window")])
        self._name, self._returns, self._dated = name, returns, dated
        self._estimator, self._options = estimator, {"window": window, "min_obs": min_obs}
        self._own = dict(own or {})
        self._periods = periods_of(returns, market["date"].to_numpy())
        self._table = market[["date", "market_excess"]]
        if beside:
            assert factors is not None
            known = factors[["date", *beside]]
            self._table = self._table.merge(known, on="date", how="left", validate="one_to_one")
        self._n = self._n_still = 0

    def of(self, panel: pd.DataFrame) -> pd.DataFrame:
        """Estimates of the securities of a piece of the panel, sorted by security and date."""
        rows = _rows(panel, self._table, self._periods)
        marks = _marks(rows, self._periods, self._dated)
        estimate = catalog.load(ESTIMATORS[self._estimator])(
            Sample(rows.starts, rows.number - rows.low, rows.excess, rows.factors),
            ends=WindowEnds(marks.starts, marks.number - rows.low),
            **self._options,
            **self._own,
        )
        self._n += len(estimate.row)
        self._n_still += estimate.n_no_variation
        row = marks.row[estimate.row]
        keys = pd.DataFrame(
            {
                "security": rows.security.iloc[row].reset_index(drop=True),
                "date": marks.date[estimate.row].astype("datetime64[ms]"),
            }
        )
        return keys.assign(**{column: getattr(estimate, column) for column in _COLUMNS})

    def check(self) -> None:
        """Raise KnownProblem when no piece had a single estimate, or the factors never change."""
        if self._n:
            return
        words, (window, min_obs) = FREQUENCIES[self._returns], self._options.values()
        if not self._n_still:
            which = "" if self._estimator == "ols" else f" that {self._estimator} can use"
            found = (
                f"no security has {min_obs} {words.nouns} of returns{which} within {window} "
                f"{words.nouns}"
            )
            change = "lower min or lengthen window"
        elif "half_life" in self._own:
            found = f"the market's return does not vary among the {words.nouns} that count"
            change = "lengthen half_life, or check the market's file"
        elif self._table.shape[1] > 2:
            found = "the market or a factor never changes, or is a mixture of the others"
            change = "check the market's file and that of the factors"
        else:
            found = f"the market's return is the same in every {words.noun}"
            change = "check the market's file"
        raise KnownProblem(_NONE, [Problem(f"betas.{self._name}", found, change)])


def estimates_of(
    panel: pd.DataFrame, market: pd.DataFrame, factors: pd.DataFrame | None = None, **options: Any
) -> pd.DataFrame:
    """Estimates of every security of a panel sorted by security and date; the options are those of `Estimation`.

    Raises KnownProblem when there is not a single estimate.
    """
    estimation = Estimation(market, factors, **options)
    table = estimation.of(panel)
    estimation.check()
    return table


def estimate_betas(
    panels: Iterable[pd.DataFrame],
    market: pd.DataFrame,
    factors: pd.DataFrame | None = None,
    **options: Any,
) -> Iterator[dict[str, pd.DataFrame]]:
    """The same for a panel in pieces of whole securities, as pieces of the table `betas`."""
    estimation = Estimation(market, factors, **options)
    for panel in panels:
        table = estimation.of(panel)
        if table.empty:
            continue
        codes, names = coded(table["security"])
        texts = pa.DictionaryArray.from_arrays(codes, pa.array(names.tolist(), pa.string()))
        yield {"betas": table.assign(security=texts.cast(pa.string()).to_pandas().astype("str"))}
    estimation.check()


def shrink_betas(betas: pd.DataFrame, *, shrink: str, own: Mapping[str, Any]) -> pd.DataFrame:
    """A table of estimates with beta and its standard error shrunk by one of `SHRINKAGES`; the rest stays."""
    shrunk, se = catalog.load(SHRINKAGES[shrink])(
        *(betas[column].to_numpy() for column in ("beta", "se_beta", "date")), **own
    )
    return betas.assign(beta=shrunk, se_beta=se)


@dataclass(frozen=True)
class _Rows:
    """The rows of the panel that lie in periods of the market, (n_rows,) each.

    `factors` (n_periods, n_factors) begins with the period numbered `low`.
    """

    security: pd.Series
    starts: np.ndarray
    number: np.ndarray
    excess: np.ndarray
    low: int
    factors: np.ndarray


@dataclass(frozen=True)
class _Marks:
    """Where estimates are wanted, (n_marks,) each: a row of the security, the period at which the window ends, and
    the date it gets; `starts` (n_securities + 1,) parts them by security."""

    row: np.ndarray
    number: np.ndarray
    date: np.ndarray
    starts: np.ndarray


def _rows(panel: pd.DataFrame, table: pd.DataFrame, periods: Periods) -> _Rows:
    number = periods.number(panel["date"].to_numpy())
    if (number == ABSENT).any():  # days on which the market has no return
        panel, number = panel[number != ABSENT], number[number != ABSENT]
    at = periods.number(table["date"].to_numpy())
    low = int(min(at.min(), number.min(initial=at.min())))
    by_number = np.full(
        (max(at.max(), number.max(initial=at.max())) - low + 1, table.shape[1] - 1), np.nan
    )
    by_number[at - low] = table.drop(columns="date").to_numpy()
    return _Rows(
        security=panel["security"],
        starts=starts_of(coded(panel["security"])[0]),
        number=number,
        excess=panel["excess_return"].to_numpy(),
        low=low,
        factors=by_number,
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
