"""The market and the riskless rate, period by period, in the periods that both have."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd

from lineproof.intake.second_pass import Span
from lineproof.intake.stopping import stop
from lineproof.periods import Periods


@dataclass(frozen=True)
class Series:
    """One value a period: `number` ascending int64 (n,), `value` decimal (n,); `label` is its file."""

    label: str
    number: np.ndarray
    value: np.ndarray


@dataclass(frozen=True)
class Factor:
    """`riskless` and `market_excess` (n_periods,), decimal, for each period of `span`, NaN where the study has none.

    `market_excess` is None where the market is built from the panel. `begins` and `ends` name the files that bound the
    span.
    """

    span: Span
    riskless: np.ndarray
    market_excess: np.ndarray | None
    begins: str
    ends: str

    def of(self, periods: np.ndarray) -> np.ndarray:
        """The riskless return of each period, 0 where the study has no riskless rate."""
        return np.nan_to_num(self.riskless[periods - self.span.first])

    def table(self, built: np.ndarray | None, first: int, last: int) -> pd.DataFrame:
        """Date, market_excess and riskless from one period to another; `built` is the market made from the panel."""
        numbers = np.arange(first, last + 1)
        excess = self.market_excess if self.market_excess is not None else built
        assert excess is not None
        dates = self.span.periods.date(numbers).astype("datetime64[ms]")
        at = numbers - self.span.first
        return pd.DataFrame(
            {"date": dates, "market_excess": excess[at], "riskless": self.riskless[at]}
        )


def join(
    market: Series | None,
    riskless: Series | None,
    market_is: str,
    periods: Periods,
    panel: tuple[int, int],
) -> Factor:
    """The periods that both series have; each has no gaps between its first and its last, so they are one stretch.

    `panel` gives the first and last period of the raw returns, which bound the study where there is no series at all.

    Raises KnownProblem when the series have no period in common.
    """
    series = [given for given in (market, riskless) if given is not None]
    first = max((int(given.number[0]) for given in series), default=panel[0])
    last = min((int(given.number[-1]) for given in series), default=panel[1])
    if first > last:
        found = f"it has no {periods.noun} in common with {series[1].label}"
        raise stop(
            series[0].label, found, "compare the dates", headline="Nothing is left to study."
        )
    rate = _within(riskless, first, last) if riskless else np.full(last - first + 1, np.nan)
    excess = None
    if market is not None:
        excess = _within(market, first, last) - (rate if market_is == "total" else 0.0)
    return Factor(
        span=Span(periods, first, last),
        riskless=rate,
        market_excess=excess,
        begins=" and ".join(given.label for given in series if given.number[0] == first),
        ends=" and ".join(given.label for given in series if given.number[-1] == last),
    )


def _within(series: Series, first: int, last: int) -> np.ndarray:
    begins = int(series.number[0])
    return series.value[first - begins : last - begins + 1]
