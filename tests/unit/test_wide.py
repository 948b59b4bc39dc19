"""Wide files on their way through the whole intake, and what they say where a column has no name of ours."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from tests.unit.intake_examples import (
    UNUSABLE,
    aside,
    kept,
    monthly_file,
    months,
    reading,
    refused,
    validate,
)

from lineproof.intake.series import read_series
from lineproof.problems import KnownProblem

WIDE = {"columns": {"date": "month"}, "layout": "wide", "dates": "%Y-%m"}
HEADER = "month,A,B\n"


def table(*rows: str) -> str:
    return HEADER + "\n".join(rows) + "\n"


def test_cells_become_rows_of_the_panel(tmp_path: Path) -> None:
    found = validate(tmp_path, table("2000-01,0.1,x", "2000-02,,0.2", "2000-03,-1.5,inf"), **WIDE)
    assert kept(found) == [("A", "2000-01"), ("B", "2000-02")]
    assert found.panel["total_return"].tolist() == [0.1, 0.2]
    assert aside(found) == [
        (2, 13, "text in a number column: 'x'", "B=x"),
        (4, 15, "a return below −100 %: '-1.5'", "A=-1.5"),
        (4, 14, "an infinite value, or one spelt nan: 'inf'", "B=inf"),
    ]


def test_cells_may_be_prices(tmp_path: Path) -> None:
    text = table("2000-01,10,", "2000-02,11,50", "2000-03,,40", "2000-04,12,NA")
    found = validate(tmp_path, text, **WIDE, return_from="price")
    assert kept(found) == [
        *(("A", f"2000-0{month}") for month in (1, 2, 4)),
        *(("B", f"2000-0{month}") for month in (2, 3, 4)),
    ]
    nan = np.nan
    expected = [nan, 11 / 10 - 1, nan, nan, 40 / 50 - 1, nan]
    np.testing.assert_array_equal(found.panel["total_return"], expected)
    np.testing.assert_array_equal(found.panel["price"], [10, 11, 12, 50, 40, nan])
    (said, *_) = found.intake["evidence"]["scale"]
    assert (said["found"], said["verdict"]) == ("computed from the price", "no unit to judge")


@pytest.mark.parametrize(
    ("cell", "said"),
    [
        (
            lambda k: f'"{k % 7 - 3},{k % 10}"',
            "most numbers have a decimal comma, as in -1,0\n    → set decimal: comma",
        ),
        (
            lambda k: f"{(-1) ** k * (2 + k % 5)}",
            "read as decimal, half of all returns exceed 400 % in size and one in twenty exceeds 600 %\n"
            "    → set unit: percent",
        ),
        (
            lambda k: f"{20 + k % 10}",
            "read as decimal, half of all returns exceed 2.45e+03 % in size and one in twenty exceeds 2.9e+03 %\n"
            "    → hardly any is negative: do the cells hold prices, or 1 + return? "
            "For prices, set return: {from: price} under columns",
        ),
    ],
)
def test_a_wide_file_that_is_read_wrongly(tmp_path: Path, cell, said: str) -> None:
    rows = [f"{m},{cell(2 * k)},{cell(2 * k + 1)}" for k, m in enumerate(months("1995-01", 60))]
    assert refused(tmp_path, table(*rows), **WIDE) == f"{UNUSABLE}  raw/returns.csv: {said}"


def test_supplied_assets_may_be_wide(tmp_path: Path) -> None:
    file = tmp_path / "a.csv"
    wide = reading("raw/a.csv", WIDE["columns"], layout="wide", names="asset", dates="%Y-%m")
    file.write_text(table("2000-01,0.1,0.3", "2000-02,,0.2"), encoding="utf-8")
    found = read_series(str(file), wide, "return").values
    assert found["asset"].tolist() == ["A", "B", "B"]
    assert found["return"].tolist() == [0.1, 0.3, 0.2]
    file.write_text("month,A,market\n2000-01,0.1,x\n", encoding="utf-8")
    with pytest.raises(KnownProblem) as caught:
        read_series(str(file), wide, "return")
    assert str(caught.value) == (
        f"{UNUSABLE}  raw/a.csv, line 2: 'x' is not a number\n    → mend it, or list it under missing:"
    )


def test_levels_of_an_index_are_no_returns(tmp_path: Path) -> None:
    levels = {month: 100.0 + k for k, month in enumerate(months("2000-01", 40))}
    (tmp_path / "m.csv").write_text(monthly_file("level", levels), encoding="utf-8")
    series = reading("raw/m.csv", {"date": "month", "return": "level"}, dates="%Y-%m")
    with pytest.raises(KnownProblem) as caught:
        read_series(str(tmp_path / "m.csv"), series, "return")
    assert str(caught.value).endswith(
        "→ hardly any is negative: does the column hold the levels of an index? "
        "Deliver its returns, level(t)/level(t−1) − 1"
    )
