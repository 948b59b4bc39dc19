"""Take a few invented rows in, so that every kernel of the intake is compiled before a study waits for it."""

from __future__ import annotations

import tempfile
from pathlib import Path
from typing import Any

import numpy as np

from lineproof import store
from lineproof.validation import validate_returns

_FIRST = np.datetime64("2001-01-01")
_N_DAYS = 70
_RULES = {
    "screens": [{"column": "price", "at_least": 1}],
    "outliers": {"jump_and_reversal": "flag"},
    "return_after_hole": "keep",
    "stale_run": None,
    "missing_final_return": None,
    "final_return_by_reason": {},
    "allow_partial_last_month": True,
    "other_unit_stop_above": 1.0,
    "same_month_rows": "set_aside",
}


def warm_up() -> None:
    """Compile what a daily and a monthly file need, and a market of either weights."""
    days = _FIRST + np.arange(_N_DAYS)
    months = _FIRST.astype("datetime64[M]") + np.arange(_N_DAYS)
    ends = (months + 1).astype("datetime64[D]") - 1
    with tempfile.TemporaryDirectory() as folder:
        _take_in(Path(folder), ends, "monthly", "size")
        _take_in(Path(folder), days, "daily", "equal")


def _take_in(folder: Path, dates: np.ndarray, delivered: str, build: str) -> None:
    returns, riskless = folder / f"{delivered}.csv", folder / f"riskless_{delivered}.csv"
    rows = [
        f"{name},{day},{0.01 * (-1) ** at},{100 + at},{20 - at / 10},\n"
        for name in "AB"
        for at, day in enumerate(dates)
    ]
    header = "security,date,return,size,price,final_return\n"
    store.write_text(header + "".join(rows), returns)
    store.write_text("date,rate\n" + "".join(f"{day},0.0001\n" for day in dates), riskless)
    columns = ("security", "date", "return", "size", "price", "final_return")
    series = {"market": None, "market_is": "total", "riskless_quoted": "period_return"}
    with store.Scratch(folder) as scratch:
        found = validate_returns(
            {"returns": [str(returns)], "riskless": [str(riskless)]},
            scratch,
            frequency="monthly",
            returns=_reading("returns", columns),
            returns_are="total",
            returns_frequency=delivered,
            series={
                **series,
                "market_frequency": delivered,
                "riskless": _reading("riskless", ("date", "rate")),
                "riskless_frequency": delivered,
            },
            market_build=build,
            rules=_RULES,
        )
        for _ in found.tables():
            pass
        found.markets()
        found.counts()


def _reading(label: str, columns: tuple[str, ...]) -> dict[str, Any]:
    same_name = {name: name for name in columns}
    return {
        "label": label,
        "columns": same_name,
        "unit": "decimal",
        "missing": [],
        "dates": "%Y-%m-%d",
        "separator": ",",
        "decimal": "point",
        "layout": "long",
    }
