"""The account of the raw rows: each is kept, set aside or an exact duplicate, file by file."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import numpy as np
import pandas as pd

from lineproof.intake.blocks import RawFile
from lineproof.intake.chunk import Chunk
from lineproof.intake.faults import label_of
from lineproof.intake.first_pass import Taken
from lineproof.intake.record import FileRecord, check_conserved
from lineproof.intake.second_pass import Tracked
from lineproof.intake.stopping import counted
from lineproof.problems import KnownProblem, Problem

_NOTHING_LEFT = "Nothing is left to study."
_N_EXAMPLES = 3


class Account:
    """What became of the rows of raw files, which readers know together as `label`."""

    def __init__(self, files: list[RawFile], label: str, taken: Taken) -> None:
        self._files, self._label, self._taken = files, label, taken
        n = np.zeros(len(files), np.int64)
        self.tracked = Tracked(n, n.copy())
        self._examples: dict[int, list[dict[str, Any]]] = {}

    @property
    def _n_aside(self) -> list[int]:
        return self._taken.aside.counts(len(self._files))

    def tally(self) -> None:
        """Count the faults of the rows set aside."""
        self._taken.aside.count(self._files, self._taken.tally)

    def check_conservation(self) -> None:
        """Raises ValueError when the rows read of a file are not the sum of what became of them."""
        for file in self.file_records():
            check_conserved(file)

    def nothing_kept(self) -> KnownProblem:
        """The error when every row is set aside: each fault with its first row."""
        problems = []
        for number, n, place, reason in self._taken.aside.first_of_each(self._files):
            found = f"{counted(n, 'row')} with {label_of(number, self._taken.tally.noun)}"
            problems.append(Problem(self._label, found, f"{place} has {reason}"))
        return KnownProblem(f"{_NOTHING_LEFT} Every row is set aside.", problems)

    def set_aside(self) -> Iterator[pd.DataFrame]:
        """Pieces of the table of rows set aside, by file and line."""
        for table in self._taken.aside.tables(self._files):
            for fault, rows in table.groupby("fault"):
                held = self._examples.setdefault(int(fault), [])
                more = rows.head(_N_EXAMPLES - len(held))
                held += more[["file", "line", "reason", "raw"]].to_dict("records")
            yield table

    def totals(self) -> dict[str, Any]:
        """The rows of all files together."""
        return {
            "file": self._label,
            "rows_read": sum(self._taken.n_read),
            "rows_kept": int(self.tracked.n_kept.sum()),
            "rows_set_aside": sum(self._n_aside),
            "exact_duplicates": int(self.tracked.n_duplicates.sum()),
        }

    def file_records(self) -> list[FileRecord]:
        """What became of the rows of each file."""
        return [
            {
                "place": "data.returns",
                "label": file.label,
                "rows_read": self._taken.n_read[at],
                "rows_kept": int(self.tracked.n_kept[at]),
                "rows_set_aside": n_aside,
                "exact_duplicates": int(self.tracked.n_duplicates[at]),
            }
            for at, (file, n_aside) in enumerate(zip(self._files, self._n_aside, strict=True))
        ]

    def aside_records(self) -> list[dict[str, Any]]:
        """A `record.AsideRecord` a fault; its examples are known once `set_aside` has come to its end."""
        return [
            {
                "number": number,
                "label": label_of(number, self._taken.tally.noun),
                "n": n,
                "examples": self._examples.get(number, []),
            }
            for number, n, _, _ in self._taken.aside.first_of_each(self._files)
        ]


class PanelCounts:
    """What the panel holds."""

    def __init__(self) -> None:
        self.first, self.last = np.iinfo(np.int64).max, np.iinfo(np.int64).min
        self.n_rows = self.n_securities = self.n_missing = self.n_screened = 0

    def add(self, chunk: Chunk, eligible: np.ndarray) -> None:
        """Count a chunk of whole securities, of which some rows are eligible."""
        self.first = min(self.first, int(chunk.period.min()))
        self.last = max(self.last, int(chunk.period.max()))
        self.n_rows += len(chunk)
        self.n_securities += len(chunk.names)
        self.n_missing += int(np.isnan(chunk.values["total_return"]).sum())
        self.n_screened += int((~eligible).sum())
