"""Nothing later than a month can change what is estimated, formed or returned by that month.

Every estimator, design and weighting of the registries is tried. All values dated after a random
month are replaced by noise, or all rows after it removed; what is dated up to it must stay the same
to the last bit.
"""

from __future__ import annotations

import tempfile
from collections.abc import Callable
from dataclasses import replace
from functools import partial
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from tests.properties.drawn_designs import DRAWN, SECTORS, estimates, options, with_sector
from tests.properties.random_market import DATES, WINDOWS, draw_market
from tests.thorough import examples

from lineproof import store
from lineproof.designs import DESIGNS, WEIGHTS, Design
from lineproof.estimation import estimates_of, shrink_betas
from lineproof.estimators import ESTIMATORS, SHRINKAGES
from lineproof.forming import form_portfolios
from lineproof.problems import KnownProblem
from lineproof.sorting import Sorted, sort_ranked

SEEDS = st.integers(0, 2**32 - 1)
# The place of the cut in the calendar: late enough for a first formation and a return after it in
# any month of the year, early enough for later values to change.
CUTS = st.floats(0.5, 1.0, exclude_max=True)
FEW = settings(max_examples=examples(15), deadline=None, derandomize=True)
Market = tuple[pd.DataFrame, pd.DataFrame]


def with_noise_after(frame: pd.DataFrame, cut: pd.Timestamp, seed: int) -> pd.DataFrame:
    """Every value dated after `cut` drawn anew: returns, sizes, prices and screens alike."""
    rng = np.random.default_rng(seed)
    later = frame["date"] > cut
    n = int(later.sum())
    frame = frame.copy()
    for column in frame.columns.difference(["security", "date"]):
        if column == "eligible":
            frame.loc[later, column] = rng.random(n) < 0.5
        elif column == "sector":
            frame.loc[later, column] = rng.choice(SECTORS, n)
        else:
            noise = rng.uniform(0.0, 9.0, n) if column in ("size", "price") else rng.normal(size=n)
            noise[rng.random(n) < (0.2 if "market" not in column else 0.0)] = np.nan
            frame.loc[later, column] = noise
    return frame


def cut_after(frame: pd.DataFrame, cut: pd.Timestamp, seed: int) -> pd.DataFrame:
    """No row after `cut`."""
    return frame[frame["date"] <= cut].reset_index(drop=True)


CHANGES: dict[str, Callable[[pd.DataFrame, pd.Timestamp, int], pd.DataFrame]] = {
    "noise": with_noise_after,
    "cut": cut_after,
}


def assert_identical_until(
    one: pd.DataFrame, other: pd.DataFrame, by: str, cut: pd.Timestamp
) -> None:
    early = [frame[frame[by] <= cut].reset_index(drop=True) for frame in (one, other)]
    assert len(early[0]) > 0
    pd.testing.assert_frame_equal(*early, check_exact=True)
    numbers = [frame.select_dtypes("number").to_numpy().tobytes() for frame in early]
    assert numbers[0] == numbers[1]


def changed_market(market: Market, change: str, cut: pd.Timestamp, seed: int) -> Market:
    panel, factor = (CHANGES[change](frame, cut, seed) for frame in market)
    return panel, factor


def cut_at(dates: pd.DatetimeIndex, at: float) -> pd.Timestamp:
    """A date that has at least one later one of another month."""
    last = int((dates < dates[-1].replace(day=1)).sum()) - 1
    return dates[int(at * last)]


# Options without which an estimator cannot be tried, and others worth trying. Estimators that need none are found by
# themselves.
OWN: dict[str, list[dict]] = {
    "lagged": [{"lags": 1, "leads": 0}, {"lags": 1, "leads": 2}],
    "exponential": [{"half_life": 8.0}],
    "correlation_volatility": [{"volatility_window": 15, "volatility_min_obs": 6, "overlap": 3}],
    "downside": [{"below": "mean"}, {"below": "zero"}],
}
TRIED = [(name, own) for name in ESTIMATORS for own in OWN.get(name, [{}])]
BESIDE = ["smb", "hml"]


def factors_of(market: Market) -> pd.DataFrame:
    """Two further factors; those of a market made into noise are noise."""
    excess = market[1]["market_excess"].to_numpy()
    values = {"smb": np.sin(1e3 * excess), "hml": np.cos(1e3 * excess)}
    return pd.DataFrame({"date": market[1]["date"], **values})


def estimated(market: Market, estimator: str, own: dict, **options: object) -> pd.DataFrame:
    beside = BESIDE if estimator == "multi_factor" else []
    return estimates_of(
        *market,
        factors_of(market),
        name="short",
        estimator=estimator,
        own=own,
        beside=beside,
        **options,
    )


@pytest.mark.parametrize("change", list(CHANGES))
@pytest.mark.parametrize(
    ("returns", "dated"), [("monthly", "monthly"), ("daily", "daily"), ("daily", "monthly")]
)
@pytest.mark.parametrize(("estimator", "own"), TRIED, ids=str)
@FEW
@given(seed=SEEDS, at=CUTS)
def test_betas(
    estimator: str, own: dict, returns: str, dated: str, change: str, seed: int, at: float
) -> None:
    market, cut = draw_market(seed, returns), cut_at(DATES[returns], at)
    if dated != returns:  # a month is dated by its last day, which is no trading day
        cut += pd.offsets.MonthEnd(0)
    options = {**WINDOWS[returns], "returns": returns, "dated": dated}
    before, after = (
        estimated(each, estimator, own, **options)
        for each in (market, changed_market(market, change, cut, seed))
    )
    assert_identical_until(before, after, "date", cut)
    assert not before.equals(after)  # the change does reach what is dated later


SHRUNK = {"cross_section": {}, "fixed": {"weight": 0.6, "to": 1.0}}


@pytest.mark.parametrize("shrink", list(SHRINKAGES))
@pytest.mark.parametrize("change", list(CHANGES))
@FEW
@given(seed=SEEDS, at=CUTS)
def test_shrunk_betas(shrink: str, change: str, seed: int, at: float) -> None:
    market, cut = draw_market(seed, "monthly"), cut_at(DATES["monthly"], at)
    before, after = (
        shrink_betas(
            estimated(each, "ols", {}, **WINDOWS["monthly"]), shrink=shrink, own=SHRUNK[shrink]
        )
        for each in (market, changed_market(market, change, cut, seed))
    )
    assert_identical_until(before, after, "date", cut)
    assert not before.equals(after)


def ranked(
    kind: str, market: Market, frequency: str, weights: str, seed: int, folder: Path
) -> Sorted:
    """A design that ranks, from the files that a job would read."""
    panel, factor = market
    tables = {"panel": panel, **estimates(panel, factor, frequency)}
    for name, table in tables.items():
        store.write_table(table, folder / f"{name}.parquet", None)
    sources = [str(folder / f"{name}.parquet") for name in tables]
    given = {**options(kind, seed), "weights": weights, "frequency": frequency}
    return form_portfolios(sources, factor, design=kind, estimates=["b", "c"], **given)


def supplied(market: Market, frequency: str, weights: str, seed: int, folder: Path) -> Sorted:
    """The first securities of the panel stand for supplied assets, which nobody weighs or forms."""
    panel, factor = market
    columns = {"asset": "security", "date": "date", "return": "total_return"}
    file = folder / "supplied.csv"
    panel[panel["security"] < "S05"].to_csv(file, columns=list(columns.values()), index=False)
    reading = {
        "label": file.name,
        "columns": columns,
        "unit": "decimal",
        "missing": [""],
        "dates": "%Y-%m-%d",
        "separator": None,
    }
    return form_portfolios(
        [str(file)], factor, design="supplied", reading=reading, returns_are="total"
    )


# How each design is fed from a panel and a market. A new design needs a line here, or in DRAWN.
FED: dict[str, Callable[[Market, str, str, int, Path], Sorted]] = {
    **{kind: partial(ranked, kind) for kind in DRAWN},
    "supplied": supplied,
}


def test_every_design_is_tried() -> None:
    assert set(FED) == set(DESIGNS)


def assert_no_look_ahead(before: Sorted, after: Sorted, cut: pd.Timestamp) -> None:
    """How many members leave during a hold is known only after it; all else is known at its date."""
    tables, other = before.tables(), after.tables()
    for name, table in tables.items():
        dated = "formed" if "formed" in table else "date"
        one, two = (
            frame.drop(columns="n_exits", errors="ignore") for frame in (table, other[name])
        )
        names = [column for column in ("security", "asset") if column in one]
        one, two = (frame.astype(dict.fromkeys(names, str)) for frame in (one, two))
        if name == "portfolio_returns":
            one, two = until_the_shorter_ends(one, two, cut)
        if (one[dated] <= cut).any() or (two[dated] <= cut).any():
            assert_identical_until(one, two, dated, cut)


def until_the_shorter_ends(
    one: pd.DataFrame, other: pd.DataFrame, cut: pd.Timestamp
) -> tuple[pd.DataFrame, pd.DataFrame]:
    """Returns end with the last period that has a member; what the longer has beyond, up to the cut, is empty."""
    end = min(one["date"].max(), other["date"].max())
    for each in (one, other):
        beyond = each[(each["date"] > end) & (each["date"] <= cut)]
        assert beyond["excess_return"].isna().all()
        assert not beyond["n_members"].gt(0).any()
    return one[one["date"] <= end], other[other["date"] <= end]


@pytest.mark.parametrize("change", list(CHANGES))
@pytest.mark.parametrize("weights", list(WEIGHTS))
# Supplied series of days are the intake's to read.
@pytest.mark.parametrize(
    ("design", "frequency"),
    [*((design, "monthly") for design in DESIGNS), *((design, "daily") for design in DRAWN)],
)
@settings(FEW, max_examples=3)
@given(seed=SEEDS, at=CUTS)
def test_test_assets(
    design: str, frequency: str, weights: str, change: str, seed: int, at: float
) -> None:
    panel, factor = draw_market(seed, frequency)
    market = (with_sector(panel), factor)
    cut = cut_at(DATES[frequency], 0.4 + 0.6 * at)
    with tempfile.TemporaryDirectory() as folder:
        try:
            before = FED[design](market, frequency, weights, seed, Path(folder))
        except KnownProblem:  # no formation in this draw
            assume(False)
        assume((before.returns["date"] <= cut).any() and (before.returns["date"] > cut).any())
        after = FED[design](
            changed_market(market, change, cut, seed), frequency, weights, seed, Path(folder)
        )
    assert_no_look_ahead(before, after, cut)
    assert not before.returns.equals(after.returns)


def test_what_may_be_known_later() -> None:
    """The full-period betas of groups look ahead by intention, and only they do."""
    market = draw_market(3)
    market = (with_sector(market[0]), market[1])
    cut = cut_at(DATES["monthly"], 0.7)
    changed = changed_market(market, "noise", cut, 3)
    given = {"assign_betas": "full_period", "rank_on": ("b",), "ante_betas": ("b",), "groups": (3,)}
    found = []
    for panel, factor in (market, changed):
        design = Design(name="three", **given)
        found.append(sort_ranked(panel, estimates(panel, factor), design, market=factor))
    early = [each.assigned[each.assigned["date"] <= cut] for each in found]
    assert len(early[0]) > 0
    assert not np.array_equal(early[0]["beta"], early[1]["beta"])
    one, other = (replace(each, assigned=each.assigned.iloc[:0]) for each in found)
    assert_no_look_ahead(one, other, cut)
