"""Weights of members inside a group, before they are scaled to one over the members with a return.

A function of the registry takes the members' sizes and gives one weight each; a security whose weight would be
zero at formation is not ranked.
"""

from __future__ import annotations

import numpy as np
from numba import njit


def equal(lagged_size: np.ndarray) -> np.ndarray:
    """The same weight for each member, every period; shape as `lagged_size`."""
    return np.ones(len(lagged_size))


def by_size(lagged_size: np.ndarray) -> np.ndarray:
    """Size at the end of the period before; a member without a known size weighs nothing."""
    return np.where(np.isnan(lagged_size), 0.0, lagged_size)


@njit(cache=True)
def scaled_to_one(weight, group, n_groups):  # pragma: no cover - compiled
    """Weights divided by their sum in each group; shape as `weight`.

    `group` numbers the cell (a portfolio in a period) of each row, 0 to n_groups − 1. A cell whose
    weights sum to zero keeps zero weights.
    """
    total, scaled = np.zeros(n_groups), np.zeros(len(weight))
    for row in range(len(weight)):
        total[group[row]] += weight[row]
    for row in range(len(weight)):
        if total[group[row]] > 0:
            scaled[row] = weight[row] / total[group[row]]
    return scaled


@njit(cache=True)
def lagged_sizes(starts, size, growth):  # pragma: no cover - compiled
    """Size at the end of the row before, of the same security; (n_rows,), NaN where unknown.

    A missing size is the last known one grown by `growth` (1 + return, 1 where it is missing), so
    that a weight drifts with its security; after a total loss no size is known. `starts`
    (n_securities + 1,) parts the rows by security.
    """
    lagged = np.empty(len(size))
    for security in range(len(starts) - 1):
        known = np.nan
        for row in range(starts[security], starts[security + 1]):
            lagged[row] = known if known > 0 else np.nan
            if np.isnan(size[row]):
                known *= growth[row]
            else:
                known = size[row]
    return lagged
