"""Numbers about the sample itself, as rows of the estimates."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd

from lineproof.calendar import month_name, month_number, within_months
from lineproof.periods import ABSENT, Months, Periods
from lineproof.plain_estimates import plain_estimates
from lineproof.securities import coded, starts_of


def describe_sample(
    panel: pd.DataFrame,
    estimated: pd.DataFrame | None,
    subperiods: Sequence[dict[str, Any]],
    intake: dict[str, Any],
    periods: Periods | None = None,
) -> pd.DataFrame:
    """What came in, who was there in each month, and the sample of each subperiod.

    `panel` is sorted by security and date, and has a row a period of `periods` (months if None).
    `estimated` has the date of each of the betas that the main test assets are ranked on, or is
    None.
    """
    periods = Months() if periods is None else periods
    sample = _sample(panel, periods)
    rows = _intake_rows(intake) + _month_rows(sample, estimated, periods)
    for subperiod in subperiods:
        rows += _subperiod_rows(sample, subperiod)
    no_totals = panel["total_return"].isna().all()
    too_few = f"too few {periods.noun}s with returns in the subperiod"
    frame = pd.DataFrame(rows, columns=_ROW)
    return plain_estimates(frame.assign(reason=_NO_TOTALS if no_totals else too_few))


_NO_TOTALS = "the returns are in excess of a riskless rate that is not known"


@dataclass(frozen=True)
class _Sample:
    """The panel counted once.

    `code` and `month` are (n_rows,): security and calendar month. `alive` and `mean` are Series by
    date: rows, and the mean of the returns. `first` and `last` are the (n_securities,) numbers of
    the periods in which each has its first and last row.
    """

    code: np.ndarray
    month: np.ndarray
    alive: pd.Series
    mean: pd.Series
    first: np.ndarray
    last: np.ndarray
    periods: Periods


def _sample(panel: pd.DataFrame, periods: Periods) -> _Sample:
    number = periods.number(panel["date"].to_numpy())
    if (number == ABSENT).any():
        panel, number = panel[number != ABSENT], number[number != ABSENT]
    code, _ = coded(panel["security"])
    starts = starts_of(code)
    return _Sample(
        code=code,
        month=periods.month(number),
        alive=panel["date"].value_counts().sort_index(),
        mean=panel.groupby("date")["total_return"].mean(),
        first=number[starts[:-1]],
        last=number[starts[1:] - 1],
        periods=periods,
    )


_ROW = ["subperiod", "analysis", "variant", "asset", "term", "estimate", "n_periods"]
Row = tuple[str, str, str, str, str, float, int]  # in the order of _ROW


def _intake_rows(intake: dict[str, Any]) -> list[Row]:
    counted = ("rows_read", "rows_kept", "rows_set_aside", "exact_duplicates", "rows_screened")
    found = [("rows", "all", term, intake[term]) for term in counted]
    found += [("fault", f"fault-{f['number']:02d}", "n_rows", f["n"]) for f in intake["faults"]]
    found += [
        ("screen", f"screen-{index}", term, screen[term])
        for index, screen in enumerate(intake["screens"], start=1)
        for term in ("n_rows", "n_securities")
    ]
    return [("-", "intake", *each, 0) for each in found]


def _month_rows(sample: _Sample, estimated: pd.DataFrame | None, periods: Periods) -> list[Row]:
    """Securities with a row, and with a beta, at the end of each month that has any."""
    closes = periods.closes_month(periods.number(sample.alive.index.to_numpy()))
    alive = sample.alive[closes]
    dated = alive.iloc[:0] if estimated is None else estimated["date"].value_counts()
    with_beta = dated.reindex(alive.index, fill_value=0)
    counts = pd.DataFrame({"n_securities": alive, "n_with_beta": with_beta})
    return [
        ("-", "sample", "month", month_name(date), term, n, 1)
        for date, terms in counts.to_dict("index").items()
        for term, n in terms.items()
    ]


def _subperiod_rows(sample: _Sample, subperiod: dict[str, Any]) -> list[Row]:
    """The sample between two months.

    An entry is a security whose first row lies in the subperiod, unless the panel begins with it;
    an exit one whose last row does, unless the panel ends with it. A hole is neither.
    """
    first, last = subperiod["first"], subperiod["last"]
    start, end = month_number([pd.Timestamp(first), pd.Timestamp(last)])

    def within(months: np.ndarray) -> np.ndarray:
        return (months >= start) & (months <= end)

    here = within(sample.month)
    alive = sample.alive[within_months(sample.alive.index.to_series(), first, last)]
    mean = sample.mean[within_months(sample.mean.index.to_series(), first, last)]
    n_periods, n_rows = subperiod["n_periods"], int(here.sum())
    entered = within(sample.periods.month(sample.first)) & (sample.first > sample.first.min())
    left = within(sample.periods.month(sample.last)) & (sample.last < sample.last.max())
    values = {
        "n_periods": n_periods,
        "n_securities": len(np.unique(sample.code[here])),
        "n_security_periods": n_rows,
        "mean_alive": n_rows / n_periods,
        "min_alive": alive.min() if len(alive) == n_periods else 0,
        "max_alive": alive.max() if len(alive) else 0,
        "n_entries": entered.sum(),
        "n_exits": left.sum(),
        "mean_return": mean.mean(),
        "sd_return": mean.std(),
    }
    name = subperiod["name"]
    return [(name, "sample", "panel", "all", *each, n_periods) for each in values.items()]
