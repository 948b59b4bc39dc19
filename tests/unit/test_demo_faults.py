"""The faults of the demo market: planted where the record says, and nowhere else."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from tests.unit.demo_examples import (
    LISTED_FAULTS,
    clean_rows,
)

from lineproof.demo import faults, make_demo

LINE = "000417,1987-03-31,-0.012300,,,12.500,250.000,retail"


@pytest.mark.parametrize(
    ("kind", "raw"),
    [
        ("too many fields", "000417,1987-03-31,-0.012300,,,12.500,250.000,retail,revised"),
        ("decimal comma", "000417,1987-03-31,-0,012300,,,12.500,250.000,retail"),
        ("too few fields", "000417,1987-03-31,-0.012300,,"),
        ("trailing blanks", "000417,1987-03-31,-0.012300,,,12.500,250.000,retail   "),
        ("impossible day", "000417,1987-02-30,-0.012300,,,12.500,250.000,retail"),
        ("text as price", "000417,1987-03-31,-0.012300,,,see note,250.000,retail"),
        ("overflow", "000417,1987-03-31,1e400,,,12.500,250.000,retail"),
        ("blanks around", " 000417 ,1987-03-31,-0.012300,,,12.500,250.000,retail"),
        ("blank identifier", ",1987-03-31,-0.012300,,,12.500,250.000,retail"),
        ("negative", "000417,1987-03-31,-0.012300,,,12.500,-12.500,retail"),
    ],
)
def test_a_spoilt_line_by_hand(kind: str, raw: str) -> None:
    spoil = next(fault.spoil for fault in faults.INSIDE if fault.kind == kind)
    spoilt = spoil([LINE, "next"])
    assert spoilt.lines == [raw, "next"]
    assert spoilt.marks == ((0, 0),)


def test_spoilt_stretches_by_hand() -> None:
    stretch = [f"a,2001-0{month}-28,0.010000,,,{month}.000,9.000,x" for month in range(1, 7)]
    assert faults.repeat(stretch).lines == [stretch[0], *stretch]
    assert faults.contradict(stretch).lines[:2] == [
        stretch[0], "a,2001-01-28,0.060000,,,1.000,9.000,x",
    ]  # fmt: skip
    assert faults.hole(2)(stretch).lines == [stretch[0], *stretch[3:]]
    assert faults.hole(2)(stretch).marks == ((1, 3),)
    assert faults.stale(2)(stretch).lines == [
        stretch[0],
        "a,2001-02-28,0.000000,,,1.000,9.000,x",
        "a,2001-03-28,0.000000,,,1.000,9.000,x",
        *stretch[3:],
    ]
    assert faults.jump(stretch).lines == [
        stretch[0],
        "a,2001-02-28,4.000000,,,5.000,9.000,x",
        "a,2001-03-28,-0.800000,,,1.000,9.000,x",
        *stretch[3:],
    ]


def test_every_fault_is_planted_where_the_record_says(
    market: dict[str, str | pd.DataFrame],
) -> None:
    lines = market["returns.csv"].splitlines()
    record = market["truth_faults"]
    assert set(record["fault"]) == LISTED_FAULTS
    kinds = {(fault.number, fault.kind) for fault in (*faults.INSIDE, *faults.AT_EXIT)}
    assert set(zip(record["fault"], record["kind"], strict=True)) == kinds
    assert record["line"].is_monotonic_increasing
    assert record["line"].is_unique
    assert record["raw"].tolist() == [lines[line - 1] for line in record["line"]]


def test_spoilt_lines_show_their_fault(market: dict[str, str | pd.DataFrame]) -> None:
    lines = [line.split(",") for line in market["returns.csv"].splitlines()]
    for row in market["truth_faults"].itertuples():
        at = row.line - 1
        assert SHOWS[row.fault](lines[at - 1 : at + 4], row), row
        if row.fault not in {5, 8, 23}:
            assert lines[at][:2] == [row.security, row.date]


# What shows each fault, given the fields of the line before it, of its own and of three more.
SHOWS = {
    5: lambda near, row: len(near[1]) != 8,
    7: lambda near, row: row.raw != row.raw.rstrip(),
    8: lambda near, row: near[1][1] in {row.date[:4] + "-02-30", "9999-12-31"},
    12: lambda near, row: near[1][2] in {"", "NA", "-99"},
    13: lambda near, row: near[1][2] == "halted" or near[1][5] == "see note",
    14: lambda near, row: near[1][2] in {"inf", "nan", "1e400"},
    15: lambda near, row: near[1][2] in {"-66", "-77", "-88", "-1.400000"},
    16: lambda near, row: "-1.000000" in near[1][2:4],
    19: lambda near, row: near[1][:2] in (near[0][:2], near[2][:2]),
    20: lambda near, row: near[0][0] == near[1][0] and months_apart(near[0][1], row.date) > 1,
    21: lambda near, row: [fields[2] for fields in near[1:]] == ["0.000000"] * 4,
    22: lambda near, row: (near[1][2], near[2][2]) == ("4.000000", "-0.800000"),
    23: lambda near, row: near[1][0] in {"", f" {row.security} "},
    24: lambda near, row: near[1][6] in {"", "0", "-12.500"},
    25: lambda near, row: near[1][4] != "" and near[1][3] == "",
}


def months_apart(earlier: str, later: str) -> int:
    return (pd.Period(later, "M") - pd.Period(earlier, "M")).n


def test_nothing_is_wrong_but_what_is_recorded(market: dict[str, str | pd.DataFrame]) -> None:
    """Undoing the record leaves exactly the truth's rows."""
    assert clean_rows(market)["ret"].between(-0.99, 3.0).all()
    record, truth = market["truth_faults"], market["truth_betas"]
    unreadable = record[record["fault"].isin({5, 8, 19, 23})]
    lines = market["returns.csv"].splitlines()[1:]
    kept = [line.split(",")[:2] for line in np.delete(lines, unreadable["line"] - 2).tolist()]
    assert len(kept) == len(set(map(tuple, kept)))
    restored = unreadable[["security", "date"]].itertuples(index=False, name=None)
    found = {*map(tuple, kept), *restored}
    listed = set(truth[["security", "date"]].itertuples(index=False, name=None))
    assert found <= listed
    in_holes = record["kind"].map({"hole of 1": 1, "hole of 4": 4}).fillna(0).sum()
    assert len(listed) - len(found) == in_holes


def test_faults_grow_with_the_market(
    large: dict[str, str | pd.DataFrame], small: dict[str, str | pd.DataFrame]
) -> None:
    counts = large["truth_faults"]["fault"].value_counts()
    n_lines = len(large["truth_betas"])
    assert counts[12] == round(faults.RATE * n_lines)
    assert counts[22] == round(faults.RARE * n_lines)
    assert small["truth_faults"]["fault"].value_counts()[22] == 1


@settings(max_examples=12, deadline=None, derandomize=True)
@given(
    n_securities=st.integers(40, 90),
    n_months=st.integers(60, 150),
    seed=st.integers(0, 2**32 - 1),
)
def test_any_small_market_is_sound(n_securities: int, n_months: int, seed: int) -> None:
    first = pd.Period("1990-03", "M")
    demo = make_demo(
        n_securities=n_securities, first=str(first), last=str(first + n_months - 1), seed=seed
    )
    lines = demo["returns.csv"].splitlines()
    record = demo["truth_faults"]
    assert set(record["fault"]) == LISTED_FAULTS
    assert record["raw"].tolist() == [lines[line - 1] for line in record["line"]]
    assert demo["truth_betas"]["security"].nunique() == n_securities
    assert demo["truth_betas"]["residual_sd"].min() > 0
    assert len(demo["truth_eras"]) == 4
    assert demo["market.csv"].count("\n") == n_months + 1
