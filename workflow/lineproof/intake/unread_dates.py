"""Are the dates of a file of another form than the study file declares? (faults 8 to 10)"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc

from lineproof.intake.date_order import date_format
from lineproof.intake.headers import where_is
from lineproof.intake.stopping import stop
from lineproof.problems import KnownProblem

_FEWEST = 30  # rows on which to judge
_SHARE = 0.2  # of the rows; with days and months swapped three in five do not parse
_N_KEPT = 1000  # distinct texts


@dataclass
class UnreadDates:
    """Counts the rows whose date is written but does not parse, block by block."""

    n_rows: int = 0
    n_unread: int = 0
    _texts: set[str] = field(default_factory=set)

    def add(self, column: pa.Array, is_unread: np.ndarray) -> None:
        """Take in one block: its dates as written, and a mask (n_rows,) of those that do not parse."""
        self.n_rows += len(is_unread)
        if not is_unread.any() or pa.types.is_temporal(column.type):
            return
        texts = column.filter(pa.array(is_unread)).cast(pa.string()).drop_null()
        texts = texts.filter(pc.not_equal(texts, ""))
        self.n_unread += len(texts)
        # The least ones, so that they do not depend on the order of the rows.
        self._texts = set(sorted({*self._texts, *pc.unique(texts).to_pylist()})[:_N_KEPT])

    def judge(self, reading: dict[str, Any]) -> None:
        """Stop when they are too many to be faults of single rows. Raises KnownProblem."""
        if self.n_rows < _FEWEST or self.n_unread <= _SHARE * self.n_rows:
            return
        found = (
            f"{self.n_unread:,} of {self.n_rows:,} dates are not of the form {reading['dates']}, "
            f"as {min(self._texts)!r}"
        )
        raise stop(where_is(reading, "date"), found, self._change(reading))

    def _change(self, reading: dict[str, Any]) -> str:
        """The form that they have, where they leave no doubt."""
        try:
            return f'set dates: "{date_format(self._texts, reading)}"'
        except KnownProblem:
            return "set dates: as the file writes them, or leave it out to have it found"
