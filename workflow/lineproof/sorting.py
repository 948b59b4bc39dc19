"""The stage that forms test assets: who is in which group when, and what the groups return.

No design looks ahead. Groups formed at the end of month s rest on estimates, screens and sizes
dated s or before; the weight of a member in a later period t (a month, or in a daily study a
trading day) rests on sizes and returns dated t − 1 or before.
Screens act at formation only: whatever a member returns afterwards counts.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import pandas as pd

from lineproof import catalog, formed_tables
from lineproof.designs import DRIFTING, WEIGHTS, Design
from lineproof.intake.screens import passes
from lineproof.intake.values import to_numbers
from lineproof.periods import Months, Periods
from lineproof.problems import KnownProblem, Problem
from lineproof.ranking import PanelRows, rank, split_rank
from lineproof.stats.holding import Rows, hold
from lineproof.stats.weights import lagged_sizes


@dataclass(frozen=True)
class Sorted:
    """Test assets: `members` at each formation, and `returns` of each asset and period.

    Of ranked ones also what becomes of the groups from one formation to the next (`formations`,
    `transitions`), and the betas of groups by their members (`assigned`).
    """

    members: pd.DataFrame
    returns: pd.DataFrame
    formations: pd.DataFrame
    transitions: pd.DataFrame
    assigned: pd.DataFrame

    def tables(self) -> dict[str, pd.DataFrame]:
        """Each table by the name of its contract."""
        named = ("members", "formations", "transitions", "assigned")
        return {"portfolio_returns": self.returns, **{name: getattr(self, name) for name in named}}


def sort_ranked(
    panel: pd.DataFrame,
    estimates: Mapping[str, pd.DataFrame],
    design: Design,
    *,
    periods: Periods | None = None,
    market: pd.DataFrame | None = None,
) -> Sorted:
    """Rank securities at the end of formation months, and hold the groups.

    A security can be ranked at s when it has a row that passes the screens and a weight above zero
    (with weights by size, a size at s), both dated s, and what the design ranks on. It stays in its
    group until the hold ends or until it leaves; in a period without a return it is no member.
    Where holding periods overlap, an asset returns the mean over the groups that are held at once.

    `panel` is sorted by security and date, and has a row a period of `periods` (months if None);
    `estimates` are tables by name; `market` is needed for betas of the full period alone.
    Formations with fewer securities than groups are left out. `returns` runs without gaps from the
    first to the last period with a member; a group that is empty in a period has a missing return.

    Raises KnownProblem when no formation month has as many securities as groups, no return follows
    one, or a column to rank on is text.
    """
    formed = form_groups(panel, estimates, design, periods)
    returns = formed_tables.returns(formed)
    return Sorted(
        members=formed_tables.members(formed),
        returns=returns,
        formations=formed_tables.formations(formed),
        transitions=formed_tables.transitions(formed),
        assigned=formed_tables.assigned(formed, returns, market),
    )


def form_groups(
    panel: pd.DataFrame,
    estimates: Mapping[str, pd.DataFrame],
    design: Design,
    periods: Periods | None = None,
) -> formed_tables.Formed:
    """The groups of `sort_ranked`, formed and held, from which its tables follow. Raises KnownProblem."""
    periods = Months() if periods is None else periods
    rows = PanelRows.of(panel, periods)
    asked = dict.fromkeys((*design.rank_on, *design.ante_betas))
    found = {each: _variable(rows, estimates, each, design) for each in asked}
    ranks = [found[each] for each in design.rank_on]
    antes = [found[each] for each in design.ante_betas]
    ranked = rank(rows, ranks, antes, _marks(rows, design), design)
    if len(ranked.month) == 0:
        groups = int(np.prod(design.groups))
        raise _unformed(design, groups, ranked.most)
    held_rows = _held_rows(rows, antes, design)
    held = hold(held_rows, ranked.formations)
    if not held.n_members.any():
        last = Months().name(int(ranked.month.max()))
        found = f"no member has a return after the last formation month, {last}"
        change = "form in another month, or lengthen the data"
        raise _not_formed(f"{design.name}.form_month", found, change)
    return formed_tables.Formed(rows, held_rows, ranked, held, design)


def _unformed(design: Design, groups: int, most: int) -> KnownProblem:
    """The error where at most so many securities can be ranked in any formation month."""
    if most == 0:
        since = f" from {design.first_formation} on" if design.first_formation else ""
        found = f"no security has an estimate and passes the screens in any formation month{since}"
        change = "lower min of the betas, lengthen the data, or check the screens"
        if since:
            return _not_formed(f"{design.name}.first_formation", found, f"form earlier, {change}")
        return _not_formed(f"{design.name}.groups", found, change)
    if design.breakpoints is not None and most >= groups:
        found = (
            "too few securities meet the condition to part the groups by, in every formation month"
        )
        return _not_formed(f"{design.name}.breakpoints", found, "check the condition")
    whose = "1 security" if most == 1 else f"{most} securities"
    found = f"{groups} groups, but at most {whose} can be ranked in a formation month"
    fewer = "use fewer groups, or check the screens"
    change = fewer if most > 1 else "deliver more securities, or check the screens"
    return _not_formed(f"{design.name}.groups", found, change)


def _not_formed(option: str, found: str, change: str) -> KnownProblem:
    problem = Problem(f"portfolios.{option}", found, change)
    return KnownProblem("Ranked portfolios cannot be formed.", [problem])


def _variable(
    rows: PanelRows, estimates: Mapping[str, pd.DataFrame], asked: str, design: Design
) -> np.ndarray:
    """A variable beside the rows of the panel, NaN where it is missing; (n_rows,)."""
    table, column = split_rank(asked, list(estimates))
    if table is not None:
        return rows.of_estimates(estimates[table], [column])[0]
    values = rows.panel[column]
    if pd.api.types.is_numeric_dtype(values):
        return values.to_numpy(dtype=float)
    codes, texts = pd.factorize(values)
    numbers = to_numbers(pd.Series(texts, dtype=str), [], thousands=True)
    if numbers.is_text.any():
        text = texts[int(np.flatnonzero(numbers.is_text)[0])]
        found = f"the column {column} holds {text!r}, which is no number"
        raise _not_formed(f"{design.name}.rank_on", found, "rank on a column of numbers")
    return np.append(numbers.value, np.nan)[codes]


@dataclass(frozen=True)
class _Columns:
    """The panel as a screen sees it: see `Chunk`."""

    values: dict[str, np.ndarray]
    texts: dict[str, tuple[np.ndarray, list[str]]]
    owner: np.ndarray
    names: np.ndarray


def _returns(panel: pd.DataFrame) -> pd.Series:
    """Total returns, or those in excess where a study knows no others."""
    total = panel["total_return"]
    return panel["excess_return"] if total.isna().all() else total


def _marks(rows: PanelRows, design: Design) -> np.ndarray | None:
    """Whether each row meets the condition on who sets breakpoints: bool (n_rows,), None where every one does."""
    if design.breakpoints is None:
        return None
    column = design.breakpoints["column"]
    values, texts = {}, {}
    if column != "security":
        series = rows.panel[column] if column != "return" else _returns(rows.panel)
        if pd.api.types.is_numeric_dtype(series):
            values["return_" if column == "return" else column] = series.to_numpy(dtype=float)
        else:
            codes, distinct = pd.factorize(series.fillna(""))
            texts[column] = codes, list(distinct)
    names = rows.names.to_numpy(dtype=object)
    return passes(_Columns(values, texts, rows.owner, names), design.breakpoints)


def _held_rows(rows: PanelRows, antes: list[np.ndarray], design: Design) -> Rows:
    excess = rows.panel["excess_return"].to_numpy(dtype=float)
    growth = growth_of(rows.panel)
    size = lagged_sizes(rows.starts, rows.panel["size"].to_numpy(dtype=float), growth)
    return Rows(
        starts=rows.starts,
        period=rows.period,
        excess=excess,
        growth=growth,
        size=size,
        weight=catalog.load(WEIGHTS[design.weights])(size),
        beta=np.array(antes) if antes else np.empty((0, len(excess))),
        drifts=design.weights in DRIFTING,
    )


def growth_of(panel: pd.DataFrame) -> np.ndarray:
    """1 + the total return of each row, 1 where it is missing; (n_rows,).

    A study without a riskless rate knows no total returns: there excess returns stand in, which lets a weight lag by
    the riskless return.
    """
    total = panel["total_return"].to_numpy(dtype=float)
    grown = np.where(np.isnan(total), panel["excess_return"].to_numpy(dtype=float), total)
    return np.where(np.isnan(grown), 1.0, np.maximum(1.0 + grown, 0.0))


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
    columns = formed_tables.RETURN_COLUMNS
    returns = returns[columns].sort_values(["asset", "date"], ignore_index=True)
    return Sorted(returns=returns, **formed_tables.empty())


def warm_up() -> None:
    """Compile what forming and holding groups needs, on a few invented rows."""
    months = pd.date_range("2001-01-31", periods=14, freq="ME", unit="ms")
    security = pd.Categorical(np.repeat(["A", "B", "C"], len(months)))
    panel = pd.DataFrame({"security": security, "date": np.tile(months, 3), "eligible": True})
    panel = panel.assign(total_return=0.02, excess_return=0.01, size=1.0)
    betas = panel[["security", "date"]].assign(beta=np.arange(len(panel)) / 10)
    on_betas = {"rank_on": ("b",), "ante_betas": ("b",), "assign_betas": "ex_ante"}
    design = Design(name="warm", groups=(2,), form_each="month", hold=1, **on_betas)
    sort_ranked(panel, {"b": betas}, design)
