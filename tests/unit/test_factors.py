"""Further factors: read like any series, one column each."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from lineproof import store
from lineproof.estimation import estimate_betas, estimates_of
from lineproof.factors import read_factors
from lineproof.frames import contract
from lineproof.problems import KnownProblem

READING = {
    "label": "factors.csv",
    "columns": {"date": "month", "smb": "SMB", "hml": "HML"},
    "unit": "percent",
    "missing": [""],
    "dates": "%Y-%m",
    "separator": None,
    "decimal": "point",
}


def read(folder: Path, text: str) -> pd.DataFrame:
    file = folder / "factors.csv"
    file.write_text(text, encoding="utf-8")
    return read_factors([str(file)], reading=READING, frequency="monthly")


def test_each_factor_is_a_column(tmp_path: Path) -> None:
    table = read(tmp_path, "month,SMB,HML\n2001-03,3,-1\n2001-01,1,\n2001-02,2,4\n")
    contract("factors").validate(table)
    assert table["date"].dt.strftime("%Y-%m-%d").tolist() == [
        "2001-01-31",
        "2001-02-28",
        "2001-03-31",
    ]
    np.testing.assert_allclose(table["smb"], [0.01, 0.02, 0.03])
    np.testing.assert_allclose(table["hml"], [np.nan, 0.04, -0.01])


def test_a_value_that_is_no_number_stops_the_run(tmp_path: Path) -> None:
    with pytest.raises(KnownProblem, match="column HML: 'x' is not a number"):
        read(tmp_path, "month,SMB,HML\n2001-01,1,x\n")


@pytest.mark.parametrize("rows", [1, 7, 60, 10_000])
def test_pieces_of_whole_securities_make_the_same_table(tmp_path: Path, rows: int) -> None:
    """To the last byte, wherever row groups and pieces end."""
    rng = np.random.default_rng(1)
    months = pd.date_range("2001-01-31", periods=60, freq="ME", unit="ms")
    market = pd.DataFrame({"date": months, "market_excess": rng.normal(size=60), "riskless": 0.0})
    factors = pd.DataFrame({"date": months[3:], "smb": rng.normal(size=57)})
    parts = [
        pd.DataFrame({"security": f"S{k}", "date": months[k : 60 - k]}).assign(
            excess_return=rng.normal(size=60 - 2 * k)
        )
        for k in range(9)
    ]
    panel = pd.concat(parts, ignore_index=True)
    panel.to_parquet(tmp_path / "panel.parquet", row_group_size=50, index=False)
    options = {"name": "b", "estimator": "multi_factor", "window": 30, "min_obs": 12}
    options["beside"] = ["smb"]
    pieces = list(store.read_securities(tmp_path / "panel.parquet", list(panel.columns), rows))
    assert sum(map(len, pieces)) == len(panel)
    owners = [set(piece["security"]) for piece in pieces]
    assert sum(map(len, owners)) == 9
    paths = {name: tmp_path / f"{name}.parquet" for name in ("whole", "betas")}
    store.write_table(estimates_of(panel, market, factors, **options), paths["whole"], "betas")
    store.write_together(
        estimate_betas(pieces, market, factors, **options), {"betas": paths["betas"]}
    )
    assert paths["whole"].read_bytes() == paths["betas"].read_bytes()
