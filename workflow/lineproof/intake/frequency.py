"""Do rows come as often as the study file says? (fault 40)"""

from __future__ import annotations

from typing import Any

import numpy as np
from numba import njit

from lineproof.intake.chunk import Chunk
from lineproof.intake.stopping import counted, stop

_FEWEST = 30  # months of single securities, or steps, on which to judge
_SEVERAL, _SHARE_OF_SEVERAL = 2, 0.2  # more dates than that in a month are not monthly
_OFTEN = 6  # dates in a month; weekly data have four or five
_QUARTER, _SHARE_OF_QUARTERLY = 3, 0.5  # months from row to row
_SHARE_OF_SINGLE, _SHARE_OF_WEEKLY = 0.8, 0.5
_N_STEPS, _N_DATES = 25, 32  # counted up to 24 months from row to row, and 31 dates a month


class FrequencyEvidence:
    """Observer of the rows as delivered, before rows of one security and month are resolved.

    Rows are sorted by security and month; a month may have several, in any order. Only `start` and `day` of a chunk
    are looked at. The same day twice counts once, so that a file delivered twice is not taken for another frequency.
    """

    def __init__(self) -> None:
        self.dates = np.zeros(_N_DATES, np.int64)  # months of single securities by number of dates
        self.steps = np.zeros(_N_STEPS, np.int64)  # months from one to the next
        self.gaps = np.zeros(
            2, np.int64
        )  # days from date to date inside a month: all, five to nine

    def see(self, chunk: Chunk) -> None:
        self.add(chunk.start, chunk.day)

    def add(self, start: np.ndarray, day: np.ndarray) -> None:
        """Take in rows: securities begin at `start`, int64 (n_securities + 1,); `day` is datetime64[D] (n_rows,)."""
        _count(
            np.ascontiguousarray(start, np.int64),
            np.ascontiguousarray(day, "datetime64[D]").view(np.int64),
            self.dates,
            self.steps,
            self.gaps,
        )

    def merge(self, other: FrequencyEvidence) -> None:
        """Add what another one has seen of other securities."""
        self.dates += other.dates
        self.steps += other.steps
        self.gaps += other.gaps

    def result(self) -> dict[str, Any]:
        """Months of single securities by their number of dates, and steps from month to month."""
        return {
            "dates_a_month": {str(n): int(k) for n, k in enumerate(self.dates) if k},
            "months_between_rows": {str(n): int(k) for n, k in enumerate(self.steps) if k},
        }

    def judge(self, label: str, frequency: str) -> None:
        """Stop when rows come at another frequency than `frequency`, "monthly" or "daily". Raises KnownProblem."""
        n_cells = int(self.dates.sum())
        if n_cells:
            (self._judge_monthly if frequency == "monthly" else self._judge_daily)(label, n_cells)

    def _said(self, n_cells: int) -> str:
        n_dates = int(self.dates @ np.arange(_N_DATES))
        return (
            f"{counted(n_dates, 'date')} in {counted(n_cells, 'month')} of single securities, "
            f"{n_dates / n_cells:.3g} a month"
        )

    def _judge_monthly(self, label: str, n_cells: int) -> None:
        if self.dates[_SEVERAL + 1 :].sum() > _SHARE_OF_SEVERAL * n_cells:
            often = self.dates[_OFTEN + 1 :].sum() > self.dates[_SEVERAL + 1 : _OFTEN + 1].sum()
            kind = "daily" if often else "weekly"
            change = (
                "set frequency: daily under data.returns, and they are compounded to months"
                if often
                else "compound the returns to months first"
            )
            raise stop(label, f"declared monthly, but {self._said(n_cells)}: {kind} data?", change)
        n_steps = int(self.steps.sum())
        if n_steps >= _FEWEST and self.steps[_QUARTER:].sum() > _SHARE_OF_QUARTERLY * n_steps:
            typical = int(np.searchsorted(np.cumsum(self.steps), (n_steps + 1) // 2))
            kind = "yearly" if typical >= 12 else "half-yearly" if typical >= 6 else "quarterly"
            found = (
                f"declared monthly, but a security's next row is typically {typical} months on, "
                f"in {counted(n_steps, 'step')} from row to row: {kind} data?"
            )
            raise stop(label, found, "deliver monthly returns")

    def _judge_daily(self, label: str, n_cells: int) -> None:
        if n_cells < _FEWEST:
            return
        if self.dates[1] > _SHARE_OF_SINGLE * n_cells:
            found = f"declared daily, but {self._said(n_cells)}: monthly data?"
            raise stop(label, found, "set frequency: monthly")
        if self.gaps[0] >= _FEWEST and self.gaps[1] > _SHARE_OF_WEEKLY * self.gaps[0]:
            found = f"declared daily, but {self._said(n_cells)}, mostly a week apart: weekly data?"
            raise stop(label, found, "deliver daily returns, or compound them to months")


@njit(cache=True, nogil=True)
def _month_and_place(day):  # pragma: no cover - compiled
    """The month of a day, both counted from 1970, and the day's place in it from 0: the Gregorian calendar counted in
    cycles of 146,097 days and in years that begin in March, so that a leap day is the last of its year."""
    shifted = day + 719_468
    cycle, in_cycle = shifted // 146_097, shifted % 146_097
    year = (in_cycle - in_cycle // 1_460 + in_cycle // 36_524 - in_cycle // 146_096) // 365
    in_year = in_cycle - (365 * year + year // 4 - year // 100)
    month = (5 * in_year + 2) // 153
    place = in_year - (153 * month + 2) // 5
    return (cycle * 400 + year - 1970) * 12 + month + 2, place


@njit(cache=True, nogil=True)
def _count(start, day, dates, steps, gaps):  # pragma: no cover - compiled
    for security in range(len(start) - 1):
        before, seen, begins = np.int64(0), np.int64(0), np.int64(0)
        for i in range(start[security], start[security + 1]):
            month, place = before, day[i] - begins
            if (
                not seen or not 0 <= place < 28
            ):  # within 28 days of its first a month cannot have ended
                month, place = _month_and_place(day[i])
                begins = day[i] - place
            if seen and month != before:
                steps[min(month - before, len(steps) - 1)] += 1
                _close(seen, dates, gaps)
                seen = np.int64(0)
            before, seen = month, seen | (np.int64(1) << place)
        if seen:
            _close(seen, dates, gaps)


@njit(cache=True, nogil=True)
def _close(seen, dates, gaps):  # pragma: no cover - compiled
    """Count the dates of one month, given as bits, and the gaps between them."""
    n, gap = 0, 0
    while seen:
        if seen & 1:
            if n:
                gaps[0] += 1
                gaps[1] += 5 <= gap <= 9
            n, gap = n + 1, 0
        gap += 1
        seen >>= 1
    dates[n] += 1
