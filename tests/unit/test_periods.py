"""Months and trading days as numbers, against the calendar of the standard library."""

from __future__ import annotations

import datetime

import numpy as np
import pandas as pd
import pytest

from lineproof.periods import ABSENT, Months, TradingDays, periods_of

DAYS = pd.bdate_range("2000-01-03", "2002-12-31").to_numpy().astype("datetime64[D]")
# Carnival Monday of 2001 and the Friday on which June of 2001 ends: closed.
CLOSED = np.array(["2001-02-26", "2001-06-29"], "datetime64[D]")
CALENDAR = TradingDays(DAYS[~np.isin(DAYS, CLOSED)])


def test_months_are_numbered_and_dated() -> None:
    days = np.array(["1999-12-31", "2000-01-01", "2000-02-10", "NaT"], "datetime64[ms]")
    numbers = Months().number(days)
    assert numbers.tolist() == [1999 * 12 + 11, 2000 * 12, 2000 * 12 + 1, ABSENT]
    dated = Months().date(numbers[:3]).astype(str).tolist()
    assert dated == ["1999-12-31", "2000-01-31", "2000-02-29"]
    assert Months().name(2000 * 12) == "2000-01"
    assert Months().closes_month(numbers).all()
    assert Months().n_between("1999-11", "2001-01") == 15


def test_trading_days_are_numbered_and_dated() -> None:
    days = np.array(["2000-01-03", "2000-01-04", "2000-01-08", "1999-01-01", "2003-01-01", "NaT"])
    numbers = CALENDAR.number(days.astype("datetime64[ms]"))
    assert numbers.tolist() == [0, 1, ABSENT, ABSENT, ABSENT, ABSENT]
    every = CALENDAR.number(CALENDAR.days)
    assert every.tolist() == list(range(len(CALENDAR.days)))
    assert (CALENDAR.date(every) == CALENDAR.days).all()
    assert CALENDAR.number(CLOSED).tolist() == [ABSENT, ABSENT]
    assert CALENDAR.name(1) == "2000-01-04"


def test_the_last_trading_day_closes_its_month() -> None:
    every = np.arange(len(CALENDAR.days))
    dates = [day.astype(datetime.date) for day in CALENDAR.days]
    last = {(d.year, d.month): place for place, d in enumerate(dates)}
    assert np.flatnonzero(CALENDAR.closes_month(every)).tolist() == list(last.values())
    assert "2001-06-28" in CALENDAR.days[list(last.values())].astype(str)
    want = [last[d.year, d.month] for d in dates]
    assert CALENDAR.last_of_month(every).tolist() == want
    assert CALENDAR.month(every).tolist() == [d.year * 12 + d.month - 1 for d in dates]


@pytest.mark.parametrize(
    ("until", "over"),
    [
        ("2002-11-29", True),  # a Friday; only a weekend is left
        ("2002-11-28", False),
        ("2002-12-31", True),
        ("2002-12-30", False),
    ],
)
def test_a_month_that_may_go_on_is_not_closed(until: str, over: bool) -> None:
    calendar = TradingDays(DAYS[np.datetime64(until) >= DAYS])
    assert calendar.closes_month(np.array([len(calendar.days) - 1])).tolist() == [over]


def test_a_market_open_on_saturdays_has_not_closed_its_month_on_a_friday() -> None:
    days = pd.date_range("2002-01-01", "2002-11-29").to_numpy().astype("datetime64[D]")
    open_days = days[(days.astype(np.int64) + 3) % 7 != 6]  # all but Sundays
    calendar = TradingDays(open_days)
    assert not calendar.closes_month(np.array([len(open_days) - 1]))[0]


def test_days_between_months() -> None:
    want = sum("2001-02" <= str(day)[:7] <= "2001-06" for day in CALENDAR.days)
    assert CALENDAR.n_between("2001-02", "2001-06") == want


def test_periods_of_a_frequency() -> None:
    dates = np.array(["2001-01-03", "2001-01-02", "2001-01-03"], "datetime64[ms]")
    assert periods_of("monthly", dates) == Months()
    assert periods_of("daily", dates).days.astype(str).tolist() == ["2001-01-02", "2001-01-03"]
