"""Ranked portfolios of random markets: against a slow loop, and what must hold of any of them.

Every design and weighting of the registries is tried, each with options drawn at random.
"""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise, product
from typing import Any

import numpy as np
import pandas as pd
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from tests.properties.drawn_designs import DRAWN, NOT_RANKED, draw_design, estimates, with_sector
from tests.properties.random_market import DATES, draw_market
from tests.properties.slow_sort import SlowSort
from tests.thorough import examples

from lineproof.addresses import is_spread
from lineproof.designs import DESIGNS, WEIGHTS, Design
from lineproof.formed_tables import asset_names
from lineproof.frames import contract
from lineproof.periods import periods_of
from lineproof.problems import KnownProblem
from lineproof.sorting import Sorted, sort_ranked

SEEDS = st.integers(0, 2**32 - 1)
FEW = settings(max_examples=examples(4), deadline=None, derandomize=True)
# Sums of at most 30 returns or sizes in another order; returns are of the order of 0.1.
CLOSE = {"rtol": 1e-12, "atol": 1e-14}
RETURNS = ["excess_return", "n_members", "mean_size", "ante_beta"]

FREQUENCIES = pytest.mark.parametrize("frequency", list(DATES))
KINDS = pytest.mark.parametrize("kind", list(DRAWN))
EVERY_WEIGHTING = pytest.mark.parametrize("weights", list(WEIGHTS))
Drawn = tuple[pd.DataFrame, dict[str, pd.DataFrame], Design, Any]


def test_every_design_is_tried() -> None:
    assert set(DRAWN) | NOT_RANKED == set(DESIGNS)


def draw(kind: str, seed: int, weights: str, frequency: str = "monthly") -> Drawn:
    """Panel, estimates, design and periods of a sort."""
    panel, market = draw_market(seed, frequency)
    panel = with_sector(panel)
    periods = periods_of(frequency, market["date"].to_numpy())
    return panel, estimates(panel, market, frequency), draw_design(kind, seed, weights), periods


def form(panel: pd.DataFrame, betas: dict, design: Design, periods: Any) -> Sorted:
    """The sort, its tables within their contracts; a draw without a formation is drawn anew."""
    try:
        found = sort_ranked(panel, betas, design, periods=periods)
    except KnownProblem:
        assume(False)
        raise
    frequency = "daily" if periods.noun == "day" else "monthly"
    for name, table in found.tables().items():
        contract(name, frequency).validate(table)
    return found


def named(found: pd.DataFrame) -> pd.DataFrame:
    """A table with names as text."""
    names = [column for column in ("security", "asset") if column in found]
    return found.astype(dict.fromkeys(names, str))


def groups_of(design: Design) -> dict[str, tuple[int, ...]]:
    """The groups of each asset, one a variable."""
    every = product(*(range(1, count + 1) for count in design.groups))
    return dict(zip(asset_names(*design.groups), every, strict=True))


@FREQUENCIES
@EVERY_WEIGHTING
@KINDS
@FEW
@given(seed=SEEDS)
def test_equals_a_slow_loop(kind: str, weights: str, frequency: str, seed: int) -> None:
    drawn = draw(kind, seed, weights, frequency)
    found, slow, groups = form(*drawn), SlowSort(*drawn), groups_of(drawn[2])
    names = {group: asset for asset, group in groups.items()}
    members = [
        (slow.calendar[place], names[group], security)
        for place, at in slow.formations.items()
        for security, group in at.items()
    ]
    got = named(found.members)[["formed", "asset", "security"]]
    assert list(got.itertuples(index=False, name=None)) == sorted(members)
    antes = [
        slow.value(drawn[2].ante_betas[0], row.security, slow.places[row.formed])
        if drawn[2].ante_betas
        else np.nan
        for row in got.itertuples(index=False)
    ]
    np.testing.assert_array_equal(found.members["ante_beta"], antes)
    assets = found.returns[~found.returns["asset"].map(is_spread)]
    assert assets["asset"].unique().tolist() == list(groups)
    values = [
        slow.returns(groups[row.asset], slow.places[row.date])
        for row in assets[["asset", "date"]].itertuples(index=False)
    ]
    np.testing.assert_allclose(assets[RETURNS].to_numpy(), values, **CLOSE)
    held = [
        place
        for place in range(len(slow.calendar))
        if any(
            members
            for formed in slow.in_force(place)
            for members in slow.held(formed, place).values()
        )
    ]
    first, last = slow.places[assets["date"].min()], slow.places[assets["date"].max()]
    assert (first, last) == (held[0], held[-1])


@FREQUENCIES
@EVERY_WEIGHTING
@KINDS
@FEW
@given(seed=SEEDS)
def test_formations_and_transitions_equal_a_slow_loop(
    kind: str, weights: str, frequency: str, seed: int
) -> None:
    drawn = draw(kind, seed, weights, frequency)
    found, slow, groups = form(*drawn), SlowSort(*drawn), groups_of(drawn[2])
    weight = named(found.members).set_index(["formed", "security"])["weight"]
    for row in found.formations.itertuples(index=False):
        place, group = slow.places[row.formed], groups[row.asset]
        inside = [s for s, at in slow.formations[place].items() if at == group]
        new = {security: weight[row.formed, security] for security in inside}
        ends = [p for p in range(len(slow.calendar)) if place in slow.in_force(p)]
        last = max(ends, default=place)
        gone = [s for s in inside if max(slow.rows[s]) < last]
        assert (row.n_members, row.n_exits) == (len(inside), len(gone))
        np.testing.assert_allclose(row.turnover, slow.turnover(group, place, new), **CLOSE)
        sizes = [slow.rows[s][place].size for s in inside]
        known = [size for size in sizes if not np.isnan(size)]
        np.testing.assert_allclose(row.mean_size, np.mean(known) if known else np.nan, **CLOSE)
    names = {group: asset for asset, group in groups.items()}
    moves: dict[tuple, int] = {}
    every = list(slow.formations)
    for before, after in pairwise(every):
        for security in {*slow.formations[before], *slow.formations[after]}:
            came = names.get(slow.formations[before].get(security), "new")
            went = names.get(slow.formations[after].get(security), "out")
            key = (slow.calendar[after], came, went)
            moves[key] = moves.get(key, 0) + 1
    got = found.transitions.itertuples(index=False, name=None)
    assert {key[:3]: key[3] for key in got} == moves
    total = found.transitions.groupby(["formed", "from"])["share"].sum()
    np.testing.assert_allclose(total, 1.0, rtol=1e-14)


@EVERY_WEIGHTING
@KINDS
@FEW
@given(seed=SEEDS)
def test_groups_part_the_ranked_securities(kind: str, weights: str, seed: int) -> None:
    drawn = draw(kind, seed, weights)
    members = named(form(*drawn).members)
    assert not members.duplicated(["formed", "security"]).any()
    slow = SlowSort(*drawn)
    for formed, rows in members.groupby("formed"):
        assert sorted(rows["security"]) == sorted(slow.ranked_on(slow.places[formed]))
    # A sum of a few dozen shares.
    total = members.groupby(["formed", "asset"])["weight"].sum()
    np.testing.assert_allclose(total, 1.0, rtol=1e-14)


@FREQUENCIES
@EVERY_WEIGHTING
@KINDS
@FEW
@given(seed=SEEDS)
def test_groups_rebuild_the_market_of_their_members(
    kind: str, weights: str, frequency: str, seed: int
) -> None:
    """Groups weighted by what their members weigh return the same as all members, each weighted by itself."""
    drawn = draw(kind, seed, weights, frequency)
    assume(not drawn[2].overlap)
    found, slow, groups = form(*drawn), SlowSort(*drawn), groups_of(drawn[2])
    wide = found.returns.pivot(index="date", columns="asset", values="excess_return")
    for date, row in wide.iterrows():
        place = slow.places[date]
        for formed in slow.in_force(place):
            held = slow.held(formed, place)
            every = [(w, r) for members in held.values() for _, w, r, _ in members]
            whole = sum(w for w, _ in every)
            if whole > 0:
                weighed = {
                    asset: sum(w for _, w, _, _ in held.get(group, []))
                    for asset, group in groups.items()
                }
                mine = sum(w * row[asset] for asset, w in weighed.items() if w > 0) / whole
                np.testing.assert_allclose(mine, sum(w * r for w, r in every) / whole, **CLOSE)


@KINDS
@FEW
@given(seed=SEEDS)
def test_wealth_that_is_bought_and_held_is_that_of_its_members(kind: str, seed: int) -> None:
    """Without holes, leavers or a riskless rate, a group's wealth is the mean of its members' wealths."""
    panel, market = draw_market(seed)
    dates = panel["security"].value_counts()
    panel = with_sector(panel[panel["security"].isin(dates.index[dates > 40])]).reset_index(
        drop=True
    )
    whole = pd.MultiIndex.from_product([panel["security"].unique(), DATES["monthly"]])
    panel = panel.set_index(["security", "date"]).reindex(whole)
    panel.index.names = ["security", "date"]
    panel["total_return"] = panel["excess_return"] = panel["total_return"].fillna(0.01)
    panel["eligible"] = panel["eligible"].eq(True)
    panel = with_sector(panel.reset_index())
    betas, design = estimates(panel, market), draw_design(kind, seed, "buy_and_hold")
    assume(not design.overlap)
    found = form(panel, betas, design, periods_of("monthly", market["date"].to_numpy()))
    growth = 1 + panel.pivot(index="date", columns="security", values="total_return")
    grown = 1 + found.returns.pivot(index="date", columns="asset", values="excess_return")
    for (formed, asset), rows in named(found.members).groupby(["formed", "asset"]):
        months = growth.index[growth.index > formed][: design.hold]
        wealth = growth.loc[months, rows["security"]].cumprod().mean(axis=1)
        # A product of up to 36 months.
        np.testing.assert_allclose(grown.loc[months, asset].cumprod(), wealth, rtol=1e-11)


@EVERY_WEIGHTING
@KINDS
@FEW
@given(seed=SEEDS)
def test_spreads_and_assigned_betas(kind: str, weights: str, seed: int) -> None:
    panel, betas, design, periods = draw(kind, seed, weights)
    design = replace(design, spread=True, assign_betas="ex_ante")
    found = form(panel, betas, design, periods)
    wide = found.returns.pivot(index="date", columns="asset", values="excess_return")
    names = asset_names(*design.groups)
    if len(design.groups) == 1:
        pd.testing.assert_series_equal(
            wide["spread"], wide[names[-1]] - wide[names[0]], check_names=False
        )
    slow = SlowSort(panel, betas, design, periods)
    expected: dict[tuple, list[float]] = {}
    for place in range(len(slow.calendar)):
        for formed in slow.in_force(place):
            for members in slow.held(formed, place).values():
                known = [(w, b) for _, w, _, b in members if not np.isnan(b)]
                total = sum(w for w, _ in known)
                for security, *_ in members if total > 0 else ():
                    beta = sum(w * b for w, b in known) / total
                    expected.setdefault((security, slow.calendar[place]), []).append(beta)
    got = named(found.assigned)
    assert list(zip(got["security"], got["date"], strict=True)) == sorted(expected)
    means = [np.mean(expected[key]) for key in sorted(expected)]
    np.testing.assert_allclose(got["beta"], means, **CLOSE)


@EVERY_WEIGHTING
@KINDS
@FEW
@given(seed=SEEDS)
def test_names_of_securities_do_not_matter(kind: str, weights: str, seed: int) -> None:
    panel, betas, design, periods = draw(kind, seed, weights)
    names = panel["security"].unique()
    new = dict(zip(names, np.random.default_rng(seed).permutation(names), strict=True))

    def relabelled(frame: pd.DataFrame) -> pd.DataFrame:
        frame = frame.assign(security=frame["security"].map(new))
        return frame.sort_values(["security", "date"], ignore_index=True)

    other = {name: relabelled(table) for name, table in betas.items()}
    one = form(panel, betas, design, periods).returns
    pd.testing.assert_frame_equal(
        one, form(relabelled(panel), other, design, periods).returns, **CLOSE
    )


@EVERY_WEIGHTING
@KINDS
@FEW
@given(seed=SEEDS)
def test_the_unit_of_size_does_not_matter(kind: str, weights: str, seed: int) -> None:
    panel, betas, design, periods = draw(kind, seed, weights)
    one = form(panel, betas, design, periods)
    # A power of two, so that no quantile of sizes rounds anew.
    other = form(panel.assign(size=1024 * panel["size"]), betas, design, periods)
    returns = other.returns.assign(mean_size=other.returns["mean_size"] / 1024)
    members = other.members.assign(size=other.members["size"] / 1024)
    pd.testing.assert_frame_equal(one.returns, returns, **CLOSE)
    pd.testing.assert_frame_equal(one.members, members, **CLOSE)
