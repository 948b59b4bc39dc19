"""No text of ours is a formula to a spreadsheet."""

from __future__ import annotations

import csv
import io
from pathlib import Path

import pandas as pd
import pytest
from tests.unit.paper_examples import HOSTILE

from lineproof import store
from lineproof.spreadsheet import as_text


@pytest.mark.fault(38)
@pytest.mark.parametrize("start", ["=", "+", "-", "@", "\t", "\r"])
def test_what_begins_like_a_formula_is_marked_as_text(start: str) -> None:
    assert as_text(f"{start}cmd()") == f"'{start}cmd()"
    assert as_text(f"{start}1+1") == f"'{start}1+1"
    assert as_text(f"a{start}b") == f"a{start}b"


@pytest.mark.parametrize("text", ["", "-", "-99", "+1.5", "-.5", "-1e-05", "7", "x=1", "<b>", "'"])
def test_signs_and_numbers_and_other_text_are_left(text: str) -> None:
    assert as_text(text) == text


@pytest.mark.fault(38)
def test_csv_of_a_frame(tmp_path: Path) -> None:
    reasons = [*HOSTILE, "-1,+2", None]
    frame = pd.DataFrame(
        {
            "line": range(len(reasons)),
            "value": [-0.5] * len(reasons),
            "date": pd.Timestamp("2001-01-31"),
            "reason": pd.Series(reasons, dtype="str"),
            "file": pd.Categorical(["=a.csv"] * len(reasons)),
        }
    )
    store.write_csv(frame, tmp_path / "set_aside.csv")
    rows = list(csv.DictReader(io.StringIO((tmp_path / "set_aside.csv").read_text("utf-8"))))
    assert [row["reason"] for row in rows] == [
        HOSTILE[0],
        "'" + HOSTILE[1],
        *HOSTILE[2:],
        "'-1,+2",
        "",
    ]
    assert {row["value"] for row in rows} == {"-0.5"}
    assert {row["file"] for row in rows} == {"'=a.csv"}
    assert frame["reason"][1] == HOSTILE[1]  # the frame itself, and so the Parquet, is as it was
