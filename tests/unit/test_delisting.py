"""Final returns and leavers, by hand."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from tests.unit import intake_examples as examples
from tests.unit.intake_examples import fault, lines, validate

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
    assert (entry["n"], entry["kinds"], entry["examples"]) == (1, {said: 1}, ["A in 2000-01"])
    assert "Shumway 1997" in entry["note"]


@pytest.mark.fault(42)
def test_final_returns_of_a_security_that_goes_on_are_not_used(tmp_path: Path) -> None:
    rows = [f"A,2000-0{m}-28,0.1,-0.5,1,1" for m in (1, 2, 4)]  # the vendor repeats it
    found = validate(tmp_path, lines(*STAYS, *rows))
    totals = found.panel.query("security == 'A'")["total_return"]
    # In February A leaves, to come back in April; in January it only goes on.
    np.testing.assert_allclose(totals, [0.1, -0.45, -0.45], rtol=1e-15)
    assert (fault(found, 42)["n"], fault(found, 42)["examples"]) == (1, ["A in 2000-01"])


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
