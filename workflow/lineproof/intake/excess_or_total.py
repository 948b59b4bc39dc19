"""Is the market's return what the study file says: total, or in excess of the riskless rate?"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

_FEWEST = 60  # periods
_FAR, _NEAR = 3.0, 2.0  # standard errors from what is declared, and from the other


class Evidence(NamedTuple):
    """`slope` of the panel's return less the market's on the riskless return, its standard error, and what it would be
    under either; `looks` is "total", "excess" or "" where the data cannot tell."""

    slope: float
    se: float
    if_total: float
    looks: str


def market_evidence(market: np.ndarray, riskless: np.ndarray, reference: np.ndarray) -> Evidence:
    """How the equally weighted total return of the panel, less the market's, moves with the riskless return.

    All arguments are (T,), decimal, NaN where missing. By ordinary least squares of reference − market on a constant,
    the market and the riskless return: where the market is total the reference is riskless + b (market − riskless), so
    the slope on the riskless return is 1 − b, b − 1 being the slope on the market; where the market is an excess
    return already, the reference is riskless + b market, and the slope is 1. Standard errors as White 1980 (HC0).
    With fewer than 60 periods, or a riskless return that does not vary, the data cannot tell.
    """
    known = np.isfinite(market) & np.isfinite(riskless) & np.isfinite(reference)
    x = np.column_stack([np.ones(known.sum()), market[known], riskless[known]])
    scale = np.abs(x).max(axis=0, initial=0.0)
    nothing = Evidence(np.nan, np.nan, np.nan, "")
    if len(x) < _FEWEST or (scale == 0).any() or np.linalg.matrix_rank(x / scale, 1e-8) < 3:
        return nothing
    y = reference[known] - market[known]
    inverse = np.linalg.inv(x.T @ x)
    slope = inverse @ (x.T @ y)
    scores = x * (y - x @ slope)[:, None]
    spread = inverse @ (scores.T @ scores) @ inverse
    from_total = slope[2] + slope[1]  # 1 − b + b − 1
    se_total = np.sqrt(spread[1, 1] + spread[2, 2] + 2 * spread[1, 2])
    from_excess, se_excess = slope[2] - 1, np.sqrt(spread[2, 2])
    z_total, z_excess = abs(from_total) / se_total, abs(from_excess) / se_excess
    looks = ""
    if z_total > _FAR and z_excess < _NEAR and from_total > 0:
        looks = "excess"
    elif z_excess > _FAR and z_total < _NEAR and from_excess < 0:
        looks = "total"
    return Evidence(float(slope[2]), float(se_excess), float(-slope[1]), looks)


def looks_like_excess(
    market: np.ndarray, riskless: np.ndarray, reference: np.ndarray, declared: str
) -> str:
    """What to say when the market looks like the other of total and excess (fault 30); empty where nothing is amiss.

    `market` is as delivered, `declared` "total" or "excess"; for the rest see `market_evidence`.
    """
    found = market_evidence(market, riskless, reference)
    if found.looks in ("", declared):
        return ""
    return (
        f"the market is declared {declared}, but looks like {_NOUN[found.looks]}: the equally "
        f"weighted return of all securities less the market's has a slope of {found.slope:.2f} "
        f"(standard error {found.se:.2f}) on the riskless return, where {found.if_total:.2f} is "
        "due to a total return and 1.00 to an excess return; check data.market.is"
    )


_NOUN = {"total": "a total return", "excess": "an excess return"}
