"""Screens: conditions that decide who may be ranked, judged on the same month's row and nothing later."""

from __future__ import annotations

from typing import Any

import numpy as np
import pandas as pd

from lineproof.intake.stopping import stop
from lineproof.intake.values import to_numbers

_COMPARE = {
    "at_least": (np.greater_equal, "at least"),
    "at_most": (np.less_equal, "at most"),
    "above": (np.greater, "above"),
    "below": (np.less, "below"),
}
_LISTS = {"in": (True, "one of"), "not_in": (False, "none of")}


def passes(rows: pd.DataFrame, screen: dict[str, Any]) -> np.ndarray:
    """Whether each row meets every condition of a screen; a missing value meets none: bool (n_rows,).

    Numbers are compared as our tables hold them, returns as decimals; a column of text is compared
    as numbers by `at_least`, `at_most`, `above` and `below`, and as text by `in` and `not_in`.

    Raises KnownProblem for a screen on the date, which subperiods are for.
    """
    if screen["column"] == "date":
        found = "a screen cannot use the date"
        raise stop("intake.screens", found, "remove it, and cut the study with subperiods")
    column = rows["return_" if screen["column"] == "return" else screen["column"]]
    is_text = not pd.api.types.is_numeric_dtype(column)
    number = to_numbers(column, [], thousands=True).value if is_text else column.to_numpy()
    known = (column != "").to_numpy() if is_text else ~np.isnan(number)
    met = known.copy()
    for word, (compare, _) in _COMPARE.items():
        if word in screen:
            met &= compare(number, screen[word])
    for word, (wanted, _) in _LISTS.items():
        if word in screen:
            met &= _is_listed(column, screen[word], is_text) == wanted
    return met


def _is_listed(column: pd.Series, listed: list[str | float], is_text: bool) -> np.ndarray:
    values = [str(value) for value in listed]
    if not is_text:
        values = pd.to_numeric(pd.Series(values), errors="coerce").dropna().tolist()
    return column.isin(values).to_numpy()


def screen_label(screen: dict[str, Any]) -> str:
    """The condition in words, as in `price at least 1`."""
    parts = [
        f"{words} {screen[word]:,.15g}" for word, (_, words) in _COMPARE.items() if word in screen
    ]
    parts += [
        f"{said} {', '.join(str(value) for value in screen[word])}"
        for word, (_, said) in _LISTS.items()
        if word in screen
    ]
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
