"""Rows of the pricing analyses: from single numbers to the output frame with p values."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from typing import NamedTuple, TypeVar

import numpy as np
import pandas as pd

from lineproof.addresses import COLUMNS, DTYPES, NUMBER_COLUMNS
from lineproof.stats import Undefined
from lineproof.stats import distributions as tails

Value = TypeVar("Value")

NAN = float("nan")
NO_ERROR = "its standard error is zero"
NO_VARIATION = "it is a ratio to a variance, and that is zero"


class Row(NamedTuple):
    """One number before its p values; a row with a `reason` is undefined.

    `family` names its reference distributions: "signed" (Student's t, or the standard normal if df1
    is NaN), "joint" (F, or chi-square if df2 is NaN), or "" for an estimate without a hypothesis.
    """

    variant: str
    asset: str
    term: str
    se_kind: str
    n_periods: int
    n_assets: int
    family: str = ""
    estimate: float = NAN
    se: float = NAN
    statistic: float = NAN
    df1: float = NAN
    df2: float = NAN
    reason: str = ""


def attempt(
    noun: str, function: Callable[..., Value], *arguments: object
) -> tuple[Value | None, str]:
    """The function's result and no reason or, where it is undefined, no result and the reason.

    `noun` is what the reason calls a period.
    """
    try:
        return function(*arguments), ""
    except Undefined as undefined:
        return None, undefined.reason(noun)


def finish(rows: Sequence[Row], keys: Mapping[str, str], level: float) -> pd.DataFrame:
    """The output frame (COLUMNS) of one analysis of one sort.

    Args:
        rows: its numbers; signed ones get the statistic estimate / se here.
        keys: sort, subperiod and analysis.
        level: significance level of the critical values.
    """
    given = pd.DataFrame(rows, columns=list(Row._fields))
    family = given["family"].to_numpy()
    estimate, se, statistic, df1, df2 = given[NUMBER_COLUMNS[:5]].to_numpy(dtype=float).T
    signed = family == "signed"
    quotient = np.divide(estimate, se, out=np.full(len(given), NAN), where=se > 0.0)
    statistic = np.where(signed, quotient, statistic)
    reason = given["reason"].to_numpy(dtype=object, copy=True)
    headline = np.where(family == "", estimate, statistic)
    reason[(reason == "") & signed & ~(se > 0.0)] = NO_ERROR
    reason[(reason == "") & ~np.isfinite(headline)] = NO_VARIATION
    tests = _tests(family, statistic, df1, df2, level)
    numbers = {
        "estimate": estimate,
        "se": se,
        "statistic": statistic,
        "df1": df1,
        "df2": df2,
        **tests,
    }
    defined = reason == ""
    numbers = {name: np.where(defined, values, NAN) for name, values in numbers.items()}
    status = np.where(defined, "ok", "undefined")
    frame = given.assign(**keys, **numbers, status=status, reason=reason)[COLUMNS]
    return frame.astype(DTYPES)


def _tests(
    family: np.ndarray, statistic: np.ndarray, df1: np.ndarray, df2: np.ndarray, level: float
) -> dict[str, np.ndarray]:
    """p values and critical values of each row's statistic, NaN where they do not apply."""
    signed, joint = family == "signed", family == "joint"
    tests = {name: np.full(len(family), NAN) for name in NUMBER_COLUMNS[5:]}
    tests["p"][signed] = tails.two_sided_p(statistic[signed], df1[signed])
    tests["p_one_sided"][signed] = tails.greater_p(statistic[signed], df1[signed])
    tests["critical"][signed] = tails.two_sided_critical(level, df1[signed])
    tests["critical_one_sided"][signed] = tails.one_sided_critical(level, df1[signed])
    tests["p"][joint] = tails.joint_p(statistic[joint], df1[joint], df2[joint])
    tests["critical"][joint] = tails.joint_critical(level, df1[joint], df2[joint])
    return tests
