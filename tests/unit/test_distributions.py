"""Tails and critical values against an independent library and printed tables."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from lineproof.stats import distributions as tails

NAN = float("nan")
X = np.array([-12.0, -2.5, -0.3, 0.0, 0.7, 1.96, 4.0, 15.0])
# Two implementations of the same special functions: a few hundred roundings, even far in the tail.
CLOSE = 1e-11


@pytest.mark.parametrize("df", [1.0, 2.0, 8.0, 58.0, 838.0])
def test_t_tails_agree_with_an_independent_library(df: float) -> None:
    np.testing.assert_allclose(tails.greater_p(X, df), stats.t.sf(X, df), rtol=CLOSE)
    np.testing.assert_allclose(tails.two_sided_p(X, df), 2 * stats.t.sf(np.abs(X), df), rtol=CLOSE)


def test_without_degrees_of_freedom_the_normal_applies() -> None:
    np.testing.assert_allclose(tails.greater_p(X, NAN), stats.norm.sf(X), rtol=CLOSE)
    np.testing.assert_allclose(tails.two_sided_p(X, NAN), 2 * stats.norm.sf(abs(X)), rtol=CLOSE)


def test_small_p_values_keep_their_digits() -> None:
    assert tails.two_sided_p(30.0, NAN) == pytest.approx(2 * stats.norm.sf(30.0), rel=CLOSE)
    assert tails.joint_p(900.0, 3.0, NAN) == pytest.approx(stats.chi2.sf(900.0, 3), rel=CLOSE)


@pytest.mark.parametrize(("df1", "df2"), [(1.0, 10.0), (9.0, 809.0), (28.0, 3.0)])
def test_joint_tails_agree_with_an_independent_library(df1: float, df2: float) -> None:
    values = np.array([0.0, 0.2, 1.0, 3.3, 20.0])
    np.testing.assert_allclose(
        tails.joint_p(values, df1, df2), stats.f.sf(values, df1, df2), rtol=CLOSE
    )
    np.testing.assert_allclose(
        tails.joint_p(values, df1, NAN), stats.chi2.sf(values, df1), rtol=CLOSE
    )


def test_mixed_rows_take_each_their_own_distribution() -> None:
    p = tails.two_sided_p(np.array([2.0, 2.0]), np.array([5.0, NAN]))
    np.testing.assert_allclose(p, [2 * stats.t.sf(2, 5), 2 * stats.norm.sf(2)], rtol=CLOSE)
    p = tails.joint_p(np.array([2.0, 2.0]), np.array([3.0, 3.0]), np.array([7.0, NAN]))
    np.testing.assert_allclose(p, [stats.f.sf(2, 3, 7), stats.chi2.sf(2, 3)], rtol=CLOSE)


def test_critical_values_of_printed_tables() -> None:
    # Any statistics textbook's tables, from memory; half a unit of the last printed digit.
    assert tails.two_sided_critical(0.05, 9.0) == pytest.approx(2.262, abs=5e-4)
    assert tails.one_sided_critical(0.05, 9.0) == pytest.approx(1.833, abs=5e-4)
    assert tails.two_sided_critical(0.05, NAN) == pytest.approx(1.960, abs=5e-4)
    assert tails.one_sided_critical(0.05, NAN) == pytest.approx(1.645, abs=5e-4)
    assert tails.joint_critical(0.05, 2.0, NAN) == pytest.approx(5.991, abs=5e-4)
    assert tails.joint_critical(0.05, 5.0, 10.0) == pytest.approx(3.33, abs=5e-3)


@pytest.mark.parametrize("level", [0.001, 0.05, 0.4])
@pytest.mark.parametrize("df", [3.0, 40.0, NAN])
def test_the_p_value_of_a_critical_value_is_the_level(level: float, df: float) -> None:
    two_sided, one_sided = (
        tails.two_sided_critical(level, df),
        tails.one_sided_critical(level, df),
    )
    assert tails.two_sided_p(two_sided, df) == pytest.approx(level, rel=1e-9)
    assert tails.greater_p(one_sided, df) == pytest.approx(level, rel=1e-9)
    assert tails.joint_p(tails.joint_critical(level, 4.0, df), 4.0, df) == pytest.approx(
        level, rel=1e-9
    )


def test_a_missing_statistic_has_no_p_value() -> None:
    assert np.isnan(tails.two_sided_p(NAN, 5.0))
    assert np.isnan(tails.joint_p(NAN, 5.0, NAN))
