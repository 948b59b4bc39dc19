"""The largest gains and losses, with their neighbours, so that a misplaced decimal point shows."""

from __future__ import annotations

from typing import Any

import numpy as np

from lineproof.intake.chunk import Chunk
from lineproof.intake.record import LargeReturn, LargestEvidence, NeighbourRow
from lineproof.periods import Periods

N_SHOWN = 20


class Largest:
    """The twenty largest total returns above zero and below, with the rows before and after of the same security.

    Of equal returns the earlier security comes first, then the earlier date: as chunks come in this order, a later
    row takes a place only if it is strictly larger, so the cut into chunks plays no part.
    """

    def __init__(self, periods: Periods) -> None:
        del periods  # rows are shown by the date they were delivered with
        self._gains: list[LargeReturn] = []
        self._losses: list[LargeReturn] = []

    def see(self, chunk: Chunk) -> None:
        """Compare the returns of one chunk with the largest so far."""
        value = chunk.values["total_return"]
        self._gains = _merged(self._gains, chunk, value)
        self._losses = _merged(self._losses, chunk, -value)

    def result(self) -> LargestEvidence:
        """Both lists, from the largest down."""
        return {"positive": self._gains, "negative": self._losses}


def _merged(known: list[LargeReturn], chunk: Chunk, size: np.ndarray) -> list[LargeReturn]:
    """The largest of those known and of a chunk's rows by `size` (n_rows,)."""
    least = abs(known[-1]["return_"]) if len(known) == N_SHOWN else 0.0
    rows = np.flatnonzero(size > least)
    rows = rows[np.isfinite(size[rows])]
    if len(rows) > N_SHOWN:
        enough = np.partition(size[rows], -N_SHOWN)[-N_SHOWN]
        rows = rows[size[rows] >= enough]
        rows = rows[np.argsort(-size[rows], kind="stable")][:N_SHOWN]
    found = known + [_large_return(chunk, row) for row in rows.tolist()]
    return sorted(found, key=lambda each: -abs(each["return_"]))[:N_SHOWN]  # stable


def _large_return(chunk: Chunk, row: int) -> LargeReturn:
    owner = int(np.searchsorted(chunk.start, row, side="right")) - 1
    begin, end = chunk.start[owner], chunk.start[owner + 1]
    return {
        "security": str(chunk.names[owner]),
        **_row(chunk, row),
        "before": _row(chunk, row - 1) if row > begin else None,
        "after": _row(chunk, row + 1) if row + 1 < end else None,
    }


def _row(chunk: Chunk, row: int) -> NeighbourRow:
    said: Any = {"date": str(chunk.day[row])}
    said["return_"] = _known(chunk.values["total_return"][row])
    if "price" in chunk.values:
        said["price"] = _known(chunk.values["price"][row])
    return said


def _known(value: float) -> float | None:
    return float(value) if np.isfinite(value) else None
