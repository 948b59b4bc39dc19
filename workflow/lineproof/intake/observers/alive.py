"""Securities alive over time, and when they enter and leave."""

from __future__ import annotations

import numpy as np

from lineproof.intake.chunk import Chunk
from lineproof.intake.observers.counting import (
    PeriodCounts,
    by_year,
    count_periods,
    count_values,
    years_of,
)
from lineproof.intake.record import AliveEvidence
from lineproof.periods import Periods

_ROWS, _ALIVE, _FIRST, _LAST = range(4)


class Alive:
    """Rows with a return by period; first and last rows of the securities by year.

    A security whose first row lies in the first period of the data has not entered, and one whose last row lies in
    the last period has not left. All sums are of integers, so the cut into chunks plays no part.
    """

    def __init__(self, periods: Periods) -> None:
        self._periods = periods
        self._counts = PeriodCounts(4)

    def see(self, chunk: Chunk) -> None:
        """Count the rows of one chunk."""
        counts, first = self._counts.reach(chunk.period)
        begins, ends = chunk.start[:-1], chunk.start[1:]
        held = ends > begins
        count_periods(chunk.period, first, counts[_ROWS])
        count_values(chunk.period, chunk.values["total_return"], first, counts[_ALIVE])
        count_periods(chunk.period[begins[held]], first, counts[_FIRST])
        count_periods(chunk.period[ends[held] - 1], first, counts[_LAST])

    def result(self) -> AliveEvidence:
        """Securities with a return in each period from the first row to the last; entries and exits in each year."""
        numbers, counts = self._counts.whole()
        entered, left = counts[_FIRST].copy(), counts[_LAST].copy()
        entered[:1] = 0
        left[-1:] = 0
        years = years_of(self._periods, numbers)
        all_years = np.arange(years[0], years[-1] + 1) if len(years) else years
        return {
            "periods": [self._periods.name(number) for number in numbers.tolist()],
            "alive": counts[_ALIVE].tolist(),
            "years": all_years.tolist(),
            "entries": by_year(years, entered, all_years),
            "exits": by_year(years, left, all_years),
        }
