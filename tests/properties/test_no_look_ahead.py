"""Nothing later than a month can change what is estimated, formed or returned by that month.

Every estimator, design and weighting of the registries is tried. All values dated after a random
month are replaced by noise, or all rows after it removed; what is dated up to it must stay the same
to the last bit.
"""

from __future__ import annotations

import tempfile
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from tests.properties.random_market import DATES, WINDOWS, draw_market

from lineproof import store
from lineproof.designs import DESIGNS, WEIGHTS
from lineproof.estimation import estimate_betas, shrink_betas
from lineproof.estimators import ESTIMATORS, SHRINKAGES
from lineproof.forming import form_portfolios
from lineproof.sorting import Sorted

SEEDS = st.integers(0, 2**32 - 1)
# The place of the cut in the calendar: late enough for a first formation and a return after it in
# any month of the year, early enough for later values to change.
CUTS = st.floats(0.5, 1.0, exclude_max=True)
FEW = settings(max_examples=15, deadline=None, derandomize=True)
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


def estimates(market: Market, estimator: str, own: dict, **options: object) -> pd.DataFrame:
    beside = BESIDE if estimator == "multi_factor" else []
    return estimate_betas(
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
        estimates(each, estimator, own, **options)
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
            estimates(each, "ols", {}, **WINDOWS["monthly"]), shrink=shrink, own=SHRUNK[shrink]
        )
        for each in (market, changed_market(market, change, cut, seed))
    )
    assert_identical_until(before, after, "date", cut)
    assert not before.equals(after)


def single_window(
    market: Market, frequency: str, weights: str, form_month: int, folder: Path
) -> Sorted:
    panel, factor = market
    options = {**WINDOWS[frequency], "returns": frequency, "dated": frequency}
    betas = estimate_betas(panel, factor, name="short", estimator="ols", **options)
    sources = [str(folder / "panel.parquet"), str(folder / "betas.parquet")]
    store.write_table(panel, sources[0], None)
    store.write_table(betas, sources[1], "betas", frequency)
    options = {"name": "three", "groups": 3, "form_month": form_month, "hold": 12}
    options["frequency"] = frequency
    return form_portfolios(sources, factor, design="single_window", weights=weights, **options)


def supplied(market: Market, frequency: str, weights: str, form_month: int, folder: Path) -> Sorted:
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


# How each design is fed from a panel and a market. A new design needs a line here.
FED: dict[str, Callable[[Market, str, str, int, Path], Sorted]] = {
    "single_window": single_window,
    "supplied": supplied,
}


def test_every_design_is_tried() -> None:
    assert set(FED) == set(DESIGNS)


@pytest.mark.parametrize("change", list(CHANGES))
@pytest.mark.parametrize("weights", list(WEIGHTS))
# Supplied series of days are the intake's to read.
@pytest.mark.parametrize(
    ("design", "frequency"),
    [*((design, "monthly") for design in DESIGNS), ("single_window", "daily")],
)
@FEW
@given(seed=SEEDS, at=CUTS, form_month=st.integers(1, 12))
def test_test_assets(
    design: str, frequency: str, weights: str, change: str, seed: int, at: float, form_month: int
) -> None:
    if frequency == "daily":  # two years: a first estimate by May, and a month held before the cut
        form_month = 5 + form_month % 6
        at = 0.55 + 0.45 * at
    market, cut = draw_market(seed, frequency), cut_at(DATES[frequency], at)
    with tempfile.TemporaryDirectory() as folder:
        before, after = (
            FED[design](each, frequency, weights, form_month, Path(folder))
            for each in (market, changed_market(market, change, cut, seed))
        )
    if len(before.members):
        assert_identical_until(before.members, after.members, "formed", cut)
    assert_identical_until(before.returns, after.returns, "date", cut)
    assert not before.returns.equals(after.returns)
