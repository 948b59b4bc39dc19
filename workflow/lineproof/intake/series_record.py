"""What the data report says of the market and of the riskless rate: rows used, and the numbers themselves."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
import pandas as pd

from lineproof.intake.series import FileOfSeries


class UsedDays:
    """The days of a series that a study uses, from its tables of the market: `market` and perhaps `market_daily`.

    `frequency` is that of the study, hence of `market`.
    """

    def __init__(self, tables: Mapping[str, pd.DataFrame], frequency: str) -> None:
        dates = {name: table["date"].to_numpy() for name, table in tables.items()}
        held = np.concatenate(list(dates.values()))
        self._months = held.astype("datetime64[M]")
        daily = held if frequency == "daily" else dates.get("market_daily", held[:0])
        self._days = daily.astype("datetime64[D]")
        compounded = held[:0] if frequency == "daily" else dates["market"]
        self._compounded = compounded.astype("datetime64[M]")

    def among(self, days: np.ndarray, frequency: str) -> np.ndarray:
        """Which of the days of a series of that frequency are used: (n_days,) bool."""
        months = days.astype("datetime64[M]")
        if frequency == "monthly":
            return np.isin(months, self._months)
        return np.isin(days, self._days) | np.isin(months, self._compounded)


def file_records(
    place: str, files: Sequence[FileOfSeries], frequency: str, used: UsedDays
) -> list[dict[str, Any]]:
    """A `record.FileRecord` a file of a series."""
    found = []
    for file in files:
        kept = int(used.among(file.days, frequency).sum())
        found.append(
            {
                "place": place,
                "label": file.label,
                "rows_read": file.n_rows,
                "rows_kept": kept,
                "rows_set_aside": 0,
                "exact_duplicates": 0,
                "rows_unused": file.n_rows - kept,
            }
        )
    return found


def series_record(
    place: str, source: str, period: str, date: pd.Series, values: pd.Series
) -> dict[str, Any]:
    """A `record.SeriesRecord`: values decimal a `period` ("month" or "day"); `source` says what they are."""
    return {
        "place": place,
        "source": source,
        "period": period,
        "first": f"{date.iloc[0]:%Y-%m-%d}",
        "last": f"{date.iloc[-1]:%Y-%m-%d}",
        "n_periods": len(date),
        "mean": float(values.mean()),
        "sd": float(values.std()) if len(values) > 1 else None,
        "min": float(values.min()),
        "max": float(values.max()),
    }
