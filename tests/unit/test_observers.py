"""What the observers of the panel add up, against slow ways to the same, and whatever the cut into chunks."""

from __future__ import annotations

import json
import math
from decimal import ROUND_DOWN, ROUND_HALF_UP, Context, Decimal
from typing import Any

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from tests.unit.chunk_examples import MONTHS, chunk_of, cut, draw_panel, trading_days

from lineproof.intake.observers import (
    OBSERVERS,
    evidence,
    start_observers,
)
from lineproof.intake.observers.distribution import SHARES
from lineproof.intake.observers.largest import N_SHOWN
from lineproof.intake.observers.significant import N_BINS, ZERO_BIN, bin_of, value_of
from lineproof.periods import Periods

DAYS = trading_days("1999-11-15", "2000-02-10")
CASES = [(seed, MONTHS) for seed in range(6)] + [(seed, DAYS) for seed in range(3)]


def observe(chunks: list[Any], periods: Periods = MONTHS) -> dict[str, Any]:
    observers = start_observers(periods)
    for chunk in chunks:
        for observer in observers.values():
            observer.see(chunk)
    return evidence(observers)


@pytest.fixture(params=CASES, ids=lambda case: f"{case[1].noun}-{case[0]}", scope="module")
def case(request: pytest.FixtureRequest) -> tuple[pd.DataFrame, Periods, dict[str, Any]]:
    seed, periods = request.param
    panel = draw_panel(seed, periods=periods)
    return panel, periods, observe([chunk_of(panel)], periods)


def years(panel: pd.DataFrame) -> pd.Series:
    return panel["day"].dt.year


def test_alive_counts_rows_with_a_return(case) -> None:
    panel, periods, found = case
    every = range(panel["period"].min(), panel["period"].max() + 1)
    expected = panel.groupby("period")["total_return"].count().reindex(every, fill_value=0)
    said = found["alive"]
    assert said["periods"] == [periods.name(number) for number in expected.index]
    assert said["alive"] == expected.tolist()


def test_entries_and_exits_leave_out_the_ends_of_the_data(case) -> None:
    panel, _, found = case
    ends = {"entries": ("first", panel["period"].min()), "exits": ("last", panel["period"].max())}
    for name, (which, excepted) in ends.items():
        rows = panel.groupby("security").agg(which)
        rows = rows[rows["period"] != excepted]
        expected = years(rows).value_counts()
        assert found["alive"][name] == [
            expected.get(year, 0) for year in range(years(panel).min(), years(panel).max() + 1)
        ]


def test_coverage_counts_values_by_year_and_column(case) -> None:
    panel, _, found = case
    said = found["coverage"]
    assert said["years"] == list(range(years(panel).min(), years(panel).max() + 1))
    expected = panel.assign(
        **{"return": panel["total_return"], "sector": panel["sector"].where(panel["sector"] != "")}
    ).groupby(years(panel))
    assert said["n_rows"] == expected.size().reindex(said["years"], fill_value=0).tolist()
    assert list(said["columns"]) == ["return", "size", "price", "sector"]
    for name, counts in said["columns"].items():
        assert counts == expected[name].count().reindex(said["years"], fill_value=0).tolist(), name


def cut_off(value: float) -> float:
    """Four significant digits towards zero, by decimal arithmetic; twelve digits of a float are meant."""
    exact = Context(prec=12, rounding=ROUND_HALF_UP).create_decimal(repr(value))
    return float(Context(prec=4, rounding=ROUND_DOWN).plus(exact))


def test_distribution_by_decade(case) -> None:
    panel, _, found = case
    decades = dict(list(panel.groupby(years(panel) // 10 * 10)["total_return"]))
    assert [each["decade"] for each in found["distribution"]] == sorted(decades)
    for said in found["distribution"]:
        returns = decades[said["decade"]]
        held = returns.dropna()
        counts = {"n": len(held), "n_missing": returns.isna().sum(), "n_zero": (held == 0).sum()}
        assert {key: said[key] for key in counts} == counts
        assert (said["min"], said["max"]) == (held.min(), held.max())
        mean = math.fsum(held) / len(held)
        # one rounding of the exact sum, one of the division; and the mean is rounded before it is taken off
        assert said["mean"] == pytest.approx(mean, rel=4e-16, abs=1e-18)
        sd = math.sqrt(math.fsum((each - mean) ** 2 for each in held) / (len(held) - 1))
        assert said["sd"] == pytest.approx(sd, rel=1e-14)
        exact = np.quantile(held, SHARES, method="inverted_cdf")
        assert said["quantiles"] == {
            str(share): cut_off(value) for share, value in zip(SHARES, exact.tolist(), strict=True)
        }


def test_standard_deviation_of_equal_returns_is_zero() -> None:
    panel = draw_panel(1).assign(total_return=0.1)  # 0.1² is not a float
    found = [each["sd"] for each in observe([chunk_of(panel)])["distribution"]]
    # what is rounded off is summed, and that sum is rounded: some eps² a row of the square, under the root
    assert max(found) < 0.1 * math.sqrt(len(panel)) * np.finfo(float).eps


@pytest.mark.parametrize("sign", [1, -1], ids=["positive", "negative"])
def test_largest_returns_with_their_neighbours(case, sign: int) -> None:
    panel, _, found = case
    neighbours = panel.groupby("security")[["day", "total_return", "price"]]
    before, after = neighbours.shift(1), neighbours.shift(-1)
    order = panel.assign(size=-sign * panel["total_return"])
    order = order[order["size"] < 0].sort_values(["size", "security", "period"]).head(N_SHOWN)
    expected = [
        {"security": panel.at[row, "security"], **said(panel, row)}
        | {"before": said(before, row), "after": said(after, row)}
        for row in order.index
    ]
    assert found["largest"]["positive" if sign > 0 else "negative"] == expected


def said(rows: pd.DataFrame, row: int) -> dict[str, Any] | None:
    day, value, price = rows.loc[row, ["day", "total_return", "price"]]
    if pd.isna(day):
        return None
    found = None if np.isnan(value) else value
    return {"date": str(day.date()), "return_": found, "price": price}


@settings(max_examples=60, deadline=None)
@given(
    seed=st.integers(0, 10_000),
    at=st.sets(st.integers(1, 11)),
    daily=st.booleans(),
)
def test_the_cut_into_chunks_changes_no_bit(seed: int, at: set[int], daily: bool) -> None:
    periods = DAYS if daily else MONTHS
    panel = draw_panel(seed, periods=periods)
    whole, parts = observe([chunk_of(panel)], periods), observe(cut(panel, at), periods)
    assert json.dumps(whole) == json.dumps(parts)


def test_results_are_plain_json_even_of_nothing() -> None:
    nothing = chunk_of(draw_panel(1).iloc[:0])
    for chunks in ([], [nothing]):
        found = observe(chunks)
        assert json.loads(json.dumps(found, allow_nan=False)) == found
        assert list(found) == list(OBSERVERS)
    unknown = observe([chunk_of(draw_panel(1).assign(total_return=np.nan))])
    assert json.loads(json.dumps(unknown, allow_nan=False)) == unknown
    assert unknown["distribution"][0]["mean"] is None


def test_returns_beyond_what_a_float_can_square_are_no_traceback() -> None:
    panel = draw_panel(2)
    panel.loc[[3, 4], "total_return"] = [1e200, np.inf]
    found = observe([chunk_of(panel)])
    assert json.dumps(found, allow_nan=False)
    assert found["largest"]["positive"][0]["return_"] == 1e200
    assert None in [each["sd"] for each in found["distribution"]]


def test_memory_does_not_grow_with_the_rows() -> None:
    """The bins of a decade, the periods and the twenty largest are all that is kept."""
    panel = draw_panel(3)
    few, many = start_observers(MONTHS), start_observers(MONTHS)
    for observers, times in ((few, 1), (many, 30)):
        for observer in observers.values():
            for _ in range(times):
                observer.see(chunk_of(panel))
    sizes = [
        {name: kept(observer) for name, observer in observers.items()} for observers in (few, many)
    ]
    assert sizes[0] == sizes[1]


def kept(thing: Any) -> int:
    """Numbers held by an object, in arrays and lists at any depth."""
    if isinstance(thing, np.ndarray):
        return thing.size
    if isinstance(thing, list):
        return len(thing)
    parts = thing.values() if isinstance(thing, dict) else vars(thing).values()
    return sum(
        kept(part)
        for part in parts
        if isinstance(part, np.ndarray | list | dict)
        or type(part).__module__.startswith("lineproof.intake.observers")
    )


def bin_at(value: float) -> int:
    return bin_of(value, int(np.array([value]).view(np.int64)[0] >> 52) & 2047)


@settings(max_examples=400, deadline=None)
@given(st.floats(1e-9, 9.999e7), st.sampled_from([1, -1]))
def test_a_bin_is_four_significant_digits(size: float, sign: int) -> None:
    value = sign * size
    assert value_of(bin_at(value)) in {cut_off(value), cut_off(value * (1 + 1e-12))}


def test_bins_are_in_the_order_of_their_values() -> None:
    places = np.arange(0, N_BINS, 37)
    values = [value_of(place) for place in places.tolist()]
    assert values == sorted(values)
    assert [bin_at(value) for value in values] == places.tolist()
    assert value_of(ZERO_BIN) == value_of(bin_at(-0.0)) == value_of(bin_at(1e-12)) == 0.0
    assert (value_of(bin_at(1e300)), value_of(bin_at(-np.inf))) == (9.999e7, -9.999e7)


@settings(max_examples=200, deadline=None)
@given(st.integers(-99_999, 99_999), st.integers(2, 7))
def test_three_digits_round_as_the_value_itself_does(digits: int, places: int) -> None:
    """Even where a value as typed lies half-way between two numbers of three digits."""
    value = float(f"{digits}e-{places}")
    rounding = Context(prec=3, rounding=ROUND_HALF_UP)
    kept = Decimal(repr(value_of(bin_at(value))))
    assert rounding.plus(kept) == rounding.plus(Decimal(repr(value)))
