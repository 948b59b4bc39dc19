"""Read a raw file as text: every row with its place, and every row that does not fit its header."""

from __future__ import annotations

import csv
import io
import json
from dataclasses import dataclass
from difflib import get_close_matches
from itertools import chain
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pyarrow as pa
import pyarrow.compute as pc
import pyarrow.csv
import pyarrow.parquet as pq

from lineproof.intake.lines import Block, find_misfits, read_blocks
from lineproof.intake.stopping import UNUSABLE, stop
from lineproof.problems import KnownProblem, Problem

_SEPARATORS = {",": "comma", ";": "semicolon", "\t": "tab", "|": "bar"}


@dataclass(frozen=True)
class TextTable:
    """A raw file as text.

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


def read_text(file: str, reading: dict[str, Any]) -> TextTable:
    """Read CSV or TSV (also .gz, .bz2, .zst) or Parquet, keeping the columns the study file names.

    Raises KnownProblem when the file is missing, empty, broken, not UTF-8 or lacks a column.
    """
    label, path = reading["label"], Path(file)
    if not path.is_file():
        raise stop(label, "there is no such file", "check the path in the study file")
    if path.stat().st_size == 0:
        raise stop(label, "the file is empty", "deliver it again")
    try:
        table = _read_parquet(file, reading) if _is_parquet(file) else _read_csv(file, reading)
    except (OSError, pa.ArrowException) as error:
        said = str(error).strip().split("\n")[0].rstrip(".")
        change = "is it complete, and what its ending says?"
        raise stop(label, f"it cannot be read: {said}", change) from None
    if table.n_read == 0:
        raise stop(label, "there is a header but no row", "deliver it again")
    return table


def raw_rows(file: str, wanted: np.ndarray) -> list[str]:
    """The text of the given lines (ascending, as in `TextTable.line`), without line ends.

    A row of Parquet is written as a line of CSV.
    """
    if len(wanted) == 0:
        return []
    if _is_parquet(file):
        rows = pq.read_table(file).take(wanted - 1).to_pylist()
        return [_as_line(row.values()) for row in rows]
    found: list[str] = []
    for block in read_blocks(file, file):
        upto = np.searchsorted(wanted, block.first + len(block))
        found += [block.line(index) for index in wanted[len(found) : upto] - block.first]
        if upto == len(wanted):
            break
    return found


def _as_line(values: Any) -> str:
    line = io.StringIO()
    csv.writer(line, lineterminator="").writerow(values)
    return line.getvalue()


def _is_parquet(file: str) -> bool:
    return Path(file).suffix.lower() == ".parquet"


def _read_csv(file: str, reading: dict[str, Any]) -> TextTable:
    label = reading["label"]
    separator = _separator(file, reading)
    blocks = read_blocks(file, label)
    first = next(blocks, None)
    if first is None:
        raise stop(label, "the file is empty", "deliver it again")
    header = next(csv.reader([first.line(0)], delimiter=separator), [])
    if not any(name.strip() for name in header):
        raise stop(f"{label}, line 1", "there are no column names", "give a header in line 1")
    wanted = _match([name.strip() for name in header], reading, separator, first.line(0))
    texts, lines, rejects = [], [], []
    for block in chain([first], blocks):
        blank, reasons = find_misfits(block, separator, len(header))
        if block is first:
            blank[0] = True  # the header is no row
            reasons.pop(0, None)
        fits = ~blank
        fits[list(reasons)] = False
        texts.append(_split(block, fits, separator, len(header), sorted(set(wanted.values()))))
        lines.append(np.flatnonzero(fits) + block.first)
        rejects += [(block.first + index, said) for index, said in reasons.items()]
    columns = _named(pa.concat_tables(texts), wanted)
    return _as_table(label, "line", columns, np.concatenate(lines), rejects)


def _separator(file: str, reading: dict[str, Any]) -> str:
    given = reading["separator"]
    if given is None:
        return "\t" if ".tsv" in Path(file.lower()).suffixes else ","
    if not given.isascii() or given in '"\r\n':
        found = f"the character {given!r} cannot part the fields of a file"
        raise stop(f"{reading['label']}, separator", found, "use , or ; or | or a tab")
    return given


def _split(
    block: Block, fits: np.ndarray, separator: str, n_fields: int, wanted: list[int]
) -> pa.Table:
    """The wanted fields, by position, of the lines that fit: text columns named by position."""
    names = [str(position) for position in range(n_fields)]
    kept = [str(position) for position in wanted]
    if not fits.any():
        return pa.table({name: pa.array([], pa.string()) for name in kept})
    text = block.only(fits)
    table = pyarrow.csv.read_csv(
        pa.BufferReader(text),
        read_options=pyarrow.csv.ReadOptions(column_names=names, block_size=len(text)),
        parse_options=pyarrow.csv.ParseOptions(delimiter=separator),
        convert_options=pyarrow.csv.ConvertOptions(
            column_types=dict.fromkeys(names, pa.string()), include_columns=kept
        ),
    )
    if len(table) != fits.sum():
        raise AssertionError(f"{fits.sum()} lines gave {len(table)} rows")
    return table


def _read_parquet(file: str, reading: dict[str, Any]) -> TextTable:
    names = pq.read_schema(file).names
    wanted = _match(names, reading, None, "")
    table = pq.read_table(file, columns=sorted({names[position] for position in wanted.values()}))
    columns = {
        ours: _as_text(table[names[position]], reading["dates"], ours in _INTEGERS)
        for ours, position in wanted.items()
    }
    return _as_table(reading["label"], "row", columns, np.arange(1, len(table) + 1), [])


_INTEGERS = ("security", "date")  # whole numbers that missing values may have turned to floats


def _as_text(column: pa.ChunkedArray, dates: str, is_integer: bool) -> pa.ChunkedArray:
    """A typed column as it would stand in a CSV file, missing values as empty text."""
    if pa.types.is_date(column.type) or pa.types.is_timestamp(column.type):
        column = pc.strftime(column.cast(pa.timestamp("s"), safe=False), format=dates)
    elif pa.types.is_floating(column.type):
        column = pc.if_else(pc.is_nan(column), None, column)
        if is_integer and pc.all(pc.equal(column, pc.floor(column))).as_py():
            column = column.cast(pa.int64())
    return pc.fill_null(column.cast(pa.string()), "")


def _named(table: pa.Table, wanted: dict[str, int]) -> dict[str, pa.ChunkedArray]:
    return {ours: table[str(position)] for ours, position in wanted.items()}


def _as_table(
    label: str,
    place: str,
    columns: dict[str, pa.ChunkedArray],
    lines: np.ndarray,
    rejects: list[tuple[int, str]],
) -> TextTable:
    trimmed = {name: pc.utf8_trim_whitespace(column) for name, column in columns.items()}
    n_trimmed = sum(
        pc.sum(pc.not_equal(trimmed[name], column)).as_py() or 0 for name, column in columns.items()
    )
    rows = pa.table(trimmed).to_pandas().assign(line=lines.astype(np.int64))
    frame = pd.DataFrame(
        {
            "line": pd.Series([line for line, _ in rejects], dtype="int64"),
            "reason": pd.Series([said for _, said in rejects], dtype=str),
        }
    )
    return TextTable(label, place, rows, frame, n_trimmed)


def _match(
    header: list[str], reading: dict[str, Any], separator: str | None, first_line: str
) -> dict[str, int]:
    """The position of each of our columns, after checking that every name is there, and once."""
    label, columns = reading["label"], reading["columns"]
    absent = [theirs for theirs in dict.fromkeys(columns.values()) if theirs not in header]
    if separator is not None and len(header) == 1 and absent:
        _check_separator(label, separator, first_line)
    problems = [
        Problem(label, f"there is no column {theirs!r}", _columns_found(theirs, header))
        for theirs in absent
    ]
    twice = sorted({name for name in header if name and header.count(name) > 1})
    problems += [
        Problem(label, f"two columns are called {name!r}", "rename one of them") for name in twice
    ]
    if problems:
        raise KnownProblem(UNUSABLE, problems)
    return {ours: header.index(theirs) for ours, theirs in columns.items()}


def _columns_found(absent: str, header: list[str]) -> str:
    close = get_close_matches(absent, header, n=1)
    near = f"did you mean {close[0]}? " if close else ""
    return f"{near}The columns are: {', '.join(header)}"


def _check_separator(label: str, separator: str, first_line: str) -> None:
    better = max(_SEPARATORS, key=first_line.count)
    if first_line.count(better):
        found = (
            f"its header has no {_SEPARATORS.get(separator, separator)} but a {_SEPARATORS[better]}"
        )
        raise stop(label, found, f"set separator: {json.dumps(better)}")


class _Old:
    def __init__(self, file, reading):
        self.file, self.reading, self.label = file, reading, reading["label"]
        self.place = "row" if _is_parquet(file) else "line"

    def blocks(self):
        from lineproof.intake.blocks import RawBlock

        t = read_text(self.file, self.reading)
        cols = {c: pa.array(t.rows[c].tolist(), pa.string()) for c in t.rows if c != "line"}
        yield RawBlock(
            cols,
            t.rows["line"].to_numpy(),
            list(t.rejects.itertuples(index=False, name=None)),
            t.n_trimmed,
        )

    def line(self, p):
        return p

    def raw(self, p):
        yield raw_rows(self.file, p)


def open_files(files, reading):
    return [_Old(f, reading) for f in files]
