"""Assigning securities to ranked groups."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence

import numpy as np
from numba import njit

Marks = np.ndarray | None  # which values set the breakpoints, bool (n,); None for all
Rule = Callable[[np.ndarray, int, Marks], np.ndarray]  # the group of each value, from 1 on


def breakpoints(values: np.ndarray, n_groups: int) -> np.ndarray:
    """Quantiles that part `values` into groups, by linear interpolation; shape (n_groups − 1,).

    The k-th lies at the position k (n − 1) / n_groups of the ordered values, counted from 0. The
    position is taken in whole numbers, so that a quantile that is one of the values equals it
    exactly.
    """
    ordered = np.sort(np.asarray(values, float))
    below, part = np.divmod(np.arange(1, n_groups) * (len(ordered) - 1), n_groups)
    lower = ordered[below]
    above = ordered[np.minimum(below + 1, len(ordered) - 1)]
    return lower + (above - lower) * (part / n_groups)


def by_quantiles(values: np.ndarray, n_groups: int, marks: Marks) -> np.ndarray:
    """Groups parted at the quantiles of the values marked, of which there is one at least.

    A value at a breakpoint belongs to the lower group, so equal values always share a group.
    """
    set_by = values if marks is None else values[marks]
    return _one_more_than_below(values, breakpoints(set_by, n_groups))


@njit(cache=True, nogil=True)
def _one_more_than_below(values, points):  # pragma: no cover - compiled
    """One more than how many of a few points lie below each value, int64 (n,)."""
    count = np.ones(len(values), np.int64)
    for point in points:
        for at in range(len(values)):
            count[at] += point < values[at]
    return count


def by_equal_counts(values: np.ndarray, n_groups: int, marks: Marks) -> np.ndarray:
    """Groups of `group_sizes` by rank; equal values rank in the order given. `marks` is not used."""
    group = np.empty(len(values), np.int64)
    sizes = group_sizes(len(values), n_groups)
    group[np.argsort(values, kind="stable")] = np.repeat(np.arange(1, n_groups + 1), sizes)
    return group


def group_sizes(n: int, n_groups: int) -> np.ndarray:
    """How many of `n` securities each group gets; int64 (n_groups,).

    The rule of Fama and MacBeth (1973): the middle groups get int(n / n_groups), the first and the
    last that and half the remainder each, the last also the odd one out.
    """
    each, left = divmod(n, n_groups)
    sizes = np.full(n_groups, each, np.int64)
    sizes[0] += left // 2
    sizes[-1] += left - left // 2
    return sizes


def sorted_cells(
    values: Sequence[np.ndarray],
    n_groups: Sequence[int],
    rule: Rule,
    marks: Marks,
    *,
    dependent: bool = False,
) -> np.ndarray | None:
    """The cell of each security in a sort on one variable or several, 0 to prod(n_groups) − 1.

    Cells run through the groups of the last variable first. A dependent sort ranks each further
    variable inside the cells of those before it, an independent one among all. None where there
    are fewer securities than cells, or no security that sets a breakpoint is in a cell to be parted.
    """
    n = len(values[0])
    n_marked = n if marks is None else marks.sum()
    if n < math.prod(n_groups) or n_marked < (n_groups[0] if dependent else max(n_groups)):
        return None
    cell = np.zeros(n, np.int64)
    for place, (each, count) in enumerate(zip(values, n_groups, strict=True)):
        parted = _within_cells if dependent and place else _among_all
        group = parted(each, count, rule, marks, cell)
        if group is None:
            return None
        cell = cell * count + group - 1
    return cell


def _among_all(
    values: np.ndarray, count: int, rule: Rule, marks: Marks, _: np.ndarray
) -> np.ndarray:
    return rule(values, count, marks)


def _within_cells(
    values: np.ndarray, count: int, rule: Rule, marks: Marks, cell: np.ndarray
) -> np.ndarray | None:
    group = np.empty(len(values), np.int64)
    for part in np.unique(cell):
        here = cell == part
        inside = None if marks is None else marks[here]
        if inside is not None and not inside.any():
            return None
        group[here] = rule(values[here], count, inside)
    return group
