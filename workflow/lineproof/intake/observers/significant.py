"""A histogram in which every bin is one number of four significant decimal digits, cut off.

Rounding a bin to three digits or fewer gives what rounding the value itself gives, so quantiles print exactly. Counts
are integers: histograms add up to the same whatever the order. A value is nudged by a part in 10¹² before it is cut
off, so that 0.1235, which binary numbers hold only nearly, counts as 0.1235.
"""

from __future__ import annotations

import math

import numpy as np
from numba import njit

_PER_POWER = 9_000  # 1.000 to 9.999
_LEAST, _MOST = -9, 7  # powers of ten told apart: nearer to zero counts as zero, further as 9.999e7
N_BINS = 2 * _PER_POWER * (_MOST - _LEAST + 1) + 1
ZERO_BIN = N_BINS // 2
_NUDGE = 1 + 1e-12
_POWERS = 10.0 ** np.arange(_LEAST, _MOST + 2)
_SCALES = 1000.0 / _POWERS  # take a number of that power to four digits before the point
# For each binary exponent, as a float holds it, the power of ten that its smallest number reaches.
_GUESS = np.array([math.floor((held - 1023) * math.log10(2)) for held in range(2048)], np.int64)


@njit(cache=True, nogil=True)
def bin_of(value: float, exponent: int) -> int:
    """The bin of a value that is not NaN, whose binary exponent, as a float holds it, is `exponent`."""
    size, power = abs(value) * _NUDGE, _GUESS[exponent]
    if _LEAST - 1 <= power <= _MOST and size >= _POWERS[power + 1 - _LEAST]:
        power += 1
    if power < _LEAST:
        return ZERO_BIN
    if power > _MOST:
        place = _PER_POWER * (_MOST - _LEAST + 1)
    else:
        digits = int(size * _SCALES[power - _LEAST])
        place = _PER_POWER * (power - _LEAST) + min(max(digits, 1_000), 9_999) - 999
    return ZERO_BIN + place if value > 0 else ZERO_BIN - place


def value_of(place: int) -> float:
    """The number that a bin stands for, as the float nearest to its decimal digits."""
    away = abs(place - ZERO_BIN)
    if not away:
        return 0.0
    power, digits = divmod(away - 1, _PER_POWER)
    size = float(f"{digits + 1000}e{power + _LEAST - 3}")
    return size if place > ZERO_BIN else -size


def quantiles(counts: np.ndarray, shares: list[float]) -> list[float | None]:
    """For each share, the smallest value that at least this share of all do not exceed; None where there are none.

    `counts` is int64 (N_BINS,). This is the inverse of the empirical distribution function, definition 1 of Hyndman
    and Fan 1996.
    """
    below = np.cumsum(counts)
    n = int(below[-1])
    if not n:
        return [None] * len(shares)
    ranks = [max(1, math.ceil(share * n - 1e-9)) for share in shares]
    return [value_of(int(np.searchsorted(below, rank))) for rank in ranks]
