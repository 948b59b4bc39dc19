"""Equally weighted mean returns, period by period."""

from __future__ import annotations

import numpy as np


class MeansByPeriod:
    """Adds up returns by period, from `first` on, for so many periods."""

    def __init__(self, first: int, n_periods: int) -> None:
        self._first = first
        self._sums = np.zeros(n_periods)
        self._n = np.zeros(n_periods, np.int64)

    def see(self, period: np.ndarray, returns: np.ndarray) -> None:
        """Take in rows: period int64 and return (n_rows,), NaN where missing."""
        known = ~np.isnan(returns)
        at = period[known] - self._first
        n = len(self._sums)
        self._sums += np.bincount(at, returns[known], minlength=n)
        self._n += np.bincount(at, minlength=n)

    def means(self) -> np.ndarray:
        """The mean of each period, NaN where there is no return: (n_periods,)."""
        return np.divide(self._sums, self._n, out=np.full(len(self._n), np.nan), where=self._n > 0)

    def average(self) -> float | None:
        """The mean of the means, or None where there is no return at all."""
        means = self.means()
        return float(means[~np.isnan(means)].mean()) if self._n.any() else None
