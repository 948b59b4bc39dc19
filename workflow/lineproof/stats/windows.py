"""Least squares over rolling windows, compiled: the only loop over windows in the project.

Block prefix and suffix sums. A security's periods are cut into blocks as long as the window. Within a block, prefix
sums run forwards from its start and suffix sums backwards from its end; any window is one suffix of a block plus one
prefix of the next, each faded by its age where weights decay. Nothing is ever subtracted, so an extreme value leaves
no rounding behind once it has left the window, as it would with running sums, and nothing later than a window touches
its sums, not even in the last bit.

What the sums hold of the factors alone depends on the date only while a window has no gap: it is then taken from one
table by date, made for all securities together. Where centring or a close fit would cost digits, the window is fitted
again from its own observations, by orthogonal columns.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numba import njit, prange

# Centring within the window and taking off the fit both cancel digits. The block sums are kept while more than this
# share of the raw sum of squares is left after both: 3 digits lost at most.
_SHARE_LEFT = 1e-3
# A factor whose standard deviation is below this, relative to its level (and to 1), only rounds; one of which the
# other factors leave a smaller share than this is a mixture of them.
_ROUNDING = 1e-12
_MIXTURE = 1e-10

SLOPES, NEIGHBOURS, MOMENTS = range(3)  # what is made of a window: see `fit_windows`
ALL, BELOW_MEAN = range(2)  # which observations of a window count
TOO_FEW, NO_VARIATION, FITTED = range(3)
_N_OUT = 6

_compiled = njit(cache=True, error_model="numpy")
_parallel = njit(cache=True, error_model="numpy", parallel=True)
_inlined = njit(
    cache=True, error_model="numpy", forceinline=True
)  # or each call passes every array part by part


@dataclass(frozen=True)
class Sample:
    """Returns of securities and the factors of the periods they lie in.

    Of security i the rows are `starts[i]` to `starts[i + 1]` (exclusive); `period` (n_rows,) strictly increases
    within a security, and numbers the rows of `factors` (n_periods, n_factors), the market first. `excess` is
    (n_rows,). Where any of them is NaN the observation does not count.
    """

    starts: np.ndarray
    period: np.ndarray
    excess: np.ndarray
    factors: np.ndarray


@dataclass(frozen=True)
class WindowEnds:
    """Where windows end: of security i at the periods `period[starts[i]:starts[i + 1]]`, ascending.

    `starts` is (n_securities + 1,), `period` int64 (n_windows,); a period need not be one in which the security has a
    row.
    """

    starts: np.ndarray
    period: np.ndarray


@dataclass(frozen=True)
class Windows:
    """What was made of the windows numbered `row` (n_fitted,): `values` (6, n_fitted) and `n_obs` int64 (n_fitted,).

    Unless window ends were given, windows are numbered as the rows they end at. `n_too_few` and `n_no_variation` count
    the others.
    """

    row: np.ndarray
    values: np.ndarray
    n_obs: np.ndarray
    n_too_few: int
    n_no_variation: int


def fit_windows(
    sample: Sample,
    *,
    window: int,
    min_obs: int,
    ends: WindowEnds | None = None,
    sum_of: np.ndarray | None = None,
    what: int = SLOPES,
    which: int = ALL,
    half_life: float | None = None,
) -> Windows:
    """Regress returns on a constant and the factors over the last `window` calendar periods, at each of `ends`.

    Parameters
    ----------
    window, min_obs : periods in a window, and fewest observations in it (more than the coefficients, by one).
    ends : where windows end; at each row if None.
    sum_of : (n_factors,) the weights by which slopes are added up to beta; the first alone if None.
    what : `SLOPES` and `NEIGHBOURS` give beta, alpha, its standard error, R² and the residuals' standard deviation.
        `NEIGHBOURS` takes three factors, the market a period before, in the same period, and a period after, and
        divides the sum of its three single slopes by 1 + 2ρ. `MOMENTS` takes one factor and gives the means of factor
        and returns, centred sums of squares and products xx, xy and yy, and the sum of squared residuals.
    which : `BELOW_MEAN` uses only periods with the first factor below its mean in the window.
    half_life : periods after which a weight is half; None for equal weights.

    Notes
    -----
    Weights count relative to their mean, so residual variance has the degrees of freedom of as many observations.
    `NEIGHBOURS` has residuals from alpha + beta × market, and the exact variance of its slope for errors of one
    variance, the market given.

    Raises
    ------
    ValueError
        When a window has no period, or `min_obs` is too small for a standard error.
    """
    if window < 1:
        raise ValueError(f"a window of {window} periods")
    fewest = sample.factors.shape[1] + 2 if what == SLOPES else 3
    if min_obs < fewest and what != MOMENTS:
        raise ValueError(
            f"at least {fewest} observations are needed for a standard error, not {min_obs}"
        )
    ends = WindowEnds(sample.starts, sample.period) if ends is None else ends
    factors = _plain(sample.factors, np.float64)
    n_factors = factors.shape[1]
    first = np.zeros(n_factors)
    first[0] = 1.0
    period = _plain(ends.period, np.int64)
    powers = 0.5 ** (np.arange(window + 1) / (half_life or np.inf))
    wanted = np.zeros(len(factors), np.bool_)
    if which == ALL:
        wanted[period[(period >= window - 1) & (period < len(factors))]] = True
    values = np.empty((_N_OUT, len(period)))
    n_obs = np.empty(len(period), np.int64)
    state = np.empty(len(period), np.int8)
    _fit_all(
        _plain(sample.starts, np.int64),
        _plain(sample.period, np.int64),
        _plain(sample.excess, np.float64),
        factors,
        ~np.isnan(factors).any(axis=1),
        _by_date(factors, wanted, powers),
        powers,
        (window, min_obs, what, which),
        first if sum_of is None else _plain(sum_of, np.float64),
        _plain(ends.starts, np.int64),
        period,
        values,
        n_obs,
        state,
    )
    row = np.flatnonzero(state == FITTED)
    if len(row) < len(state):
        _close_ranks(values, n_obs, row)
        values, n_obs = values[:, : len(row)], n_obs[: len(row)]
    n_too_few = int((state == TOO_FEW).sum())
    return Windows(row, values, n_obs, n_too_few, len(state) - len(row) - n_too_few)


def _plain(values: np.ndarray, dtype: type) -> np.ndarray:
    """As the kernels are compiled for: contiguous and writable."""
    return np.require(values, dtype, ["C", "W"])


@_parallel
def _close_ranks(values, n_obs, row):  # pragma: no cover - compiled
    """Move what belongs to `row`, ascending, to the front."""
    for line in prange(_N_OUT + 1):
        for place in range(len(row)):
            if line < _N_OUT:
                values[line, place] = values[line, row[place]]
            else:
                n_obs[place] = n_obs[row[place]]


@_parallel
def _by_date(factors, wanted, powers):  # pragma: no cover - compiled
    """What whole windows that end at the wanted dates share, a line a date: the share left by centring (0 where there
    is no such window, or it needs care), the sum of weights, means, and centred products with their inverse."""
    n_dates, k = factors.shape
    window = len(powers) - 1
    out = np.zeros((n_dates, 2 + k + 2 * k * k))
    for date in prange(n_dates):
        if wanted[date]:
            _one_date(factors[date - window + 1 : date + 1], powers, out[date])
    return out


@_compiled
def _one_date(x, powers, out):  # pragma: no cover - compiled
    n, k = x.shape
    weight = 0.0
    for row in range(n):
        weight += powers[n - 1 - row]
        for i in range(k):
            if np.isnan(x[row, i]):
                return
    mean, raw = out[2 : 2 + k], np.zeros(k)
    products = out[2 + k : 2 + k + k * k].reshape(k, k)
    for i in range(k):
        for row in range(n):
            mean[i] += powers[n - 1 - row] * (x[row, i] - x[0, i])
            raw[i] += powers[n - 1 - row] * x[row, i] * x[row, i]
        mean[i] = x[0, i] + mean[i] / weight
    for i in range(k):
        for j in range(i + 1):
            for row in range(n):
                u, v = x[row, i] - mean[i], x[row, j] - mean[j]
                products[i, j] += powers[n - 1 - row] * u * v
            products[j, i] = products[i, j]
    inverse = out[2 + k + k * k :].reshape(k, k)
    inverse[:] = products
    out[1] = weight
    out[0] = _invert(inverse, raw)


@_compiled
def _invert(matrix, raw):  # pragma: no cover - compiled
    """Invert a positive definite matrix in place; the smallest pivot relative to `raw`, 0 where there is none."""
    k, left = len(raw), 1.0
    for p in range(k):
        pivot = matrix[p, p]
        if not pivot > _SHARE_LEFT * raw[p]:
            return 0.0
        left = min(left, pivot / raw[p])
        matrix[p, p] = 1.0
        for j in range(k):
            matrix[p, j] /= pivot
        for i in range(k):
            if i != p:
                factor = matrix[i, p]
                matrix[i, p] = 0.0
                for j in range(k):
                    matrix[i, j] -= factor * matrix[p, j]
    return left


@_parallel
def _fit_all(
    starts, period, y, factors, known, dates, powers, how, sum_of, end_starts, ends, out, n, state
):  # pragma: no cover - compiled
    for security in prange(len(starts) - 1):
        first, last = starts[security], starts[security + 1]
        begin, stop = end_starts[security], end_starts[security + 1]
        if stop > begin:
            place, own = np.empty(last - first, np.int64), np.empty(last - first)
            size = 0
            for row in range(first, last):
                if known[period[row]] and not np.isnan(y[row]):
                    place[size], own[size] = period[row], y[row]
                    size += 1
            _fit_one(
                place[:size],
                own[:size],
                factors,
                dates,
                powers,
                how,
                sum_of,
                ends[begin:stop],
                out[:, begin:stop],
                n[begin:stop],
                state[begin:stop],
            )


@_compiled
def _fit_one(
    period, y, x, dates, powers, how, sum_of, ends, out, n, state
):  # pragma: no cover - compiled
    """All windows of one security, from its complete observations."""
    window, min_obs, what, which = how
    k = x.shape[1]
    n_sums = 3 + 2 * k + k * (k + 1) // 2
    lines = min(window, len(period)) + 3  # of suffixes, then the prefix and the window's own total
    sums, held = np.empty((lines, n_sums)), np.full((2, 3), -1)
    s, mean, products = np.empty(k), np.empty(k), np.empty((k, k))
    inverse, raw = np.empty((k, k)), np.empty(k)
    start = period[0] if len(period) else 0  # of the window's block
    oldest, low, middle, after = (
        0,
        0,
        0,
        0,
    )  # rows: of the window, its block before, its block, the first one after it
    for place in range(len(ends)):
        end = ends[place]
        while after < len(period) and period[after] <= end:
            after += 1
        while oldest < after and period[oldest] <= end - window:
            oldest += 1
        n[place] = after - oldest
        state[place] = TOO_FEW
        if n[place] < max(min_obs, 1):
            continue
        if end >= start + window:  # a block is done
            start += (end - start) // window * window
        while middle < len(period) and period[middle] < start:
            middle += 1
        while low < middle and period[low] < start - window:
            low += 1
        if which == ALL:
            _sum_up(0, period, x, y, powers, start, end, low, middle, oldest, after, sums, held)
            weight, left = 0.0, 0.0
            if n[place] == window and dates[end, 0] > 0:
                left, weight = dates[end, 0], dates[end, 1]
                for i in range(k):
                    mean[i] = dates[end, 2 + i]
                    for j in range(k):
                        products[i, j] = dates[end, 2 + k + i * k + j]
                        inverse[i, j] = dates[end, 2 + k + k * k + i * k + j]
            else:
                _sum_up(1, period, x, y, powers, start, end, low, middle, oldest, after, sums, held)
                weight, left = _centre(sums, mean, products, inverse, raw)
            if left > 0 and _from_sums(
                what,
                n[place],
                sums,
                weight,
                left,
                mean,
                products,
                inverse,
                sum_of,
                s,
                out,
                place,
            ):
                state[place] = FITTED
                continue
        n[place], state[place] = _fit_again(
            period[oldest:after], y[oldest:after], x, powers, end, how, sum_of, out, place
        )


@_inlined
def _sum_up(
    part, period, x, y, powers, start, end, low, middle, oldest, after, sums, held
):  # pragma: no cover - compiled
    """Write to the last line the sums of the window: a suffix of the block before and a prefix of its own block.

    `held` says which block the prefix is of, to which row it reaches, and which block the suffixes are of.
    """
    k = x.shape[1]
    first = (2 + k) * part
    stop = sums.shape[1] if part else 2 + k
    prefix, total = len(sums) - 2, len(sums) - 1
    if held[part, 0] != start:
        held[part, 0], held[part, 1] = start, middle
        for c in range(first, stop):
            sums[prefix, c] = 0.0
    for row in range(held[part, 1], after):
        fade = powers[period[row] - period[row - 1]] if row > middle else 1.0
        _add_terms(part, x, period[row], y[row], 1.0, sums, prefix, fade, prefix)
    held[part, 1] = max(held[part, 1], after)
    fade = powers[end - period[after - 1]] if after > middle else 0.0
    for c in range(first, stop):
        sums[total, c] = fade * sums[prefix, c]
    if oldest >= middle:
        return
    if held[part, 2] != start:
        held[part, 2] = start
        for c in range(first, stop):
            sums[middle - low, c] = 0.0
        for row in range(middle - 1, low - 1, -1):
            weight, at = powers[start - 1 - period[row]], row - low
            _add_terms(part, x, period[row], y[row], weight, sums, at + 1, 1.0, at)
    fade = powers[end - start + 1]
    for c in range(first, stop):
        sums[total, c] += fade * sums[oldest - low, c]


@_inlined
def _add_terms(part, x, p, y, weight, sums, of, fade, into):  # pragma: no cover - compiled
    """Add an observation to a line, faded: y, yy and each xy; or, of factors alone, the weight, each x and product."""
    k = x.shape[1]
    if part == 0:
        v = weight * y
        sums[into, 0] = fade * sums[of, 0] + v
        sums[into, 1] = fade * sums[of, 1] + v * y
        for i in range(k):
            sums[into, 2 + i] = fade * sums[of, 2 + i] + v * x[p, i]
        return
    sums[into, 2 + k] = fade * sums[of, 2 + k] + weight
    c = 3 + 2 * k
    for i in range(k):
        u = weight * x[p, i]
        sums[into, 3 + k + i] = fade * sums[of, 3 + k + i] + u
        for j in range(i + 1):
            sums[into, c] = fade * sums[of, c] + u * x[p, j]
            c += 1


@_inlined
def _centre(sums, mean, products, inverse, raw):  # pragma: no cover - compiled
    """Means and centred products from raw sums; the sum of weights, and the share that centring left."""
    k, total = len(mean), len(sums) - 1
    weight, c = sums[total, 2 + k], 3 + 2 * k
    for i in range(k):
        mean[i] = sums[total, 3 + k + i] / weight
        for j in range(i + 1):
            product = sums[total, c] - mean[i] * sums[total, 3 + k + j]
            products[i, j], products[j, i] = product, product
            inverse[i, j], inverse[j, i] = product, product
            if i == j:
                raw[i] = sums[total, c]
            c += 1
    return weight, _invert(inverse, raw)


@_inlined
def _from_sums(
    what, n, sums, weight, left, mean, products, inverse, sum_of, s, out, place
):  # pragma: no cover - compiled
    """Write what is asked for; False where that would have cost too many digits."""
    k, total = len(mean), len(sums) - 1
    sum_y, square_y = sums[total, 0], sums[total, 1]
    mean_y = sum_y / weight
    syy = square_y - mean_y * sum_y
    if not syy > 0:
        return False
    explained = 0.0
    for i in range(k):
        s[i] = sums[total, 2 + i] - mean[i] * sum_y
    for i in range(k):
        for j in range(k):
            explained += s[i] * inverse[i, j] * s[j]
    rest = syy - explained
    if not min(left, syy / square_y) * rest > _SHARE_LEFT * syy:
        return False
    if what == SLOPES:
        beta, alpha, variance = 0.0, mean_y, 0.0
        for i in range(k):
            slope = 0.0
            for j in range(k):
                slope += inverse[i, j] * s[j]
                variance += sum_of[i] * inverse[i, j] * sum_of[j]
            beta += sum_of[i] * slope
            alpha -= slope * mean[i]
        _write(beta, alpha, variance, explained, rest, syy, n, n / weight, k + 1, out, place)
        return True
    if what == MOMENTS:
        _write_moments(mean[0], mean_y, products[0, 0], s[0], syy, rest, out, place)
        return True
    beta, variance = _of_neighbours(products, s)
    gap = beta - s[1] / products[1, 1]
    rest = syy - s[1] * s[1] / products[1, 1] + gap * gap * products[1, 1]
    if not variance > 0:
        return False
    alpha = mean_y - beta * mean[1]
    _write(beta, alpha, variance, syy - rest, rest, syy, n, n / weight, 2, out, place)
    return True


@_compiled
def _of_neighbours(products, s):  # pragma: no cover - compiled
    """The sum of three single slopes over 1 + 2ρ, and its variance for errors of variance one (0 where undefined)."""
    rho = products[0, 1] / np.sqrt(products[0, 0] * products[1, 1])
    scale = 1 + 2 * rho
    if not scale > 0:
        return 0.0, 0.0
    beta, variance = 0.0, 0.0
    for i in range(3):
        beta += s[i] / products[i, i]
        for j in range(3):
            variance += products[i, j] / (products[i, i] * products[j, j])
    return beta / scale, variance / (scale * scale)


@_inlined
def _write(
    beta, alpha, variance, explained, rest, syy, n, unit, used, out, place
):  # pragma: no cover - compiled
    """Beta to residual standard deviation; `unit` makes the mean weight one, `used` counts the coefficients."""
    out[0, place], out[1, place] = beta, alpha
    out[2, place] = np.sqrt(variance * rest / (n - used))
    out[3, place] = min(max(explained / syy, 0.0), 1.0) if syy > 0 else 0.0
    out[4, place] = np.sqrt(unit * rest / (n - used))


@_inlined
def _write_moments(mean_x, mean_y, sxx, sxy, syy, rest, out, place):  # pragma: no cover - compiled
    out[0, place], out[1, place], out[2, place] = mean_x, mean_y, sxx
    out[3, place], out[4, place], out[5, place] = sxy, syy, rest


@_compiled
def _fit_again(period, y, x, powers, end, how, sum_of, out, place):  # pragma: no cover - compiled
    """A window by itself, pass by pass: centre, make the factors orthogonal, take off the fit. Gives n and state."""
    _, min_obs, what, which = how
    n, k = len(period), x.shape[1]
    columns, weights = np.empty((k + 1, n)), np.empty(n)
    limit = np.inf if which == ALL else _mean_of(x, period)
    size = 0
    for row in range(n):
        if x[period[row], 0] < limit:
            weights[size] = powers[end - period[row]]
            for i in range(k):
                columns[i, size] = x[period[row], i]
            columns[k, size] = y[row]
            size += 1
    if size < min_obs:
        return size, TOO_FEW
    columns, weights = columns[:, :size], weights[:size]
    weight = 0.0
    for row in range(size):
        weight += weights[row]
    means, products = np.empty(k + 1), np.empty((k + 1, k + 1))
    for i in range(k + 1):
        means[i] = _centre_column(columns, i, weights, weight)
    for i in range(k + 1):
        for j in range(k + 1):
            products[i, j] = _product(columns, i, j, weights)
    for i in range(k):
        if not products[i, i] > _ROUNDING**2 * weight * (1 + means[i] ** 2):
            return size, NO_VARIATION
    if what == NEIGHBOURS:
        beta, variance = _of_neighbours(products[:k, :k], products[k, :k])
        if not variance > 0:
            return size, NO_VARIATION
        for row in range(size):
            columns[k, row] -= beta * columns[1, row]
        rest, alpha = _product(columns, k, k, weights), means[k] - beta * means[1]
        syy = products[k, k]
        _write(beta, alpha, variance, syy - rest, rest, syy, size, size / weight, 2, out, place)
        return size, FITTED
    slopes = np.empty(k)
    variance = _orthogonal_fit(columns, weights, products, sum_of, slopes)
    if not variance >= 0:
        return size, NO_VARIATION
    rest = _product(columns, k, k, weights)
    syy = products[k, k]
    if what == MOMENTS:
        _write_moments(means[0], means[1], products[0, 0], products[0, 1], syy, rest, out, place)
        return size, FITTED
    beta, alpha = 0.0, means[k]
    for i in range(k):
        beta += sum_of[i] * slopes[i]
        alpha -= slopes[i] * means[i]
    _write(beta, alpha, variance, syy - rest, rest, syy, size, size / weight, k + 1, out, place)
    return size, FITTED


@_compiled
def _mean_of(x, period):  # pragma: no cover - compiled
    total = 0.0
    for row in range(len(period)):
        total += x[period[row], 0] - x[period[0], 0]
    return x[period[0], 0] + total / len(period)


@_compiled
def _centre_column(columns, i, weights, weight):  # pragma: no cover - compiled
    """Take off the mean, and give it; it is taken from the first value: exact for constant data."""
    base, total = columns[i, 0], 0.0
    for row in range(len(weights)):
        total += weights[row] * (columns[i, row] - base)
    mean = base + total / weight
    for row in range(len(weights)):
        columns[i, row] -= mean
    return mean


@_compiled
def _product(columns, i, j, weights):  # pragma: no cover - compiled
    total = 0.0
    for row in range(len(weights)):
        total += weights[row] * columns[i, row] * columns[j, row]
    return total


@_compiled
def _orthogonal_fit(columns, weights, products, sum_of, slopes):  # pragma: no cover - compiled
    """Turn centred columns into orthogonal ones, the last into residuals; the variance of the summed slopes for errors
    of variance one, −1 where a factor is a mixture of others."""
    k = len(columns) - 1
    shares, squares = np.zeros((k + 1, k + 1)), np.zeros(k)
    for j in range(k + 1):
        for _ in range(2):  # the second time takes off what rounding left
            for i in range(j):
                share = _product(columns, i, j, weights) / squares[i]
                shares[i, j] += share
                for row in range(len(weights)):
                    columns[j, row] -= share * columns[i, row]
        if j < k:
            squares[j] = _product(columns, j, j, weights)
            if not squares[j] > _MIXTURE**2 * products[j, j]:
                return -1.0
    part, variance = sum_of.copy(), 0.0
    for j in range(k):
        for i in range(j):
            part[j] -= shares[i, j] * part[i]
        variance += part[j] * part[j] / squares[j]
    for j in range(k - 1, -1, -1):
        slopes[j] = shares[j, k]
        for i in range(j + 1, k):
            slopes[j] -= shares[j, i] * slopes[i]
    return variance


def warm_up() -> None:
    """Compile the kernels, so that no study waits for it."""
    rows = np.arange(4)
    sample = Sample(np.array([0, 4]), rows, rows**2.0, np.sin(rows)[:, None])
    fit_windows(sample, window=4, min_obs=3)
