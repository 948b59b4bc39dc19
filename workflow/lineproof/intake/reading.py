"""Open raw files in whatever format: their rows block by block, every row with its place, and every row that does
not fit its header."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pyarrow as pa

from lineproof.catalog import load
from lineproof.intake.arrays import as_text, settled, trimmed
from lineproof.intake.blocks import RawBlock, RawFile
from lineproof.intake.formats import FORMATS, check_beginning, kind_of, members
from lineproof.intake.headers import Mapping, match
from lineproof.intake.pieces import Format, Piece
from lineproof.intake.stopping import stop
from lineproof.intake.wide import as_rows, raw_cell

_LONGEST_BEGINNING = 32


@dataclass(frozen=True)
class TextTable:
    """A whole raw file as text, for files that are small.

    `rows` has the columns of the study file under our names, trimmed of blanks, and `line`;
    `rejects` has `line` and `reason` of each row whose fields do not fit the header. `line` counts
    from 1, the header being line 1, or rows from 1 where `place` is "row", as in Parquet.
    `n_read` counts the rows of both, and `n_trimmed` the values that had blanks around them.
    """

    label: str
    place: str
    rows: pd.DataFrame
    rejects: pd.DataFrame
    n_trimmed: int

    @property
    def n_read(self) -> int:
        return len(self.rows) + len(self.rejects)


def open_files(files: str | list[str], reading: dict[str, Any]) -> list[RawFile]:
    """The raw files of one source, in order; a folder stands for the Parquet files in it.

    `reading` is what `Source.reading()` gives; of its keys only `label` and `columns` must be there.
    Several files may hold no row each; a single one may not.

    Raises KnownProblem when a file is missing, empty, or not what its ending says.
    """
    given = [files] if isinstance(files, str) else list(files)
    labels = reading.get("labels") or _labels(given, reading["label"])
    found = [
        member
        for file, label in zip(given, labels, strict=True)
        for member in members(Path(file), label)
    ]
    if not found:
        raise stop(reading["label"], "there is no file", "check the path in the study file")
    return [_Opened(str(path), label, reading, len(found) > 1) for path, label in found]


def _labels(files: list[str], label: str) -> list[str]:
    return [label] if len(files) == 1 else [f"{label}, {Path(file).name}" for file in files]


class _Opened:
    """A `RawFile`. What is wrong with the file is said when its rows are asked for."""

    def __init__(self, file: str, label: str, reading: dict[str, Any], may_be_empty: bool) -> None:
        self.label = label
        self._file, self._reading, self._may_be_empty = file, reading, may_be_empty
        self._kind = _checked_kind(Path(file), label, reading)

    @property
    def place(self) -> str:
        return "line" if self._kind == "text" else "row"

    @cached_property
    def _format(self) -> Format:
        return load(FORMATS[self._kind])(self._file, self.label, self._reading)

    @cached_property
    def _header(self) -> list[str]:
        return self._format.header()

    @cached_property
    def _mapping(self) -> Mapping:
        return match(self._header, self._reading, self.label)

    def blocks(self) -> Iterator[RawBlock]:
        """See `RawFile`."""
        n_read = 0
        for block in self._saying_what_is_broken(self._blocks()):
            n_read += block.n_read
            yield block
        if not n_read and not self._may_be_empty:
            raise stop(self.label, "there is a header but no row", "deliver it again")

    def _blocks(self) -> Iterator[RawBlock]:
        mapping = self._mapping
        for piece in self._format.pieces(mapping.wanted):
            if mapping.cells is None:
                yield _long(piece, mapping, self._reading, self.label)
            else:
                yield as_rows(piece, mapping, len(self._header), self._reading, self.label)

    def line(self, positions: np.ndarray) -> np.ndarray:
        """See `RawFile`."""
        wide = self._reading.get("layout") == "wide"
        return positions // len(self._header) if wide else np.asarray(positions, np.int64)

    def raw(self, positions: np.ndarray) -> Iterator[list[str]]:
        """See `RawFile`."""
        positions = np.asarray(positions, np.int64)
        yield from self._saying_what_is_broken(self._raw(positions))

    def _raw(self, positions: np.ndarray) -> Iterator[list[str]]:
        shape = self._format
        if not len(positions):
            return
        if self._reading.get("layout") != "wide":
            for rows in shape.rows(positions):
                yield [shape.line_of(row) for row in rows]
            return
        lines, column = np.divmod(positions, len(self._header))
        places, n_cells = np.unique(lines, return_counts=True)
        date, cell, place = self._mapping.ours["date"], 0, 0
        for rows in shape.rows(places):
            texts = []
            for row in rows:
                text, fields = shape.line_of(row), shape.fields_of(row)
                upto = cell + int(n_cells[place])
                texts += [
                    raw_cell(text, fields, self._header, c, date)
                    for c in column[cell:upto].tolist()
                ]
                cell, place = upto, place + 1
            yield texts

    def _saying_what_is_broken(self, items: Iterator[Any]) -> Iterator[Any]:
        try:
            yield from items
        except (OSError, pa.ArrowException, UnicodeError) as error:
            said = str(error).strip().split("\n")[0].rstrip(".").replace(self._file, self.label)
            change = "is it complete, and what its ending says?"
            raise stop(self.label, f"it cannot be read: {said}", change) from None


def _checked_kind(path: Path, label: str, reading: dict[str, Any]) -> str:
    if not path.is_file():
        raise stop(label, "there is no such file", "check the path in the study file")
    if path.stat().st_size == 0:
        raise stop(label, "the file is empty", "deliver it again")
    kind = kind_of(path, label)
    if kind != "text":
        try:
            with path.open("rb") as stream:
                check_beginning(stream.read(_LONGEST_BEGINNING), kind, label)
        except OSError as error:
            raise stop(
                label, f"it cannot be read: {error.strerror}", "check its permissions"
            ) from None
    return kind


def _long(piece: Piece, mapping: Mapping, reading: dict[str, Any], label: str) -> RawBlock:
    columns, n_trimmed = {}, 0
    for ours, position in mapping.ours.items():
        where = f"{label}, column {reading['columns'][ours]}"
        array = settled(piece.columns[position], ours, reading, where)
        columns[ours], n_blanks = trimmed(array)
        n_trimmed += n_blanks
    return RawBlock(columns, piece.place, piece.rejects, n_trimmed)


def read_text(files: str | list[str], reading: dict[str, Any]) -> TextTable:
    """Read whole files as text, keeping the columns the study file names.

    Raises KnownProblem when a file is missing, empty, broken, in another encoding or lacks a column.
    """
    opened = open_files(files, reading)
    parts, rejects, n_trimmed = [], [], 0
    for file in opened:
        for block in file.blocks():
            texts = {name: as_text(array, reading) for name, array in block.columns.items()}
            parts.append(pa.table({**texts, "line": file.line(block.position)}))
            at = file.line(np.array([position for position, _ in block.rejects], np.int64))
            rejects += zip(at.tolist(), [why for _, why in block.rejects], strict=True)
            n_trimmed += block.n_trimmed
    rows = pa.concat_tables(parts).to_pandas() if parts else pd.DataFrame()
    if not len(rows) and not rejects:
        raise stop(reading["label"], "there is a header but no row", "deliver it again")
    frame = pd.DataFrame(
        {
            "line": pd.Series([line for line, _ in rejects], dtype="int64"),
            "reason": pd.Series([said for _, said in rejects], dtype=str),
        }
    )
    return TextTable(reading["label"], opened[0].place, rows, frame, n_trimmed)
