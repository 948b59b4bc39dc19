"""The stage that reads returns of further factors, to stand beside the market."""

from __future__ import annotations

from typing import Any

import pandas as pd

from lineproof.intake.dating import with_dates
from lineproof.intake.series import read_series


def read_factors(files: list[str], *, reading: dict[str, Any], frequency: str) -> pd.DataFrame:
    """`date` and a column a factor (decimal), sorted by date; NaN where a factor has no value at a date.

    Raises KnownProblem when a file cannot be used: see `read_series`, by whose rules each factor is read.
    """
    reading = with_dates(files, reading, daily=frequency == "daily")
    columns = dict(reading["columns"])
    date = columns.pop("date")
    table: pd.DataFrame | None = None
    for name, theirs in columns.items():
        alone = {**reading, "columns": {"date": date, "return": theirs}}
        series = read_series(files, alone, "return", frequency).values
        series = series.rename(columns={"return": name})
        table = series if table is None else table.merge(series, on="date", how="outer", sort=True)
    assert table is not None
    return table.astype({"date": "datetime64[ms]"})
