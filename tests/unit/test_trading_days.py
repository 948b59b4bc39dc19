"""The trading calendar: gaps of the market's series stop, stray days are handed back."""

from __future__ import annotations

import numpy as np
import pytest

from lineproof.intake.trading_days import check_calendar, days_of_panel, whole_months
from lineproof.periods import Months
from lineproof.problems import KnownProblem

EVERY = np.arange("2001-01-01", "2001-03-01", dtype="datetime64[D]")
WEEKDAYS = EVERY[np.is_busday(EVERY)]


def counts_of(**other: int) -> np.ndarray:
    """500 securities on each weekday, none at weekends, but for some days given as d_2001_01_06=3."""
    counts = np.where(np.is_busday(EVERY), 500, 0)
    for name, n in other.items():
        counts[np.datetime64(name[2:].replace("_", "-")) == EVERY] = n
    return counts


def test_a_whole_calendar_has_nothing_to_say() -> None:
    assert len(check_calendar(EVERY, counts_of(), WEEKDAYS, "raw/market.csv")) == 0


def test_days_missing_from_the_market_stop() -> None:
    gaps = np.array(["2001-01-17", "2001-02-05"], "datetime64[D]")
    market = WEEKDAYS[~np.isin(WEEKDAYS, gaps)]
    with pytest.raises(KnownProblem) as caught:
        check_calendar(EVERY, counts_of(d_2001_01_17=250), market, "raw/market.csv")
    assert str(caught.value) == (
        "The raw data cannot be used; nothing was written.\n"
        "  raw/market.csv: no return on 2 days on which at least half the usual number of securities has one: "
        "2001-01-17, 2001-02-05\n    → deliver them, or shorten the series"
    )


def test_days_on_which_few_return_are_set_aside() -> None:
    gap = np.datetime64("2001-01-17")
    found = check_calendar(
        EVERY, counts_of(d_2001_01_17=249, d_2001_01_20=3), WEEKDAYS[gap != WEEKDAYS], "m"
    )
    assert found.tolist() == [gap.item(), np.datetime64("2001-01-20").item()]


def test_days_outside_the_market_are_none_of_its_gaps() -> None:
    assert len(check_calendar(EVERY, counts_of(), WEEKDAYS[5:20], "m")) == 0


def test_a_market_that_grows_is_measured_by_its_own_time() -> None:
    """Half of twenty securities in January are many, although February has thousands."""
    counts = np.where(np.datetime64("2001-02-01") > EVERY, 20, 5000) * np.is_busday(EVERY)
    gap = np.datetime64("2001-01-10")
    with pytest.raises(KnownProblem, match="2001-01-10"):
        check_calendar(EVERY, counts, WEEKDAYS[gap != WEEKDAYS], "m")


def test_a_market_that_trades_where_nobody_returns_keeps_its_days() -> None:
    found = check_calendar(EVERY, np.zeros(len(EVERY), int), WEEKDAYS, "m")
    assert len(found) == 0


def test_the_calendar_of_a_built_market() -> None:
    counts = counts_of(d_2001_01_20=3, d_2001_01_24=260, d_2001_01_25=240)
    expected = WEEKDAYS[np.datetime64("2001-01-25") != WEEKDAYS]
    assert days_of_panel(EVERY, counts).tolist() == expected.tolist()


@pytest.mark.parametrize(
    ("first", "last", "whole"),
    [
        ("2001-01-01", "2001-03-30", ("2001-01", "2001-03")),
        ("2001-01-04", "2001-03-27", ("2001-01", "2001-03")),  # three weekdays may be holidays
        ("2001-01-05", "2001-03-26", ("2001-02", "2001-02")),
        ("2001-02-15", "2001-03-01", ("2001-03", "2001-02")),
    ],
)
def test_a_month_delivered_in_part_is_none(first: str, last: str, whole: tuple[str, str]) -> None:
    """A misdated row far away does not begin the calendar."""
    days = np.arange(np.datetime64(first), np.datetime64(last) + 1)
    days = np.append(np.datetime64("1999-12-01"), days[np.is_busday(days)])
    counts = np.append(1, np.full(len(days) - 1, 50))
    found = whole_months(days, counts)
    assert found == tuple(Months().number(np.array(whole, "datetime64[D]")).tolist())
