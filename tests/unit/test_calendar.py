"""Months as dates and as numbers."""

from __future__ import annotations

import numpy as np
import pandas as pd

from lineproof.calendar import month_end, month_name, month_number


def test_consecutive_months_are_consecutive_numbers() -> None:
    dates = pd.date_range("1899-11-30", "2101-02-28", freq="ME", unit="ms")
    numbers = month_number(dates)
    assert numbers.dtype == np.int64
    assert (np.diff(numbers) == 1).all()
    assert numbers[0] == 1899 * 12 + 10


def test_every_day_of_a_month_has_its_number() -> None:
    days = pd.Series(pd.to_datetime(["2024-02-01", "2024-02-29", "2024-03-01"]))
    assert month_number(days).tolist() == [24289, 24289, 24290]
    assert month_number([days[0], days[2]]).tolist() == [24289, 24290]


def test_month_ends_and_names() -> None:
    for month, day in (("2023-02", 28), ("2024-02", 29), ("1900-02", 28), ("1999-12", 31)):
        end = month_end(month)
        assert end == pd.Timestamp(f"{month}-{day}")
        assert end.unit == "ms"
        assert month_name(end) == month
    assert month_end(pd.Period("1962-06", "M")) == pd.Timestamp("1962-06-30")
