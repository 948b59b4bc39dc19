"""The distribution of returns by decade."""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np
from numba import njit

from lineproof.intake.chunk import Chunk
from lineproof.intake.observers.counting import years_of
from lineproof.intake.observers.significant import N_BINS, bin_of, quantiles
from lineproof.intake.record import DecadeEvidence
from lineproof.periods import Periods

SHARES = [0.01, 0.05, 0.25, 0.5, 0.75, 0.95, 0.99]
_SPLIT = 134_217_729.0  # 2**27 + 1, which parts a float into halves (Dekker 1971)


class Distribution:
    """Counts, moments, extremes and quantiles of total returns, by decade.

    Sums run row by row in the order of the panel, and are carried from chunk to chunk, so the cut into chunks plays
    no part, not even in the last bit. What each addition and each square rounds off is summed beside (Knuth 1969,
    Dekker 1971), so that mean and standard deviation are right to the last digits of a float. Quantiles come from
    integer counts in bins of four significant digits. Memory is one histogram a decade.
    """

    def __init__(self, periods: Periods) -> None:
        self._periods = periods
        self._decades: dict[int, int] = {}  # first year → its slot
        self._bins = np.zeros((0, N_BINS), np.int64)
        self._counts = np.zeros((0, 3), np.int64)  # with a return, missing, zero
        self._sums = np.zeros((0, 4))  # of returns and of squares, each with what was rounded off
        self._ends = np.zeros((0, 2))  # least and greatest

    def see(self, chunk: Chunk) -> None:
        """Take in the returns of one chunk."""
        if not len(chunk):
            return
        low, high = int(chunk.period.min()), int(chunk.period.max())
        decade = years_of(self._periods, np.arange(low, high + 1)) // 10 * 10
        slots = {each: self._slot(each) for each in np.unique(decade).tolist()}
        slot = np.array([slots[each] for each in decade.tolist()])
        value = np.ascontiguousarray(chunk.values["total_return"], np.float64)
        _add(
            value, value.view(np.int64), chunk.period, low, slot,
            self._bins, self._counts, self._sums, self._ends,
        )  # fmt: skip

    def result(self) -> list[DecadeEvidence]:
        """One entry a decade that has rows, in order."""
        return [
            self._decade(decade, slot)
            for decade, slot in sorted(self._decades.items())
            if self._counts[slot, :2].any()
        ]

    def _slot(self, decade: int) -> int:
        if decade not in self._decades:
            self._decades[decade] = len(self._decades)
            self._bins = np.pad(self._bins, ((0, 1), (0, 0)))
            self._counts = np.pad(self._counts, ((0, 1), (0, 0)))
            self._sums = np.pad(self._sums, ((0, 1), (0, 0)))
            self._ends = np.vstack([self._ends, [np.inf, -np.inf]])
        return self._decades[decade]

    def _decade(self, decade: int, slot: int) -> DecadeEvidence:
        n, n_missing, n_zero = self._counts[slot].tolist()
        mean, sd = _moments(n, self._sums[slot].tolist())
        least, greatest = (end if math.isfinite(end) else None for end in self._ends[slot].tolist())
        found = quantiles(self._bins[slot], SHARES)
        return {
            "decade": decade,
            "n": n,
            "n_missing": n_missing,
            "n_zero": n_zero,
            "mean": mean,
            "sd": sd,
            "min": least,
            "max": greatest,
            "quantiles": {str(share): value for share, value in zip(SHARES, found, strict=True)},
        }


def _moments(n: int, sums: list[float]) -> tuple[float | None, float | None]:
    """Mean and standard deviation (n − 1) from sums and what was rounded off them; None where undefined."""
    if not n or not all(map(math.isfinite, sums)):
        return None, None
    first, first_off, second, second_off = map(Fraction, sums)
    total = first + first_off
    spread = second + second_off - total * total / n
    sd = math.sqrt(max(spread, Fraction(0)) / (n - 1)) if n > 1 else None
    return float(total / n), sd


@njit(cache=True, nogil=True)
def _add(value, bits, period, low, slot, bins, counts, sums, ends):
    """Add each row to the slot of its period; `bits` is `value` (n,) seen as integers."""
    row, n = 0, len(value)
    while row < n:
        at = slot[period[row] - low]
        first, first_off, second, second_off = sums[at]
        least, greatest = ends[at]
        while (
            row < n and slot[period[row] - low] == at
        ):  # a stretch of one decade, its sums at hand
            x = value[row]
            if x == x:
                counts[at, 0] += 1
                counts[at, 2] += x == 0.0
                bins[at, bin_of(x, (bits[row] >> 52) & 2047)] += 1
                least, greatest = min(least, x), max(greatest, x)
                square = x * x
                high = _SPLIT * x
                high = high - (high - x)
                rest = x - high
                second_off += ((high * high - square) + 2.0 * high * rest) + rest * rest
                first, off = _two_sum(first, x)
                first_off += off
                second, off = _two_sum(second, square)
                second_off += off
            else:
                counts[at, 1] += 1
            row += 1
        sums[at] = (first, first_off, second, second_off)
        ends[at] = (least, greatest)


@njit(cache=True, nogil=True, inline="always")
def _two_sum(a, b):
    """a + b as a float, and exactly what that rounds off (Knuth 1969)."""
    total = a + b
    part = total - a
    return total, (a - (total - part)) + (b - part)
