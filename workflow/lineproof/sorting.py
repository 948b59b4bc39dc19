"""The stage that forms test assets: who is in which group when, and what the groups return.

No design looks ahead. Groups formed at the end of month s rest on estimates, screens and sizes
dated s or before; the weight of a member in a later month t rests on sizes dated t − 1 or before.
Screens act at formation only: whatever a member returns afterwards counts.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd

from lineproof import catalog
from lineproof.calendar import month_name, month_number
from lineproof.designs import WEIGHTS
from lineproof.problems import KnownProblem, Problem
from lineproof.stats.sorts import ranked_groups
from lineproof.stats.weights import scaled_to_one


@dataclass(frozen=True)
class Sorted:
    """Test assets: `members` at each formation, and `returns` of each asset and month."""

    members: pd.DataFrame
    returns: pd.DataFrame


def asset_names(n_groups: int) -> list[str]:
    """`p01` (lowest) to `p10`: names that sort in the order of the groups."""
    digits = max(2, len(str(n_groups)))
    return [f"p{group:0{digits}d}" for group in range(1, n_groups + 1)]


def sort_single_window(
    panel: pd.DataFrame,
    betas: pd.DataFrame,
    *,
    name: str,
    groups: int,
    weights: str,
    form_month: int,
    hold: int,
) -> Sorted:
    """Rank on the latest estimate at each formation month, hold for `hold` months.

    The single-window design of Black, Jensen and Scholes (1972). A security can be ranked at s when
    it has a row that passes the screens and an estimate, both dated s, and a weight above zero:
    with weights by size, a size at s. It stays in its group until the next formation or until it
    leaves; in a month without a return it is no member.

    `panel` is sorted by security and date. Formations with fewer securities than groups are left
    out. `returns` runs without gaps from the first to the last month with a member; a group that is
    empty in a month has a missing return.

    Raises KnownProblem when no formation month has as many securities as groups, or no return
    follows one.
    """
    candidates = _candidates(panel, betas, weights, form_month)
    formed = _formations(candidates, groups)
    if formed.empty:
        most = candidates["date"].value_counts().max() if len(candidates) else 0
        found = f"{groups} groups, but at most {most} securities can be ranked in a formation month"
        raise _not_formed(f"{name}.groups", found, "use fewer groups, or check the screens")
    held = _held_months(panel, formed, hold)
    if held.empty:
        last = month_name(formed["formed"].max())
        found = f"no member has a return after the last formation month, {last}"
        raise _not_formed(
            f"{name}.form_month", found, "form in another month, or lengthen the data"
        )
    weighed = _with_weights(held, weights, groups)
    names = np.array(asset_names(groups))
    returns = _group_returns(weighed, groups)
    returns["asset"] = names[returns["group"] - 1]
    returns = returns.sort_values(["asset", "date"], ignore_index=True)
    return Sorted(_members(formed, weights, names), returns[_RETURN_COLUMNS])


_RETURN_COLUMNS = ["asset", "date", "excess_return", "n_members", "mean_size", "ante_beta"]


def _not_formed(option: str, found: str, change: str) -> KnownProblem:
    problem = Problem(f"portfolios.{option}", found, change)
    return KnownProblem("Ranked portfolios cannot be formed.", [problem])


def _candidates(
    panel: pd.DataFrame, betas: pd.DataFrame, weights: str, form_month: int
) -> pd.DataFrame:
    """Securities that can be ranked, at each formation month."""
    at_formation = panel["date"].dt.month == form_month
    rows = panel.loc[panel["eligible"] & at_formation, ["security", "date", "size"]]
    rows = rows[catalog.load(WEIGHTS[weights])(rows["size"].to_numpy()) > 0]
    estimates = betas[["security", "date", "beta"]]
    return rows.merge(estimates, on=["security", "date"], validate="one_to_one")


def _formations(candidates: pd.DataFrame, groups: int) -> pd.DataFrame:
    """security, formed, size, ante_beta, group; formations with too few securities are left out."""
    found = candidates.rename(columns={"date": "formed", "beta": "ante_beta"})
    found = found[found.groupby("formed")["security"].transform("size") >= groups]
    found = found.sort_values(["formed", "security"], ignore_index=True)
    ranked = [ranked_groups(v.to_numpy(), groups) for _, v in found.groupby("formed")["ante_beta"]]
    return found.assign(group=np.concatenate([np.empty(0, np.int64), *ranked]))


def _members(formed: pd.DataFrame, weights: str, names: np.ndarray) -> pd.DataFrame:
    raw = catalog.load(WEIGHTS[weights])(formed["size"].to_numpy())
    cell = formed.groupby(["formed", "group"]).ngroup().to_numpy()
    members = formed.assign(
        asset=names[formed["group"] - 1], weight=scaled_to_one(raw, cell, cell.max() + 1)
    )
    columns = ["formed", "asset", "security", "weight", "ante_beta", "size"]
    return members[columns].sort_values(columns[:3], ignore_index=True)


def _held_months(panel: pd.DataFrame, formed: pd.DataFrame, hold: int) -> pd.DataFrame:
    """Every month in which a member has a return, with the size it had the month before."""
    rows = panel[["security", "date", "excess_return"]].assign(
        month=month_number(panel["date"]), lagged_size=_lagged_size(panel)
    )
    at = formed[["security", "ante_beta", "group"]].assign(
        formed_month=month_number(formed["formed"])
    )
    formations = np.unique(at["formed_month"])
    latest = np.searchsorted(formations, rows["month"], side="left") - 1
    rows["formed_month"] = formations[np.maximum(latest, 0)]
    in_time = (latest >= 0) & (rows["month"] - rows["formed_month"] <= hold)
    rows = rows[in_time & rows["excess_return"].notna()]
    return rows.merge(at, on=["security", "formed_month"], validate="many_to_one")


def _lagged_size(panel: pd.DataFrame) -> np.ndarray:
    """Size at the end of the row before, of the same security; (n_rows,), NaN where unknown.

    A missing size is the last known one grown by the total returns since, so that a weight drifts
    with its security; a missing return grows nothing, and after a total loss no size is known. A study without a
    riskless rate knows no total returns: there excess returns stand in, which lets a size lag by the riskless return.
    """
    first = panel["security"].ne(panel["security"].shift()).to_numpy()
    grew = panel["total_return"].fillna(panel["excess_return"])
    size, growth = panel["size"].to_numpy(), 1 + grew.fillna(0.0)
    begins = first | ~np.isnan(size)
    start = np.maximum.accumulate(np.where(begins, np.arange(len(panel)), 0))
    grown = size[start] * growth.mask(begins, 1.0).groupby(start).cumprod().to_numpy()
    known = np.where(grown > 0, grown, np.nan)
    return np.where(first, np.nan, np.roll(known, 1))


def _with_weights(held: pd.DataFrame, weights: str, groups: int) -> pd.DataFrame:
    """Members of a month with their weights, which sum to one in each group and month."""
    cell = ((held["month"] - held["month"].min()) * groups + held["group"] - 1).to_numpy()
    raw = catalog.load(WEIGHTS[weights])(held["lagged_size"].to_numpy())
    return held.assign(cell=cell, weight=scaled_to_one(raw, cell, int(cell.max()) + 1))


def _group_returns(weighed: pd.DataFrame, groups: int) -> pd.DataFrame:
    """group, date and the columns of the contract; every group in every month."""
    n_months = int(weighed["month"].max() - weighed["month"].min()) + 1
    dates = pd.date_range(weighed["date"].min(), periods=n_months, freq="ME", unit="ms")
    cell, weight, size = (weighed[c].to_numpy() for c in ("cell", "weight", "lagged_size"))

    def total(values: np.ndarray) -> np.ndarray:
        return np.bincount(cell, values, n_months * groups)

    def ratio(part: np.ndarray, whole: np.ndarray) -> np.ndarray:
        return np.divide(part, whole, out=np.full(len(whole), np.nan), where=whole > 0)

    weighs = np.where(total(weight) > 0, 1.0, np.nan)
    return pd.DataFrame(
        {
            "group": np.tile(np.arange(1, groups + 1), n_months),
            "date": np.repeat(dates, groups),
            "excess_return": weighs * total(weight * weighed["excess_return"].to_numpy()),
            "n_members": total(np.ones(len(cell))),
            "mean_size": ratio(total(np.nan_to_num(size)), total(np.isfinite(size).astype(float))),
            "ante_beta": weighs * total(weight * weighed["ante_beta"].to_numpy()),
        }
    )


def take_supplied(supplied: pd.DataFrame, market: pd.DataFrame, *, returns_are: str) -> Sorted:
    """Test assets that are given as return series.

    `supplied` has asset, date, return_ (decimal); `returns_are` says whether they are total
    returns, from which the riskless rate is taken, or in excess of it already. Months without a
    market return are left out.

    Raises KnownProblem when no month is left, or total returns are given and no riskless rate is known.
    """
    if returns_are == "total" and market["riskless"].isna().all():
        change = "add data.riskless, or set is: excess if they are in excess of it"
        problem = Problem("the supplied test assets", "total returns need a riskless rate", change)
        raise KnownProblem("Excess returns cannot be taken.", [problem])
    known = supplied.merge(market[["date", "riskless"]], on="date", validate="many_to_one")
    if known.empty:
        found = "no month in common with the market"
        raise KnownProblem(
            "Nothing is left to study.",
            [Problem("the supplied test assets", found, "compare the dates")],
        )
    returns = known.assign(
        excess_return=known["return_"] - (known["riskless"] if returns_are == "total" else 0.0),
        n_members=np.nan,
        mean_size=np.nan,
        ante_beta=np.nan,
    )
    returns = returns[_RETURN_COLUMNS].sort_values(["asset", "date"], ignore_index=True)
    return Sorted(_no_members(), returns)


def _no_members() -> pd.DataFrame:
    types = {"formed": "datetime64[ms]", "asset": str, "security": str}
    types |= dict.fromkeys(("weight", "ante_beta", "size"), float)
    return pd.DataFrame({name: pd.Series(dtype=kind) for name, kind in types.items()})
