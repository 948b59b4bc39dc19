"""Sums over rolling windows by blocks, compiled, and the fit of each window from them.

The observations of a security are cut into blocks of as many periods as a window has. Prefix sums run forwards from
the start of a block, suffix sums backwards from its end, so that any window is one suffix of a block plus one prefix
of the next, each faded by its age where weights decay. Nothing is ever subtracted: an extreme value leaves no rounding
behind once it has left the window, as it would with running sums, and nothing later than a window touches its sums,
not even in the last bit.

What the sums hold of the factors alone depends on the date only while a window has no gap: it is then taken from one
table by date, made for all securities together (`window_dates`). What follows from the sums is worked out for many
windows at a time (`window_solve`). A window of which centring or a close fit would cost digits is fitted again from
its own observations (`window_alone`).
"""

from __future__ import annotations

import numpy as np
from numba import njit, prange

from lineproof.stats.window_alone import ALL, FITTED, fit_alone
from lineproof.stats.window_dates import invert
from lineproof.stats.window_solve import solve

_AT_ONCE = 256  # windows, whose numbers then stay in the fastest memory
_PARTS = 64  # shares of the work, of which each has its own scratch

_compiled = njit(cache=True, error_model="numpy")
_parallel = njit(cache=True, error_model="numpy", parallel=True)


@_compiled
def parts_of(starts):  # pragma: no cover - compiled
    """Boundaries between shares of the securities with about as many rows each: (n_parts + 1,)."""
    n, rows = len(starts) - 1, starts[-1] - starts[0]
    n_parts = max(min(_PARTS, n), 1)
    bounds = np.empty(n_parts + 1, np.int64)
    for part in range(n_parts):
        bounds[part] = np.searchsorted(starts[:-1], starts[0] + rows * part // n_parts)
    bounds[n_parts] = n
    return bounds


@_parallel
def count_windows(
    bounds, starts, period, y, known, end_starts, ends, window, least, whole
):  # pragma: no cover - compiled
    """How many windows of each security have at least so many observations: (n_securities,).

    `whole` (n_periods,) is set where a window ends that has an observation in every period.
    """
    counts = np.zeros(len(starts) - 1, np.int64)
    for part in prange(len(bounds) - 1):
        for security in range(bounds[part], bounds[part + 1]):
            counts[security] = _count_one(
                starts[security], starts[security + 1], period, y, known,
                ends[end_starts[security] : end_starts[security + 1]], window, least, whole,
            )  # fmt: skip
    return counts


@_compiled
def _count_one(
    first, stop, period, y, known, ends, window, least, whole
):  # pragma: no cover - compiled
    after = oldest = first
    n = found = 0
    for end in ends:
        while after < stop and period[after] <= end:
            n += known[period[after]] and not np.isnan(y[after])
            after += 1
        while oldest < after and period[oldest] <= end - window:
            n -= known[period[oldest]] and not np.isnan(y[oldest])
            oldest += 1
        found += n >= least
        if n == window:
            whole[end] = True
    return found


@_parallel
def fit_blocks(
    bounds, starts, period, y, factors, known, dates, powers, how, sum_of, end_starts, ends, offsets,
    out, number, n_obs, state,
):  # fmt: skip  # pragma: no cover - compiled
    """Fit the windows that `count_windows` counted, those of security i from `offsets[i]` on."""
    for part in prange(len(bounds) - 1):
        _fit_part(
            bounds[part], bounds[part + 1], starts, period, y, factors, known, dates, powers, how,
            sum_of, end_starts, ends, offsets, out, number, n_obs, state,
        )  # fmt: skip


@_compiled
def _fit_part(
    begin, stop, starts, period, y, factors, known, dates, powers, how, sum_of, end_starts, ends,
    offsets, out, number, n_obs, state,
):  # fmt: skip  # pragma: no cover - compiled
    """The windows of the securities from `begin` to `stop`, with scratch that suits the longest."""
    k, size, wanted = factors.shape[1], 0, 0
    for security in range(begin, stop):
        size = max(size, starts[security + 1] - starts[security])
        wanted = max(wanted, offsets[security + 1] - offsets[security])
    if wanted == 0:
        return
    place, own, block = np.empty(size, np.int64), np.empty(size), np.empty((2, size), np.int64)
    fades, sums = np.empty((3, size)), np.empty((2, _n_sums(k), size))
    spans, whole = np.empty((2, wanted), np.int64), np.empty(wanted, np.bool_)
    held, at = np.empty((9 + 2 * k + 2 * k * k, _AT_ONCE)), np.empty(_AT_ONCE, np.int64)
    for security in range(begin, stop):
        a, b = offsets[security], offsets[security + 1]
        if b > a:
            n = _complete(starts[security], starts[security + 1], period, y, known, place, own)
            _fit_one(
                place[:n], own[:n], factors, dates, powers, how, sum_of,
                ends[end_starts[security] : end_starts[security + 1]], end_starts[security],
                block, fades, sums, spans, whole[: b - a], held, at,
                out, a, number[a:b], n_obs[a:b], state[a:b],
            )  # fmt: skip


@_compiled
def _n_sums(k):  # pragma: no cover - compiled
    """Lines of sums: of y, yy and each xy; of weights, each x, and products of two."""
    return 3 + 2 * k + k * (k + 1) // 2


@_compiled
def _complete(first, stop, period, y, known, place, own):  # pragma: no cover - compiled
    """Copy the rows whose returns and factors are known; gives how many."""
    n = 0
    for row in range(first, stop):
        if known[period[row]] and not np.isnan(y[row]):
            place[n], own[n] = period[row], y[row]
            n += 1
    return n


@_compiled
def _fit_one(
    period, y, x, dates, powers, how, sum_of, ends, first, block, fades, sums, spans, whole, held, at,
    out, offset, number, n_obs, state,
):  # fmt: skip  # pragma: no cover - compiled
    """All windows of one security, from its complete observations; `first` is the number of its first window.

    Whole arrays are handed on, with where to begin: of a part of their lines the compiler would not know that it lies
    together, and would not work on several numbers at once.
    """
    window, min_obs, what, which = how
    k, n_windows = x.shape[1], len(number)
    _find_windows(period, ends, first, window, max(min_obs, 1), spans, number, n_obs)
    if which == ALL:
        _cut(period, window, powers, block, fades)
        _sum_returns(period, y, x, fades, sums)
        n_whole = 0
        for w in range(n_windows):
            whole[w] = n_obs[w] == window and dates[0, ends[number[w] - first]] > 0
            n_whole += whole[w]
        if n_whole < n_windows:
            _sum_factors(period, x, block, fades, sums, spans, whole)
    for low in range(0, n_windows, _AT_ONCE):
        high = min(low + _AT_ONCE, n_windows)
        if which == ALL:
            _gather(
                period, dates, powers, ends, first, number[low:high], n_obs[low:high],
                spans, low, whole[low:high], block, sums, held, at, k,
            )  # fmt: skip
            solve(what, sum_of, held, out, offset + low, state[low:high], k)
        for w in range(low, high):
            if which != ALL or state[w] != FITTED:
                part = slice(spans[0, w], spans[1, w] + 1)
                n_obs[w], state[w] = fit_alone(
                    period[part],
                    y[part],
                    x,
                    powers,
                    ends[number[w] - first],
                    how,
                    sum_of,
                    out,
                    offset + w,
                )


@_compiled
def _find_windows(
    period, ends, first, window, least, spans, number, n_obs
):  # pragma: no cover - compiled
    """The windows with enough observations: their numbers, and their first and last observation."""
    oldest = after = found = 0
    for place in range(len(ends)):
        end = ends[place]
        while after < len(period) and period[after] <= end:
            after += 1
        while oldest < after and period[oldest] <= end - window:
            oldest += 1
        if after - oldest >= least:
            number[found], n_obs[found] = first + place, after - oldest
            spans[0, found], spans[1, found] = oldest, after - 1
            found += 1


@_compiled
def _cut(period, window, powers, block, fades):  # pragma: no cover - compiled
    """Cut observations into blocks: the first one of its block, for each, and the last period of that.

    The lines of `fades` are what the prefix sum of the observation before counts for (0 where a block begins), what the
    suffix sum of the one after does, and the weight of the observation at the end of its block.
    """
    head, stop, n = 0, period[0] + window, len(period)
    for row in range(n):
        if period[row] >= stop:
            stop += ((period[row] - stop) // window + 1) * window
            head = row
        block[0, row], block[1, row] = head, stop - 1
        fades[0, row] = powers[period[row] - period[row - 1]] if row > head else 0.0
        fades[1, max(row - 1, 0)] = 1.0 if row > head else 0.0
        fades[2, row] = powers[stop - 1 - period[row]]
    fades[1, n - 1] = 0.0


@_compiled
def _sum_returns(period, y, x, fades, sums):  # pragma: no cover - compiled
    """Lines 0 to k + 1 of the prefix and the suffix sums: of y, yy, and each xy; from both ends at once."""
    n = len(y)
    prefix, suffix = sums[0], sums[1]
    before = before_square = after = after_square = 0.0
    for row in range(n):
        v = y[row]
        before = fades[0, row] * before + v
        before_square = fades[0, row] * before_square + v * v
        prefix[0, row], prefix[1, row] = before, before_square
        back = n - 1 - row
        v = fades[2, back] * y[back]
        after = fades[1, back] * after + v
        after_square = fades[1, back] * after_square + v * y[back]
        suffix[0, back], suffix[1, back] = after, after_square
    for i in range(x.shape[1]):
        before = after = 0.0
        for row in range(n):
            before = fades[0, row] * before + y[row] * x[period[row], i]
            prefix[2 + i, row] = before
            back = n - 1 - row
            after = fades[1, back] * after + fades[2, back] * y[back] * x[period[back], i]
            suffix[2 + i, back] = after


@_compiled
def _sum_factors(period, x, block, fades, sums, spans, whole):  # pragma: no cover - compiled
    """Further lines of the sums: of weights, each x, and products; in blocks of windows that are not whole."""
    n, k = len(period), x.shape[1]
    needed = np.zeros(n, np.bool_)
    for w in range(len(whole)):
        if not whole[w]:
            needed[block[0, spans[0, w]]] = True
            needed[block[0, spans[1, w]]] = True
    for row in range(n):
        if needed[block[0, row]]:
            _add_factors(sums[0], row, max(row - 1, 0), fades[0, row], 1.0, x, period[row], k)
        back = n - 1 - row
        if needed[block[0, back]]:
            after = min(back + 1, n - 1)
            _add_factors(sums[1], back, after, fades[1, back], fades[2, back], x, period[back], k)


@_compiled
def _add_factors(lines, row, other, fade, weight, x, p, k):  # pragma: no cover - compiled
    """Add an observation to the sums of its neighbour; where it has none, `fade` is 0 and what stands there nothing."""
    c = 2 + k
    lines[c, row] = (fade * lines[c, other] if fade > 0 else 0.0) + weight
    for i in range(k):
        c = 3 + k + i
        u = weight * x[p, i]
        lines[c, row] = (fade * lines[c, other] if fade > 0 else 0.0) + u
        for j in range(i + 1):
            c = 3 + 2 * k + i * (i + 1) // 2 + j
            lines[c, row] = (fade * lines[c, other] if fade > 0 else 0.0) + u * x[p, j]


@_compiled
def _gather(
    period, dates, powers, ends, first, number, n_obs, spans, low, whole, block, sums, held, at, k
):  # pragma: no cover - compiled
    """Lines of `held`, a window a column: sums of y, yy and xy (k + 2), the share left by centring, the sum of weights,
    means (k), centred products and their inverse (k² each), and last how many observations."""
    m, n_sums, n_dates = len(number), sums.shape[1], dates.shape[1]
    of_prefix, of_suffix, count = held[-2], held[-3], held[-1]  # the first two for a while
    oldests, lasts = spans[0, low : low + m], spans[1, low : low + m]
    runs_on = steps_on = (
        True  # a date a window, an observation a window: then what is read lies together
    )
    low_one, last_one = oldests[0], lasts[0]
    for w in range(m):
        oldest, last = oldests[w], lasts[w]
        steps_on &= (oldest == low_one + w) & (last == last_one + w)
        end = ends[number[w] - first]
        at[w], count[w] = max(min(end, n_dates - 1), 0), n_obs[w]
        runs_on &= at[w] == at[0] + w
        of_prefix[w], of_suffix[w] = powers[end - period[last]], 0.0
        if block[0, last] != oldest:
            of_suffix[w] = powers[end - block[1, oldest]]
            if block[0, last] < oldest:  # the window ends with its block, or after it
                of_prefix[w] = 0.0
    for c in range(2 + k):
        prefix, suffix, line = sums[0, c], sums[1, c], held[c]
        if steps_on:
            for w in range(m):
                line[w] = of_prefix[w] * prefix[last_one + w] + of_suffix[w] * suffix[low_one + w]
        else:
            for w in range(m):
                line[w] = of_prefix[w] * prefix[lasts[w]] + of_suffix[w] * suffix[oldests[w]]
    for c in range(len(dates)):
        dated, line = dates[c], held[2 + k + c]
        begins = at[0]
        if runs_on:
            for w in range(m):
                line[w] = dated[begins + w]
        else:
            for w in range(m):
                line[w] = dated[at[w]]
    total, mean = np.empty(n_sums), np.empty(k)
    products, inverse, raw = np.empty((k, k)), np.empty((k, k)), np.empty(k)
    for w in range(m):
        if whole[w]:
            continue
        for c in range(2 + k, n_sums):
            total[c] = of_prefix[w] * sums[0, c, lasts[w]] + of_suffix[w] * sums[1, c, oldests[w]]
        weight, left = _centre(total, mean, products, inverse, raw)
        held[2 + k, w], held[3 + k, w] = left, weight
        for i in range(k):
            held[4 + k + i, w] = mean[i]
            for j in range(k):
                held[4 + 2 * k + i * k + j, w] = products[i, j]
                held[4 + 2 * k + k * k + i * k + j, w] = inverse[i, j]


@_compiled
def _centre(total, mean, products, inverse, raw):  # pragma: no cover - compiled
    """Means and centred products from raw sums; the sum of weights, and the share that centring left."""
    k = len(mean)
    weight, c = total[2 + k], 3 + 2 * k
    for i in range(k):
        mean[i] = total[3 + k + i] / weight
        for j in range(i + 1):
            product = total[c] - mean[i] * total[3 + k + j]
            products[i, j], products[j, i] = product, product
            inverse[i, j], inverse[j, i] = product, product
            if i == j:
                raw[i] = total[c]
            c += 1
    return weight, invert(inverse, raw)
