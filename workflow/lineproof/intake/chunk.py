"""A stretch of the sorted panel: all rows of some securities, as arrays."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np


@dataclass(frozen=True)
class Chunk:
    """Rows sorted by security and period, one row each.

    `names` (n_securities,) are the identifiers in order; rows `start[i]` to `start[i + 1]` belong to `names[i]`
    (`start` int64, n_securities + 1). `period` is int64 (n_rows,), consecutive periods being consecutive numbers, and
    `day` is the date as delivered, datetime64[D] (n_rows,).
    `values` holds float64 (n_rows,) by name, decimal, NaN where missing: return_, final_return, size, price, those that
    the study has; once they are known also total_return.
    `texts` holds the further columns: codes int32 (n_rows,) into a list of distinct texts.
    `code` is int8 (n_rows,): which code stood for a missing return, by position among those declared, or -1.
    """

    names: np.ndarray
    start: np.ndarray
    period: np.ndarray
    day: np.ndarray
    values: dict[str, np.ndarray]
    texts: dict[str, tuple[np.ndarray, list[str]]]
    code: np.ndarray

    def __len__(self) -> int:
        return len(self.period)

    @cached_property
    def owner(self) -> np.ndarray:
        """Position in `names` of each row's security, int64 (n_rows,)."""
        return np.repeat(np.arange(len(self.names)), np.diff(self.start))

    @cached_property
    def is_first(self) -> np.ndarray:
        """Whether a row is the first of its security, bool (n_rows,)."""
        first = np.zeros(len(self), bool)
        first[self.start[:-1][np.diff(self.start) > 0]] = True
        return first

    @cached_property
    def absent(self) -> np.ndarray:
        """How many periods are missing between a row and the one before of the same security; 0 in a first row."""
        gap = np.diff(self.period, prepend=0) - 1
        gap[self.is_first] = 0
        return gap

    @cached_property
    def follows(self) -> np.ndarray:
        """Whether the row before is the same security's in the period before, bool (n_rows,)."""
        return ~self.is_first & (self.absent == 0)

    def only(self, mask: np.ndarray) -> Chunk:
        """The rows of a mask (n_rows,); securities without rows are left out."""
        if mask.all():
            return self
        n_each = np.bincount(self.owner[mask], minlength=len(self.names))
        held = n_each > 0
        return Chunk(
            names=self.names[held],
            start=np.append(0, np.cumsum(n_each[held])),
            period=self.period[mask],
            day=self.day[mask],
            values={name: values[mask] for name, values in self.values.items()},
            texts={name: (codes[mask], texts) for name, (codes, texts) in self.texts.items()},
            code=self.code[mask],
        )

    def where(self, rows: np.ndarray) -> list[str]:
        """Security and date of some rows, by index, as in `000123 on 2001-05-31`."""
        return [
            f"{self.names[i]} on {day}"
            for i, day in zip(self.owner[rows], self.day[rows], strict=True)
        ]
