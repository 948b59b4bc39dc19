"""How many rows have a value, by column and year."""

from __future__ import annotations

import numpy as np

from lineproof.intake.chunk import Chunk
from lineproof.intake.observers.counting import (
    PeriodCounts,
    by_year,
    count_periods,
    count_texts,
    count_values,
    years_of,
)
from lineproof.intake.record import CoverageEvidence
from lineproof.periods import Periods

_DERIVED = {"total_return"}  # made from columns that are counted themselves


class Coverage:
    """Rows, and rows with a value in each column, by year; a blank text is no value.

    All sums are of integers, so the cut into chunks plays no part.
    """

    def __init__(self, periods: Periods) -> None:
        self._periods = periods
        self._rows = PeriodCounts(1)
        self._columns: dict[str, PeriodCounts] = {}

    def see(self, chunk: Chunk) -> None:
        """Count the values of one chunk."""
        counts, first = self._rows.reach(chunk.period)
        count_periods(chunk.period, first, counts[0])
        for name, value in chunk.values.items():
            if name not in _DERIVED:
                counts, first = self._column(name).reach(chunk.period)
                count_values(chunk.period, value, first, counts[0])
        for name, (code, texts) in chunk.texts.items():
            is_value = np.array([text != "" for text in texts] or [False])
            counts, first = self._column(name).reach(chunk.period)
            count_texts(chunk.period, code, is_value, first, counts[0])

    def result(self) -> CoverageEvidence:
        """Counts in each year, columns in the order in which they came."""
        numbers, counts = self._rows.whole()
        years = years_of(self._periods, numbers)
        all_years = np.arange(years[0], years[-1] + 1) if len(years) else years
        columns = {}
        for name, column in self._columns.items():
            held, with_value = column.whole()
            held_years = years_of(self._periods, held)
            columns[name.removesuffix("_")] = by_year(held_years, with_value[0], all_years)
        return {
            "years": all_years.tolist(),
            "n_rows": by_year(years, counts[0], all_years),
            "columns": columns,
        }

    def _column(self, name: str) -> PeriodCounts:
        return self._columns.setdefault(name, PeriodCounts(1))
