"""The stage that estimates betas: panel and market in, one table of estimates out."""

from __future__ import annotations

import numpy as np
import pandas as pd

from lineproof import catalog
from lineproof.calendar import month_number
from lineproof.estimators import ESTIMATORS
from lineproof.problems import KnownProblem, Problem
from lineproof.stats.betas import RollingBetas

_NONE = "No beta can be estimated."


def estimate_betas(
    panel: pd.DataFrame,
    market: pd.DataFrame,
    *,
    name: str,
    estimator: str,
    window: int,
    min_obs: int,
) -> pd.DataFrame:
    """Estimates of every security at each of its months, by one estimator of the registry.

    `panel` is sorted by security and date. An estimate dated t uses returns dated t and before, and
    is made whenever the security has a row at t, with a return or without. Months without an
    estimate have no row.

    Raises KnownProblem when the window is longer than the sample, no security has enough months for a
    single estimate, or the market's return never changes.
    """
    if window > len(market):
        found = f"a window of {window} months is longer than the sample, which has {len(market)}"
        raise KnownProblem(_NONE, [Problem(f"betas.{name}.window", found, "shorten window")])
    lookup = pd.Series(market["market_excess"].to_numpy(), index=market["date"])
    factor = lookup.reindex(panel["date"]).to_numpy()
    security = panel["security"].to_numpy()
    changes = np.flatnonzero(security[1:] != security[:-1]) + 1
    starts = np.concatenate([[0], changes, [len(panel)]])
    estimate = catalog.load(ESTIMATORS[estimator])(
        starts,
        month_number(panel["date"]),
        panel["excess_return"].to_numpy(),
        factor,
        window=window,
        min_obs=min_obs,
    )
    if len(estimate.row) == 0:
        raise KnownProblem(_NONE, [_why_none(name, estimate, window, min_obs)])
    keys = panel[["security", "date"]].iloc[estimate.row].reset_index(drop=True)
    columns = ("beta", "alpha", "se_beta", "r2", "residual_sd", "n_obs")
    return keys.assign(**{column: getattr(estimate, column) for column in columns})


def _why_none(name: str, estimate: RollingBetas, window: int, min_obs: int) -> Problem:
    if estimate.n_no_variation:
        found, change = "the market's return is the same in every month", "check the market's file"
    else:
        found = f"no security has {min_obs} months of returns within {window} months"
        change = "lower min or lengthen window"
    return Problem(f"betas.{name}", found, change)
