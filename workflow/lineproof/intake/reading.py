"""Read a raw file as text: every row with its line, and every row that does not fit its header set aside."""

from __future__ import annotations

import codecs
import csv
import io
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import duckdb
import numpy as np
import pandas as pd
import pyarrow as pa

from lineproof.problems import KnownProblem, Problem
from lineproof.schema import nearest

_CHUNK = 1 << 20


@dataclass(frozen=True)
class TextTable:
    """Rows as trimmed text under our own names, with `line`; `rejects` has line and reason of rows that do not fit.

    `n_read` counts both; `n_trimmed` counts values that had blanks around them.
    """

    label: str
    rows: pd.DataFrame
    rejects: pd.DataFrame
    n_read: int
    n_trimmed: int


def read_text(file: str, reading: dict[str, Any]) -> TextTable:
    """Read CSV, TSV (also .gz, .bz2, .zst) or Parquet, keeping the columns the study file names.

    Raises KnownProblem when the file is missing, empty, broken, not UTF-8, or lacks a column.
    """
    label = reading["label"]
    path = Path(file)
    if not path.is_file():
        raise _stop(label, "there is no such file", "check the path in the study file")
    if path.stat().st_size == 0:
        raise _stop(label, "the file is empty", "deliver it again")
    try:
        read = _read_parquet if path.suffix == ".parquet" else _read_csv
        table = read(file, reading)
    except (duckdb.Error, OSError, EOFError, pa.ArrowException) as error:
        said = str(error).strip().split("\n")[0]
        raise _stop(
            label, f"it cannot be read: {said}", "is it complete, and what its ending says?"
        ) from None
    if table.n_read == 0:
        raise _stop(label, "there is a header but no row", "deliver it again")
    return table


def _stop(where: str, found: str, change: str) -> KnownProblem:
    return KnownProblem(
        "The raw data cannot be used; nothing was written.", [Problem(where, found, change)]
    )


def raw_lines(file: str, wanted: np.ndarray) -> list[str]:
    """The text of the given lines (1-based, any order) of a text file, without line ends."""
    if Path(file).suffix == ".parquet":
        return ["" for _ in wanted]
    keep = set(wanted.tolist())
    found: dict[int, str] = {}
    with pa.input_stream(file, compression="detect") as stream:
        text = io.TextIOWrapper(io.BufferedReader(stream), encoding="utf-8-sig", newline="\n")
        for number, line in enumerate(text, start=1):
            if number in keep:
                found[number] = line.rstrip("\r\n")
    return [found[number] for number in wanted.tolist()]


def _read_csv(file: str, reading: dict[str, Any]) -> TextTable:
    label = reading["label"]
    separator = reading["separator"] or ("\t" if ".tsv" in Path(file).suffixes else ",")
    lines = _scan(file, label)
    header = _header(file, separator)
    wanted = _match(header, reading["columns"], label, separator, _first_line(file))
    connection = duckdb.connect(config={"threads": 1})
    types = ", ".join(f"'c{i}': 'VARCHAR'" for i in range(len(header)))
    shown = ", ".join(
        f"c{header.index(theirs)} AS {_quoted(ours)}" for ours, theirs in wanted.items()
    )
    rows = connection.execute(
        f"SELECT {shown} FROM read_csv(?, auto_detect=false, header=true, delim=?, quote='\"', escape='\"', "
        f"columns={{{types}}}, store_rejects=true, rejects_limit=0, max_line_size=1000000, null_padding=false)",
        [file, separator],
    ).df()
    rejects = connection.execute(
        "SELECT line, first(error_message ORDER BY error_message) AS reason "
        "FROM reject_errors GROUP BY line ORDER BY line"
    ).df()
    rejects["line"] = rejects["line"].astype("int64")
    return _finished(label, rows, rejects, lines)


def _read_parquet(file: str, reading: dict[str, Any]) -> TextTable:
    label = reading["label"]
    connection = duckdb.connect(config={"threads": 1})
    schema = connection.execute("DESCRIBE SELECT * FROM read_parquet(?)", [file]).fetchall()
    kinds = {name: kind for name, kind, *_ in schema}
    wanted = _match(list(kinds), reading["columns"], label, ",", "")
    shown = []
    for ours, theirs in wanted.items():
        is_date = kinds[theirs].startswith(("DATE", "TIMESTAMP"))
        as_text = (
            "strftime({}, '" + reading["dates"].replace("'", "") + "')"
            if is_date
            else "CAST({} AS VARCHAR)"
        )
        shown.append(f"{as_text.format(_quoted(theirs))} AS {_quoted(ours)}")
    rows = connection.execute(f"SELECT {', '.join(shown)} FROM read_parquet(?)", [file]).df()
    rejects = pd.DataFrame({"line": pd.Series(dtype="int64"), "reason": pd.Series(dtype=str)})
    return _finished(label, rows, rejects, np.arange(1, len(rows) + 1))


def _finished(
    label: str, rows: pd.DataFrame, rejects: pd.DataFrame, lines: np.ndarray
) -> TextTable:
    free = np.setdiff1d(lines, rejects["line"].to_numpy(), assume_unique=True)
    if len(free) != len(rows):
        found = f"{len(rows)} rows stand on {len(free)} lines, so some quoted field runs over several lines"
        raise _stop(label, found, "remove the line ends inside quotes")
    rows = rows.astype(str).where(rows.notna(), "")
    trimmed = rows.apply(lambda column: column.str.strip())
    n_trimmed = int((trimmed != rows).to_numpy().sum())
    return TextTable(label, trimmed.assign(line=free), rejects, len(rows) + len(rejects), n_trimmed)


def _quoted(name: str) -> str:
    return '"' + name.replace('"', '""') + '"'


def _scan(file: str, label: str) -> np.ndarray:
    """Numbers of the lines after the header that are not blank; stops at the first byte that is not UTF-8."""
    decoder = codecs.getincrementaldecoder("utf-8")()
    blank: list[int] = []
    position, number, ends_open, has_text = 0, 1, False, False
    with pa.input_stream(file, compression="detect") as stream:
        while chunk := stream.read(_CHUNK):
            try:
                decoder.decode(chunk)
            except UnicodeDecodeError as error:
                at = position + error.start
                raise _stop(
                    label, f"byte {at:,} is not UTF-8 text", "save the file as UTF-8"
                ) from None
            position += len(chunk)
            for part in _split(chunk):
                has_text = has_text or bool(part.strip())
                ends_open = not part.endswith(b"\n")
                if not ends_open:
                    if not has_text:
                        blank.append(number)
                    number, has_text = number + 1, False
    last = number if ends_open and has_text else number - 1
    return np.setdiff1d(np.arange(2, last + 1), np.array(blank, dtype="int64"), assume_unique=True)


def _split(chunk: bytes) -> list[bytes]:
    parts = chunk.split(b"\n")
    return [part + b"\n" for part in parts[:-1]] + ([parts[-1]] if parts[-1] else [])


def _first_line(file: str) -> str:
    with pa.input_stream(file, compression="detect") as stream:
        return stream.read(_CHUNK).decode("utf-8-sig", errors="replace").split("\n")[0].rstrip("\r")


def _header(file: str, separator: str) -> list[str]:
    return [name.strip() for name in next(csv.reader([_first_line(file)], delimiter=separator), [])]


def _match(
    header: list[str], columns: dict[str, str], label: str, separator: str, first_line: str
) -> dict[str, str]:
    """Our names to theirs, after checking that every column is there once."""
    problems = []
    absent = [theirs for theirs in columns.values() if theirs not in header]
    for theirs in absent:
        near = nearest(theirs, header)
        change = f"{near} The columns are: {', '.join(header)}"
        problems.append(Problem(label, f"there is no column {theirs!r}", change))
    if len(absent) == len(columns):
        others = {",": "comma", ";": "semicolon", "\t": "tab", "|": "bar"}
        better = max(others, key=first_line.count)
        if better != separator and first_line.count(better) > first_line.count(separator):
            found = f"its first line has no {others.get(separator, separator)} but many a {others[better]}"
            problems = [Problem(label, found, f"set separator: {better!r}")]
    for theirs in sorted({c for c in columns.values() if header.count(c) > 1}):
        problems.append(Problem(label, f"two columns are called {theirs!r}", "rename one of them"))
    if problems:
        raise KnownProblem("The raw data cannot be used; nothing was written.", problems)
    return dict(columns)
