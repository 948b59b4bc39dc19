"""Rows set aside: the first fault of each, with its reason in words."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence

import numpy as np
import pandas as pd
import pyarrow as pa

from lineproof.intake.blocks import RawFile
from lineproof.intake.faults import FAULTS, N_EXAMPLES, Tally, label_of

_NOT_SPLIT = 5
_COLUMNS = ["file", "line", "fault", "reason", "raw"]
_AT_ONCE = 200_000  # rows


class SetAside:
    """Everything set aside so far, as numbers: file, position in it, fault, and which reason.

    `noun` is what reasons call a period of the raw returns.
    """

    def __init__(self, noun: str = "month") -> None:
        self.noun = noun
        self._reasons: dict[str, int] = {}
        self._parts: list[tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]] = []

    def add(
        self, files: np.ndarray | int, positions: np.ndarray, fault: int, reasons: Sequence[str]
    ) -> None:
        """Set rows aside: `files` and `positions` say where they are, `reasons` why, one a row."""
        n = len(positions)
        known = self._reasons
        which = np.fromiter((known.setdefault(why, len(known)) for why in reasons), np.int64, n)
        files = np.broadcast_to(np.asarray(files, np.int32), n)
        self._parts.append((files, np.asarray(positions), np.full(n, fault, np.int64), which))

    def add_rejects(self, file: int, rejects: list[tuple[int, str]]) -> None:
        """Set aside rows whose fields never fitted the header."""
        if rejects:
            label = label_of(_NOT_SPLIT)
            positions = np.array([position for position, _ in rejects], np.int64)
            self.add(file, positions, _NOT_SPLIT, [f"{label}: {why}" for _, why in rejects])

    def counts(self, n_files: int) -> list[int]:
        """How many rows of each file."""
        found = np.zeros(n_files, np.int64)
        for files, *_ in self._parts:
            found += np.bincount(files, minlength=n_files)
        return found.tolist()

    def tables(self, files: Sequence[RawFile]) -> Iterator[pd.DataFrame]:
        """File, line, fault, reason and raw text of every row, by file and line, some at a time."""
        of_file, position, fault, which = self._sorted()
        reasons = pa.array(list(self._reasons), pa.string())
        yield _table([], [], [], pa.array([], pa.string()), [])
        for number, file in enumerate(files):
            first, last = np.searchsorted(of_file, [number, number + 1])
            if first == last:
                continue
            at = first
            for texts in _batched(file.raw(position[first:last])):
                rows = slice(at, at + len(texts))
                line = file.line(position[rows])
                yield _table(
                    [file.label] * len(texts), line, fault[rows], reasons.take(which[rows]), texts
                )
                at += len(texts)
            if at != last:
                raise AssertionError(f"{file.label}: {last - first} rows aside, {at - first} found")

    def count(self, files: Sequence[RawFile], tally: Tally) -> None:
        """Add to the tally how often each fault was met, with the first places."""
        of_file, position, fault, _ = self._sorted()
        for number in np.unique(fault).tolist():
            rows = np.flatnonzero(fault == number)
            examples = []
            for row in rows[:N_EXAMPLES]:
                file = files[of_file[row]]
                named = f"{file.label}, " if len(files) > 1 else ""
                examples.append(f"{named}{file.place} {file.line(position[[row]])[0]}")
            # A fault that is otherwise flagged counts more than rows: say how many are set aside.
            kinds = {} if FAULTS[number].answer == "set aside" else {"set aside": len(rows)}
            tally.add(number, len(rows), examples, kinds)

    def first_of_each(self, files: Sequence[RawFile]) -> list[tuple[int, int, str, str]]:
        """Fault, how often, place and reason of the first row, for each fault met."""
        of_file, position, fault, which = self._sorted()
        reasons, found = list(self._reasons), []
        for number in np.unique(fault).tolist():
            rows = np.flatnonzero(fault == number)
            file = files[of_file[rows[0]]]
            place = f"{file.place} {file.line(position[rows[:1]])[0]}"
            found.append((number, len(rows), place, reasons[which[rows[0]]]))
        return found

    def _sorted(self) -> list[np.ndarray]:
        if not self._parts:
            return [np.array([], np.int64)] * 4
        of_file, position, fault, which = (
            np.concatenate(column) for column in zip(*self._parts, strict=True)
        )
        order = np.lexsort((position, of_file))
        found = tuple(column[order] for column in (of_file, position, fault, which))
        self._parts = [found]  # so that the next who asks finds them in order
        return list(found)


def _batched(batches: Iterator[list[str]]) -> Iterator[list[str]]:
    """The same texts in batches that are not small, so that a table costs little."""
    held: list[str] = []
    for batch in batches:
        held += batch
        if len(held) >= _AT_ONCE:
            yield held
            held = []
    if held:
        yield held


def _table(
    file: list[str], line: Sequence[int], fault: Sequence[int], reason: pa.Array, raw: list[str]
) -> pd.DataFrame:
    columns = {
        "file": pa.array(file, pa.string()),
        "line": pa.array(np.asarray(line, np.int64)),
        "fault": pa.array(np.asarray(fault, np.int64)),
        "reason": reason,
        "raw": pa.array(raw, pa.string()),
    }
    return pa.table({name: columns[name] for name in _COLUMNS}).to_pandas()


class FirstFault:
    """The first fault noted of each row of a block or chunk, so that a row is set aside once.

    `positions` (n_rows,) and `files` say where the rows are; `found` marks those that have a fault.
    """

    def __init__(self, aside: SetAside, files: np.ndarray | int, positions: np.ndarray) -> None:
        self._aside, self._files, self._positions = aside, files, positions
        self.found = np.zeros(len(positions), bool)

    def note(
        self,
        mask: np.ndarray,
        number: int,
        said: Callable[[np.ndarray], Sequence[str]] | None = None,
    ) -> None:
        """Set aside those rows of a mask (n_rows,) that have no fault yet.

        The reason is the label of the fault, followed by what `said` gives for the rows' indices.
        """
        new = np.flatnonzero(mask & ~self.found)
        if len(new) == 0:
            return
        self.found[new] = True
        label = label_of(number, self._aside.noun)
        reasons = [label] * len(new) if said is None else [f"{label}: {text}" for text in said(new)]
        files = self._files if np.isscalar(self._files) else self._files[new]
        self._aside.add(files, self._positions[new], number, reasons)
