"""Screens: conditions that decide who may be ranked, judged on the same month's row and nothing later."""

from __future__ import annotations

from functools import partial
from typing import Any

import numpy as np
import pandas as pd

from lineproof.intake.chunk import Chunk
from lineproof.intake.flags import zeros_so_far
from lineproof.intake.stopping import stop
from lineproof.intake.values import to_numbers

_COMPARE = {
    "at_least": (np.greater_equal, "at least"),
    "at_most": (np.less_equal, "at most"),
    "above": (np.greater, "above"),
    "below": (np.less, "below"),
}
_LISTS = {"in": (True, "one of"), "not_in": (False, "none of")}


def passes(chunk: Chunk, screen: dict[str, Any]) -> np.ndarray:
    """Whether each row meets every condition of a screen; a missing value meets none: bool (n_rows,).

    Numbers are compared as our tables hold them, returns as decimals; a column of text is compared
    as numbers by `at_least`, `at_most`, `above` and `below`, and as text by `in` and `not_in`.

    Raises KnownProblem for a screen on the date, which subperiods are for.
    """
    column = "return_" if screen["column"] == "return" else screen["column"]
    if column == "date":
        found = "a screen cannot use the date"
        raise stop("intake.screens", found, "remove it, and cut the study with subperiods")
    if column in chunk.values:
        number = chunk.values[column]
        listed = {
            word: np.isin(number, _numbers(screen[word])) for word in _LISTS if word in screen
        }
        return _met(~np.isnan(number), number, listed, screen)
    codes, texts = (
        (chunk.owner, chunk.names.tolist()) if column == "security" else chunk.texts[column]
    )
    text = pd.Series(texts, dtype=str)  # few: the rows have codes into them
    number = to_numbers(text, [], thousands=True).value
    listed = {
        word: text.isin([str(value) for value in screen[word]]).to_numpy()
        for word in _LISTS
        if word in screen
    }
    return _met((text != "").to_numpy(), number, listed, screen)[codes]


def _met(
    known: np.ndarray, number: np.ndarray, listed: dict[str, np.ndarray], screen: dict[str, Any]
) -> np.ndarray:
    met = known.copy()
    for word, (compare, _) in _COMPARE.items():
        if word in screen:
            met &= compare(number, screen[word])
    for word, found in listed.items():
        met &= found == _LISTS[word][0]
    return met


def _numbers(listed: list[str | float]) -> np.ndarray:
    return pd.to_numeric(pd.Series([str(v) for v in listed]), errors="coerce").dropna().to_numpy()


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


class Screens:
    """The screens of a study, in order, and what each took from the rows that passed so far.

    With `stale_run`, rows at the end of so many zero returns in a row or more do not pass: what came before a row is
    known at its date, how the run goes on is not.
    """

    def __init__(self, screens: list[dict[str, Any]], stale_run: int | None, noun: str) -> None:
        self._tests = [(screen_label(screen), partial(passes, screen=screen)) for screen in screens]
        if stale_run is not None:
            label = f"fewer than {stale_run} zero returns in consecutive {noun}s up to then"
            self._tests.append((label, lambda chunk: zeros_so_far(chunk) < stale_run))
        self._n_rows = [0] * len(self._tests)
        self._n_securities = [0] * len(self._tests)

    def eligible(self, chunk: Chunk) -> np.ndarray:
        """Which rows pass all screens, bool (n_rows,)."""
        eligible = np.ones(len(chunk), bool)
        for at, (_, passed) in enumerate(self._tests):
            out = eligible & ~passed(chunk)
            eligible &= ~out
            self._n_rows[at] += int(out.sum())
            self._n_securities[at] += len(np.unique(chunk.owner[out]))
        return eligible

    def report(self) -> list[dict[str, Any]]:
        """One entry a screen, in order."""
        return [
            {"label": label, "n_rows": rows, "n_securities": securities}
            for (label, _), rows, securities in zip(
                self._tests, self._n_rows, self._n_securities, strict=True
            )
        ]
