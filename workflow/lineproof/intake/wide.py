"""Wide files: one column a security, one row a date. Each cell that is not empty becomes a row."""

from __future__ import annotations

from typing import Any

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc

from lineproof.intake.arrays import as_text, settled, trimmed
from lineproof.intake.blocks import RawBlock
from lineproof.intake.headers import Mapping
from lineproof.intake.pieces import Piece


def as_rows(
    piece: Piece, mapping: Mapping, stride: int, reading: dict[str, Any], label: str
) -> RawBlock:
    """The cells of some rows as rows of date, return (or price) and security (or asset), along each line in turn.

    The position of a cell is its line times `stride`, the number of columns, plus its column; that of a row that does
    not fit the header has the column of the date.
    """
    cells = mapping.cells or {}
    own = reading.get("names", "security")
    value = "price" if reading.get("return_from") == "price" else "return"
    date, n_trimmed = trimmed(settled(piece.columns[mapping.ours["date"]], "date", reading, label))
    values, n_blanks = _values(piece, cells, reading, label)
    at = np.flatnonzero(_is_given(values, len(piece.place), len(cells)))
    row, column = np.divmod(at, max(len(cells), 1))
    names = pa.array([cells[position] for position in cells], pa.string())
    places = np.array(list(cells), np.int64)
    columns = {
        own: names.take(pa.array(column)),
        "date": date.take(pa.array(row)),
        value: values.take(pa.array(column * len(piece.place) + row)),
    }
    rejects = [(place * stride + mapping.ours["date"], why) for place, why in piece.rejects]
    position = piece.place[row] * stride + places[column]
    return RawBlock(columns, position, rejects, n_trimmed + n_blanks)


def _values(
    piece: Piece, cells: dict[int, str], reading: dict[str, Any], label: str
) -> tuple[pa.Array, int]:
    """All cells, one column after the other, in one type; and how many had blanks around them."""
    columns = [
        settled(piece.columns[position], "return", reading, f"{label}, column {name}")
        for position, name in cells.items()
    ]
    if len({array.type for array in columns}) > 1:
        if any(pa.types.is_string(array.type) for array in columns):
            columns = [as_text(array, reading) for array in columns]
        else:
            columns = [array.cast(pa.float64()) for array in columns]
    return trimmed(pa.concat_arrays(columns))


def _is_given(values: pa.Array, n_rows: int, n_columns: int) -> np.ndarray:
    """Which cells hold something, bool (n_rows * n_columns,), along each row in turn."""
    given = pc.is_valid(values)
    if pa.types.is_string(values.type):
        given = pc.not_equal(values, "")
    return given.to_numpy(zero_copy_only=False).reshape(n_columns, n_rows).T.ravel()


def raw_cell(row_text: str, fields: list[str], header: list[str], column: int, date: int) -> str:
    """A cell as `name=text`; the whole line where the row does not fit the header."""
    return row_text if column == date else f"{header[column]}={fields[column]}"
