"""The trading calendar of a daily study: the market's own dates, held against the panel's."""

from __future__ import annotations

import numpy as np

from lineproof.intake.riskless import cut_off
from lineproof.intake.stopping import counted, few, stop
from lineproof.periods import Months

_AROUND = 10  # days before and after
_EDGE = 60  # days at either end, enough to know the usual number of securities
_SHARE_TRADING = 0.5  # of the usual number of securities


def check_calendar(
    days: np.ndarray, counts: np.ndarray, market_days: np.ndarray, label: str
) -> np.ndarray:
    """Days inside the market's span on which securities return and the market does not.

    Parameters
    ----------
    days, counts : ascending datetime64[D] (n,) and int64 (n,): the days of the raw returns, and how many securities
        have a return on each.
    market_days : ascending datetime64[D]: the dates of the market's series.
    label : what messages call that series.

    Returns the days whose rows are to be set aside (fault 28), ascending datetime64[D]: few securities return on them,
    as on a misdated row or a day of holiday trading. Raises KnownProblem listing the days on which at least half the
    usual number of securities has a return (fault 27): there the market's series has a gap. Usual is the median
    of the market's days around, ten on either side.
    """
    within = (days >= market_days[0]) & (days <= market_days[-1]) & (counts > 0)
    other = within & ~np.isin(days, market_days)
    if not other.any():
        return days[other]
    on_market = _counts_on(market_days, days, counts)
    at = np.searchsorted(market_days, days[other])
    usual = np.array([_median_around(on_market, i) for i in at])
    is_gap = counts[other] >= np.maximum(_SHARE_TRADING * usual, 1)
    if is_gap.any():
        gaps = days[other][is_gap]
        found = (
            f"no return on {counted(len(gaps), 'day')} on which at least half the usual number of securities "
            f"has one: {few(map(str, gaps))}"
        )
        raise stop(label, found, "deliver them, or shorten the series")
    return days[other]


def days_of_panel(days: np.ndarray, counts: np.ndarray) -> np.ndarray:
    """The trading calendar of a market that is built from the panel: days on which half the usual number returns.

    Arguments as for `check_calendar`; usual is the median of the twenty days around, itself left out. The calendar,
    ascending datetime64[D].
    """
    present = counts > 0
    days, counts = days[present], counts[present]
    usual = np.array([_median_around(counts, i, leave_out=True) for i in range(len(days))])
    return days[counts >= _SHARE_TRADING * usual]


def whole_months(days: np.ndarray, counts: np.ndarray) -> tuple[int, int]:
    """The first and the last month, as `Months` numbers them, that days of raw returns cover; see `days_of_panel`.

    A first or last month of which more than three weekdays are missing is no month: its return would be that of a few
    days. The first is later than the last where none is whole.
    """
    head = days_of_panel(days[:_EDGE], counts[:_EDGE])[0]
    tail = days_of_panel(days[-_EDGE:], counts[-_EDGE:])[-1]
    begins = head.astype("datetime64[M]").astype("datetime64[D]")
    ends = (tail.astype("datetime64[M]") + 1).astype("datetime64[D]")
    first, last = Months().number(np.array([head, tail])).tolist()
    return first + (cut_off(begins, head) > 0), last - (cut_off(tail + 1, ends) > 0)


def _counts_on(market_days: np.ndarray, days: np.ndarray, counts: np.ndarray) -> np.ndarray:
    found = np.zeros(len(market_days), np.int64)
    known = np.isin(days, market_days)
    found[np.searchsorted(market_days, days[known])] = counts[known]
    return found


def _median_around(counts: np.ndarray, at: int, leave_out: bool = False) -> float:
    """Median of the counts before position `at` and from it on, ten on either side."""
    after = at + 1 if leave_out else at
    around = np.concatenate([counts[max(at - _AROUND, 0) : at], counts[after : after + _AROUND]])
    return float(np.median(around)) if len(around) else 0.0
