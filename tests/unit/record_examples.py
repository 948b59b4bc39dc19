"""Records of an intake for the tests of the data report and of `make check`."""

from __future__ import annotations

from copy import deepcopy
from functools import cache
from typing import Any

import numpy as np
from tests.unit.chunk_examples import MONTHS, chunk_of, cut, draw_panel, trading_days

from lineproof.intake.faults import FAULTS, label_of
from lineproof.intake.observers import evidence, start_observers
from lineproof.periods import Periods

HOSTILE = "<script>alert(1)</script> & 'x' \"y\" {{ 7*7 }} %_$ =cmd()"


def fault(number: int, n: int, examples: list[str], kinds: dict[str, int] | None = None) -> Any:
    """A fault as the tally reports it."""
    said = FAULTS[number]
    about = {"number": number, "label": label_of(number), "answer": said.answer, "note": said.note}
    return {**about, "n": n, "kinds": kinds or {}, "examples": examples}


def observed(seed: int, periods: Periods, n_securities: int = 60) -> dict[str, Any]:
    """Evidence of a random panel."""
    observers = start_observers(periods)
    for chunk in cut(draw_panel(seed, n_securities, periods), {20, 40}):
        for observer in observers.values():
            observer.see(chunk)
    return evidence(observers)


@cache
def _usual() -> dict[str, Any]:
    found = observed(4, MONTHS)
    panel = chunk_of(draw_panel(4, 60))
    kept = len(panel)
    missing = int(np.isnan(panel.values["total_return"]).sum())
    medians = [[f"{year}-01", 0.04 if year != 1967 else 4.1] for year in range(1957, 1983)]
    return {
        "file": "raw/returns.csv",
        "first": MONTHS.name(int(panel.period.min())),
        "last": MONTHS.name(int(panel.period.max())),
        "rows_read": kept + 1_284 + 97,
        "rows_kept": kept,
        "rows_set_aside": 1_284,
        "exact_duplicates": 97,
        "rows_screened": 1_420,
        "n_securities": 60,
        "n_missing_returns": missing,
        "faults": [
            fault(8, 51, ["line 7", "line 19", "line 23"]),
            fault(12, missing, ["S001 in 1960-02", "S001 in 1961-03", "S002 in 1959-12"],
                  {"empty": missing - 37, "-99": 37}),
            fault(15, 1_200, ["line 101", "line 102", "line 103"]),
            fault(16, 2, ["S003 in 1971-05", "S017 in 1974-06"]),
            fault(28, 33, ["line 11", "line 12", "line 13"]),
        ],
        "screens": [
            {"label": "price at least 1", "n_rows": 1_333, "n_securities": 31},
            {"label": "sector not mines", "n_rows": 87, "n_securities": 9},
        ],
        "span": ["33 rows of returns dated after 1982-12, where raw/market.csv ends: the study ends there"],
        "period": "month",
        "files": [
            {"place": "data.returns", "label": "raw/returns.csv", "rows_read": kept + 1_381, "rows_kept": kept,
             "rows_set_aside": 1_284, "exact_duplicates": 97},
            {"place": "data.market", "label": "raw/market.csv", "rows_read": 320, "rows_kept": 312,
             "rows_set_aside": 0, "exact_duplicates": 0, "rows_unused": 8},
            {"place": "data.riskless", "label": "raw/riskless.csv", "rows_read": 312, "rows_kept": 312,
             "rows_set_aside": 0, "exact_duplicates": 0},
        ],
        "series": [
            {"place": "data.market", "source": "raw/market.csv: total returns", "period": "month",
             "first": "1957-01-31", "last": "1982-12-31", "n_periods": 312,
             "mean": 0.00512, "sd": 0.0431, "min": -0.1912, "max": 0.1624},
            {"place": "data.riskless", "source": "raw/riskless.csv: a compound yield a year", "period": "month",
             "first": "1957-01-31", "last": "1982-12-31", "n_periods": 312,
             "mean": 0.0037, "sd": None, "min": 0.0009, "max": 0.0101},
        ],
        "set_aside": [
            aside(8, 51, [(7, "'31/31/1960'", "S001,31/31/1960,0.02,1.5")]),
            aside(15, 1_200, [(101, "-1.5", "S004,1960-01-31,-1.5,1.5"), (102, "-99.9", "S004,1960-02-29,-99.9,")]),
            aside(28, 33, []),
        ],
        "delisting": {
            "n_with": 22,
            "n_without": 31,
            "by_reason": {
                "": {"n": 3, "n_with": 0, "n_without": 3, "stand_in": None},
                "merged": {"n": 30, "n_with": 20, "n_without": 10, "stand_in": 0.0},
                "failed": {"n": 20, "n_with": 2, "n_without": 18, "stand_in": -0.3},
            },
            "mean_with": 0.0081234,
            "mean_without": 0.0088765,
        },
        "evidence": {
            **found,
            "scale": [
                {"what": "Unit of the returns", "found": "half of all returns lie between −3.2 % and 4.1 %",
                 "verdict": "decimal, as declared"},
                {"what": "Unit by month", "found": "in 1 month the median size is 102 times its neighbours’",
                 "verdict": "kept, flagged", "series": {"label": "Median size of a return", "points": medians}},
            ],
        },
    }  # fmt: skip


def aside(number: int, n: int, rows: list[tuple[int, str, str]]) -> dict[str, Any]:
    """Rows set aside for one fault; of each row its line, what was found and its text."""
    label = label_of(number)
    examples = [
        {"file": "raw/returns.csv", "line": line, "reason": f"{label}: {said}", "raw": raw}
        for line, said, raw in rows
    ]
    return {"number": number, "label": label, "n": n, "examples": examples}


def usual() -> dict[str, Any]:
    """A monthly study with something of everything."""
    return deepcopy(_usual())


def daily() -> dict[str, Any]:
    """A daily study of survivors."""
    intake = usual()
    days = trading_days("1999-11-15", "2000-02-10")
    intake |= {"period": "day", "first": "1999-11-15", "last": "2000-02-10", "span": []}
    intake["faults"].append(fault(26, 1, []))
    intake["evidence"] |= observed(4, days)
    del intake["delisting"]
    return intake


def raw_files() -> dict[str, Any]:
    """Sizes and sums of the files of `usual`, whose last was made by a rule."""
    signs = [
        {"n_bytes": 12_345_678, "sha256": "ab" * 32},
        {"n_bytes": 4_321, "sha256": "cd" * 32},
        {"n_bytes": 99},
    ]
    return {"made_with": "ef" * 32, "files": signs}


def earlier() -> dict[str, Any]:
    """A record of the version before files, rows set aside and evidence were told."""
    intake = usual()
    for key in ("files", "series", "set_aside", "delisting", "evidence", "period"):
        del intake[key]
    return intake


def clean() -> dict[str, Any]:
    """A file without a fault, of which nothing is set aside or screened, and nothing observed."""
    intake = earlier()
    intake |= {"rows_set_aside": 0, "exact_duplicates": 0, "rows_read": intake["rows_kept"]}
    intake |= {"faults": [], "screens": [], "span": [], "n_missing_returns": 0, "rows_screened": 0}
    return intake | {"set_aside": [], "evidence": observed(1, MONTHS, 1)}


def hostile() -> dict[str, Any]:
    """Names and texts from the data that are meant to break the page, wherever the record holds text."""
    return poisoned(usual())


_OURS = {"first", "last", "period", "place", "answer", "date", "periods", "sha256"}


def poisoned(thing: Any) -> Any:
    """Every text from the data with something hostile behind it."""
    if isinstance(thing, str):
        return f"{thing} {HOSTILE}"
    if isinstance(thing, list):
        return [poisoned(each) for each in thing]
    if isinstance(thing, dict):
        return {
            (f"{key} {HOSTILE}" if key in {"merged", "empty", "sector"} else key): (
                each if key in _OURS else poisoned(each)
            )
            for key, each in thing.items()
        }
    return thing
