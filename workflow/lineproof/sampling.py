"""Numbers about the sample itself, as rows of the estimates."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
import pandas as pd

from lineproof.addresses import COLUMNS, DTYPES
from lineproof.calendar import month_end, month_name, month_number


def describe_sample(
    panel: pd.DataFrame,
    estimated: pd.DataFrame | None,
    subperiods: Sequence[dict[str, Any]],
    intake: dict[str, Any],
) -> pd.DataFrame:
    """What came in, who was there in each month, and the sample of each subperiod.

    `estimated` has the security and date of the betas that the main test assets are ranked on, or
    is None.
    """
    rows = _intake_rows(intake) + _month_rows(panel, estimated)
    spans = _spans(panel)
    for subperiod in subperiods:
        rows += _subperiod_rows(panel, spans, subperiod)
    return _as_estimates(rows)


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


def _month_rows(panel: pd.DataFrame, estimated: pd.DataFrame | None) -> list[Row]:
    """Securities with a row, and with a beta, in each month that has any."""
    alive = panel["date"].value_counts().sort_index()
    dated = alive.iloc[:0] if estimated is None else estimated["date"].value_counts()
    with_beta = dated.reindex(alive.index, fill_value=0)
    counts = pd.DataFrame({"n_securities": alive, "n_with_beta": with_beta})
    return [
        ("-", "sample", "month", month_name(date), term, n, 1)
        for date, terms in counts.to_dict("index").items()
        for term, n in terms.items()
    ]


def _spans(panel: pd.DataFrame) -> pd.DataFrame:
    """First and last month number of each security: columns min and max."""
    month = pd.Series(month_number(panel["date"]), index=panel.index)
    return month.groupby(panel["security"], sort=False).agg(["min", "max"])


def _subperiod_rows(
    panel: pd.DataFrame, spans: pd.DataFrame, subperiod: dict[str, Any]
) -> list[Row]:
    """The sample between two months.

    An entry is a security whose first row lies in the subperiod, unless the panel begins with it;
    an exit one whose last row does, unless the panel ends with it. A hole is neither.
    """
    first, last = month_end(subperiod["first"]), month_end(subperiod["last"])
    part = panel[panel["date"].between(first, last)]
    alive = part["date"].value_counts()
    by_month = part.groupby("date")["total_return"].mean()
    start, end = month_number([first, last])
    beginning, ending = spans["min"].min(), spans["max"].max()
    n_periods = subperiod["n_periods"]
    entered = spans["min"].between(start, end) & (spans["min"] > beginning)
    left = spans["max"].between(start, end) & (spans["max"] < ending)
    values = {
        "n_periods": n_periods,
        "n_securities": part["security"].nunique(),
        "n_security_periods": len(part),
        "mean_alive": len(part) / n_periods,
        "min_alive": alive.min() if len(alive) == n_periods else 0,
        "max_alive": alive.max() if len(alive) else 0,
        "n_entries": entered.sum(),
        "n_exits": left.sum(),
        "mean_return": by_month.mean(),
        "sd_return": by_month.std(),
    }
    name = subperiod["name"]
    return [(name, "sample", "panel", "all", *each, n_periods) for each in values.items()]


def _as_estimates(rows: list[Row]) -> pd.DataFrame:
    frame = pd.DataFrame(rows, columns=_ROW).assign(sort="-", se_kind="-", n_assets=0)
    frame["estimate"] = frame["estimate"].astype(float)
    undefined = frame["estimate"].isna()
    frame["status"] = np.where(undefined, "undefined", "ok")
    frame["reason"] = np.where(undefined, "too few months with returns in the subperiod", "")
    return frame.reindex(columns=COLUMNS).astype(DTYPES)
