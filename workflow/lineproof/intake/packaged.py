"""Stata files, SAS data sets and Excel workbooks, some rows at a time."""

from __future__ import annotations

import datetime
import os
from collections.abc import Callable, Iterator
from functools import cached_property, partial
from itertools import islice
from pathlib import Path
from typing import Any

import pandas as pd
import pyarrow as pa

from lineproof.intake.stopping import stop
from lineproof.intake.typedfile import TypedFormat, guarded
from lineproof.schema import nearest

Stretches = Iterator[tuple[int | None, Callable[[], Iterator[pa.Table]]]]
_STATA, _STATA_END = b"<stata_dta>", b"</stata_dta>"
_ROWS = 1 << 17  # rows read at a time


class _PackagedFormat(TypedFormat):
    """A file of a program whose numbers are neither whole nor not."""

    @staticmethod
    def text_of(value: Any) -> str:
        whole = isinstance(value, float) and value.is_integer()
        return TypedFormat.text_of(int(value) if whole else value)


class _FrameFormat(_PackagedFormat):
    """A file that pandas reads chunk by chunk."""

    def _frames(self, n_rows: int) -> Iterator[pd.DataFrame]:
        raise NotImplementedError

    @cached_property
    def _names(self) -> list[str]:
        first = next(guarded(self._frames(1)), None)
        if first is None:
            raise stop(self._label, "there is a header but no row", "deliver it again")
        return [str(name) for name in first.columns]

    def names(self) -> list[str]:
        return self._names

    def stretches(self, columns: list[int] | None) -> Stretches:
        yield None, partial(self._tables, columns)

    def _tables(self, columns: list[int] | None) -> Iterator[pa.Table]:
        for frame in guarded(self._frames(_ROWS)):
            chosen = frame if columns is None else frame.iloc[:, columns]
            arrays = [_as_array(chosen.iloc[:, at]) for at in range(chosen.shape[1])]
            yield _table(arrays, len(frame))


class StataFormat(_FrameFormat):
    """A .dta file. Months (%tm) are their first day; labelled values are their numbers; .a to .z are missing."""

    def _frames(self, n_rows: int) -> Iterator[pd.DataFrame]:
        self._check_end()
        with pd.read_stata(
            self._file, chunksize=n_rows, convert_categoricals=False, preserve_dtypes=False
        ) as reader:
            yield from reader

    def _check_end(self) -> None:
        """The rows of a file that is cut off may be whole; its end mark is not."""
        with open(self._file, "rb") as stream:
            is_marked = stream.read(len(_STATA)) == _STATA
            stream.seek(-min(len(_STATA_END), Path(self._file).stat().st_size), os.SEEK_END)
            if is_marked and stream.read() != _STATA_END:
                raise OSError("its end mark is missing")


class SasFormat(_FrameFormat):
    """A .sas7bdat file."""

    def _frames(self, n_rows: int) -> Iterator[pd.DataFrame]:
        with pd.read_sas(
            self._file, format="sas7bdat", encoding="infer", chunksize=n_rows
        ) as reader:
            yield from reader


def _as_array(column: pd.Series) -> pa.Array:
    """Numbers as float64, whatever a chunk of the column holds; dates as timestamps; everything else as text."""
    if pd.api.types.is_numeric_dtype(column):
        return pa.array(column.to_numpy("float64"), from_pandas=True)
    if pd.api.types.is_datetime64_any_dtype(column):
        return pa.array(column.astype("datetime64[s]"), from_pandas=True)
    if isinstance(column.dtype, pd.StringDtype):
        return pa.array(column, pa.string(), from_pandas=True)
    return _cells(column.tolist(), "%Y-%m-%d")


def _table(arrays: list[pa.Array], n_rows: int) -> pa.Table:
    names = [str(position) for position in range(len(arrays))]
    if not arrays:
        return pa.table({"": pa.nulls(n_rows)}).select([])
    return pa.Table.from_arrays(arrays, names=names)


def _cells(values: list[Any], dates: str) -> pa.Array:
    """Cells of one column: float64 or timestamps where all that are given are such, else text."""
    given = [
        value for value in values if value is not None and value is not pd.NaT and value == value
    ]
    if all(_is_number(value) for value in given):
        numbers = [float(value) if _is_number(value) else None for value in values]
        return pa.array(numbers, pa.float64(), from_pandas=True)
    if all(isinstance(value, datetime.date) for value in given):
        whole = [
            _moment(v) if isinstance(v, datetime.date) and v is not pd.NaT else None for v in values
        ]
        return pa.array(whole, pa.timestamp("s"))
    kept = set(map(id, given))
    return pa.array([_text(v, dates) if id(v) in kept else "" for v in values], pa.string())


def _is_number(value: Any) -> bool:
    return isinstance(value, int | float) and not isinstance(value, bool) and value == value


def _moment(value: datetime.date) -> datetime.datetime:
    if isinstance(value, datetime.datetime):
        return value.replace(microsecond=0, tzinfo=None)
    return datetime.datetime(value.year, value.month, value.day)


def _text(value: Any, dates: str) -> str:
    if isinstance(value, bytes):
        return value.decode("latin-1")
    if isinstance(value, bool):
        return str(value).lower()
    if isinstance(value, datetime.date):
        return value.strftime(dates)
    if isinstance(value, float) and value.is_integer() and abs(value) < 2**53:
        return str(int(value))
    return str(value)


class ExcelFormat(_PackagedFormat):
    """One sheet of an .xlsx workbook, the first unless `sheet` names another; rows are numbered as the sheet does.

    Row 1 is the header. A cell with a formula has the value that was last computed. A row without any value is no
    row. In a column that holds numbers and text everything is text.
    """

    first_row = 2
    marks_blank_rows = True

    def names(self) -> list[str]:
        return self._names

    @cached_property
    def _names(self) -> list[str]:
        first = next(guarded(self._rows()), ())
        names = ["" if cell is None else _text(cell, self._reading["dates"]) for cell in first]
        while names and not names[-1].strip():
            names.pop()
        if not names:
            where = f"{self._label}, row 1"
            raise stop(where, "there are no column names", "give a header in row 1")
        return names

    def stretches(self, columns: list[int] | None) -> Stretches:
        asked = list(range(len(self.names()))) if columns is None else columns
        yield None, partial(self._tables, asked)

    def _tables(self, asked: list[int]) -> Iterator[pa.Table]:
        rows = guarded(self._rows())
        next(rows, None)
        n_most = max(asked, default=-1) + 1
        comma = self._reading.get("decimal") == "comma"
        while part := list(islice(rows, _ROWS)):
            blank = pa.array([not any(cell not in (None, "") for cell in row) for row in part])
            part = [(*row, *[None] * (n_most - len(row))) for row in part]
            columns = [self._column([row[at] for row in part], comma) for at in asked]
            yield _table([*columns, blank], len(part))

    def _column(self, values: list[Any], comma: bool) -> pa.Array:
        array = _cells(values, self._reading["dates"])
        if comma and pa.types.is_string(array.type):
            # A number among texts must look like the others do.
            values = [str(v).replace(".", ",") if _is_number(v) else v for v in values]
            array = _cells(values, self._reading["dates"])
        return array

    def _rows(self) -> Iterator[tuple]:
        from openpyxl import load_workbook

        book = load_workbook(self._file, read_only=True, data_only=True, keep_links=False)
        try:
            sheet = self._sheet(book)
            sheet.reset_dimensions()  # what the file says of its size may be wrong
            yield from sheet.iter_rows(values_only=True)
        finally:
            book.close()

    def _sheet(self, book: Any) -> Any:
        wanted, names = self._reading.get("sheet"), [sheet.title for sheet in book.worksheets]
        if wanted is None and names:
            return book.worksheets[0]
        if wanted not in names:
            found = f"there is no sheet {wanted!r}" if names else "there is no sheet"
            raise stop(self._label, found, nearest(wanted or "", names))
        return book[wanted]
