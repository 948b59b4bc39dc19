"""Text files with separators: CSV, TSV and the like."""

from __future__ import annotations

import csv
from collections.abc import Iterator
from pathlib import PurePath
from typing import Any

import numpy as np
import pyarrow as pa
import pyarrow.csv

from lineproof.ahead import ahead
from lineproof.intake.decoding import member_name
from lineproof.intake.headers import check_separator
from lineproof.intake.lines import Block, Misfits, find_misfits, pick_lines, read_blocks
from lineproof.intake.pieces import Piece
from lineproof.intake.stopping import stop

_SPLIT = 1 << 20  # bytes that one thread splits at a time


class TextFormat:
    """A `Format` whose rows are lines, numbered from 1, the header being line 1."""

    place = "line"

    def __init__(self, file: str, label: str, reading: dict[str, Any]) -> None:
        self._file, self._label = file, label
        self._encoding = reading.get("encoding")
        self._asked = set(reading["columns"].values())
        self._separator = _separator(member_name(file, label), label, reading.get("separator"))

    def header(self) -> list[str]:
        first = next(self._blocks(), None)
        if first is None:
            raise stop(self._label, "the file is empty", "deliver it again")
        line = _first_line(first).decode("utf-8")
        where = f"{self._label}, line 1"
        if "\0" in line:
            raise stop(
                where,
                "it holds zero bytes, as UTF-16 text does",
                "set encoding:, or save it as UTF-8",
            )
        if "\r" in line:
            found = "its lines end with carriage returns alone"
            raise stop(where, found, "save it with line feeds, as other programs do")
        names = [name.strip() for name in self._fields(line)]
        if not any(names):
            raise stop(where, "there are no column names", "give a header in line 1")
        check_separator(self._label, self._separator, line, names, self._asked)
        return names

    def pieces(self, wanted: list[int]) -> Iterator[Piece]:
        n_fields = len(self.header())
        for text, first, misfits in ahead(self._checked(n_fields)):
            place = np.delete(np.arange(first, first + misfits.n_lines), misfits.index)
            columns = self._split(misfits.fitting(text), misfits, n_fields, wanted, len(place))
            yield Piece(columns, place, misfits.rejects(first, n_fields))

    def rows(self, places: np.ndarray) -> Iterator[list[str]]:
        yield from pick_lines(self._blocks(), places)

    def line_of(self, row: str) -> str:
        return row

    def fields_of(self, row: str) -> list[str]:
        return self._fields(row)

    def _blocks(self) -> Iterator[Block]:
        return read_blocks(self._file, self._label, self._encoding)

    def _fields(self, line: str) -> list[str]:
        try:
            return next(csv.reader([line], delimiter=self._separator), [])
        except csv.Error as error:
            found = f"its fields cannot be told apart: {error}"
            raise stop(f"{self._label}, line 1", found, "is it text?") from None

    def _checked(self, n_fields: int) -> Iterator[tuple[bytes, int, Misfits]]:
        """The lines below the header, as text, number of its first line, and misfits."""
        for block in self._blocks():
            text, first = block.text, block.first
            if first == 1:
                text, first = text[len(_first_line(block)) :], 2
                text = text.removeprefix(b"\r").removeprefix(b"\n")
            if text:
                yield text, first, find_misfits(text, self._separator, n_fields)

    def _split(
        self, text: bytes, misfits: Misfits, n_fields: int, wanted: list[int], n_rows: int
    ) -> dict[int, pa.Array]:
        if not n_rows:
            return {position: pa.array([], pa.string()) for position in wanted}
        names = [str(position) for position in range(n_fields)]
        kept = [str(position) for position in wanted]
        table = pyarrow.csv.read_csv(
            pa.BufferReader(text),
            read_options=pyarrow.csv.ReadOptions(
                column_names=names, block_size=max(_SPLIT, 2 * misfits.longest)
            ),
            parse_options=pyarrow.csv.ParseOptions(delimiter=self._separator),
            convert_options=pyarrow.csv.ConvertOptions(
                column_types=dict.fromkeys(kept, pa.string()),
                include_columns=kept,
                check_utf8=False,
            ),
        )
        if len(table) != n_rows:
            raise AssertionError(f"{n_rows} lines gave {len(table)} rows")
        return {int(name): table[name].combine_chunks() for name in kept}


def _first_line(block: Block) -> bytes:
    return block.text.split(b"\n", 1)[0].removesuffix(b"\r")


def _separator(name: str, label: str, given: str | None) -> str:
    if given is None:
        return "\t" if {".tsv", ".tab"} & set(PurePath(name.lower()).suffixes) else ","
    if not given.isascii() or given in '"\r\n\0':
        found = f"the character {given!r} cannot part the fields of a file"
        raise stop(f"{label}, separator", found, "use , or ; or | or a tab")
    return given
