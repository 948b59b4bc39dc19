"""Sort more rows than memory holds by security and day: sorted runs, merged a stretch of securities at a time."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field

import numpy as np
from numba import njit

from lineproof.store import Scratch

Columns = dict[str, np.ndarray]
_ROWS = 1 << 20  # of a run: many small ones would be read back in as many small parts


class Names:
    """Distinct texts in the order they were first met, and their codes."""

    def __init__(self) -> None:
        self._codes: dict[str, int] = {}

    def __len__(self) -> int:
        return len(self._codes)

    def codes(self, texts: list[str]) -> np.ndarray:
        """The code of each text, int32; texts not met before get the next ones."""
        known = self._codes
        return np.fromiter((known.setdefault(t, len(known)) for t in texts), np.int32, len(texts))

    def texts(self) -> list[str]:
        """The text of each code."""
        return list(self._codes)


@dataclass
class SortedRuns:
    """Rows in runs that are each sorted by security; later runs hold later rows of the raw files.

    Every column is one NumPy array a run. Runs lie in `scratch`, on disk where they are many.
    """

    scratch: Scratch
    _runs: list[tuple[list[str], np.ndarray]] = field(default_factory=list)
    _columns: list[str] = field(default_factory=list)
    _held: list[tuple[np.ndarray, Columns]] = field(default_factory=list)
    _names: Names = field(default_factory=Names)

    def add(self, security: np.ndarray, names: list[str], columns: Columns) -> None:
        """Add rows: `security` (n_rows,) is int32 into `names`, which may have names without rows."""
        if len(security) == 0:
            return
        self._held.append((self._names.codes(names)[security], columns))
        if sum(len(codes) for codes, _ in self._held) >= _ROWS:
            self._end_run()

    def _end_run(self) -> None:
        """Sort the rows held since the last run ended, and put them away."""
        if not self._held:
            return
        security = np.concatenate([codes for codes, _ in self._held])
        columns = {
            name: np.concatenate([each[name] for _, each in self._held])
            for name in self._held[0][1]
        }
        names = self._names.texts()
        self._held, self._names = [], Names()
        rank, ordered = _ranks(names)
        order, start = counting_order(rank[security], len(names))
        is_sorted = bool((order[1:] > order[:-1]).all())
        number, self._columns = len(self._runs), list(columns)
        for at, values in enumerate(columns.values()):
            self.scratch.keep(f"{number}-{at}", values if is_sorted else values[order])
        self._runs.append((ordered, start))

    @property
    def n_rows(self) -> int:
        self._end_run()
        return sum(int(start[-1]) for _, start in self._runs)

    def stretches(
        self, at_most: int, wanted: list[str] | None = None
    ) -> Iterator[tuple[list[str], np.ndarray, Columns]]:
        """Names in order, the security of each row as a position in them, and the columns, all or those wanted.

        All rows of a security come together, in the order of the raw files; a stretch has at most so many rows, or one
        security.
        """
        self._end_run()
        names = sorted(set().union(*(ordered for ordered, _ in self._runs)))
        place = {name: at for at, name in enumerate(names)}
        placed = [
            np.array([place[name] for name in ordered], np.int64) for ordered, _ in self._runs
        ]
        n_rows = np.zeros(len(names), np.int64)
        for at, (_, start) in zip(placed, self._runs, strict=True):
            n_rows[at] += np.diff(start)
        for first, last in _cuts(n_rows, at_most):
            security: list[np.ndarray] = []
            pieces: dict[str, list[np.ndarray]] = {name: [] for name in wanted or self._columns}
            for number, (at, (_, start)) in enumerate(zip(placed, self._runs, strict=True)):
                low, high = np.searchsorted(at, [first, last])
                if start[low] == start[high]:
                    continue
                security.append(np.repeat(at[low:high] - first, np.diff(start[low : high + 1])))
                for name, found in pieces.items():
                    kept = f"{number}-{self._columns.index(name)}"
                    found.append(self.scratch.part(kept, start[low], start[high]))
            together = {name: np.concatenate(found) for name, found in pieces.items()}
            yield names[first:last], np.concatenate(security), together


def _ranks(names: list[str]) -> tuple[np.ndarray, list[str]]:
    """The rank of each name by code point, and the names in that order."""
    order = sorted(range(len(names)), key=names.__getitem__)
    rank = np.empty(len(names), np.int64)
    rank[order] = np.arange(len(names))
    return rank, [names[at] for at in order]


def _cuts(n_rows: np.ndarray, at_most: int) -> Iterator[tuple[int, int]]:
    """First and last (exclusive) of consecutive entries whose sum stays within a bound, or of single ones."""
    first, held = 0, 0
    for at, n in enumerate(n_rows.tolist()):
        if held and held + n > at_most:
            yield first, at
            first, held = at, 0
        held += n
    if held:
        yield first, len(n_rows)


@njit(cache=True, nogil=True)
def counting_order(key: np.ndarray, n_keys: int) -> tuple[np.ndarray, np.ndarray]:
    """The stable order of small non-negative integers, and where each key begins: int64 (n,), (n_keys + 1,)."""
    start = np.zeros(n_keys + 1, np.int64)
    for value in key:
        start[value + 1] += 1
    for at in range(n_keys):
        start[at + 1] += start[at]
    place = start.copy()
    order = np.empty(len(key), np.int64)
    for row in range(len(key)):
        order[place[key[row]]] = row
        place[key[row]] += 1
    return order, start
