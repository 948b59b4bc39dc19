"""How large returns typically are: counts on fine bins of size, added up block by block.

A bin is the leading bits of a float, so that adding costs a shift and no logarithm, and no value is ever
binned differently on another machine. All sums are of integers: the order of the rows and the cut into blocks leave no
trace, not even in the last bit.
"""

from __future__ import annotations

import numpy as np
from numba import njit

_FRACTION = 52  # bits of the fraction of a float64
_FINE, _COARSE = (
    11,
    4,
)  # leading bits of the fraction that tell bins apart: 0.05 % and 6 % wide at most
_REACH = 40  # sizes from 2^-40 to 2^40; those beyond count in the outermost bins
_BASE = (1023 - _REACH) << _FINE
_N_FINE = 2 * _REACH << _FINE
_N_COARSE = 2 * _REACH << _COARSE
_DROP = _FRACTION - _FINE
_KEPT = 20  # bits of a value's place inside its bin; 2^43 rows of one bin can be added up
_MONTHS = (1800 * 12, 2201 * 12)  # as periods.Months counts them


class ScaleEvidence:
    """Sizes of returns, over all and by month.

    Zeros and missing values are counted but say nothing of the unit. Memory is bounded: some 4 MB, and 5 KB for each
    calendar month between the first and the last.
    """

    def __init__(self) -> None:
        self.counts = np.zeros((2, _N_FINE), np.int64)  # above zero, below zero
        self._inside = np.zeros(_N_FINE, np.int64)  # sums of places inside the bin
        self._aside = np.zeros(2, np.int64)  # zeros, missing
        self._first = -1
        self._monthly = np.zeros((0, _N_COARSE), np.int32)

    def add(self, month: np.ndarray, decimal: np.ndarray) -> None:
        """Take in some rows: their months as `periods.Months` numbers them, int64, −1 where unknown; and their
        returns, float64, NaN where missing. Both (n_rows,), in any order."""
        month = np.ascontiguousarray(month, np.int64)
        decimal = np.ascontiguousarray(decimal, np.float64)
        first, last = _span(month)
        if first <= last:
            self._reach(first, last)
        _count(
            month,
            self._first,
            decimal.view(np.int64),
            self.counts,
            self._inside,
            self._aside,
            self._monthly,
        )

    def merge(self, other: ScaleEvidence) -> None:
        """Add what another one has seen."""
        self.counts += other.counts
        self._inside += other._inside
        self._aside += other._aside
        if other._first >= 0:
            n_months = len(other._monthly)
            self._reach(other._first, other._first + n_months - 1)
            start = other._first - self._first
            self._monthly[start : start + n_months] += other._monthly

    def _reach(self, first: int, last: int) -> None:
        """Make room for the months from first to last."""
        if self._first < 0:
            self._first = first
        before = max(0, self._first - first)
        after = max(0, last - (self._first + len(self._monthly) - 1))
        if before or after:
            self._monthly = np.pad(self._monthly, ((before, after), (0, 0)))
            self._first -= before

    @property
    def n(self) -> int:
        """Returns that are neither zero nor missing."""
        return int(self.counts.sum())

    @property
    def n_zero(self) -> int:
        return int(self._aside[0])

    @property
    def n_missing(self) -> int:
        return int(self._aside[1])

    @property
    def share_negative(self) -> float:
        """Of the returns that are neither zero nor missing; NaN without any."""
        return float(self.counts[1].sum() / self.n) if self.n else np.nan

    def quantile(self, level: float) -> float:
        """Quantile of |return| over all returns but zeros, linear between order statistics; NaN without any.

        Each order statistic is known to 0.05 %, and exactly to the eye where its bin holds no other value.
        """
        n = self.n
        if n == 0:
            return np.nan
        reached = np.cumsum(self.counts.sum(axis=0))
        at = (n - 1) * level
        below, above = (
            self._value(int(np.searchsorted(reached, rank, "right")))
            for rank in (int(np.floor(at)), int(np.ceil(at)))
        )
        return below + (at - np.floor(at)) * (above - below)

    def _value(self, index: int) -> float:
        """The mean of the sizes in a fine bin."""
        inside = int(self._inside[index]) // int(self.counts[:, index].sum())
        return _as_float(((index + _BASE) << _DROP) + (inside << (_DROP - _KEPT)))

    def below(self, size: float) -> tuple[int, float]:
        """How many returns lie beyond the bin of −`size`; and the largest share of them in one bin, as where they are
        a code for a missing value that nobody declared."""
        beyond = self.counts[1, (int(np.float64(size).view(np.int64)) >> _DROP) - _BASE + 1 :]
        n = int(beyond.sum())
        return n, float(beyond.max() / n) if n else 0.0

    def by_month(self) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
        """Months from first to last, how many returns each has that are neither zero nor missing, both int64
        (n_months,), and their median size, float64, to 3 %, NaN without any."""
        months = self._first + np.arange(len(self._monthly))
        n = self._monthly.sum(axis=1, dtype=np.int64)
        middle = [coarse_median(row) for row in self._monthly]
        return months, n, np.array(middle, np.float64)


def coarse_median(counts: np.ndarray) -> float:
    """Middle of the bin that holds the lower median, from counts on coarse bins; NaN if all are zero."""
    reached = np.cumsum(counts, dtype=np.int64)
    if reached[-1] == 0:
        return np.nan
    index = int(np.searchsorted(reached, (reached[-1] - 1) // 2, "right"))
    drop = _FRACTION - _COARSE
    return _as_float(((index + (_BASE >> (_FINE - _COARSE))) << drop) + (1 << (drop - 1)))


def _as_float(bits: int) -> float:
    return float(np.int64(bits).view(np.float64))


_SIGN = np.int64(0x7FFFFFFFFFFFFFFF)
_INFINITE = np.int64(0x7FF0000000000000)


@njit(cache=True, nogil=True)
def _span(month):  # pragma: no cover - compiled
    """The first and the last month that is one; the first is later than the last where there is none."""
    first, last = _MONTHS[1], _MONTHS[0]
    for i in range(len(month)):
        if _MONTHS[0] <= month[i] < _MONTHS[1]:
            first, last = min(first, month[i]), max(last, month[i])
    return first, last


@njit(cache=True, nogil=True)
def _count(month, first, bits, counts, inside, aside, monthly):  # pragma: no cover - compiled
    for i in range(len(bits)):
        size = bits[i] & _SIGN
        if size >= _INFINITE:
            aside[1] += 1
            continue
        if size == 0:
            aside[0] += 1
            continue
        index = min(max((size >> _DROP) - _BASE, 0), _N_FINE - 1)
        counts[1 if bits[i] < 0 else 0, index] += 1
        inside[index] += (size >> (_DROP - _KEPT)) & ((1 << _KEPT) - 1)
        place = month[i] - first
        if 0 <= place < len(monthly):
            monthly[place, index >> (_FINE - _COARSE)] += 1


@njit(cache=True, nogil=True)
def medians_by_run(start, value):  # pragma: no cover - compiled
    """Count and median size of the values that are neither zero nor missing, in each run of rows.

    `start` is int64 (n_runs + 1,), `value` float64 (n_rows,). Returns int64 and float64 (n_runs,); NaN without any.
    The median is the lower one.
    """
    n_runs = len(start) - 1
    n, middle = np.zeros(n_runs, np.int64), np.full(n_runs, np.nan)
    for run in range(n_runs):
        size = np.empty(start[run + 1] - start[run])
        for i in range(start[run], start[run + 1]):
            if np.isfinite(value[i]) and value[i] != 0:
                size[n[run]] = abs(value[i])
                n[run] += 1
        if n[run]:
            place = (n[run] - 1) // 2
            middle[run] = np.partition(size[: n[run]], place)[place]
    return n, middle
