"""Files whose columns have types: what their formats share. Rows are numbered from 1, or as a sheet numbers them."""

from __future__ import annotations

import csv
import datetime
import io
from collections.abc import Callable, Iterator
from typing import Any, TypeVar

import numpy as np
import pyarrow as pa

from lineproof.intake.formats import partition_keys
from lineproof.intake.pieces import Piece
from lineproof.problems import KnownProblem

Item = TypeVar("Item")
PIECE = 1 << 19  # rows read at a time


class TypedFormat:
    """A `Format` made from tables. A subclass gives `names` and `stretches`.

    Columns that the folders of the file give (`year=2000`) stand behind its own, as text. Where `marks_blank_rows`, the
    tables have one more column, which says of each row whether it has no value at all and so is no row.
    """

    place = "row"
    first_row = 1
    marks_blank_rows = False

    def __init__(self, file: str, label: str, reading: dict[str, Any]) -> None:
        self._file, self._label, self._reading = file, label, reading

    def names(self) -> list[str]:
        """The names of the file's own columns."""
        raise NotImplementedError

    def stretches(
        self, columns: list[int] | None
    ) -> Iterator[tuple[int | None, Callable[[], Iterator[pa.Table]]]]:
        """Parts of the file that can be read alone: number of rows (None where it is not known), and a function that
        reads the part. Tables have the columns at the given positions, in that order, or all."""
        raise NotImplementedError

    def header(self) -> list[str]:
        return [name.strip() for name in self.names()] + list(self._folders())

    def pieces(self, wanted: list[int]) -> Iterator[Piece]:
        n_own, folders = len(self.names()), list(self._folders().values())
        own = [position for position in wanted if position < n_own]
        row = self.first_row
        for _, read in self.stretches(own):
            for table in read():
                columns = {p: _whole(table.column(i)) for i, p in enumerate(own)}
                for position in set(wanted) - set(own):
                    columns[position] = pa.repeat(folders[position - n_own], len(table))
                yield self._without_blank_rows(columns, table, row)
                row += len(table)

    def _without_blank_rows(self, columns: dict[int, pa.Array], table: pa.Table, row: int) -> Piece:
        place = np.arange(row, row + len(table))
        if self.marks_blank_rows:
            kept = ~table.columns[-1].to_numpy()
            place = place[kept]
            columns = {
                position: array.filter(pa.array(kept)) for position, array in columns.items()
            }
        return Piece(columns, place, [])

    def rows(self, places: np.ndarray) -> Iterator[list[list[str]]]:
        row, done, folders = self.first_row, 0, list(self._folders().values())
        for n_rows, read in self.stretches(None):
            if done == len(places):
                return
            if n_rows is not None and places[done] >= row + n_rows:
                row += n_rows
                continue
            for table in read():
                upto = int(np.searchsorted(places, row + len(table)))
                found = table.take(places[done:upto] - row)
                own = found.columns[:-1] if self.marks_blank_rows else found.columns
                texts = [[self.text_of(value) for value in _values(column)] for column in own]
                if upto > done:
                    yield [[*fields, *folders] for fields in zip(*texts, strict=True)]
                row, done = row + len(table), upto

    def line_of(self, row: list[str]) -> str:
        line = io.StringIO()
        csv.writer(line, lineterminator="").writerow(row)
        return line.getvalue()

    def fields_of(self, row: list[str]) -> list[str]:
        return row

    @staticmethod
    def text_of(value: Any) -> str:
        """A value as a line of text shows it."""
        if isinstance(value, datetime.datetime) and value.time() == datetime.time():
            value = value.date()
        return "" if value is None else str(value)

    def _folders(self) -> dict[str, str]:
        own = set(self.names())
        return {key: text for key, text in partition_keys(self._label).items() if key not in own}


def _whole(column: pa.ChunkedArray) -> pa.Array:
    found = column.combine_chunks()
    return found.chunk(0) if isinstance(found, pa.ChunkedArray) else found


def _values(column: pa.ChunkedArray) -> list[Any]:
    """The values of a column; text where there are dates that Python does not know, such as infinity."""
    try:
        return column.to_pylist()
    except (OverflowError, ValueError):
        return column.cast(pa.string()).to_pylist()


def guarded(items: Iterator[Item]) -> Iterator[Item]:
    """The same items; whatever a library raises while it makes them becomes an OSError.

    Libraries for the formats of other programs raise errors of every class over a broken file.
    """
    while True:
        try:
            item = next(items)
        except StopIteration:
            return
        except KnownProblem:
            raise
        except Exception as error:
            said = str(error) or type(error).__name__
            raise OSError(said) from None
        yield item
