"""Screens: conditions that decide who may be ranked, judged on the same month's row and nothing later."""

from __future__ import annotations

from typing import Any

import numpy as np
import pandas as pd

from lineproof.intake.values import to_numbers

_COMPARE = {
    "at_least": (np.greater_equal, "at least"),
    "at_most": (np.less_equal, "at most"),
    "above": (np.greater, "above"),
    "below": (np.less, "below"),
}


def passes(rows: pd.DataFrame, screen: dict[str, Any]) -> np.ndarray:
    """Whether each row meets every condition of a screen; a missing value meets none. Shape (n_rows,)."""
    column = rows["return_" if screen["column"] == "return" else screen["column"]]
    is_text = not pd.api.types.is_numeric_dtype(column)
    met = np.ones(len(rows), bool)
    for word, (compare, _) in _COMPARE.items():
        if word in screen:
            value = to_numbers(column, []).value if is_text else column.to_numpy()
            met &= compare(value, screen[word])
    for word, wanted in (("in", True), ("not_in", False)):
        if word in screen:
            listed = [str(v) for v in screen[word]] if is_text else screen[word]
            known = (column != "") if is_text else column.notna()
            met &= (column.isin(listed) == wanted).to_numpy() & known.to_numpy()
    return met


def screen_label(screen: dict[str, Any]) -> str:
    """The condition in words, as in `price at least 1`."""
    parts = [f"{words} {screen[word]:g}" for word, (_, words) in _COMPARE.items() if word in screen]
    for word, said in (("in", "one of"), ("not_in", "none of")):
        if word in screen:
            parts.append(f"{said} {', '.join(str(v) for v in screen[word])}")
    return f"{screen['column']} {' and '.join(parts)}"


def apply_screens(
    rows: pd.DataFrame, screens: list[dict[str, Any]]
) -> tuple[np.ndarray, list[dict[str, Any]]]:
    """Which rows pass all screens, and for each screen in order what it took from those that passed so far."""
    eligible = np.ones(len(rows), bool)
    report = []
    for screen in screens:
        out = eligible & ~passes(rows, screen)
        eligible &= ~out
        report.append(
            {
                "label": screen_label(screen),
                "n_rows": int(out.sum()),
                "n_securities": int(rows.loc[out, "security"].nunique()),
            }
        )
    return eligible, report
