"""Counts of sizes on fine bins: quantiles, months, and sums that forget order and cut."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from lineproof.intake.scale import ScaleEvidence, medians_by_run

MONTH = 2000 * 12
FINE = 0.0005  # a fine bin is 0.05 % wide at most
COARSE = 0.032  # the middle of a coarse bin, 6.25 % wide, is at most half a bin off


def evidence(month: np.ndarray, returns: np.ndarray) -> ScaleEvidence:
    found = ScaleEvidence()
    found.add(month, returns)
    return found


def draws(seed: int, n: int, scale: float) -> tuple[np.ndarray, np.ndarray]:
    random = np.random.default_rng(seed)
    returns = random.standard_t(3, n) * scale
    returns[random.random(n) < 0.05] = 0.0
    returns[random.random(n) < 0.05] = np.nan
    return MONTH + random.integers(-1, 12, n), returns


@settings(max_examples=60, deadline=None)
@given(
    st.integers(0, 2**32 - 1),
    st.integers(2, 3000),
    st.sampled_from([1e-4, 0.05, 3.0, 1e4]),
    st.floats(0, 1),
)
def test_quantiles_are_those_of_all_the_values(
    seed: int, n: int, scale: float, level: float
) -> None:
    month, returns = draws(seed, n, scale)
    size = np.abs(returns[np.isfinite(returns) & (returns != 0)])
    found = evidence(month, returns)
    assert found.n == len(size)
    if len(size):
        assert found.quantile(level) == pytest.approx(np.quantile(size, level), rel=FINE)


def test_a_value_alone_in_its_bin_is_known_to_nine_digits() -> None:
    """So the quantiles of a small file print as they are. 2⁻³¹ of the value is kept."""
    found = evidence(np.full(3, MONTH), np.array([0.0123456789, -0.5, 0.0]))
    assert found.quantile(0.0) == pytest.approx(0.0123456789, rel=2**-31)
    assert found.quantile(0.5) == pytest.approx((0.0123456789 + 0.5) / 2, rel=2**-31)
    assert found.quantile(1.0) == 0.5


def test_what_says_nothing_is_counted_apart() -> None:
    found = evidence(np.full(6, MONTH), np.array([0.0, -0.0, np.nan, np.inf, 0.1, -0.1]))
    assert (found.n, found.n_zero, found.n_missing, found.share_negative) == (2, 2, 2, 0.5)
    empty = ScaleEvidence()
    assert np.isnan(empty.quantile(0.5))
    assert np.isnan(empty.share_negative)
    assert [len(part) for part in empty.by_month()] == [0, 0, 0]


def test_sizes_beyond_all_bins_count_in_the_outermost() -> None:
    found = evidence(np.full(2, MONTH), np.array([1e-300, 1e300]))
    assert found.n == 2
    assert found.quantile(0.0) < 1e-11
    assert found.quantile(1.0) > 1e11


def test_losses_of_more_than_everything() -> None:
    found = evidence(np.full(6, MONTH), np.array([-1.0, -1.01, -3.0, -99.0, -99.0, 5.0]))
    assert found.below(1.0) == (4, 0.5)  # a total loss is not beyond; half of them are one value
    assert evidence(np.full(1, MONTH), np.array([0.1])).below(1.0) == (0, 0.0)


def test_medians_by_month() -> None:
    month, returns = draws(3, 20_000, 0.05)
    months, n, middle = evidence(month, returns).by_month()
    assert months.tolist() == list(range(MONTH - 1, MONTH + 12))
    for place, each in enumerate(months):
        size = np.abs(returns[(month == each) & np.isfinite(returns) & (returns != 0)])
        assert n[place] == len(size)
        lower = np.sort(size)[(len(size) - 1) // 2]
        assert middle[place] == pytest.approx(lower, rel=COARSE)


def test_unknown_and_impossible_months_count_over_all_only() -> None:
    found = evidence(np.array([-1, MONTH, 10**9, 5]), np.full(4, 0.1))
    assert found.n == 4
    months, n, _ = found.by_month()
    assert (months.tolist(), n.tolist()) == ([MONTH], [1])


@settings(max_examples=30, deadline=None)
@given(st.integers(0, 2**32 - 1), st.integers(1, 500), st.integers(1, 5))
def test_order_and_cut_leave_no_trace(seed: int, n: int, n_parts: int) -> None:
    month, returns = draws(seed, n, 0.05)
    order = np.random.default_rng(seed).permutation(n)
    whole, parts = evidence(month, returns), ScaleEvidence()
    for part in np.array_split(order, n_parts):
        parts.merge(evidence(month[part], returns[part]))
    levels = (0.0, 0.1, 0.5, 0.95, 1.0)
    same = [(whole.quantile(level), parts.quantile(level)) for level in levels]
    np.testing.assert_array_equal(*zip(*same, strict=True))
    for one, other in zip(whole.by_month(), parts.by_month(), strict=True):
        np.testing.assert_array_equal(one, other)


def test_medians_of_runs() -> None:
    value = np.array([0.0, np.nan, 0.3, -0.1, 0.2, 0.4, np.inf])
    n, middle = medians_by_run(np.array([0, 2, 2, 6, 7]), value)
    assert n.tolist() == [0, 0, 4, 0]
    np.testing.assert_array_equal(middle, [np.nan, np.nan, 0.2, np.nan])
