"""Final returns and leavers, by hand."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from tests.unit import intake_examples as examples
from tests.unit.intake_examples import chunk_of, fault, lines, validate

from lineproof.intake.chunk import Chunk
from lineproof.intake.delisting import Leavers, exit_reasons, leaving_rows
from lineproof.intake.faults import Tally

STAYS = [f"Z,2000-{m:02d}-28,0.01,,1,1" for m in range(1, 13)]


def panel_of(folder: Path, *rows: str, **options) -> pd.DataFrame:
    found = validate(folder, lines(*STAYS, *rows), **options).panel
    return found[found["security"] != "Z"].reset_index(drop=True)


def test_final_return_compounds_with_the_partial_month(tmp_path: Path) -> None:
    panel = panel_of(tmp_path, "A,2000-01-31,0.2,,1,1", "A,2000-02-29,0.1,-0.5,1,1")
    np.testing.assert_allclose(panel["total_return"], [0.2, -0.45], rtol=1e-15)  # 1.1 × 0.5 − 1
    np.testing.assert_allclose(panel["excess_return"], [0.198, -0.452], rtol=1e-15)
    assert panel["leaves"].tolist() == [False, True]


@pytest.mark.parametrize(
    ("ret", "final", "total"),
    [
        ("", "-0.3", -0.3),  # no return of the month: the final return alone
        ("0.1", "-1", -1.0),
        ("-1", "0.5", -1.0),
        ("0.1", "0", 0.1),
        ("0.1", "", 0.1),
        ("", "", np.nan),
    ],
)
def test_last_month(tmp_path: Path, ret: str, final: str, total: float) -> None:
    panel = panel_of(tmp_path, f"A,2000-02-29,{ret},{final},1,1")
    np.testing.assert_allclose(panel["total_return"], [total], rtol=1e-15)


def test_final_return_in_the_last_month_of_the_file(tmp_path: Path) -> None:
    panel = panel_of(tmp_path, "A,2000-12-29,0.1,-0.5,1,1")
    np.testing.assert_allclose(panel["total_return"], [-0.45], rtol=1e-15)
    assert panel["leaves"].tolist() == [False]  # whether it leaves, the file does not say


@pytest.mark.fault(25)
@pytest.mark.parametrize(
    ("stand_in", "total", "said"), [(None, 0.1, "left as it is"), (-0.3, -0.23, "taken as -0.3")]
)
def test_leavers_without_a_final_return(
    tmp_path: Path, stand_in: float | None, total: float, said: str
) -> None:
    rows = ["A,2000-01-31,0.1,,1,1", "B,2000-01-31,0.1,0.1,1,1", "C,2000-12-29,0.1,,1,1"]
    found = validate(tmp_path, lines(*STAYS, *rows), missing_final_return=stand_in)
    totals = found.panel.set_index("security")["total_return"]
    np.testing.assert_allclose(totals[["A", "B", "C"]], [total, 0.21, 0.1], rtol=1e-15)
    entry = fault(found, 25)
    assert (entry["n"], entry["kinds"], entry["examples"]) == (1, {said: 1}, ["A on 2000-01-31"])
    assert "Shumway 1997" in entry["note"]


@pytest.mark.fault(42)
def test_final_returns_of_a_security_that_goes_on_are_not_used(tmp_path: Path) -> None:
    rows = [f"A,2000-0{m}-28,0.1,-0.5,1,1" for m in (1, 2, 4)]  # the vendor repeats it
    found = validate(tmp_path, lines(*STAYS, *rows))
    totals = found.panel.query("security == 'A'")["total_return"]
    # In February A leaves, to come back in April; in January it only goes on.
    np.testing.assert_allclose(totals, [0.1, -0.45, -0.45], rtol=1e-15)
    assert (fault(found, 42)["n"], fault(found, 42)["examples"]) == (1, ["A on 2000-01-28"])


def test_who_is_only_set_aside_has_not_left(tmp_path: Path) -> None:
    rows = ["A,2000-11-30,0.1,,1,1", "A,2000-12-29,halted,,1,1"]
    found = validate(tmp_path, lines(*STAYS, *rows), missing_final_return=-0.3)
    assert found.panel.query("security == 'A'")["total_return"].tolist() == [0.1]
    assert fault(found, 25) is None


def test_who_goes_on_beyond_the_market_has_not_left(tmp_path: Path) -> None:
    rows = ["A,2000-11-30,0.1,,1,1", "A,2001-02-28,0.1,,1,1"]
    found = validate(tmp_path, lines(*STAYS, *rows), missing_final_return=-0.3)
    assert not found.panel["leaves"].any()
    assert fault(found, 25) is None


def test_who_left_with_a_row_set_aside_leaves_in_the_last_row_kept(tmp_path: Path) -> None:
    rows = ["A,2000-02-28,0.1,,1,1", "A,2000-03-31,halted,,1,1"]
    assert panel_of(tmp_path, *rows)["leaves"].tolist() == [True]


@pytest.mark.fault(26)
def test_survivors_only(tmp_path: Path) -> None:
    entry = fault(validate(tmp_path, lines(*STAYS)), 26)
    assert (entry["n"], entry["label"]) == (1, "no security ever leaves")
    leaver = validate(tmp_path, lines(*STAYS, "A,2000-05-31,0.1,,1,1"))
    assert fault(leaver, 26) is None
    assert examples.fault(leaver, 25)["n"] == 1


# By chunk: who leaves, and what stands in for a final return.


def leavers(chunk: Chunk, otherwise: float | None, by_reason: dict[str, float]) -> Leavers:
    first = int(chunk.period.min())
    return Leavers(otherwise, by_reason, first, int(chunk.period.max()) - first + 1)


ROWS = pd.DataFrame(
    {
        "security": list("AABCD"),
        "date": pd.to_datetime(
            ["2000-01-31", "2000-02-15", "2000-02-29", "2000-03-10", "2000-03-31"]
        ),
        "return_": [0.1, 0.2, 0.1, 0.1, np.nan],
        "exit_reason": ["", "merged", "failed", "", "failed"],
    }
)


@pytest.mark.parametrize(
    ("last", "expected"),
    [
        ("2000-01-01", "00000"),
        ("2000-03-01", "01100"),  # C's row on the 10th is in the last month
        ("2000-04-01", "01111"),
    ],
)
def test_who_leaves_before_the_last_period(last: str, expected: str) -> None:
    chunk = chunk_of(ROWS)
    seen = chunk.day[chunk.start[1:] - 1]
    leaves = leaving_rows(chunk, seen, np.datetime64(last))
    assert "".join(str(int(each)) for each in leaves) == expected


def test_who_was_seen_later_has_not_left() -> None:
    chunk = chunk_of(ROWS)
    seen = np.array(["2000-05-31", "2000-02-29", "2000-03-10", "2000-03-31"], "datetime64[D]")
    leaves = leaving_rows(chunk, seen, np.datetime64("2000-05-01"))
    assert leaves.tolist() == [False, False, True, True, True]


def test_final_returns_by_reason() -> None:
    chunk, tally = chunk_of(ROWS), Tally()
    leaves = np.array([False, True, True, True, True])
    total = leavers(chunk, -0.3, {"failed": -1.0, "merged": 0.0}).with_final_returns(
        chunk, leaves, tally
    )
    # A 1.2 × 1 − 1; B and D, failed, lose all; C gives no reason: 1.1 × 0.7 − 1.
    np.testing.assert_allclose(total, [0.1, 0.2, -1.0, -0.23, -1.0], rtol=1e-15)
    (entry,) = tally.report()
    assert (entry["number"], entry["n"]) == (25, 4)
    assert entry["kinds"] == {"taken as -1": 2, "taken as -0.3": 1, "taken as 0": 1}
    assert exit_reasons(chunk, np.array([1, 3])) == ["merged", ""]


def test_what_final_returns_do_to_the_mean() -> None:
    chunk = chunk_of(ROWS.assign(final_return=[np.nan, -0.5, np.nan, np.nan, np.nan]))
    found = leavers(chunk, None, {"failed": -1.0})
    found.with_final_returns(chunk, np.array([False, True, True, True, True]), Tally())
    record = found.record()
    assert (record["n_with"], record["n_without"], found.n) == (1, 3, 4)
    assert record["by_reason"]["failed"] == {"n": 2, "n_with": 0, "n_without": 2, "stand_in": -1.0}
    assert record["by_reason"]["merged"] == {"n": 1, "n_with": 1, "n_without": 0, "stand_in": None}
    # January 0.1; February (0.2 + 0.1)/2, then (1.2 × 0.5 − 1 − 1)/2; March 0.1, then (0.1 − 1)/2.
    np.testing.assert_allclose(record["mean_without"], (0.1 + 0.15 + 0.1) / 3, rtol=1e-15)
    np.testing.assert_allclose(record["mean_with"], (0.1 - 0.7 - 0.45) / 3, rtol=1e-15)


def test_a_reason_that_is_not_listed_leaves_the_return() -> None:
    chunk, tally = chunk_of(ROWS), Tally()
    leaves = np.array([False, True, True, False, False])
    total = leavers(chunk, None, {"failed": -0.5}).with_final_returns(chunk, leaves, tally)
    np.testing.assert_allclose(total, [0.1, 0.2, -0.45, 0.1, np.nan], rtol=1e-15)
    assert tally.kinds[25] == {"left as it is": 1, "taken as -0.5": 1}


def test_a_final_return_given_comes_before_the_reason() -> None:
    chunk = chunk_of(ROWS.assign(final_return=[np.nan, -0.5, np.nan, np.nan, np.nan]))
    leaves = np.array([False, True, False, False, False])
    total = leavers(chunk, -0.3, {"merged": 0.0}).with_final_returns(chunk, leaves, Tally())
    np.testing.assert_allclose(total, [0.1, -0.4, 0.1, 0.1, np.nan], rtol=1e-15)


def test_final_returns_by_reason_of_a_file(tmp_path: Path) -> None:
    columns = {**examples.COLUMNS, "exit_reason": "why"}
    rows = [
        "A,2000-02-29,0.1,,1,1,failed",
        "B,2000-02-29,0.1,,1,1,",
        "C,2000-02-29,0.1,-0.5,1,1,failed",
        "D,2000-12-29,0.1,,1,1,failed",  # in the last month: whether it leaves is not known
    ]
    found = validate(
        tmp_path,
        lines(*rows, header=examples.HEADER + ",why"),
        columns=columns,
        final_return_by_reason={"failed": -1.0},
        missing_final_return=-0.3,
    )
    np.testing.assert_allclose(found.panel["total_return"], [-1.0, -0.23, -0.45, 0.1], rtol=1e-15)
    assert fault(found, 25)["kinds"] == {"taken as -1": 1, "taken as -0.3": 1}
