"""Are the dates of a series as frequent as declared? (fault 40)"""

from __future__ import annotations

from typing import Any

import numpy as np

from lineproof.intake.stopping import counted, stop

_SHARE_OF_DAILY = 0.2  # of months with more than two dates: not monthly
_FEWEST_DAYS = 10  # dates in half of all whole months: not daily
_FEWEST_STEPS = 4  # on which to judge
_QUARTER = 3  # months


def check_series_frequency(
    days: np.ndarray, group: np.ndarray, frequency: str, reading: dict[str, Any]
) -> None:
    """Stop when the dates are more or less frequent than declared (fault 40).

    `days` has the known dates, datetime64[D] (n,); `group` int64 (n,) numbers the series a row belongs to. Exact
    repetitions of a date do not count. Raises KnownProblem with the counts.
    """
    if len(days) == 0:
        return
    pairs = np.unique(np.stack([group, days.astype(np.int64)], axis=1), axis=0)
    date = pairs[:, 1].astype("datetime64[D]")
    month = date.astype("datetime64[M]").astype(np.int64)
    cells, n_dates = np.unique(np.stack([pairs[:, 0], month], axis=1), axis=0, return_counts=True)
    said = f"{counted(len(pairs), 'date')} in {counted(len(cells), 'month')}"
    if group.max() > 0:
        said += f" of {group.max() + 1:,} series"
    if frequency == "daily":
        inner = n_dates[1:-1] if group.max() == 0 else n_dates
        if len(inner) >= _FEWEST_STEPS and np.median(inner) < _FEWEST_DAYS:
            guess = "monthly" if np.median(inner) <= 1 else "weekly"
            change = "set frequency: monthly" if guess == "monthly" else "deliver daily data"
            raise stop(
                reading["label"],
                f"declared daily, but it has {said}: are these {guess} data?",
                change,
            )
        return
    if (n_dates > 2).mean() > _SHARE_OF_DAILY:
        change = "set frequency: daily, or deliver one value a month"
        raise stop(
            reading["label"],
            f"declared monthly, but it has {said}: are these daily or weekly data?",
            change,
        )
    step = np.diff(cells[:, 1])[np.diff(cells[:, 0]) == 0]
    if len(step) >= _FEWEST_STEPS and np.median(step) >= _QUARTER:
        found = f"declared monthly, but a value is typically {int(np.median(step))} months from the next"
        raise stop(
            reading["label"],
            f"{found}: are these quarterly or yearly data?",
            "deliver monthly values",
        )
