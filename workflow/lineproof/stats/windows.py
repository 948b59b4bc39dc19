"""Sums over rolling windows, compiled: the only loop over windows in the project.

Block prefix and suffix sums. Each security's periods are cut into blocks as long as the window.
Within a block, prefix sums run forwards from its start and suffix sums backwards from its end; any
window is one suffix of a block plus one prefix of the next. Nothing is ever subtracted, so an
extreme value leaves no rounding behind once it has left the window, as it would with running sums,
and nothing later than a row touches its sums, not even in the last bit. Where centring or a close
fit would cost digits, the window is summed again, pass by pass.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numba import njit, prange

# Centring within the window and taking off the fit both cancel digits. The block sums are kept
# while more than this share of the raw sum of squares is left after both: 3 digits lost at most.
_SHARE_LEFT = 1e-3
_N_SUMS = 6  # count, x, y, xx, xy, yy
_N_MOMENTS = 7  # the fields of PairMoments


@dataclass(frozen=True)
class PairMoments:
    """Moments of (x, y) in each window asked for; every array is (n_windows,).

    `n` counts complete pairs; `sxx`, `sxy`, `syy` are sums of centred squares and products, and
    `residual_ss` is the sum of squared residuals of y on [1, x] (`syy` where x is constant). Where
    `n` is 0 the rest is 0.
    """

    n: np.ndarray
    mean_x: np.ndarray
    mean_y: np.ndarray
    sxx: np.ndarray
    sxy: np.ndarray
    syy: np.ndarray
    residual_ss: np.ndarray


@dataclass(frozen=True)
class WindowEnds:
    """Where windows end: of security i at the periods `period[starts[i]:starts[i + 1]]`, ascending.

    `starts` is (n_securities + 1,), `period` int64 (n_windows,); a period need not be one in which
    the security has a row.
    """

    starts: np.ndarray
    period: np.ndarray


def pair_moments(
    starts: np.ndarray,
    period: np.ndarray,
    x: np.ndarray,
    y: np.ndarray,
    window: int,
    ends: WindowEnds | None = None,
) -> PairMoments:
    """Moments of x and y over the last `window` calendar periods, at each of `ends`.

    Parameters
    ----------
    starts : (n_securities + 1,) row at which each security begins, and the number of rows at the
        end.
    period : (n_rows,) integer calendar period, strictly increasing within a security.
    x, y : (n_rows,) float; a pair with a NaN does not count.
    window : periods in a window, at least 1; a hole in a security's history uses up its periods.
    ends : where windows end; at each row if None.

    Raises
    ------
    ValueError
        When `window` is below 1.
    """
    if window < 1:
        raise ValueError(f"a window of {window} periods")
    ends = WindowEnds(starts, period) if ends is None else ends
    out = np.zeros((_N_MOMENTS, len(ends.period)))
    _fill(
        np.ascontiguousarray(starts, np.int64),
        np.ascontiguousarray(period, np.int64),
        np.ascontiguousarray(x, np.float64),
        np.ascontiguousarray(y, np.float64),
        window,
        np.ascontiguousarray(ends.starts, np.int64),
        np.ascontiguousarray(ends.period, np.int64),
        out,
    )
    return PairMoments(out[0].astype(np.int64), *out[1:])


@njit(cache=True, parallel=True)
def _fill(starts, period, x, y, window, end_starts, ends, out):  # pragma: no cover - compiled
    for security in prange(len(starts) - 1):
        first, last = starts[security], starts[security + 1]
        begin, stop = end_starts[security], end_starts[security + 1]
        if last > first and stop > begin:
            _one_security(
                period[first:last],
                x[first:last],
                y[first:last],
                window,
                ends[begin:stop],
                out[:, begin:stop],
            )


@njit(cache=True)
def _one_security(period, x, y, window, ends, out):  # pragma: no cover - compiled
    sums = _by_period(period, x, y, max(period[-1], ends[-1]))
    prefix, suffix = _prefixes(sums, window), _suffixes(sums, window)
    total = np.empty(_N_SUMS)
    oldest, after = 0, 0  # rows of the window: oldest to the one before after
    for place in range(len(ends)):
        end = ends[place]
        while after < len(period) and period[after] <= end:
            after += 1
        while oldest < after and period[oldest] <= end - window:
            oldest += 1
        if oldest == after:
            continue
        at = end - period[0]
        total[:] = prefix[at]
        if at % window != window - 1 and at >= window:
            total += suffix[at - window + 1]
        if total[0] > 0 and not _from_sums(total, out[:, place]):
            _pass_by_pass(x[oldest:after], y[oldest:after], out[:, place])


@njit(cache=True)
def _by_period(period, x, y, last):  # pragma: no cover - compiled
    """Each period's contribution to the sums, up to `last`; zero without a complete pair."""
    sums = np.zeros((last - period[0] + 1, _N_SUMS))
    for row in range(len(period)):
        u, v = x[row], y[row]
        if not (np.isnan(u) or np.isnan(v)):
            at = period[row] - period[0]
            sums[at, 0], sums[at, 1], sums[at, 2] = 1.0, u, v
            sums[at, 3], sums[at, 4], sums[at, 5] = u * u, u * v, v * v
    return sums


@njit(cache=True)
def _prefixes(sums, window):  # pragma: no cover - compiled
    out = sums.copy()
    for at in range(1, len(sums)):
        if at % window:
            out[at] += out[at - 1]
    return out


@njit(cache=True)
def _suffixes(sums, window):  # pragma: no cover - compiled
    out = sums.copy()
    for at in range(len(sums) - 2, -1, -1):
        if at % window != window - 1:
            out[at] += out[at + 1]
    return out


@njit(cache=True)
def _from_sums(total, out):  # pragma: no cover - compiled
    """Write the moments from raw sums; False where that has cost too many digits."""
    n = total[0]
    mean_x, mean_y = total[1] / n, total[2] / n
    sxx = total[3] - mean_x * total[1]
    sxy = total[4] - mean_x * total[2]
    syy = total[5] - mean_y * total[2]
    out[0], out[1], out[2], out[3], out[4], out[5] = n, mean_x, mean_y, sxx, sxy, syy
    if sxx <= 0 or syy <= 0:
        return False
    out[6] = syy - sxy * sxy / sxx
    left = min(sxx / total[3], syy / total[5])
    return left * out[6] > _SHARE_LEFT * syy


@njit(cache=True)
def _pass_by_pass(x, y, out):  # pragma: no cover - compiled
    mean_x, mean_y = _means(x, y)
    sxx, sxy, syy = 0.0, 0.0, 0.0
    for row in range(len(x)):
        u, v = x[row] - mean_x, y[row] - mean_y
        if not np.isnan(u + v):
            sxx, sxy, syy = sxx + u * u, sxy + u * v, syy + v * v
    slope = sxy / sxx if sxx > 0 else 0.0
    residual_ss = 0.0
    for row in range(len(x)):
        residual = y[row] - mean_y - slope * (x[row] - mean_x)
        if not np.isnan(residual):
            residual_ss += residual * residual
    out[1], out[2], out[3], out[4], out[5] = mean_x, mean_y, sxx, sxy, syy
    out[6] = residual_ss


@njit(cache=True)
def _means(x, y):  # pragma: no cover - compiled
    """Means of the complete pairs, taken from the first of them: exact for constant data."""
    n, base_x, base_y, sum_x, sum_y = 0, 0.0, 0.0, 0.0, 0.0
    for row in range(len(x)):
        if not (np.isnan(x[row]) or np.isnan(y[row])):
            if n == 0:
                base_x, base_y = x[row], y[row]
            n, sum_x, sum_y = n + 1, sum_x + (x[row] - base_x), sum_y + (y[row] - base_y)
    return base_x + sum_x / n, base_y + sum_y / n


def warm_up() -> None:
    """Compile the kernels, so that no study waits for it."""
    two = np.array([0, 2])
    pair_moments(two, two, np.array([0.0, 1.0]), np.array([0.0, 1.0]), window=2)
