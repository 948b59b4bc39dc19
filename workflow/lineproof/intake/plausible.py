"""Checks of a whole file that is in memory, as series are: is it what the study file says of it?"""

from __future__ import annotations

from typing import Any

import numpy as np
import pandas as pd

from lineproof.intake.frequency import FrequencyEvidence
from lineproof.intake.scale import ScaleEvidence
from lineproof.intake.stopping import stop
from lineproof.intake.unit import judge_unit
from lineproof.intake.values import share_with_decimal_comma


def check_unit(returns: np.ndarray, reading: dict[str, Any], frequency: str = "monthly") -> None:
    """Stop when the size of typical returns (decimal, as read) says that the unit is the other one.

    Raises KnownProblem as `judge_unit` does.
    """
    evidence = ScaleEvidence()
    evidence.add(np.full(len(returns), -1), returns)
    judge_unit(evidence, reading, frequency)


def check_decimal_comma(text: pd.Series, reading: dict[str, Any]) -> None:
    """Stop when most returns are written as in 0,015. Raises KnownProblem."""
    if share_with_decimal_comma(text) > 0.5:
        where = f"{reading['label']}, column {reading['columns']['return']}"
        found = f"most numbers have a decimal comma, as in {_first_with_comma(text)}"
        raise stop(where, found, "save the file with decimal points")


def _first_with_comma(text: pd.Series) -> str:
    return min(text[text.str.contains(",", regex=False)])


def check_frequency(
    security: pd.Series, date: pd.Series, written: pd.Series, reading: dict[str, Any]
) -> None:
    """Stop when securities typically have several dates a month, or less than one.

    The arguments have one entry a row: identifier, month end (NaT where unknown) and the date as it is written.
    Raises KnownProblem.
    """
    day = pd.to_datetime(written, format=reading["dates"], errors="coerce")
    known = (date.notna() & day.notna()).to_numpy()
    name = pd.factorize(security[known])[0]
    day = day[known].to_numpy().astype("datetime64[D]")
    order = np.lexsort((day, name))
    start = np.searchsorted(name[order], np.arange(name.max(initial=-1) + 2))
    evidence = FrequencyEvidence()
    evidence.add(start, day[order])
    evidence.judge(reading["label"], "monthly")
