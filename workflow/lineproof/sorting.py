"""The stage that forms test assets: who is in which group when, and what the groups return.

No design looks ahead. Groups formed at the end of month s rest on estimates, screens and sizes
dated s or before; the weight of a member in a later period t (a month, or in a daily study a
trading day) rests on sizes dated t − 1 or before.
Screens act at formation only: whatever a member returns afterwards counts.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd

from lineproof import catalog
from lineproof.designs import WEIGHTS
from lineproof.periods import ABSENT, Months, Periods
from lineproof.problems import KnownProblem, Problem
from lineproof.securities import coded
from lineproof.stats.sorts import ranked_groups
from lineproof.stats.weights import scaled_to_one


@dataclass(frozen=True)
class Sorted:
    """Test assets: `members` at each formation, and `returns` of each asset and period."""

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
    periods: Periods | None = None,
) -> Sorted:
    """Rank on the estimate at the end of each formation month, hold for `hold` months.

    The single-window design of Black, Jensen and Scholes (1972). A security can be ranked at s when
    it has a row that passes the screens and an estimate, both dated s, and a weight above zero:
    with weights by size, a size at s. It stays in its group until the next formation or until it
    leaves; in a period without a return it is no member.

    `panel` is sorted by security and date, and has a row a period of `periods` (months if None).
    Formations with fewer securities than groups are left out. `returns` runs without gaps from the
    first to the last period with a member; a group that is empty in a period has a missing return.

    Raises KnownProblem when no formation month has as many securities as groups, or no return
    follows one.
    """
    periods = Months() if periods is None else periods
    rows = _rows(panel, periods)
    candidates = _candidates(panel, rows, betas, weights, form_month)
    formed = _formations(candidates, groups)
    if formed.empty:
        most = candidates["date"].value_counts().max() if len(candidates) else 0
        raise _not_formed(f"{name}.groups", *_too_few(groups, most))
    held = _held(panel, rows, formed, hold)
    if held.empty:
        last = Months().name(int(formed["formed_month"].max()))
        found = f"no member has a return after the last formation month, {last}"
        raise _not_formed(
            f"{name}.form_month", found, "form in another month, or lengthen the data"
        )
    weighed = _with_weights(held, weights, groups)
    names = np.array(asset_names(groups))
    returns = _group_returns(weighed, groups, periods)
    returns["asset"] = names[returns["group"] - 1]
    returns = returns.sort_values(["asset", "date"], ignore_index=True)
    return Sorted(_members(formed, weights, names), returns[_RETURN_COLUMNS])


_RETURN_COLUMNS = ["asset", "date", "excess_return", "n_members", "mean_size", "ante_beta"]


def _too_few(groups: int, most: int) -> tuple[str, str]:
    """What was found where at most so many securities can be ranked in any formation month, and what to change."""
    if most == 0:
        found = "no security has an estimate and passes the screens in any formation month"
        return found, "lower min of the betas, lengthen the data, or check the screens"
    whose = "1 security" if most == 1 else f"{most} securities"
    found = f"{groups} groups, but at most {whose} can be ranked in a formation month"
    fewer = "use fewer groups, or check the screens"
    return found, fewer if most > 1 else "deliver more securities, or check the screens"


def _not_formed(option: str, found: str, change: str) -> KnownProblem:
    problem = Problem(f"portfolios.{option}", found, change)
    return KnownProblem("Ranked portfolios cannot be formed.", [problem])


@dataclass(frozen=True)
class _Rows:
    """The rows of the panel as numbers, (n_rows,) each: its security, its period, and the tables by period.

    `code` numbers the securities by `names`; `number` is `ABSENT` where the row lies in no period.
    `month` and `closes` are (n_periods,), of the periods from `low` on.
    """

    code: np.ndarray
    names: pd.Index
    number: np.ndarray
    low: int
    month: np.ndarray
    closes: np.ndarray


def _rows(panel: pd.DataFrame, periods: Periods) -> _Rows:
    code, names = coded(panel["security"])
    number = periods.number(panel["date"].to_numpy())
    known = number[number != ABSENT]
    low, high = (int(known.min()), int(known.max())) if len(known) else (0, -1)
    every = np.arange(low, high + 1)
    return _Rows(code, names, number, low, periods.month(every), periods.closes_month(every))


def _candidates(
    panel: pd.DataFrame, rows: _Rows, betas: pd.DataFrame, weights: str, form_month: int
) -> pd.DataFrame:
    """Securities that can be ranked, at the end of each formation month."""
    forms = rows.closes & (rows.month % 12 == form_month - 1)
    can = np.flatnonzero(_by_period(rows, forms, False) & panel["eligible"].to_numpy())
    size = panel["size"].to_numpy()[can]
    can = can[catalog.load(WEIGHTS[weights])(size) > 0]
    found = pd.DataFrame(
        {
            "security": pd.Series(rows.names[rows.code[can]], dtype=str),
            "date": panel["date"].to_numpy()[can],
            "size": panel["size"].to_numpy()[can],
            "code": rows.code[can],
            "formed_month": rows.month[rows.number[can] - rows.low],
        }
    )
    estimates = betas.loc[betas["date"].isin(found["date"].unique()), ["security", "date", "beta"]]
    estimates = estimates.astype({"security": str})
    return found.merge(estimates, on=["security", "date"], validate="one_to_one")


def _by_period(rows: _Rows, table: np.ndarray, absent: object) -> np.ndarray:
    """The entry of a table by period for each row, and `absent` for a row in no period."""
    at = np.where(rows.number == ABSENT, len(table), rows.number - rows.low)
    return np.append(table, np.asarray(absent, table.dtype))[at]


def _formations(candidates: pd.DataFrame, groups: int) -> pd.DataFrame:
    """The candidates with formed, ante_beta and group; formations with too few are left out."""
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


def _held(panel: pd.DataFrame, rows: _Rows, formed: pd.DataFrame, hold: int) -> pd.DataFrame:
    """Every period in which a member has a return, with the size it had the period before."""
    formations, formation_of = np.unique(formed["formed_month"], return_inverse=True)
    latest = np.searchsorted(formations, rows.month, side="left") - 1
    too_old = rows.month - formations[np.maximum(latest, 0)] > hold
    in_force = _by_period(rows, np.where(too_old, -1, latest), -1)
    member = np.full((len(formations), len(rows.names)), -1, np.int32)
    member[formation_of, formed["code"]] = np.arange(len(formed))
    excess = panel["excess_return"].to_numpy()
    row = np.flatnonzero((in_force >= 0) & ~np.isnan(excess))
    who = member[in_force[row], rows.code[row]]
    row, who = row[who >= 0], who[who >= 0]
    return pd.DataFrame(
        {
            "number": rows.number[row],
            "excess_return": excess[row],
            "lagged_size": _lagged_size(panel, rows.code)[row],
            "ante_beta": formed["ante_beta"].to_numpy()[who],
            "group": formed["group"].to_numpy()[who],
        }
    )


def _lagged_size(panel: pd.DataFrame, code: np.ndarray) -> np.ndarray:
    """Size at the end of the row before, of the same security; (n_rows,), NaN where unknown.

    A missing size is the last known one grown by the total returns since, so that a weight drifts
    with its security; a missing return grows nothing, and after a total loss no size is known. A study without a
    riskless rate knows no total returns: there excess returns stand in, which lets a size lag by the riskless return.
    """
    size = panel["size"].to_numpy()
    first = np.append(True, code[1:] != code[:-1])
    begins = first | ~np.isnan(size)
    start = np.maximum.accumulate(np.where(begins, np.arange(len(panel)), 0))
    known = size[start]
    grows = np.flatnonzero(~begins & ~np.isnan(known))
    part = panel.iloc[grows]
    growth = 1 + part["total_return"].fillna(part["excess_return"]).fillna(0.0)
    known[grows] *= growth.groupby(start[grows]).cumprod().to_numpy()
    known = np.where(known > 0, known, np.nan)
    return np.where(first, np.nan, np.roll(known, 1))


def _with_weights(held: pd.DataFrame, weights: str, groups: int) -> pd.DataFrame:
    """Members of a period with their weights, which sum to one in each group and period."""
    cell = ((held["number"] - held["number"].min()) * groups + held["group"] - 1).to_numpy()
    raw = catalog.load(WEIGHTS[weights])(held["lagged_size"].to_numpy())
    return held.assign(cell=cell, weight=scaled_to_one(raw, cell, int(cell.max()) + 1))


def _group_returns(weighed: pd.DataFrame, groups: int, periods: Periods) -> pd.DataFrame:
    """group, date and the columns of the contract; every group in every period."""
    numbers = np.arange(weighed["number"].min(), weighed["number"].max() + 1)
    dates = periods.date(numbers).astype("datetime64[ms]")
    n_periods = len(numbers)
    cell, weight, size = (weighed[c].to_numpy() for c in ("cell", "weight", "lagged_size"))

    def total(values: np.ndarray) -> np.ndarray:
        return np.bincount(cell, values, n_periods * groups)

    def ratio(part: np.ndarray, whole: np.ndarray) -> np.ndarray:
        return np.divide(part, whole, out=np.full(len(whole), np.nan), where=whole > 0)

    weighs = np.where(total(weight) > 0, 1.0, np.nan)
    return pd.DataFrame(
        {
            "group": np.tile(np.arange(1, groups + 1), n_periods),
            "date": np.repeat(dates, groups),
            "excess_return": weighs * total(weight * weighed["excess_return"].to_numpy()),
            "n_members": total(np.ones(len(cell))),
            "mean_size": ratio(total(np.nan_to_num(size)), total(np.isfinite(size).astype(float))),
            "ante_beta": weighs * total(weight * weighed["ante_beta"].to_numpy()),
        }
    )


def take_supplied(
    supplied: pd.DataFrame, market: pd.DataFrame, *, returns_are: str, noun: str = "month"
) -> Sorted:
    """Test assets that are given as return series.

    `supplied` has asset, date, return_ (decimal); `returns_are` says whether they are total
    returns, from which the riskless rate is taken, or in excess of it already. Periods without a
    market return are left out; `noun` is what messages call one.

    Raises KnownProblem when no period is left, or total returns are given and no riskless rate is known.
    """
    if returns_are == "total" and market["riskless"].isna().all():
        change = "add data.riskless, or set is: excess if they are in excess of it"
        problem = Problem("the supplied test assets", "total returns need a riskless rate", change)
        raise KnownProblem("Excess returns cannot be taken.", [problem])
    known = supplied.merge(market[["date", "riskless"]], on="date", validate="many_to_one")
    if known.empty:
        found = f"no {noun} in common with the market"
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
