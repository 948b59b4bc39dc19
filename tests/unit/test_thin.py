"""Periods delivered in part."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from lineproof.intake.thin import judge_thin_periods
from lineproof.periods import Months, TradingDays
from lineproof.problems import KnownProblem

FIRST = 2000 * 12


def judge(n: list[int] | np.ndarray, *, allow_last: bool = False):
    return judge_thin_periods(np.array(n), FIRST, Months(), "returns.csv", allow_last=allow_last)


@pytest.mark.fault(32)
def test_a_month_delivered_in_part_is_flagged() -> None:
    flag = judge([200, 210, 205, 12, 0, 1, 220, 230])
    assert (flag.number, flag.n) == (32, 3)
    assert flag.examples == [
        "2000-04, with 12 securities where the periods around have 205",
        "2000-05, with 0 securities where the periods around have 205",
        "2000-06, with 1 security where the periods around have 205",
    ]


@pytest.mark.fault(32)
def test_the_last_month_stops_unless_allowed() -> None:
    n = [200, 210, 205, 208, 206, 13]
    with pytest.raises(KnownProblem) as caught:
        judge(n)
    assert str(caught.value) == (
        "The raw data cannot be used; nothing was written.\n"
        "  returns.csv: the last month, 2000-06, with 13 securities where the periods around have 206: "
        "was it delivered in part?\n"
        "    → deliver it in full, or leave it out, or set allow_partial_last_month: yes under intake"
    )
    assert judge(n, allow_last=True).n == 1


def test_days_are_named_as_days() -> None:
    days = np.arange(np.datetime64("2000-01-03"), np.datetime64("2000-01-13"))
    n = np.full(10, 300)
    n[4] = 5
    flag = judge_thin_periods(n, 0, TradingDays(days), "f", allow_last=False)
    assert flag.examples == ["2000-01-07, with 5 securities where the periods around have 300"]
    n[-1] = 3
    with pytest.raises(KnownProblem, match="the last day, 2000-01-12, with 3 securities"):
        judge_thin_periods(n, 0, TradingDays(days), "f", allow_last=False)


def test_a_tenth_is_enough_and_small_markets_are_not_judged() -> None:
    assert judge([200, 200, 20, 200, 200]).n == 0
    assert judge([200, 200, 19, 200, 200]).n == 1
    assert judge([19, 19, 0, 19, 19]).n == 0
    assert judge([5]).n == 0
    assert judge([]).n == 0


@given(st.integers(0, 2**32 - 1), st.integers(1, 200))
def test_a_market_that_grows_or_shrinks_is_sound(seed: int, n_periods: int) -> None:
    """By up to a fifth a period, which doubles it within four."""
    random = np.random.default_rng(seed)
    steps = random.uniform(-0.2, 0.2, n_periods)
    assert judge(np.exp(6 + np.cumsum(steps)).astype(int)).n == 0
