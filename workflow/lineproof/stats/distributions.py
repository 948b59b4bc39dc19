"""Tail probabilities and critical values of the four reference distributions.

Two families: signed statistics follow Student's t or, with `df` NaN, the standard normal; joint
statistics follow F(df1, df2) or, with `df2` NaN, chi-square(df1). Every function broadcasts, and a
NaN statistic gives NaN.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy import special

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class JointStatistic:
    """A joint statistic, to compare with F(df1, df2), or with chi-square(df1) if df2 is NaN."""

    value: float
    df1: float
    df2: float = float("nan")


def greater_p(statistic: ArrayLike, df: ArrayLike) -> Floats:
    """One-sided p value of a signed statistic against "greater than the hypothesised value"."""
    # The lower tail at -x, not one minus the lower tail at x: small p values keep their digits.
    mirrored = -np.asarray(statistic, dtype=float)
    normal, safe_df = _split(df)
    return np.where(normal, special.ndtr(mirrored), special.stdtr(safe_df, mirrored))


def two_sided_p(statistic: ArrayLike, df: ArrayLike) -> Floats:
    """Two-sided p value of a signed statistic."""
    return 2.0 * greater_p(np.abs(np.asarray(statistic, dtype=float)), df)


def one_sided_critical(level: float, df: ArrayLike) -> Floats:
    """Value that a signed statistic exceeds with probability `level` under the hypothesis."""
    normal, safe_df = _split(df)
    return np.where(normal, -special.ndtri(level), -special.stdtrit(safe_df, level))


def two_sided_critical(level: float, df: ArrayLike) -> Floats:
    """Value that a signed statistic exceeds in size with probability `level`."""
    return one_sided_critical(level / 2.0, df)


def joint_p(statistic: ArrayLike, df1: ArrayLike, df2: ArrayLike) -> Floats:
    """Upper-tail p value of a joint statistic."""
    chi_square, safe_df2 = _split(df2)
    return np.where(
        chi_square,
        special.chdtrc(df1, statistic),
        special.fdtrc(df1, safe_df2, statistic),
    )


def joint_critical(level: float, df1: ArrayLike, df2: ArrayLike) -> Floats:
    """Value that a joint statistic exceeds with probability `level` under the hypothesis."""
    chi_square, safe_df2 = _split(df2)
    return np.where(
        chi_square,
        special.chdtri(df1, level),
        special.fdtri(df1, safe_df2, 1.0 - level),
    )


def _split(df: ArrayLike) -> tuple[NDArray[np.bool_], Floats]:
    """Where the limiting distribution applies, and degrees of freedom without NaN."""
    df = np.asarray(df, dtype=float)
    limiting = np.isnan(df)
    return limiting, np.where(limiting, 1.0, df)
