"""Least squares over rolling windows: the only loop over windows in the project.

The arithmetic stands in `window_sums` and the modules that it names.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from lineproof.stats.window_alone import ALL, FITTED, MOMENTS, SLOPES, TOO_FEW
from lineproof.stats.window_dates import by_date
from lineproof.stats.window_sums import count_windows, fit_blocks, parts_of

_N_OUT = {MOMENTS: 6}  # lines of numbers, 5 for the others


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
    """What was made of the windows numbered `row` (n_fitted,): `values` (5 or 6, n_fitted), `n_obs` int64 (n_fitted,).

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
    period = _plain(ends.period, np.int64)
    powers = 0.5 ** (np.arange(window + 1) / (half_life or np.inf))
    rows = (
        _plain(sample.starts, np.int64),
        _plain(sample.period, np.int64),
        _plain(sample.excess, np.float64),
    )
    known = ~np.isnan(factors).any(axis=1)
    whole = np.zeros(len(factors), np.bool_)
    marks = _plain(ends.starts, np.int64), period
    parts = parts_of(rows[0])
    counts = count_windows(parts, *rows, known, *marks, window, max(min_obs, 1), whole)
    offsets = np.concatenate([[0], np.cumsum(counts)])
    n = int(offsets[-1])
    values = np.empty((_N_OUT.get(what, 5), n))
    row, n_obs, state = np.empty(n, np.int64), np.empty(n, np.int64), np.empty(n, np.int8)
    fit_blocks(
        parts,
        *rows,
        factors,
        known,
        by_date(factors, whole & (which == ALL), powers),
        powers,
        (window, min_obs, what, which),
        np.eye(1, factors.shape[1])[0] if sum_of is None else _plain(sum_of, np.float64),
        *marks,
        offsets,
        values,
        row,
        n_obs,
        state,
    )
    n_too_few = len(period) - n + int((state == TOO_FEW).sum())
    fitted = state == FITTED
    if not fitted.all():
        values, row, n_obs = values[:, fitted], row[fitted], n_obs[fitted]
    return Windows(row, values, n_obs, n_too_few, len(period) - len(row) - n_too_few)


def _plain(values: np.ndarray, dtype: type) -> np.ndarray:
    """As the kernels are compiled for: contiguous and writable."""
    return np.require(values, dtype, ["C", "W"])


def warm_up() -> None:
    """Compile the kernels, so that no study waits for it."""
    rows = np.arange(4)
    sample = Sample(np.array([0, 4]), rows, rows**2.0, np.sin(rows)[:, None])
    fit_windows(sample, window=4, min_obs=3)
