"""The first pass over raw rows: each is parsed, then kept in a sorted run or set aside with its reason."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
import pyarrow as pa
from numba import njit

from lineproof.ahead import ahead
from lineproof.intake.blocks import RawBlock, RawFile
from lineproof.intake.faults import Tally
from lineproof.intake.runs import Columns, Names, SortedRuns
from lineproof.intake.setting_aside import FirstFault, SetAside
from lineproof.intake.unread_dates import UnreadDates
from lineproof.intake.values import (
    Numbers,
    as_decimal,
    as_digits,
    settled_texts,
    to_days,
    to_numbers,
)
from lineproof.intake.written_numbers import WrittenNumbers
from lineproof.store import Scratch

NUMERIC = ("return", "final_return", "size", "price")
_RETURNS = ("return", "final_return")
_UNDECLARED_CODES = (-66.0, -77.0, -88.0, -99.0, -999.0)
_LEAST = {
    "total": -1.0,
    "excess": -1.03,
}  # what a total loss is in excess of the highest plausible rate
_FIRST_DAY = np.datetime64("1800-01-01")
_N_DAYS = 401 * 366


@dataclass
class Taken:
    """What the first pass leaves: sound rows in `runs`, the rest in `aside`, and counts.

    `texts` holds the distinct texts of each further column; `n_read` counts rows by file; `rows_by_day` (n_days,)
    counts rows from 1 January 1800, sound or not.
    """

    runs: SortedRuns
    aside: SetAside
    tally: Tally
    comma: WrittenNumbers
    texts: dict[str, Names]
    n_read: list[int] = field(default_factory=list)
    rows_by_day: np.ndarray = field(default_factory=lambda: np.zeros(_N_DAYS, np.int64))
    names: Names = field(default_factory=Names)
    last_day: np.ndarray = field(default_factory=lambda: np.zeros(0, np.int32))
    unread_dates: UnreadDates = field(default_factory=UnreadDates)

    def last_seen(self, names: Sequence[str]) -> np.ndarray:
        """The last day of each security in the raw files, rows set aside included: datetime64[D]."""
        return self.last_day[self.names.codes(list(names))].astype("datetime64[D]")

    @property
    def n_dated(self) -> int:
        """How many rows have a date."""
        return int(self.rows_by_day.sum())

    @property
    def days(self) -> tuple[np.ndarray, np.ndarray]:
        """The days that have rows, ascending, and how many rows each has."""
        at = np.flatnonzero(self.rows_by_day)
        return _FIRST_DAY + at, self.rows_by_day[at]


Evidence = Callable[[np.ndarray, np.ndarray], None]


def take_rows(
    files: Sequence[RawFile], reading: dict[str, Any], scratch: Scratch, see: Evidence
) -> Taken:
    """Read every row of the raw files.

    `see` is shown the day and the decimal return of every row before anything is set aside.

    Raises KnownProblem when a file cannot be used as a whole.
    """
    further = [name for name in reading["columns"] if name not in {"security", "date", *NUMERIC}]
    comma = WrittenNumbers(reading)
    texts = {name: Names() for name in further}
    noun = reading.get("noun", "month")
    taken = Taken(SortedRuns(scratch), SetAside(noun), Tally(noun), comma, texts)
    for number, file in enumerate(files):
        taken.n_read.append(0)
        for block in ahead(file.blocks()):
            taken.n_read[number] += block.n_read
            taken.tally.add(7, block.n_trimmed)
            taken.aside.add_rejects(number, block.rejects)
            if len(block.position) == 0:
                continue
            _take_block(block, number, reading, taken, see)
    comma.judge()
    taken.unread_dates.judge(reading)
    return taken


def _take_block(
    block: RawBlock, number: int, reading: dict[str, Any], taken: Taken, see: Evidence
) -> None:
    faults = FirstFault(taken.aside, number, block.position)
    code, names = _securities(block.columns["security"], taken)
    faults.note(_is_blank(code, names), 23)
    day = to_days(block.columns["date"], reading["dates"])
    faults.note(np.isnat(day), 8, _written(block, "date"))
    taken.unread_dates.add(block.columns["date"], np.isnat(day))
    columns: Columns = {
        "day": day.astype(np.int64).clip(-(2**31), 2**31 - 1).astype(np.int32),
        "position": block.position,
        "file": np.full(len(day), number, np.int16),
    }
    for name in NUMERIC:
        if name in block.columns:
            columns |= _numbers(name, block, reading, taken, faults)
    if "return_" in columns:
        see(day, columns["return_"])
    for name, known in taken.texts.items():
        columns[name] = _texts(block.columns[name], reading, known)
    _count_days(columns["day"], taken)
    known = taken.names.codes(names)
    taken.last_day = _grown(taken.last_day, len(taken.names))
    _note_last(code, columns["day"], known, taken.last_day)
    if faults.found.any():
        sound = ~faults.found
        code, columns = code[sound], {name: values[sound] for name, values in columns.items()}
    taken.runs.add(code, names, columns)


def _securities(column: pa.Array, taken: Taken) -> tuple[np.ndarray, list[str]]:
    """A code for each row into names that have lost their quotes; the names are unique."""
    coded = column.dictionary_encode()
    written = [as_digits(value) for value in coded.dictionary.to_pylist()]
    clean = [name.strip("\"'").strip() for name in written]
    codes = coded.indices.fill_null(len(clean)).to_numpy(zero_copy_only=False)
    if coded.null_count:
        clean, written = [*clean, ""], [*written, ""]
    names = list(dict.fromkeys(clean))
    place = {name: at for at, name in enumerate(names)}
    if changed := [at for at in range(len(clean)) if clean[at] != written[at]]:
        n_each = np.bincount(codes, minlength=len(clean))
        taken.tally.add(7, n_each[changed].sum())
    code = np.array([place[name] for name in clean], np.int32)[codes]
    return code, names


def _is_blank(code: np.ndarray, names: list[str]) -> np.ndarray:
    return code == names.index("") if "" in names else np.zeros(len(code), bool)


def _numbers(
    name: str, block: RawBlock, reading: dict[str, Any], taken: Taken, faults: FirstFault
) -> Columns:
    """The values of a numeric column under our name, with the codes for missing beside a return."""
    is_return = name in _RETURNS
    numbers = to_numbers(
        block.columns[name],
        reading["missing"],
        thousands=not is_return,
        decimal=reading.get("decimal", "point"),
    )
    if name == "return":
        taken.comma.add(block.columns[name], numbers.is_text, numbers.code >= 0)
    theirs = reading["columns"].get(name)  # none in a wide file, whose raw rows name the column
    said = _written(block, name, f"{theirs} is " if theirs else "")
    faults.note(numbers.is_text, 13, said)
    faults.note(numbers.is_not_finite, 14, said)
    taken.tally.add(7, numbers.had_thousands.sum())
    if not is_return:
        return {name: numbers.value}
    decimal = as_decimal(numbers.value, reading["unit"])
    _note_below_all(decimal, numbers, said, faults, _LEAST[reading.get("are", "total")])
    return {"return_": decimal, "code": numbers.code} if name == "return" else {name: decimal}


def _note_below_all(
    decimal: np.ndarray,
    numbers: Numbers,
    said: Callable[[np.ndarray], list[str]],
    faults: FirstFault,
    least: float,
) -> None:
    """Set aside returns below −100 %, naming those that look like a code nobody declared."""
    below = decimal < least
    if not below.any():
        return
    hint = ", which often stands for a missing value; if so, add it to missing:"
    coded = below & np.isin(numbers.value, _UNDECLARED_CODES)
    faults.note(coded, 15, lambda rows: [text + hint for text in said(rows)])
    faults.note(below, 15, said)


def _written(block: RawBlock, name: str, before: str = "") -> Callable[[np.ndarray], list[str]]:
    """What the file has in a column of some rows, by index, in quotes."""

    def said(rows: np.ndarray) -> list[str]:
        return [
            f"{before}{value!r}" for value in block.columns[name].take(pa.array(rows)).to_pylist()
        ]

    return said


def _texts(column: pa.Array, reading: dict[str, Any], known: Names) -> np.ndarray:
    """Codes into the distinct texts of a further column; a code for missing is the empty text."""
    coded = column.dictionary_encode()
    texts = [as_digits(value) for value in coded.dictionary.to_pylist()]
    is_text = pa.types.is_string(column.type) or pa.types.is_large_string(column.type)
    decimal = reading.get("decimal", "point") if is_text else "point"
    codes = known.codes([*settled_texts(texts, reading["missing"], decimal), ""])
    return codes[coded.indices.fill_null(len(texts)).to_numpy(zero_copy_only=False)]


def _count_days(day: np.ndarray, taken: Taken) -> None:
    from_first = day.astype(np.int64) - _FIRST_DAY.astype(np.int64)
    known = from_first[(from_first >= 0) & (from_first < _N_DAYS)]
    if len(known):
        counts = np.bincount(known)
        taken.rows_by_day[: len(counts)] += counts


def _grown(values: np.ndarray, n: int) -> np.ndarray:
    more = np.full(max(n - len(values), 0), np.iinfo(np.int32).min, np.int32)
    return np.concatenate([values, more])


@njit(cache=True, nogil=True)
def _note_last(code: np.ndarray, day: np.ndarray, known: np.ndarray, last: np.ndarray) -> None:
    for row in range(len(code)):
        name = known[code[row]]
        if day[row] > last[name]:
            last[name] = day[row]
