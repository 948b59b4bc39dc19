"""Daily rows as monthly ones: returns compounded, sizes and prices as last known."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numba import njit, prange

from lineproof.intake.chunk import Chunk
from lineproof.periods import Months

_COMPOUNDED = ("return_", "total_return")
_LAST_KNOWN = ("size", "price")


@dataclass(frozen=True)
class Compounded:
    """Months made from days.

    `months` has one row a security and month in which the security has a row, whether that has a
    return or not. For each of them `last` is the row of the daily chunk that it ends with, and
    `n_days` the days with a return: both int64 (n_months,).
    """

    months: Chunk
    last: np.ndarray
    n_days: np.ndarray


def compound_to_months(days: Chunk) -> Compounded:
    """One row a security and month, from the rows of days; `days` holds whole securities.

    A month's return is the product of 1 + r over its days with a return, less 1; it is missing
    where no day has one. `return_` and `total_return` are compounded each by itself, and `n_days`
    counts those of `return_`, or of `total_return` where that is all there is. Size and price are
    the last ones known within the month. Everything else, a final return among it, is that of the
    month's last row; the code of a missing return is so where the month's return is missing, else -1.
    """
    month = Months().number(days.day)
    first = _first_rows(days, month)
    ends = np.append(first[1:], len(days)).astype(np.int64)
    last = ends - 1
    values = {name: value[last] for name, value in days.values.items()}
    for name in _LAST_KNOWN:
        if name in values:
            values[name] = _last_known(days.values[name], first, ends)
    n_days = np.zeros(len(first), np.int64)
    for name in reversed(_COMPOUNDED):
        if name in values:
            values[name], n_days = _products(days.values[name], first, ends)
    months = Chunk(
        names=days.names,
        start=np.searchsorted(first, days.start).astype(np.int64),
        period=month[last],
        day=days.day[last],
        values=values,
        texts={name: (codes[last], texts) for name, (codes, texts) in days.texts.items()},
        code=np.where(n_days > 0, np.int8(-1), days.code[last]),
    )
    return Compounded(months, last, n_days)


def _first_rows(days: Chunk, month: np.ndarray) -> np.ndarray:
    """The first row of each security and month, int64."""
    begins = days.is_first.copy()
    begins[1:] |= month[1:] != month[:-1]
    return np.flatnonzero(begins)


@njit(cache=True, parallel=True)
def _products(returns, first, ends):  # pragma: no cover - compiled
    """Compounded return of each stretch of rows, and how many returns it has."""
    total, count = np.empty(len(first)), np.empty(len(first), np.int64)
    for at in prange(len(first)):
        growth, n = 1.0, 0
        for row in range(first[at], ends[at]):
            if not np.isnan(returns[row]):
                growth *= 1.0 + returns[row]
                n += 1
        total[at] = growth - 1.0 if n else np.nan
        count[at] = n
    return total, count


@njit(cache=True, parallel=True)
def _last_known(values, first, ends):  # pragma: no cover - compiled
    found = np.empty(len(first))
    for at in prange(len(first)):
        row = ends[at] - 1
        while row > first[at] and np.isnan(values[row]):
            row -= 1
        found[at] = values[row]
    return found
