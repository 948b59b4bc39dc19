"""Counts by period over a range of periods that is not known beforehand."""

from __future__ import annotations

import numpy as np
from numba import njit

from lineproof.periods import Periods

_ROOM = 64  # periods added at either end beyond what is needed


class PeriodCounts:
    """Several rows of counts by period; grows as periods come, so memory depends on the range of periods alone."""

    def __init__(self, n_rows: int) -> None:
        self._first = 0
        self._counts = np.zeros((n_rows, 0), np.int64)

    def reach(self, period: np.ndarray) -> tuple[np.ndarray, int]:
        """The counts, (n_rows, n_periods), and the number of their first period, once they cover `period` (n,)."""
        if len(period):
            self._grow(int(period.min()), int(period.max()))
        return self._counts, self._first

    def whole(self) -> tuple[np.ndarray, np.ndarray]:
        """Numbers of all periods from the first to the last with any count, and their counts (n_rows, n_periods)."""
        found = np.flatnonzero(self._counts.any(axis=0))
        low, high = (found[0], found[-1] + 1) if len(found) else (0, 0)
        return np.arange(low, high) + self._first, self._counts[:, low:high]

    def _grow(self, low: int, high: int) -> None:
        n = self._counts.shape[1]
        if not n:
            self._first = low
        before, after = max(0, self._first - low), max(0, high + 1 - self._first - n)
        if before or after:
            before += _ROOM * bool(before)
            after += _ROOM * bool(after)
            self._counts = np.pad(self._counts, ((0, 0), (before, after)))
            self._first -= before


@njit(cache=True, nogil=True)
def count_periods(period: np.ndarray, first: int, counts: np.ndarray) -> None:
    """Add one for each of `period` (n,) to `counts` (n_periods,), whose first period is `first`."""
    for row in range(len(period)):
        counts[period[row] - first] += 1


@njit(cache=True, nogil=True)
def count_values(period: np.ndarray, value: np.ndarray, first: int, counts: np.ndarray) -> None:
    """As `count_periods`, for rows whose float value (n,) is not NaN."""
    for row in range(len(period)):
        counts[period[row] - first] += value[row] == value[row]


@njit(cache=True, nogil=True)
def count_texts(
    period: np.ndarray, code: np.ndarray, is_value: np.ndarray, first: int, counts: np.ndarray
) -> None:
    """As `count_periods`, for rows whose text, by its code (n,) into `is_value`, is one; a negative code is none."""
    for row in range(len(period)):
        counts[period[row] - first] += code[row] >= 0 and is_value[code[row]]


def years_of(periods: Periods, numbers: np.ndarray) -> np.ndarray:
    """Calendar year of each period number, int64 (n,)."""
    return periods.date(numbers).astype("datetime64[Y]").astype(np.int64) + 1970


def by_year(years: np.ndarray, counts: np.ndarray, all_years: np.ndarray) -> list[int]:
    """Sums of `counts` (n,) by year, one for each of `all_years`, which are consecutive."""
    found = np.zeros(len(all_years), np.int64)
    if len(all_years):
        np.add.at(found, years - all_years[0], counts)
    return found.tolist()
