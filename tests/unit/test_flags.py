"""Flags on rows that are kept: counted, named, and nothing changed."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from tests.unit import intake_examples as examples
from tests.unit.intake_examples import chunk_of, fault, lines, validate

from lineproof.intake.faults import Tally
from lineproof.intake.flags import first_rows, flag_rows, jumps_that_reverse, zeros_so_far
from lineproof.periods import Months


def rows_of(histories: dict[str, dict[int, float]]) -> pd.DataFrame:
    """Rows of securities given as {month number from 2000-01: return}, dated by month ends."""
    places = [(name, month) for name, history in sorted(histories.items()) for month in history]
    ends = pd.period_range("2000-01", periods=200, freq="M").to_timestamp(how="end").normalize()
    return pd.DataFrame(
        {
            "security": pd.Series([name for name, _ in places], dtype="str"),
            "date": pd.to_datetime([ends[month] for _, month in places]),
            "return_": [histories[name][month] for name, month in places],
            "final_return": np.nan,
            "size": 1.0,
        }
    )


def flagged(**histories: dict[int, float]) -> dict[int, dict]:
    """The tally's entries for securities given as {month number from 2000-01: return}."""
    chunk, tally = chunk_of(rows_of(histories)), Tally()
    flag_rows(chunk, tally, [""], Months())
    jumps = jumps_that_reverse(chunk)
    tally.add(22, jumps.sum(), first_rows(chunk, jumps))
    return {entry["number"]: entry for entry in tally.report()}


@pytest.mark.fault(16)
def test_total_losses_count_rows(tmp_path: Path) -> None:
    rows = ["A,2000-01-31,-1,-1,1,1", "A,2000-02-29,-1.000,,1,1", "B,2000-01-31,0.1,-1,1,1"]
    found = validate(tmp_path, lines(*rows, ",2000-01-31,-1,,1,1"))
    entry = fault(found, 16)
    assert (entry["n"], entry["examples"]) == (
        3,
        ["A on 2000-01-31", "A on 2000-02-29", "B on 2000-01-31"],
    )
    # A return of −100 % is kept; the final return of A's first row is not used, as A goes on.
    assert found.panel["total_return"].tolist() == [-1.0, -1.0, -1.0]


def test_total_loss_in_percent(tmp_path: Path) -> None:
    found = validate(tmp_path, lines("A,2000-01-31,-100,,1,1"), unit="percent")
    assert found.panel["total_return"].tolist() == [-1.0]
    assert fault(found, 16)["n"] == 1


@pytest.mark.fault(20)
def test_holes() -> None:
    found = flagged(A={0: 0.1, 1: 0.1, 3: 0.1, 8: 0.1}, B={4: 0.1, 5: 0.1})
    assert (found[20]["n"], found[20]["examples"]) == (5, ["A on 2000-04-30", "A on 2000-09-30"])
    assert 41 not in found


@pytest.mark.fault(41)
def test_an_identifier_away_for_more_than_36_months() -> None:
    assert 41 not in flagged(A={0: 0.1, 37: 0.1})  # 36 months are missing
    found = flagged(A={0: 0.1, 38: 0.1})
    assert (found[41]["n"], found[41]["examples"]) == (1, ["A on 2003-03-31"])
    assert found[20]["n"] == 37


@pytest.mark.fault(21)
def test_runs_of_zero_returns_by_length() -> None:
    zeros = dict.fromkeys
    found = flagged(
        A={0: 0.1, **zeros([1, 2], 0.0), 3: 0.1, **zeros([4, 5, 6], 0.0)},  # runs of 2 and 3
        B=zeros(range(2), 0.0),  # does not go on from A
        C=zeros([0, 1, 3, 4], 0.0),  # a hole ends a run
        D=zeros(range(12), 0.0),
        E={**zeros(range(6), 0.0), 6: np.nan, 7: 0.0},
    )
    assert found[21]["n"] == 3
    assert found[21]["kinds"] == {"of 3 to 5 months": 1, "of 6 to 11 months": 1, "longer": 1}
    assert found[21]["examples"] == ["A on 2000-05-31", "D on 2000-01-31", "E on 2000-01-31"]


@pytest.mark.fault(22)
def test_jumps_that_reverse() -> None:
    found = flagged(
        A={0: 4.0, 1: -0.8},  # 5 × 0.2 = 1: back where it was
        B={0: 3.0, 1: -0.7},  # not over 300 %
        C={0: 4.0, 1: -0.7},  # 5 × 0.3 = 1.5: not below 50 %
        D={0: 4.0, 2: -0.8},  # a month between
        E={0: 4.0},
        F={0: -0.8},  # not E's reversal
    )
    assert (found[22]["n"], found[22]["examples"]) == (1, ["A on 2000-02-29"])


@pytest.mark.fault(24)
def test_sizes(tmp_path: Path) -> None:
    sizes = ["0", "-12.5", "", "NA", "7"]
    found = validate(tmp_path, lines(*(f"{s},2000-01-31,0.1,,{v},1" for s, v in enumerate(sizes))))
    np.testing.assert_array_equal(found.panel["size"], [np.nan, np.nan, np.nan, np.nan, 7])
    entry = fault(found, 24)
    assert (entry["n"], entry["kinds"]) == (4, {"zero": 1, "negative": 1, "missing": 2})
    assert entry["examples"] == [f"{s} on 2000-01-31" for s in range(3)]


def test_no_flag_on_a_size_that_was_not_delivered(tmp_path: Path) -> None:
    columns = {"security": "id", "date": "day", "return": "ret"}
    found = validate(tmp_path, lines("A,2000-01-31,0.1,,0,1"), columns=columns)
    assert fault(found, 24) is None
    assert np.isnan(found.panel["size"]).all()


def test_a_size_column_without_any_size(tmp_path: Path) -> None:
    assert fault(validate(tmp_path, lines("A,2000-01-31,0.1,,,1")), 24)["n"] == 1


history = st.dictionaries(st.integers(0, 60), st.sampled_from([0.0, 0.1, 4.0, -0.8, np.nan]))


@settings(max_examples=100, deadline=None)
@given(st.fixed_dictionaries({"A": history, "B": history, "C": history}))
def test_flags_agree_with_a_slow_loop(histories: dict[str, dict[int, float]]) -> None:
    histories = {name: dict(sorted(each.items())) for name, each in histories.items()}
    absent = away = reversed_ = 0
    runs = []
    for each in histories.values():
        run, before = 0, None
        for month, value in each.items():
            step = 1 if before is None else month - before
            absent, away = absent + step - 1, away + (step > 37)
            previous = each.get(month - 1, np.nan)
            reversed_ += previous > 3 and (1 + previous) * (1 + value) - 1 < 0.5
            if step > 1 or value != 0:
                runs.append(run)
                run = 0
            run += value == 0
            before = month
        runs.append(run)
    found = flagged(**histories) if any(histories.values()) else {}
    n = {number: entry["n"] for number, entry in found.items() if number != 12}
    stale = sum(run >= 3 for run in runs)
    expected = {20: absent, 41: away, 22: reversed_, 21: stale}
    assert n == {number: count for number, count in expected.items() if count}


def test_examples_are_the_first_three_by_security_and_month(tmp_path: Path) -> None:
    rows = [f"{s},2000-0{m}-28,NA,,1,1" for s in "BA" for m in (2, 1)]
    found = validate(tmp_path, examples.lines(*rows))
    assert fault(found, 12)["examples"] == ["A on 2000-01-28", "A on 2000-02-28", "B on 2000-01-28"]


@settings(max_examples=100, deadline=None)
@given(st.fixed_dictionaries({"A": history, "B": history, "C": history}))
def test_zeros_so_far_agree_with_a_slow_loop(histories: dict[str, dict[int, float]]) -> None:
    histories = {name: dict(sorted(each.items())) for name, each in histories.items()}
    expected = []
    for _, each in sorted(histories.items()):
        run: dict[int, int] = {}
        for month, value in each.items():
            run[month] = run.get(month - 1, 0) + 1 if value == 0 else 0
            expected.append(run[month])
    assert zeros_so_far(chunk_of(rows_of(histories))).tolist() == expected


def test_days_within_a_month_do_not_part_what_follows() -> None:
    rows = rows_of({"A": {0: 4.0, 1: -0.8}, "B": {0: 0.0, 1: 0.0, 2: 0.0}})
    rows["date"] = pd.to_datetime(
        ["2000-01-03", "2000-02-28", "2000-01-31", "2000-02-01", "2000-03-30"]
    )
    chunk = chunk_of(rows)
    assert jumps_that_reverse(chunk).tolist() == [False, True, False, False, False]
    assert zeros_so_far(chunk).tolist() == [0, 0, 1, 2, 3]
    assert chunk.absent.tolist() == [0, 0, 0, 0, 0]
    assert first_rows(chunk, chunk.is_first) == ["A on 2000-01-03", "B on 2000-01-31"]


def test_flags_of_a_chunk_without_final_returns_and_sizes() -> None:
    rows = rows_of({"A": {0: -1.0, 1: np.nan}}).drop(columns=["final_return", "size"])
    tally = Tally()
    flag_rows(chunk_of(rows), tally, ["", "NA"], Months())
    assert tally.counts == {12: 1, 16: 1}
    assert tally.kinds[12] == {"empty": 1}
