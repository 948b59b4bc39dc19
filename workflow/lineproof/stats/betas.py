"""Rolling estimates of beta for single securities."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from lineproof.stats.windows import WindowEnds, pair_moments

# A market whose standard deviation is below this, relative to its level (and to 1), only rounds.
_ROUNDING = 1e-12


@dataclass(frozen=True)
class RollingBetas:
    """Estimates of the windows numbered `row`, each array (n_estimates,); decimal per period.

    Unless window ends are given, windows are numbered as the rows they end at. `n_too_few` and
    `n_no_variation` count the windows without an estimate, by reason.
    """

    row: np.ndarray
    beta: np.ndarray
    alpha: np.ndarray
    se_beta: np.ndarray
    r2: np.ndarray
    residual_sd: np.ndarray
    n_obs: np.ndarray
    n_too_few: int
    n_no_variation: int


def rolling_ols(
    starts: np.ndarray,
    period: np.ndarray,
    excess: np.ndarray,
    market: np.ndarray,
    *,
    window: int,
    min_obs: int,
    ends: WindowEnds | None = None,
) -> RollingBetas:
    """Least-squares slope of excess returns on [1, market] over each window.

    Parameters
    ----------
    starts, period : rows of each security and their calendar periods, as in `windows.pair_moments`.
    excess, market : (n_rows,) excess returns of the security and of the market in the same period.
    window, min_obs : periods in a window, and fewest complete pairs (at least 3) for an estimate.
    ends : where windows end; at each row if None.

    Notes
    -----
    The standard error is the classical one with n − 2 degrees of freedom; the residual standard
    deviation has the same divisor. R² is 0 where the security's returns are constant. A window
    that has too few pairs, or a market without variation, gets no estimate and is counted.

    Raises
    ------
    ValueError
        When `min_obs` is below 3.
    """
    if min_obs < 3:
        raise ValueError(f"at least 3 observations are needed for a standard error, not {min_obs}")
    moments = pair_moments(starts, period, market, excess, window, ends)
    enough = moments.n >= min_obs
    varies = moments.sxx > _ROUNDING**2 * moments.n * (1 + moments.mean_x**2)
    row = np.flatnonzero(enough & varies)
    n, sxx, sxy, syy = moments.n[row], moments.sxx[row], moments.sxy[row], moments.syy[row]
    beta = sxy / sxx
    variance = moments.residual_ss[row] / (n - 2)
    explained = np.divide(beta * sxy, syy, out=np.zeros_like(beta), where=syy > 0)
    return RollingBetas(
        row=row,
        beta=beta,
        alpha=moments.mean_y[row] - beta * moments.mean_x[row],
        se_beta=np.sqrt(variance / sxx),
        r2=np.minimum(explained, 1.0),
        residual_sd=np.sqrt(variance),
        n_obs=n,
        n_too_few=int((~enough).sum()),
        n_no_variation=int((enough & ~varies).sum()),
    )
