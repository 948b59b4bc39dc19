"""What a format gives to the intake: its header, and its rows piece by piece by position in the header."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any, Protocol

import numpy as np
import pyarrow as pa


@dataclass(frozen=True)
class Piece:
    """Consecutive rows: one Arrow array (n_rows,) for each position asked for, the place of each row, int64 (n_rows,),
    and place and reason of each row whose fields do not fit the header."""

    columns: dict[int, pa.Array]
    place: np.ndarray
    rejects: list[tuple[int, str]]


class Format(Protocol):
    """A raw file in one format. `place` is what messages call a row's place."""

    place: str

    def header(self) -> list[str]:
        """The names of the columns, without blanks around them."""

    def pieces(self, wanted: list[int]) -> Iterator[Piece]:
        """All rows, with the columns at the wanted positions of the header."""

    def rows(self, places: np.ndarray) -> Iterator[list[Any]]:
        """The rows at the given places (ascending), some at a time, as the format keeps them."""

    def line_of(self, row: Any) -> str:
        """A row that `rows` gave, as one line of text."""

    def fields_of(self, row: Any) -> list[str]:
        """The fields of a row that `rows` gave, as text."""
