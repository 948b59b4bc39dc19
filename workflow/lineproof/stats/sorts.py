"""Assigning securities to ranked groups."""

from __future__ import annotations

import numpy as np


def breakpoints(values: np.ndarray, n_groups: int) -> np.ndarray:
    """Quantiles that part `values` into groups, by linear interpolation; shape (n_groups − 1,).

    The k-th lies at the position k (n − 1) / n_groups of the ordered values, counted from 0. The
    position is taken in whole numbers, so that a quantile that is one of the values equals it
    exactly.
    """
    ordered = np.sort(np.asarray(values, float))
    below, part = np.divmod(np.arange(1, n_groups) * (len(ordered) - 1), n_groups)
    lower = ordered[below]
    return lower + (ordered[below + 1] - lower) * (part / n_groups)


def ranked_groups(values: np.ndarray, n_groups: int) -> np.ndarray:
    """Group of each value, 1 for the lowest to `n_groups` for the highest; shape as `values`.

    A value at a breakpoint belongs to the lower group, so equal values always share a group.

    Raises
    ------
    ValueError
        When there are fewer values than groups, or a value is missing.
    """
    values = np.asarray(values, float)
    if len(values) < n_groups:
        raise ValueError(f"{len(values)} values cannot fill {n_groups} groups")
    if np.isnan(values).any():
        raise ValueError("a missing value cannot be ranked")
    return np.searchsorted(breakpoints(values, n_groups), values, side="left") + 1
