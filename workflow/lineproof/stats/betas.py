"""Rolling estimates of beta for single securities, one function an estimator.

All take the same `Sample` of excess returns and factors (decimal per period), a `window` and `min_obs` in periods, and
where windows end; all give a `RollingBetas`. A window that has fewer than `min_obs` observations, or a market without
variation, gets no estimate and is counted. At a period s no estimate uses a return or a factor later than s.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from lineproof.stats.window_alone import BELOW_MEAN, MOMENTS, NEIGHBOURS
from lineproof.stats.windows import (
    Sample,
    WindowEnds,
    Windows,
    fit_windows,
)


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
    sample: Sample, *, window: int, min_obs: int, ends: WindowEnds | None = None
) -> RollingBetas:
    """Least-squares slope of excess returns on [1, market] over each window.

    The standard error is the classical one with n − 2 degrees of freedom; the residual standard deviation has the same
    divisor. R² is 0 where the security's returns are constant. `min_obs` is at least 3.
    """
    found = fit_windows(_on_market(sample), window=window, min_obs=min_obs, ends=ends)
    return _estimates(found)


def rolling_multi_factor(
    sample: Sample, *, window: int, min_obs: int, ends: WindowEnds | None = None
) -> RollingBetas:
    """Slope on the market in a least-squares regression on [1, market, further factors].

    Classical standard error with n − K − 1 degrees of freedom, K factors. `min_obs` is at least K + 2.
    """
    return _estimates(fit_windows(sample, window=window, min_obs=min_obs, ends=ends))


def rolling_lagged(
    sample: Sample,
    *,
    window: int,
    min_obs: int,
    lags: int = 1,
    leads: int = 0,
    ends: WindowEnds | None = None,
) -> RollingBetas:
    """Sum of the slopes on the market of `lags` periods before, of the same period, and of `leads` after (Dimson 1979).

    The window of returns ends `leads` periods early, so that the market's return is known to the last lead. Standard
    error of the sum of slopes from the classical covariance, n − K − 1 degrees of freedom, K = lags + leads + 1.
    """
    shifted = _with_factors(sample, _shifted(sample.factors[:, 0], range(-lags, leads + 1)))
    return _estimates(
        fit_windows(
            shifted,
            window=window,
            min_obs=min_obs,
            ends=_earlier(sample, ends, leads),
            sum_of=np.ones(lags + leads + 1),
        )
    )


def rolling_scholes_williams(
    sample: Sample, *, window: int, min_obs: int, ends: WindowEnds | None = None
) -> RollingBetas:
    """(b₋₁ + b₀ + b₊₁) / (1 + 2ρ), by Scholes and Williams 1977.

    b are the slopes of single regressions on the market of the period before, the same and the period after, and ρ is
    the market's first-order autocorrelation, all from the periods of the window in which all three are known. The
    window of returns ends one period early, so that the market's return after its last is known.

    Alpha is mean excess return − beta × mean market; residuals are those of that line, with n − 2 degrees of freedom,
    and R² is the share of variance it explains, 0 where it does worse than the mean. Beta is linear in the returns, so
    its standard error given the market is exact for independent errors of one variance:
    σ √(Σᵢⱼ Sᵢⱼ / (Sᵢᵢ Sⱼⱼ)) / (1 + 2ρ), S the centred products of the three market returns. The source has a
    large-sample form instead. Where 1 + 2ρ ≤ 0 there is no estimate.
    """
    shifted = _with_factors(sample, _shifted(sample.factors[:, 0], range(-1, 2)))
    return _estimates(
        fit_windows(
            shifted,
            window=window,
            min_obs=min_obs,
            ends=_earlier(sample, ends, 1),
            what=NEIGHBOURS,
        )
    )


def rolling_exponential(
    sample: Sample,
    *,
    window: int,
    min_obs: int,
    half_life: float,
    ends: WindowEnds | None = None,
) -> RollingBetas:
    """Weighted least squares on [1, market], the weight of a period ½^(age / half_life).

    The standard error is that of weighted least squares, σ² (X'WX)⁻¹ with n − 2 degrees of freedom, which takes the
    weights for inverse error variances. Were the errors of one variance it would be too small, by about
    √(n Σw² / (Σw)²). Weights have mean one in the residual standard deviation.
    """
    found = fit_windows(
        _on_market(sample), window=window, min_obs=min_obs, ends=ends, half_life=half_life
    )
    return _estimates(found)


def rolling_downside(
    sample: Sample,
    *,
    window: int,
    min_obs: int,
    below: str = "mean",
    ends: WindowEnds | None = None,
) -> RollingBetas:
    """Slope on [1, market] from those periods only in which the market's excess return is below a level.

    `below` is "mean", the market's mean over the window's complete pairs, or "zero", the riskless rate. Risk below a
    target is the idea of Bawa and Lindenberg 1977, whose own ratio of lower partial moments has no intercept; a slope
    below the mean is common practice since. `min_obs` and `n_obs` count the periods below. Classical standard error
    with n − 2 degrees of freedom, the choice of periods taken as given.
    """
    only = _on_market(sample)
    if below == "mean":
        found = fit_windows(only, window=window, min_obs=min_obs, ends=ends, which=BELOW_MEAN)
        return _estimates(found)
    if below != "zero":
        raise ValueError(f"below {below!r}; known are mean and zero")
    falls = np.where(only.factors < 0, only.factors, np.nan)
    found = fit_windows(_with_factors(only, falls), window=window, min_obs=min_obs, ends=ends)
    return _estimates(found)


def rolling_correlation_volatility(
    sample: Sample,
    *,
    window: int,
    min_obs: int,
    volatility_window: int,
    volatility_min_obs: int,
    overlap: int = 1,
    ends: WindowEnds | None = None,
) -> RollingBetas:
    """ρ σ / σ_m: correlation over a long window, both volatilities over a short one (Frazzini and Pedersen 2014).

    The correlation is that of returns summed over `overlap` periods, overlapping (the source sums three days of log
    returns; here excess returns are summed), by the last period of each sum: the first sums of a window reach
    `overlap` − 1 periods back before it. ρ and `n_obs` come from `window`, σ and σ_m from complete pairs within
    `volatility_window`.

    Alpha is the mean of the security − beta × that of the market over the long window, per period; R² is ρ². Residuals
    are those of the line with slope beta over the short window, n_s − 2 degrees of freedom. The source has no standard
    error; by the delta method, for independent normal returns,
    (σ/σ_m)² [(1 − ρ²)² c / (n − 2) + ρ² (1 − ρ²) / (n_s − 2)], with c = (2k² + 1) / (3k) for overlaps of k periods.
    With one window for both and no overlap this is the classical one of least squares, as beta is.
    """
    market = _on_market(sample)
    long = fit_windows(
        _overlapping(market, overlap), window=window, min_obs=min_obs, ends=ends, what=MOMENTS
    )
    short = fit_windows(
        market, window=volatility_window, min_obs=volatility_min_obs, ends=ends, what=MOMENTS
    )
    row, i, j = np.intersect1d(long.row, short.row, assume_unique=True, return_indices=True)
    mean_x, mean_y, sxx, sxy, syy, left = long.values[:, i]
    n, n_short = long.n_obs[i], short.n_obs[j]
    _, _, vxx, vxy, vyy, rest = short.values[:, j]
    scale = np.sqrt(sxx * syy)
    rho = np.clip(np.divide(sxy, scale, out=np.zeros_like(sxy), where=scale > 0), -1.0, 1.0)
    ratio = np.sqrt(vyy / vxx)
    beta = rho * ratio
    # 1 − ρ², which the difference would give without digits where the fit is close
    apart = np.divide(left, syy, out=np.ones_like(syy), where=syy > 0)
    spread = apart**2 * (2 * overlap**2 + 1) / (3 * overlap) / (n - 2)
    spread += rho**2 * apart / (n_short - 2)
    rest = rest + (beta - vxy / vxx) ** 2 * vxx
    n_windows = len(long.row) + long.n_too_few + long.n_no_variation
    n_still = max(long.n_no_variation, short.n_no_variation)
    return RollingBetas(
        row=row,
        beta=beta,
        alpha=(mean_y - beta * mean_x) / overlap,
        se_beta=ratio * np.sqrt(spread),
        r2=rho**2,
        residual_sd=np.sqrt(rest / (n_short - 2)),
        n_obs=n,
        n_too_few=n_windows - len(row) - n_still,
        n_no_variation=n_still,
    )


def _estimates(found: Windows) -> RollingBetas:
    return RollingBetas(
        found.row, *found.values, found.n_obs, found.n_too_few, found.n_no_variation
    )


def _with_factors(sample: Sample, factors: np.ndarray) -> Sample:
    return Sample(sample.starts, sample.period, sample.excess, factors)


def _on_market(sample: Sample) -> Sample:
    return _with_factors(sample, sample.factors[:, :1])


def _shifted(market: np.ndarray, shifts: range) -> np.ndarray:
    """The market of so many periods later, a column a shift; NaN beyond the ends."""
    out = np.full((len(market), len(shifts)), np.nan)
    for column, shift in enumerate(shifts):
        into = slice(max(-shift, 0), max(len(market) - max(shift, 0), 0))
        of = slice(max(shift, 0), max(len(market) - max(-shift, 0), 0))
        out[into, column] = market[of]
    return out


def _earlier(sample: Sample, ends: WindowEnds | None, periods: int) -> WindowEnds:
    ends = WindowEnds(sample.starts, sample.period) if ends is None else ends
    return WindowEnds(ends.starts, ends.period - periods)


def _overlapping(sample: Sample, n: int) -> Sample:
    """Sums over n periods up to each, of the security and of the market; NaN where one of them is missing."""
    excess, factors = sample.excess.copy(), sample.factors.copy()
    owner = np.repeat(np.arange(len(sample.starts) - 1), np.diff(sample.starts))
    for back in range(1, n):
        follows = np.zeros(len(excess), bool)
        follows[back:] = (owner[back:] == owner[:-back]) & (
            sample.period[back:] - sample.period[:-back] == back
        )
        excess[back:] += sample.excess[:-back]
        excess[~follows] = np.nan
        factors[back:] += sample.factors[:-back]
        factors[:back] = np.nan
    return Sample(sample.starts, sample.period, excess, factors)
