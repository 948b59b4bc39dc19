"""Screens by hand: conditions alone and together, on numbers and on text, with values missing."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
from tests.unit import intake_examples as examples

from lineproof.intake.chunk import Chunk
from lineproof.intake.screens import Screens, passes, screen_label
from lineproof.problems import KnownProblem

ROWS = pd.DataFrame(
    {
        "security": pd.Series(["A", "A", "B", "B", "C", "C"], dtype="str"),
        "date": pd.to_datetime(["2000-01-31", "2000-02-29"] * 3),
        "return_": [0.1, -0.2, 0.0, np.nan, 0.3, 0.1],
        "price": [0.5, 1.0, 2.0, np.nan, 10.0, 1.5],
        "sector": pd.Series(["banks", "mines", "10", "", "banks", "10.5"], dtype="str"),
        "volume": pd.Series(["1,200", "", "90", "n.a.", "1e3", "-5"], dtype="str"),
    }
)
CHUNK = examples.chunk_of(ROWS)


def screened(
    screens: list[dict[str, Any]], *chunks: Chunk, stale_run: int | None = None
) -> tuple[list[bool], list[dict[str, Any]]]:
    """What passes, row by row, and the report."""
    judge = Screens(screens, stale_run, "month")
    return [bool(each) for chunk in chunks for each in judge.eligible(chunk)], judge.report()


@pytest.mark.parametrize(
    ("screen", "expected"),
    [
        ({"column": "price", "at_least": 1}, "011011"),
        ({"column": "price", "at_most": 1}, "110000"),
        ({"column": "price", "above": 1}, "001011"),
        ({"column": "price", "below": 1}, "100000"),
        ({"column": "price", "above": 0.5, "at_most": 2}, "011001"),
        ({"column": "price", "in": [1, 10]}, "010010"),
        ({"column": "price", "in": ["1", "x"]}, "010000"),
        ({"column": "price", "not_in": [1, 10]}, "101001"),
        ({"column": "price", "at_least": 1, "not_in": [2]}, "010011"),
        ({"column": "return", "above": 0}, "100011"),
        ({"column": "sector", "in": ["banks"]}, "100010"),
        ({"column": "sector", "not_in": ["banks"]}, "011001"),
        ({"column": "sector", "in": [10]}, "001000"),
        ({"column": "sector", "at_least": 10.2}, "000001"),
        ({"column": "volume", "at_least": 90}, "101010"),
        ({"column": "volume", "below": 0}, "000001"),
        ({"column": "security", "not_in": ["A"]}, "001111"),
    ],
)
def test_conditions(screen: dict[str, Any], expected: str) -> None:
    assert "".join(str(int(met)) for met in passes(CHUNK, screen)) == expected


def test_each_screen_counts_what_those_before_it_pass() -> None:
    screens = [
        {"column": "price", "at_least": 1},
        {"column": "sector", "not_in": ["banks", "mines"]},
    ]
    eligible, report = screened(screens, CHUNK)
    assert eligible == [False, False, True, False, False, True]
    assert report == [
        {"label": "price at least 1", "n_rows": 2, "n_securities": 2},
        {"label": "sector none of banks, mines", "n_rows": 2, "n_securities": 2},
    ]
    assert screened(screens[::-1], CHUNK)[0] == eligible


def test_counts_do_not_depend_on_the_cut_into_chunks() -> None:
    screens = [{"column": "price", "at_least": 1}, {"column": "sector", "not_in": ["banks"]}]
    apart = [examples.chunk_of(each.reset_index(drop=True)) for _, each in ROWS.groupby("security")]
    assert screened(screens, *apart, stale_run=1) == screened(screens, CHUNK, stale_run=1)


def test_no_screen() -> None:
    eligible, report = screened([], CHUNK)
    assert eligible == [True] * 6
    assert report == []


def test_labels() -> None:
    screen = {"column": "price", "at_least": 1, "below": 1000, "not_in": [99]}
    assert screen_label(screen) == "price at least 1 and below 1,000 and none of 99"
    assert screen_label({"column": "price", "at_most": 2_500_000}) == "price at most 2,500,000"


def test_a_screen_on_the_date() -> None:
    with pytest.raises(KnownProblem) as caught:
        screened([{"column": "date", "at_least": 2000}], CHUNK)
    assert str(caught.value) == (
        "The raw data cannot be used; nothing was written.\n"
        "  intake.screens: a screen cannot use the date\n"
        "    → remove it, and cut the study with subperiods"
    )


def test_a_screened_row_stays_and_returns(tmp_path: Path) -> None:
    rows = ["A,2000-01-31,0.1,,1,5", "A,2000-02-29,0.2,,1,0.5", "A,2000-03-31,0.3,,1,5"]
    found = examples.validate(
        tmp_path, examples.lines(*rows), screens=[{"column": "price", "at_least": 1}]
    )
    assert found.panel["eligible"].tolist() == [True, False, True]
    assert found.panel["total_return"].tolist() == [0.1, 0.2, 0.3]
    assert found.intake["rows_screened"] == 1


def test_no_screen_looks_ahead(tmp_path: Path) -> None:
    rows = [f"{s},2000-{m:02d}-28,0.0{m},,{m},{m + s}" for s in range(4) for m in range(1, 9)]
    screens = [{"column": "price", "at_least": 4}, {"column": "return", "below": 0.07}]
    whole = examples.validate(tmp_path, examples.lines(*rows), screens=screens).panel
    for last in range(1, 8):
        early = [row for row in rows if int(row.split("-")[1]) <= last]
        cut = examples.validate(tmp_path, examples.lines(*early), screens=screens).panel
        before = whole[whole["date"].dt.month <= last].reset_index(drop=True)
        pd.testing.assert_series_equal(cut["eligible"], before["eligible"])


# Stale prices: what came before a row is known at its date, how the run goes on is not.


def zeros(*returns: float) -> Chunk:
    n = len(returns)
    ends = pd.period_range("2000-01", periods=n, freq="M").to_timestamp(how="end").normalize()
    return examples.chunk_of(pd.DataFrame({"security": "A", "date": ends, "return_": returns}))


def test_a_stale_run_counts_up_to_the_row() -> None:
    chunk = zeros(0.1, 0, 0, 0, 0, 0.1, 0, 0, np.nan, 0, 0, 0)
    eligible, report = screened([], chunk, stale_run=3)
    assert "".join(str(int(each)) for each in eligible) == "111001111110"
    label = "fewer than 3 zero returns in consecutive months up to then"
    assert report == [{"label": label, "n_rows": 3, "n_securities": 1}]


@pytest.mark.parametrize("stale_run", [1, 2, 4])
def test_a_stale_run_does_not_look_ahead(stale_run: int) -> None:
    returns = np.random.default_rng(2).choice([0.0, 0.0, 0.1, np.nan], 60)
    whole, _ = screened([], zeros(*returns), stale_run=stale_run)
    assert 0 < sum(whole) < 60
    for n in range(1, 60):
        assert screened([], zeros(*returns[:n]), stale_run=stale_run)[0] == whole[:n]


def test_a_stale_run_ends_at_a_hole_and_with_its_security(tmp_path: Path) -> None:
    rows = [f"A,2000-{m:02d}-28,0,,1,1" for m in (1, 2, 4, 5, 6)]
    rows += [f"B,2000-{m:02d}-28,0,,1,1" for m in (7, 8)]
    found = examples.validate(tmp_path, examples.lines(*rows), stale_run=3)
    assert found.panel["eligible"].tolist() == [True, True, True, True, False, True, True]
    assert found.intake["rows_screened"] == 1
    assert found.panel["total_return"].tolist() == [0.0] * 7
