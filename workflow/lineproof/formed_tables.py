"""The tables of ranked test assets, from groups as they were formed and held."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import pandas as pd

from lineproof import catalog
from lineproof.addresses import NEW, OUT, SPREAD
from lineproof.designs import WEIGHTS, Design
from lineproof.periods import ABSENT
from lineproof.ranking import PanelRows, Ranked
from lineproof.stats.holding import Held, Rows, assign, in_order, ratio
from lineproof.stats.moving import at_formation, moves, turnover
from lineproof.stats.weights import scaled_to_one

RETURN_COLUMNS = ["asset", "date", "excess_return", "n_members", "mean_size", "ante_beta"]


@dataclass(frozen=True)
class Formed:
    """Groups as they were formed and held; see `ranking` and `stats.holding`."""

    rows: PanelRows
    held_rows: Rows
    ranked: Ranked
    held: Held
    design: Design

    @cached_property
    def assets(self) -> np.ndarray:
        """Names of the groups in their order, (n_groups,)."""
        return np.array(asset_names(*self.design.groups), dtype=object)

    @cached_property
    def dates(self) -> np.ndarray:
        """The date of each formation."""
        return self.rows.dates(self.ranked.formations.formed)

    @cached_property
    def cell(self) -> np.ndarray:
        """Formation and group of each member as one number, (n_members,)."""
        f = self.ranked.formations
        return self.ranked.formation_of * f.n_groups + f.group

    @property
    def n_cells(self) -> int:
        """Formations times groups."""
        return len(self.ranked.month) * self.ranked.formations.n_groups

    @cached_property
    def size(self) -> np.ndarray:
        """Size of each member at formation."""
        return self.rows.panel["size"].to_numpy(dtype=float)[self.ranked.formations.row]

    @cached_property
    def weight(self) -> np.ndarray:
        """Weight of each member at formation, scaled to one in each group."""
        raw = catalog.load(WEIGHTS[self.design.weights])(self.size)
        return scaled_to_one(raw, self.cell, self.n_cells)

    @cached_property
    def ante_beta(self) -> np.ndarray:
        """Ex-ante beta of each member at formation, NaN where the design has none."""
        betas, row = self.held_rows.beta, self.ranked.formations.row
        return betas[0, row] if len(betas) else np.full(len(row), np.nan)


def asset_names(*groups: int) -> list[str]:
    """`p01` (lowest) to `p10`; of two variables `p01-01` to `p05-05`. Names sort in the order of the groups."""
    names = [f"{group:0{_digits(groups[0])}d}" for group in range(1, groups[0] + 1)]
    for count in groups[1:]:
        inner = [f"{group:0{_digits(count)}d}" for group in range(1, count + 1)]
        names = [f"{outer}-{each}" for outer in names for each in inner]
    return [f"p{name}" for name in names]


def _digits(count: int) -> int:
    return max(2, len(str(count)))


def members(formed: Formed) -> pd.DataFrame:
    """Who was in which group, formation by formation."""
    f = formed.ranked.formations
    order = in_order(formed.cell, formed.n_cells)
    n_each = np.bincount(formed.cell, minlength=formed.n_cells)
    groups = np.tile(np.arange(f.n_groups), len(formed.dates))
    return pd.DataFrame(
        {
            "formed": np.repeat(formed.dates, np.diff(f.starts)),
            "asset": _named(np.repeat(groups, n_each), formed.assets),
            "security": _named(f.security[order], formed.rows.names),
            "weight": formed.weight[order],
            "ante_beta": formed.ante_beta[order],
            "size": formed.size[order],
        },
        copy=False,
    )


def _named(codes: np.ndarray, names: np.ndarray | pd.Index) -> pd.Categorical:
    return pd.Categorical.from_codes(codes, pd.Index(names, dtype=str))


def returns(formed: Formed) -> pd.DataFrame:
    """Returns of every group and spread in every period, the mean over the groups that are held at once."""
    f, held = formed.ranked.formations, formed.held
    n_periods = len(formed.rows.month)
    by_period = {
        "excess_return": _mean_over(f, held.excess, n_periods),
        "n_members": _sum_over(f, held.n_members, n_periods),
        "mean_size": ratio(
            _sum_over(f, held.total_size, n_periods), _sum_over(f, held.n_sized, n_periods)
        ),
        "ante_beta": _mean_over(f, held.beta, n_periods),
    }
    some = np.flatnonzero(by_period["n_members"].any(axis=1))
    every = np.arange(some[0], some[-1] + 1)
    dates = formed.rows.dates(every)
    tables = {name: values[every] for name, values in by_period.items()}
    names = list(formed.assets)
    if formed.design.spread:
        added, tables = _with_spreads(tables, formed.design.groups)
        names += added
    flat = {name: values.T.ravel() for name, values in tables.items()}
    asset = pd.Series(np.repeat(np.array(names, dtype=object), len(dates)), dtype=str)
    frame = pd.DataFrame({"asset": asset, "date": np.tile(dates, len(names)), **flat})
    return frame[RETURN_COLUMNS]


def _with_spreads(
    tables: dict[str, np.ndarray], groups: Sequence[int]
) -> tuple[list[str], dict[str, np.ndarray]]:
    """High minus low of the last variable: one, or in a double sort its mean and that in each first group."""
    names = [SPREAD]
    if len(groups) > 1:
        names += [f"{SPREAD}-{name[1:]}" for name in asset_names(*groups[:-1])]
    found = {}
    for name, values in tables.items():
        parts = values.reshape(len(values), -1, groups[-1])
        spread = parts[..., -1] - parts[..., 0]
        if name not in ("excess_return", "ante_beta"):
            spread = np.full_like(spread, np.nan)
        mean = [spread.mean(axis=1, keepdims=True)] if len(groups) > 1 else []
        found[name] = np.hstack([values, *mean, spread])
    return names, found


def _sum_over(f, values: np.ndarray, n_periods: int) -> np.ndarray:
    """Sums over formations that are held at once, (n_periods, n_groups)."""
    total = np.zeros((n_periods, f.n_groups))
    for at, (formed, last) in enumerate(zip(f.formed, f.last, strict=True)):
        total[formed + 1 : last + 1] += values[f.cells[at] : f.cells[at + 1]]
    return total


def _mean_over(f, values: np.ndarray, n_periods: int) -> np.ndarray:
    known = np.isfinite(values)
    counts = _sum_over(f, known.astype(float), n_periods)
    return ratio(_sum_over(f, np.where(known, values, 0.0), n_periods), counts)


def formations(formed: Formed) -> pd.DataFrame:
    """What each group is at its formation, and how many of its members leave while it is held."""
    f = formed.ranked.formations
    given = (f.starts, f.group, formed.weight, formed.size, formed.ante_beta)
    sums = at_formation(*given, formed.rows.last[f.security], f.last, f.n_groups)
    n_members, total_size, n_sized, part, weighed, n_exits = sums.reshape(len(sums), -1)
    return pd.DataFrame(
        {
            "formed": np.repeat(formed.dates, f.n_groups),
            "asset": pd.Series(np.tile(formed.assets, len(formed.dates)), dtype=str),
            "n_members": n_members.astype(np.int64),
            "turnover": _turnover(formed),
            "mean_size": ratio(total_size, n_sized),
            "ante_beta": ratio(part, weighed),
            "n_exits": n_exits.astype(np.int64),
        }
    )


def _turnover(formed: Formed) -> np.ndarray:
    """Turnover from the groups whose hold ends at each formation, as they have drifted, (n_cells,)."""
    ranked, f = formed.ranked, formed.ranked.formations
    drifted = scaled_to_one(formed.held.drifted, formed.cell, formed.n_cells)
    begun = ranked.month - formed.design.hold
    at = np.minimum(np.searchsorted(ranked.month, begun), len(begun) - 1)
    ended = np.where(ranked.month[at] == begun, at, -1)
    given = (f.starts, f.security, f.group, formed.weight, drifted, ended)
    return turnover(*given, f.n_securities, f.n_groups).ravel()


def transitions(formed: Formed) -> pd.DataFrame:
    """Where the members of each group are at the next formation, dated by that."""
    f = formed.ranked.formations
    now, came, went, n = moves(f.starts, f.security, f.group, f.n_securities, f.n_groups)
    left = now * (f.n_groups + 1) + came
    total = np.bincount(left, n)[left] if len(left) else np.empty(0)
    return pd.DataFrame(
        {
            "formed": formed.dates[now],
            "from": pd.Series(np.append(NEW, formed.assets)[came], dtype=str),
            "to": pd.Series(np.append(OUT, formed.assets)[went], dtype=str),
            "n": n,
            "share": n / total,
        }
    )


def assigned(formed: Formed, returns: pd.DataFrame, market: pd.DataFrame | None) -> pd.DataFrame:
    """The beta of its group for each period in which a member has a return, as the design says; dated by the return.

    `ex_ante` is the group's in that period; `full_period` the slope of all its returns on the
    market's, as Fama and French (1992) assign it, which looks ahead by intention.
    """
    f, kind = formed.ranked.formations, formed.design.assign_betas
    if kind == "none":
        return empty()["assigned"]
    beta = formed.held.beta
    if kind == "full_period":
        slopes = [
            _slope(formed, returns[returns["asset"] == name], market) for name in formed.assets
        ]
        beta = np.broadcast_to(slopes, formed.held.excess.shape).copy()
    found = assign(formed.held_rows, f, beta)
    row = np.flatnonzero(np.isfinite(found))
    return pd.DataFrame(
        {
            "security": _named(formed.rows.owner[row], formed.rows.names),
            "date": formed.rows.panel["date"].to_numpy()[row],
            "beta": found[row],
        }
    )


def _slope(formed: Formed, returns: pd.DataFrame, market: pd.DataFrame) -> float:
    """Slope of one asset's returns on the market's by least squares, NaN where there is none."""
    periods = formed.rows.periods
    number, at = (periods.number(table["date"].to_numpy()) for table in (returns, market))
    factor = pd.Series(market["market_excess"].to_numpy(), index=at)
    x = factor[factor.index != ABSENT].reindex(number).to_numpy()
    y = returns["excess_return"].to_numpy()
    both = np.isfinite(x) & np.isfinite(y)
    x, y = x[both], y[both]
    moves = x - x.mean() if len(x) else x
    return float(moves @ y / (moves @ moves)) if moves @ moves > 0 else np.nan


def empty() -> dict[str, pd.DataFrame]:
    """The tables that supplied test assets do not have, without rows."""
    date, number, count = "datetime64[ms]", float, "int64"
    columns = {
        "members": {
            "formed": date,
            "asset": str,
            "security": str,
            **dict.fromkeys(("weight", "ante_beta", "size"), number),
        },
        "formations": {
            "formed": date,
            "asset": str,
            "n_members": count,
            **dict.fromkeys(("turnover", "mean_size", "ante_beta"), number),
            "n_exits": count,
        },
        "transitions": {"formed": date, "from": str, "to": str, "n": count, "share": number},
        "assigned": {"security": str, "date": date, "beta": number},
    }
    return {
        table: pd.DataFrame({name: pd.Series(dtype=kind) for name, kind in typed.items()})
        for table, typed in columns.items()
    }
