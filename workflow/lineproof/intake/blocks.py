"""What every reader gives: the rows of a raw file, block by block, in the names of the study file."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Protocol

import numpy as np
import pyarrow as pa


@dataclass(frozen=True)
class RawBlock:
    """Consecutive rows of one raw file.

    `columns` has, under our names, one Arrow array (n_rows,) each: text without blanks around it ("" where there is
    nothing), or float64, int64, date32 or timestamp where the format is typed (null where there is nothing).
    `position` is int64 (n_rows,), ascending within the file: see `RawFile.line`.
    `rejects` holds position and reason of each row whose fields do not fit the header; they are not in `columns`.
    `n_trimmed` counts the values that had blanks around them.
    """

    columns: dict[str, pa.Array]
    position: np.ndarray
    rejects: list[tuple[int, str]]
    n_trimmed: int

    @property
    def n_read(self) -> int:
        return len(self.position) + len(self.rejects)


class RawFile(Protocol):
    """One raw file (or the result of a query). `label` is what messages call it, `place` what a row is called there:
    "line" in a text file, "row" in a typed one."""

    label: str
    place: str

    def blocks(self) -> Iterator[RawBlock]:
        """All rows, from the start. Raises KnownProblem when the file cannot be used."""

    def line(self, positions: np.ndarray) -> np.ndarray:
        """The line (from 1, the header being line 1) or row (from 1) of each position, int64."""

    def raw(self, positions: np.ndarray) -> Iterator[list[str]]:
        """The text of the rows at the given positions (ascending), in their order, some at a time."""
