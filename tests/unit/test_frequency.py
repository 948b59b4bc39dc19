"""How often rows come: daily, weekly, monthly or rarer, told from the rows as delivered."""

from __future__ import annotations

from collections import Counter
from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from lineproof.intake.frequency import FrequencyEvidence
from lineproof.problems import KnownProblem

HEAD = "The raw data cannot be used; nothing was written.\n  returns.csv: "


def days(first: str, last: str, step: int = 1) -> np.ndarray:
    """Weekdays from first to last, every so many."""
    found = np.arange(np.datetime64(first), np.datetime64(last))
    return found[np.is_busday(found)][::step]


def month_ends(n: int, step: int = 1) -> np.ndarray:
    months = np.datetime64("2000-01") + np.arange(1, n * step + 1, step)
    return months.astype("datetime64[D]") - 1


def evidence(*histories: np.ndarray) -> FrequencyEvidence:
    found = FrequencyEvidence()
    start = np.cumsum([0, *map(len, histories)])
    found.add(start, np.concatenate(histories))
    return found


def refused(found: FrequencyEvidence, frequency: str) -> str:
    with pytest.raises(KnownProblem) as caught:
        found.judge("returns.csv", frequency)
    return str(caught.value).removeprefix(HEAD)


@pytest.mark.fault(40)
def test_daily_declared_monthly() -> None:
    found = evidence(*[days("2000-01-01", "2000-07-01")] * 3)
    assert refused(found, "monthly") == (
        "declared monthly, but 390 dates in 18 months of single securities, 21.7 a month: daily data?\n"
        "    → set frequency: daily under data.returns, and they are compounded to months"
    )
    found.judge("returns.csv", "daily")


@pytest.mark.fault(40)
def test_weekly_declared_monthly_or_daily() -> None:
    found = evidence(*[days("2000-01-03", "2001-01-01", step=5)] * 3)
    said = "156 dates in 36 months of single securities, 4.33 a month"
    assert refused(found, "monthly") == (
        f"declared monthly, but {said}: weekly data?\n    → compound the returns to months first"
    )
    assert refused(found, "daily") == (
        f"declared daily, but {said}, mostly a week apart: weekly data?\n"
        "    → deliver daily returns, or compound them to months"
    )


@pytest.mark.fault(40)
@pytest.mark.parametrize(
    ("step", "kind"), [(3, "quarterly"), (6, "half-yearly"), (12, "yearly"), (36, "yearly")]
)
def test_rarer_declared_monthly(step: int, kind: str) -> None:
    shown = min(step, 24)
    assert refused(evidence(*[month_ends(11, step)] * 4), "monthly") == (
        f"declared monthly, but a security's next row is typically {shown} months on, in 40 steps from row to row: "
        f"{kind} data?\n    → deliver monthly returns"
    )


@pytest.mark.fault(40)
def test_monthly_declared_daily() -> None:
    found = evidence(*[month_ends(20)] * 2)
    assert refused(found, "daily") == (
        "declared daily, but 40 dates in 40 months of single securities, 1 a month: monthly data?\n"
        "    → set frequency: monthly"
    )
    found.judge("returns.csv", "monthly")


def test_a_file_delivered_three_times_is_monthly_still() -> None:
    evidence(*[np.repeat(month_ends(20), 3)] * 2).judge("returns.csv", "monthly")


def test_a_few_securities_with_several_dates_a_month_pass() -> None:
    """Rows of the same month in any order: a twentieth of the securities is delivered daily."""
    random = np.random.default_rng(1)
    daily = days("2000-01-01", "2000-12-31")
    month = daily.astype("datetime64[M]")
    shuffled = np.concatenate([random.permutation(daily[month == each]) for each in set(month)])
    shuffled = shuffled[np.argsort(shuffled.astype("datetime64[M]"), kind="stable")]
    evidence(shuffled, *[month_ends(12)] * 19).judge("returns.csv", "monthly")


def test_thinly_traded_securities_are_daily_still() -> None:
    random = np.random.default_rng(2)
    all_days = days("2000-01-01", "2004-12-31")
    histories = [all_days[random.random(len(all_days)) < share] for share in (0.1, 0.2, 0.5, 1.0)]
    evidence(*histories).judge("returns.csv", "daily")


def test_gaps_in_monthly_histories_pass() -> None:
    random = np.random.default_rng(3)
    evidence(*[month_ends(60)[random.random(60) < 0.6] for _ in range(5)]).judge("f", "monthly")


def test_few_rows_say_nothing() -> None:
    evidence(month_ends(29)).judge("f", "daily")
    evidence(month_ends(30, 3)).judge("f", "monthly")
    FrequencyEvidence().judge("f", "monthly")
    evidence(np.empty(0, "datetime64[D]")).judge("f", "daily")


@settings(max_examples=60, deadline=None)
@given(
    st.lists(
        st.lists(st.dates(np.datetime64("1999-01-01").item(), np.datetime64("2003-01-01").item())),
        max_size=4,
    )
)
def test_counts_agree_with_a_slow_loop_and_forget_the_cut(histories: list[list]) -> None:
    sorted_ones = [np.array(sorted(h), "datetime64[D]") for h in histories]
    whole, parts = FrequencyEvidence(), FrequencyEvidence()
    for each in sorted_ones:
        parts.merge(evidence(each))
    if sorted_ones:
        whole = evidence(*sorted_ones)
    dates, steps = Counter(), Counter()
    for each in histories:
        months = sorted({(d.year, d.month) for d in each})
        dates.update(len({d for d in each if (d.year, d.month) == m}) for m in months)
        steps.update(min(24, 12 * (b[0] - a[0]) + b[1] - a[1]) for a, b in pairwise(months))
    for found in (whole, parts):
        assert found.result() == {
            "dates_a_month": {str(k): dates[k] for k in sorted(dates)},
            "months_between_rows": {str(k): steps[k] for k in sorted(steps)},
        }
