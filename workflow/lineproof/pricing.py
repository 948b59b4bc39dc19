"""Run the pricing tests of one subperiod.

Every number is one row addressed by KEY_COLUMNS. One that does not exist for the data at hand is a
row with status "undefined" and a reason, never an exception.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from lineproof import catalog
from lineproof.addresses import KEY_COLUMNS, refused_asset_names
from lineproof.analyses import ANALYSES
from lineproof.frequency import FREQUENCIES, Frequency
from lineproof.pricing_analyses import Sample
from lineproof.pricing_rows import finish

Floats = NDArray[np.float64]

EXTRA_COLUMNS = ["n_members", "mean_size", "ante_beta"]


def price_subperiod(
    cut: pd.DataFrame,
    *,
    subperiod: str,
    level: float,
    hac_lag: int | None,
    analyses: Sequence[str],
    frequency: str = "monthly",
) -> pd.DataFrame:
    """Run `analyses` on every sort of one subperiod.

    Args:
        cut: one row per sort, asset and period: sort, asset, date (datetime64), excess_return,
            market_excess, riskless (decimal per period), and where known n_members, mean_size,
            ante_beta.
        subperiod: its name.
        level: significance level of the critical values, between 0 and 1.
        hac_lag: truncation lag of HAC standard errors; None chooses it by the number of periods.
        analyses: keys of ANALYSES.
        frequency: of the returns, a key of FREQUENCIES.

    Returns:
        The columns of `addresses`, one row a number: sorts and assets as they first appear in `cut`, analyses in the
        order of ANALYSES. Counts are of the periods and assets that the number rests on. `p` is
        two-sided for t and normal statistics and the upper tail for F and chi-square; one-sided is
        against "greater"; `critical` matches `p`. NaN where something does not apply.

    Raises:
        ValueError: unknown analysis, level out of range, or a malformed cut (a period twice, a
            market return that differs between assets, a reserved asset name).
    """
    unknown = set(analyses) - set(ANALYSES)
    if unknown:
        raise ValueError(f"unknown analyses {sorted(unknown)}; known are {list(ANALYSES)}")
    if not 0.0 < level < 1.0:
        raise ValueError(f"level must lie between 0 and 1, is {level}")
    frames = []
    for sort, rows in cut.groupby("sort", sort=False, observed=True):
        options = {"level": level, "hac_lag": hac_lag, "frequency": FREQUENCIES[frequency]}
        sample = _sample(rows, str(sort), subperiod, **options)
        for name in (name for name in ANALYSES if name in analyses):
            keys = {"sort": sample.sort, "subperiod": subperiod, "analysis": name}
            frames.append(finish(list(catalog.load(ANALYSES[name])(sample)), keys, level))
    if not frames:
        return finish([], dict.fromkeys(KEY_COLUMNS[:3], ""), level)
    return pd.concat(frames, ignore_index=True)


def _sample(
    rows: pd.DataFrame,
    sort: str,
    subperiod: str,
    *,
    level: float,
    hac_lag: int | None,
    frequency: Frequency,
) -> Sample:
    asset_of, assets = pd.factorize(rows["asset"].astype(str))
    unit = "M" if frequency.noun == "month" else "D"
    periods = rows["date"].to_numpy().astype(f"datetime64[{unit}]")
    dates, period_of = np.unique(periods, return_inverse=True)
    _check_assets(assets, sort)
    if rows.assign(asset=asset_of, period=period_of).duplicated(["asset", "period"]).any():
        raise ValueError(f"sort {sort}: an asset has two rows in one {frequency.noun}")

    def wide(column: str) -> Floats:
        table = np.full((len(dates), len(assets)), np.nan)
        table[period_of, asset_of] = rows[column].to_numpy(dtype=float, na_value=np.nan)
        return table

    return Sample(
        sort=sort,
        subperiod=subperiod,
        dates=dates,
        assets=tuple(assets),
        excess=wide("excess_return"),
        market=_common(wide("market_excess"), f"sort {sort}: market_excess"),
        riskless=_common(wide("riskless"), f"sort {sort}: riskless"),
        extras={name: wide(name) for name in EXTRA_COLUMNS if name in rows},
        level=level,
        hac_lag=hac_lag,
        frequency=frequency,
    )


def _check_assets(assets: Sequence[str], sort: str) -> None:
    bad = refused_asset_names(list(assets))
    if bad:
        raise ValueError(f"sort {sort}: assets may not be called {bad}")


def _common(table: Floats, name: str) -> Floats:
    """(T,) the value that each row of a (T, N) table repeats; NaN where a row has none."""
    low = np.where(np.isnan(table), np.inf, table).min(axis=1)
    high = np.where(np.isnan(table), -np.inf, table).max(axis=1)
    if (low < high).any():
        raise ValueError(f"{name} differs between assets in one period")
    return np.where(low > high, np.nan, low)
