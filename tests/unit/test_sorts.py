"""Ranked groups by hand, and breakpoints against numpy's definition of a quantile."""

from __future__ import annotations

import numpy as np
import pytest

from lineproof.stats.sorts import breakpoints, by_quantiles


def ranked_groups(values: np.ndarray, n_groups: int) -> np.ndarray:
    return by_quantiles(values, n_groups, None)


def test_breakpoints_by_hand() -> None:
    """Quarters of 1, 2, 4, 8, 16, 32: positions 1.25, 2.5 and 3.75 of 0 to 5."""
    values = np.array([32.0, 1.0, 8.0, 2.0, 16.0, 4.0])
    assert breakpoints(values, 4).tolist() == [2 + 0.25 * 2, 4 + 0.5 * 4, 8 + 0.75 * 8]
    assert ranked_groups(values, 4).tolist() == [4, 1, 3, 1, 4, 2]


def test_a_value_at_a_breakpoint_belongs_below() -> None:
    assert breakpoints(np.arange(5.0), 2).tolist() == [2.0]
    assert ranked_groups(np.arange(5.0), 2).tolist() == [1, 1, 1, 2, 2]


def test_ties_share_a_group_even_if_one_stays_empty() -> None:
    """Thirds of 1, 5, 5, 5, 5, 9: both breakpoints are 5, so nobody is in the middle."""
    assert ranked_groups(np.array([5.0, 1.0, 5.0, 9.0, 5.0, 5.0]), 3).tolist() == [1, 1, 1, 3, 1, 1]
    assert ranked_groups(np.full(4, 0.1), 3).tolist() == [1, 1, 1, 1]


def test_as_many_values_as_groups() -> None:
    assert ranked_groups(np.array([0.3, -1.0, 7.0]), 3).tolist() == [2, 1, 3]


@pytest.mark.parametrize("n_groups", [2, 3, 5, 10, 20, 100])
def test_breakpoints_are_numpy_quantiles(n_groups: int) -> None:
    rng = np.random.default_rng(n_groups)
    for n in (n_groups, n_groups + 1, 137, 500):
        values = rng.normal(1.0, 0.5, max(n, n_groups))
        expected = np.quantile(values, np.arange(1, n_groups) / n_groups, method="linear")
        # numpy rounds the position, by about n × 1e-16 of a gap between neighbours.
        np.testing.assert_allclose(breakpoints(values, n_groups), expected, rtol=0, atol=1e-12)


def test_a_breakpoint_that_is_a_value_equals_it() -> None:
    """Of 101 values the hundredths are values themselves; 0.29 × 100 is less than 29 in float64."""
    values = np.random.default_rng(1).permutation(np.linspace(0.0, 2.0, 101) ** 2)
    assert breakpoints(values, 100).tolist() == np.sort(values)[1:-1].tolist()
    sizes = np.bincount(ranked_groups(values, 100), minlength=101)[1:]
    assert sizes.tolist() == [2] + [1] * 99


def test_groups_of_distinct_values_are_as_equal_as_can_be() -> None:
    rng = np.random.default_rng(2)
    for n, n_groups in ((50, 5), (53, 5), (10, 10), (700, 10), (19, 4)):
        sizes = np.bincount(ranked_groups(rng.normal(size=n), n_groups))[1:]
        assert len(sizes) == n_groups
        assert sizes.max() - sizes.min() <= 1
