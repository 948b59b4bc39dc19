"""A market built from the panel: the mean return of all securities, equally weighted or by size.

Every row that is kept counts, eligible or not: a screen decides who is ranked, and the market is all there is.
"""

from __future__ import annotations

import numpy as np
import pandas as pd
from numba import njit

from lineproof.intake.chunk import Chunk
from lineproof.intake.stopping import counted, few, stop
from lineproof.periods import Periods
from lineproof.quotings import BUILDS

_WEIGHT, _RETURN, _COUNT = range(3)  # rows of the sums


class MarketBuild:
    """Adds up the market's return of each period, a chunk at a time, in the order of the securities.

    `weights` is "equal" (over the securities with a return) or "size": the size of the period before, a missing one
    being the last known grown by the returns since, as in size-weighted portfolios. So size-weighted portfolios of
    all securities rebuild this market.

    The result does not depend on how the securities are cut into chunks, not in the last bit: each period's terms come
    in the order of the securities, and what rounding loses is carried along (Neumaier 1974), across chunks as within.
    """

    def __init__(self, weights: str) -> None:
        if weights not in BUILDS:
            raise ValueError(f"no weights {weights!r}; known are {list(BUILDS)}")
        self._by_size = weights == "size"
        self._first = 0
        self._sums = np.zeros((3, 0))
        self._lost = np.zeros((3, 0))

    def see(self, chunk: Chunk, total_return: np.ndarray) -> np.ndarray:
        """Take in a chunk; `total_return` is (n_rows,), decimal, NaN where missing, final returns included.

        In a study of excess returns without a riskless rate it is the excess return, and so is the market. Gives back
        what each row weighs in its period, before weights are scaled to one: (n_rows,), 0 where it weighs nothing.
        """
        weights = np.zeros(len(chunk))
        if len(chunk) == 0:
            return weights
        self._make_room(int(chunk.period.min()), int(chunk.period.max()))
        size = chunk.values.get("size") if self._by_size else total_return
        if size is None:
            raise ValueError("a market weighted by size needs sizes")
        _add(
            np.ascontiguousarray(chunk.start, np.int64),
            np.ascontiguousarray(chunk.period, np.int64) - self._first,
            np.ascontiguousarray(total_return, np.float64),
            np.ascontiguousarray(size, np.float64),
            self._by_size,
            self._sums,
            self._lost,
            weights,
        )
        return weights

    def result(self, periods: Periods, label: str = "data.market.build") -> pd.DataFrame:
        """`date`, `return` (decimal) and `n_securities`, one row a period from the first with a weight to the last.

        With weights by size the first period of all has none, since no size is known before it. Raises KnownProblem
        when there is no period at all, or one inside has no security with a return and a weight (fault 27).
        """
        sums = self._sums + self._lost
        weighs = np.flatnonzero(sums[_WEIGHT] > 0)
        if len(weighs) == 0:
            raise stop(
                label, "no security has a return and a weight", "check the columns of data.returns"
            )
        within = np.arange(weighs[0], weighs[-1] + 1)
        absent = np.setdiff1d(within, weighs)
        if len(absent):
            named = few(periods.name(int(number)) for number in absent + self._first)
            found = f"no security has a return and a weight in {counted(len(absent), periods.noun)}: {named}"
            raise stop(label, found, "supply the market's return as a file, or shorten the returns")
        return pd.DataFrame(
            {
                "date": periods.date(within + self._first).astype("datetime64[ms]"),
                "return": sums[_RETURN, within] / sums[_WEIGHT, within],
                "n_securities": sums[_COUNT, within].astype(np.int64),
            }
        )

    def _make_room(self, first: int, last: int) -> None:
        """Let the sums cover these periods too; with room to spare, so that it happens rarely."""
        n = self._sums.shape[1]
        if n == 0:
            self._first = first
        before = max(self._first - first, 0)
        after = max(last + 1 - self._first - n, 0)
        if before or after:
            wider = ((0, 0), (before, after))
            self._sums, self._lost = np.pad(self._sums, wider), np.pad(self._lost, wider)
            self._first -= before


@njit(cache=True)
def _add(
    start, period, total_return, size, by_size, sums, lost, out
):  # pragma: no cover - compiled
    for security in range(len(start) - 1):
        base, growth = np.nan, 1.0  # the last known size, and what has become of one unit of it
        for row in range(start[security], start[security + 1]):
            r, at = total_return[row], period[row]
            weight = base * growth if by_size else 1.0
            if not np.isnan(r) and weight > 0:
                _carry(sums, lost, _WEIGHT, at, weight)
                _carry(sums, lost, _RETURN, at, weight * r)
                _carry(sums, lost, _COUNT, at, 1.0)
                out[row] = weight
            if size[row] > 0:
                base, growth = size[row], 1.0
            elif not np.isnan(r):
                growth *= 1 + r


@njit(cache=True)
def _carry(sums, lost, line, at, term):  # pragma: no cover - compiled
    """Add a term, and what rounding takes from the sum to `lost`."""
    old = sums[line, at]
    new = old + term
    if abs(old) >= abs(term):
        lost[line, at] += (old - new) + term
    else:
        lost[line, at] += (term - new) + old
    sums[line, at] = new
