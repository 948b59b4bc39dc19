"""What the study file decides about sound rows: holes, jumps, returns from prices; and several files at once."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from tests.unit import intake_examples as examples
from tests.unit.intake_examples import aside, fault, kept, lines, validate

HOLE = "a month missing inside a security's history"
JUMP = "a jump over 300 % that reverses in the next month"


def history(name: str, returns: dict[int, float | str]) -> list[str]:
    """Rows of a security, given as {month of 2000: return}."""
    return [f"{name},2000-{month:02d}-28,{value},,1,1" for month, value in returns.items()]


# Returns after a hole.


def test_returns_after_a_hole_are_kept_unless_the_study_says_otherwise(tmp_path: Path) -> None:
    found = validate(tmp_path, lines(*history("A", {1: 0.1, 4: 0.5})))
    assert len(found.panel) == 2
    assert (fault(found, 20)["n"], fault(found, 20)["kinds"]) == (2, {})


def test_returns_after_a_hole_set_aside(tmp_path: Path) -> None:
    rows = history("A", {1: 0.1, 2: 0.1, 4: 0.5, 5: 0.1}) + history("B", {3: 0.1, 4: 0.1})
    found = validate(tmp_path, lines(*rows), return_after_hole="set_aside")
    assert kept(found) == [
        ("A", "2000-01"), ("A", "2000-02"), ("A", "2000-05"), ("B", "2000-03"), ("B", "2000-04")
    ]  # fmt: skip
    assert aside(found) == [(4, 20, f"{HOLE}: A on 2000-04-28", rows[2])]
    # Of A's history two months are missing now; a row set aside is counted apart from them.
    assert (fault(found, 20)["n"], fault(found, 20)["kinds"]) == (3, {"set aside": 1})
    assert fault(found, 20)["examples"] == ["A on 2000-05-28", "line 4"]


def test_a_row_set_aside_makes_a_hole(tmp_path: Path) -> None:
    rows = history("A", {1: 0.1, 2: "halted", 3: 0.1, 4: 0.1})
    found = validate(tmp_path, lines(*rows), return_after_hole="set_aside")
    assert kept(found) == [("A", "2000-01"), ("A", "2000-04")]
    assert [row[:2] for row in aside(found)] == [(3, 13), (4, 20)]


# Jumps that reverse.


def test_jumps_that_reverse_are_kept_unless_the_study_says_otherwise(tmp_path: Path) -> None:
    found = validate(tmp_path, lines(*history("A", {1: 4.0, 2: -0.8})))
    assert len(found.panel) == 2
    assert (fault(found, 22)["n"], fault(found, 22)["examples"]) == (1, ["A on 2000-02-28"])


def test_jumps_that_reverse_set_aside(tmp_path: Path) -> None:
    rows = [
        *history("A", {1: 0.1, 2: 4.0, 3: -0.8, 4: 0.1}),  # 5 × 0.2 − 1 = 0
        *history("B", {1: 4.0, 2: -0.7}),  # 5 × 0.3 − 1 = 50 %, not below
        *history("C", {12: 4.0}),
        *history("D", {1: -0.8}),
    ]
    found = validate(tmp_path, lines(*rows), outliers={"jump_and_reversal": "set_aside"})
    assert aside(found) == [
        (3, 22, f"{JUMP}: A on 2000-02-28", rows[1]),
        (4, 22, f"{JUMP}: A on 2000-03-28", rows[2]),
    ]
    assert len(found.panel) == 6
    assert (fault(found, 22)["n"], fault(found, 22)["kinds"]) == (2, {"set aside": 2})


def test_a_row_after_a_hole_is_set_aside_once(tmp_path: Path) -> None:
    rows = history("A", {1: 0.1, 3: 4.0, 4: -0.8})
    found = validate(
        tmp_path,
        lines(*rows),
        return_after_hole="set_aside",
        outliers={"jump_and_reversal": "set_aside"},
    )
    assert [row[:2] for row in aside(found)] == [(3, 20), (4, 22)]
    assert kept(found) == [("A", "2000-01")]


# Returns from prices.

PRICED = {name: theirs for name, theirs in examples.COLUMNS.items() if name != "return"}


def prices(*rows: tuple[str, str, str]) -> str:
    listed = [f"{name},{day},,{price}" for name, day, price in rows]
    return lines(*listed, header="id,day,final,px")


def test_returns_from_prices(tmp_path: Path) -> None:
    columns = {name: PRICED[name] for name in ("security", "date", "price")}
    text = prices(
        ("A", "2000-01-31", "8"),
        ("A", "2000-02-29", "10"),
        ("A", "2000-03-31", "5"),
        ("A", "2000-05-31", "10"),  # no price of the month before
        ("A", "2000-06-30", "NA"),
        ("A", "2000-07-31", "10"),
        ("A", "2000-08-31", "0"),
        ("A", "2000-09-29", "-10"),  # a vendor's mark that nothing was traded
        ("A", "2000-10-31", "10"),
        ("A", "2000-11-30", '"1,000"'),
        ("B", "2000-12-29", "20"),  # does not go on from A
    )
    found = validate(tmp_path, text, columns=columns, unit="percent", return_from="price")
    gap = np.nan
    np.testing.assert_array_equal(
        found.panel["total_return"], [gap, 0.25, -0.5, gap, gap, gap, gap, gap, gap, 99.0, gap]
    )
    np.testing.assert_allclose(found.panel["excess_return"][1], 0.248, rtol=1e-15)
    assert found.panel["price"].tolist()[:4] == [8, 10, 5, 10]
    assert found.intake["n_missing_returns"] == 8
    assert fault(found, 12) is None  # no code stood for a missing return
    assert fault(found, 20)["n"] == 1


def test_a_price_set_aside_gives_no_return_to_the_next_month(tmp_path: Path) -> None:
    columns = {name: PRICED[name] for name in ("security", "date", "price")}
    days = ["2000-01-31", "2000-02-29", "2000-03-31", "2000-03-30", "2000-04-28", "2000-05-31"]
    text = prices(*(("A", day, price) for day, price in zip(days, "4x8948", strict=True)))
    found = validate(tmp_path, text, columns=columns, return_from="price")
    assert [row[:2] for row in aside(found)] == [(3, 13), (4, 19), (5, 19)]
    np.testing.assert_array_equal(found.panel["total_return"], [np.nan, np.nan, 1.0])


def test_final_returns_and_flags_on_returns_from_prices(tmp_path: Path) -> None:
    columns = {name: PRICED[name] for name in ("security", "date", "price", "final_return")}
    text = lines(
        "A,2000-01-31,,10", "A,2000-02-29,,50", "A,2000-03-31,-0.5,10", "B,2000-12-29,,1",
        header="id,day,final,px",
    )  # fmt: skip
    found = validate(tmp_path, text, columns=columns, return_from="price")
    # 0.2 × 0.5 − 1, to the rounding of one product.
    np.testing.assert_allclose(found.panel["total_return"][:3], [np.nan, 4.0, -0.9], rtol=1e-15)
    assert fault(found, 22)["examples"] == ["A on 2000-03-31"]


# Several files.


def test_several_files_are_one_delivery(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    examples.in_pieces(monkeypatch, 2)
    early = [*history("A", {1: 0.1, 2: 0.2}), *history("B", {1: "x"}), *history("C", {1: 0.3})]
    late = [
        *history("A", {2: 0.2, 3: 0.3}),  # the first again
        *history("C", {1: 0.4}),  # another value
        "B,2000-02-28",
        *history("B", {2: 0.1}),
    ]
    files = [
        Path(examples.write(tmp_path / name, lines(*rows)))
        for name, rows in (("early.csv", early), ("late.csv", late))
    ]
    found = validate(tmp_path, files)
    assert kept(found) == [("A", "2000-01"), ("A", "2000-02"), ("A", "2000-03"), ("B", "2000-02")]
    assert found.set_aside[["file", "line", "fault", "raw"]].to_numpy().tolist() == [
        ["raw/early.csv", 4, 13, early[2]],
        ["raw/early.csv", 5, 19, early[3]],
        ["raw/late.csv", 4, 19, late[2]],
        ["raw/late.csv", 5, 5, late[3]],
    ]
    counts = found.intake
    assert [counts[f"rows_{what}"] for what in ("read", "kept", "set_aside")] == [9, 4, 4]
    assert counts["exact_duplicates"] == 1
    assert fault(found, 19)["examples"] == ["raw/early.csv, line 5", "raw/late.csv, line 4"]
    last = validate(tmp_path, files, same_month_rows="last")
    assert last.panel.query("security == 'C'")["total_return"].tolist() == [0.4]
    first = validate(tmp_path, files[::-1], same_month_rows="last")
    assert first.panel.query("security == 'C'")["total_return"].tolist() == [0.3]


def test_pieces_do_not_show(tmp_path: Path) -> None:
    rng = np.random.default_rng(4)
    rows = [
        f"{name},2000-{month:02d}-28,{value:.3f},,{abs(value):.3f},{price:.2f}"
        for name, month, value, price in zip(
            rng.integers(0, 9, 80), rng.integers(1, 13, 80), rng.normal(0, 1, 80),
            rng.normal(2, 1, 80), strict=True,
        )
    ]  # fmt: skip
    options = {
        "same_month_rows": "first",
        "return_after_hole": "set_aside",
        "screens": [{"column": "price", "at_least": 1}],
        "stale_run": 2,
        "missing_final_return": -0.3,
    }
    results = []
    for at_most in (1, 3, 10, 1000):
        with pytest.MonkeyPatch.context() as patch:
            examples.in_pieces(patch, at_most)
            results.append(validate(tmp_path, lines(*rows), **options))
    for found in results[:-1]:
        pd.testing.assert_frame_equal(found.panel, results[-1].panel)
        pd.testing.assert_frame_equal(found.set_aside, results[-1].set_aside)
        assert found.intake == results[-1].intake
    assert {15, 19, 20} <= set(results[-1].set_aside["fault"])
