"""Ranked portfolios of random markets: against a slow loop, and what must hold of any of them."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property
from math import floor, isnan
from typing import Any

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from tests.properties.random_market import DATES, WINDOWS, draw_market

from lineproof.designs import WEIGHTS, Design
from lineproof.estimation import estimate_betas
from lineproof.frames import contract
from lineproof.periods import Periods, periods_of
from lineproof.sorting import Sorted, sort_ranked

SEEDS = st.integers(0, 2**32 - 1)
FEW = settings(max_examples=15, deadline=None, derandomize=True)
# Sums of at most 30 returns or sizes in another order; returns are of the order of 0.1.
CLOSE = {"rtol": 1e-12, "atol": 1e-14}


FREQUENCIES = pytest.mark.parametrize("frequency", list(DATES))


def draw(
    seed: int, frequency: str = "monthly"
) -> tuple[pd.DataFrame, pd.DataFrame, dict[str, Any]]:
    """Panel, betas and options of a sort."""
    panel, market = draw_market(seed, frequency)
    how = {**WINDOWS[frequency], "returns": frequency, "dated": frequency}
    betas = estimate_betas(panel, market, name="short", estimator="ols", **how)
    rng = np.random.default_rng(seed)
    options = {
        "name": "random",
        "groups": int(rng.integers(2, 6)),
        "form_month": int(rng.integers(1, 13)),
        "hold": int(rng.choice([12, 12, 6, 1])),
        "periods": periods_of(frequency, market["date"].to_numpy()),
    }
    return panel, betas, options


def form(panel: pd.DataFrame, betas: pd.DataFrame, options: dict[str, Any], weights: str) -> Sorted:
    periods = options["periods"]
    plain = {key: value for key, value in options.items() if key not in ("periods", "groups")}
    design = Design(
        rank_on=("b",), ante_betas=("b",), groups=(options["groups"],), weights=weights, **plain
    )
    found = sort_ranked(panel, {"b": betas}, design, periods=periods)
    frequency = "daily" if periods.noun == "day" else "monthly"
    for name, table in found.tables().items():
        contract(name, frequency).validate(table)
    return found


@dataclass
class SlowSort:
    """The same portfolios one security, period and group at a time, from dictionaries.

    A period is counted by its place in the calendar, the dates of the market.
    """

    panel: pd.DataFrame
    betas: pd.DataFrame
    groups: int
    form_month: int
    hold: int
    weights: str
    periods: Periods
    name: str = ""

    @cached_property
    def calendar(self) -> list[pd.Timestamp]:
        return list(DATES["daily" if self.periods.noun == "day" else "monthly"])

    @cached_property
    def places(self) -> dict[pd.Timestamp, int]:
        return {date: place for place, date in enumerate(self.calendar)}

    def month(self, place: int) -> int:
        """Months since year 0 of a place in the calendar."""
        return self.calendar[place].year * 12 + self.calendar[place].month - 1

    def ends_month(self, place: int) -> bool:
        return place + 1 == len(self.calendar) or self.month(place) < self.month(place + 1)

    @cached_property
    def rows(self) -> dict[str, dict[int, Any]]:
        """Rows of the panel by security and place, in order."""
        found: dict[str, dict[int, Any]] = {}
        for row in self.panel.itertuples(index=False):
            found.setdefault(row.security, {})[self.places[row.date]] = row
        return found

    @cached_property
    def formations(self) -> dict[int, dict[str, tuple[int, float]]]:
        """Group and beta of each member by the place at whose end it is formed."""
        dated: dict[int, dict[str, float]] = {}
        for row in self.betas.itertuples(index=False):
            place = self.places[row.date]
            at = self.rows[row.security][place]
            weighs = self.weights == "equal" or not isnan(at.size)
            forms = self.ends_month(place) and self.month(place) % 12 == self.form_month - 1
            if forms and at.eligible and weighs:
                dated.setdefault(place, {})[row.security] = row.beta
        return {
            place: {s: (self.group(b, list(betas.values())), b) for s, b in betas.items()}
            for place, betas in sorted(dated.items())
            if len(betas) >= self.groups
        }

    def group(self, beta: float, betas: list[float]) -> int:
        """One more than the number of quantiles below `beta`, in exact arithmetic."""
        ordered = sorted(map(Fraction, betas))
        below = 0
        for k in range(1, self.groups):
            position = Fraction(k * (len(ordered) - 1), self.groups)
            low = floor(position)
            quantile = ordered[low] + (position - low) * (ordered[low + 1] - ordered[low])
            below += quantile < Fraction(beta)
        return below + 1

    def lagged_size(self, security: str, place: int) -> float | None:
        """The last known size before `place`, grown by the returns since."""
        known = None
        for at, row in self.rows[security].items():
            if at >= place:
                break
            if not isnan(row.size):
                known = row.size
            elif known is not None and not isnan(row.total_return):
                known *= 1 + row.total_return
        return known

    def held(self, place: int) -> list[tuple[int, float, float, float | None]]:
        """Group, beta, excess return and lagged size of each member with a return."""
        formed = max((s for s in self.formations if s < place), default=None)
        if formed is None or self.month(place) - self.month(formed) > self.hold:
            return []
        return [
            (group, beta, row.excess_return, self.lagged_size(security, place))
            for security, (group, beta) in self.formations[formed].items()
            if (row := self.rows[security].get(place)) and not isnan(row.excess_return)
        ]

    def returns(self) -> list[list[float]]:
        """The columns of the contract after asset and date, in their order."""
        held = {p: self.held(p) for p in range(min(self.formations) + 1, len(self.calendar))}
        some = [place for place, members in held.items() if members]
        return [
            self.portfolio([m for m in held[place] if m[0] == group])
            for group in range(1, self.groups + 1)
            for place in range(some[0], some[-1] + 1)
        ]

    def portfolio(self, members: list[tuple[int, float, float, float | None]]) -> list[float]:
        sizes = [size for *_, size in members if size is not None]
        mean_size = sum(sizes) / len(sizes) if sizes else np.nan
        raw = [1.0 if self.weights == "equal" else size or 0.0 for *_, size in members]
        if sum(raw) == 0:
            return [np.nan, len(members), mean_size, np.nan]
        excess = sum(w * r for w, (_, _, r, _) in zip(raw, members, strict=True)) / sum(raw)
        beta = sum(w * b for w, (_, b, _, _) in zip(raw, members, strict=True)) / sum(raw)
        return [excess, len(members), mean_size, beta]


@FREQUENCIES
@pytest.mark.parametrize("weights", list(WEIGHTS))
@FEW
@given(seed=SEEDS)
def test_equals_a_slow_loop(weights: str, frequency: str, seed: int) -> None:
    panel, betas, options = draw(seed, frequency)
    found, slow = (
        form(panel, betas, options, weights),
        SlowSort(panel, betas, **options, weights=weights),
    )
    members = [
        (slow.calendar[place], f"p{group:02d}", security, beta)
        for place, at in slow.formations.items()
        for security, (group, beta) in at.items()
    ]
    got = found.members[["asset", "security", "ante_beta"]]
    formed = found.members["formed"].tolist()
    assert list(zip(formed, *(got[c] for c in got), strict=True)) == sorted(members)
    values = found.returns[["excess_return", "n_members", "mean_size", "ante_beta"]].to_numpy()
    np.testing.assert_allclose(values, slow.returns(), **CLOSE)


@pytest.mark.parametrize("weights", list(WEIGHTS))
@FEW
@given(seed=SEEDS)
def test_groups_part_the_ranked_securities(weights: str, seed: int) -> None:
    panel, betas, options = draw(seed)
    members = form(panel, betas, options, weights).members
    assert not members.duplicated(["formed", "security"]).any()
    at_formation = panel["date"].dt.month == options["form_month"]
    could = panel[panel["eligible"] & at_formation].merge(betas, on=["security", "date"])
    if weights == "size":
        could = could[could["size"].notna()]
    ranked = could[could["date"].isin(members["formed"].unique())]
    pairs = members[["formed", "security"]].itertuples(index=False, name=None)
    assert sorted(pairs) == sorted(zip(ranked["date"], ranked["security"], strict=True))
    spans = members.groupby(["formed", "asset"])["ante_beta"].agg(["min", "max"])
    for _, span in spans.groupby("formed"):
        assert (span["max"].to_numpy()[:-1] < span["min"].to_numpy()[1:]).all()
    # A sum of a few dozen shares.
    total = members.groupby(["formed", "asset"])["weight"].sum()
    np.testing.assert_allclose(total, 1.0, rtol=1e-14)


@FREQUENCIES
@FEW
@given(seed=SEEDS)
def test_equally_weighted_groups_average_to_their_members(frequency: str, seed: int) -> None:
    panel, betas, options = draw(seed, frequency)
    returns = form(panel, betas, options, "equal").returns
    slow = SlowSort(panel, betas, **options, weights="equal")
    assert_rebuilt(returns, returns["n_members"], slow, lambda size: 1.0)


@FREQUENCIES
@FEW
@given(seed=SEEDS)
def test_size_weighted_groups_rebuild_the_market_of_their_members(
    frequency: str, seed: int
) -> None:
    panel, betas, options = draw(seed, frequency)
    returns = form(panel, betas, options, "size").returns
    slow = SlowSort(panel, betas, **options, weights="size")
    total_size = returns["n_members"] * returns["mean_size"]  # every member has a size
    assert_rebuilt(returns, total_size, slow, lambda size: size)


def assert_rebuilt(returns: pd.DataFrame, total: pd.Series, slow: SlowSort, weigh: Any) -> None:
    """Groups weighted by `total` return the same as all members, each weighted by itself."""
    parts = pd.DataFrame({"date": returns["date"], "weight": total}).assign(
        part=total * returns["excess_return"]
    )
    sums = parts[parts["weight"] > 0].groupby("date").sum()
    expected = []
    for date in sums.index:
        held = [(weigh(size), excess) for _, _, excess, size in slow.held(slow.places[date])]
        expected.append(sum(w * r for w, r in held) / sum(w for w, _ in held))
    np.testing.assert_allclose(sums["part"] / sums["weight"], expected, **CLOSE)


@pytest.mark.parametrize("weights", list(WEIGHTS))
@FEW
@given(seed=SEEDS)
def test_names_of_securities_do_not_matter(weights: str, seed: int) -> None:
    panel, betas, options = draw(seed)
    names = panel["security"].unique()
    new = dict(zip(names, np.random.default_rng(seed).permutation(names), strict=True))

    def relabelled(frame: pd.DataFrame) -> pd.DataFrame:
        frame = frame.assign(security=frame["security"].map(new))
        return frame.sort_values(["security", "date"], ignore_index=True)

    one = form(panel, betas, options, weights).returns
    other = form(relabelled(panel), relabelled(betas), options, weights).returns
    pd.testing.assert_frame_equal(one, other, **CLOSE)


@pytest.mark.parametrize("weights", list(WEIGHTS))
@FEW
@given(seed=SEEDS)
def test_the_unit_of_size_does_not_matter(weights: str, seed: int) -> None:
    panel, betas, options = draw(seed)
    one = form(panel, betas, options, weights)
    other = form(panel.assign(size=1000 * panel["size"]), betas, options, weights)
    returns = other.returns.assign(mean_size=other.returns["mean_size"] / 1000)
    members = other.members.assign(size=other.members["size"] / 1000)
    pd.testing.assert_frame_equal(one.returns, returns, **CLOSE)
    pd.testing.assert_frame_equal(one.members, members, **CLOSE)
