"""Flags on rows that are kept: they change no return, but a reader should know of them."""

from __future__ import annotations

import numpy as np

from lineproof.intake.chunk import Chunk
from lineproof.intake.faults import N_EXAMPLES, Tally
from lineproof.periods import Periods

STALE_RUN = 3  # periods
_STALE_KINDS = ((3, 5, "of 3 to 5 {}s"), (6, 11, "of 6 to 11 {}s"), (12, np.inf, "longer"))
LONG_AWAY = 36  # months without a row
_JUMP, _AFTER_REVERSAL = 3.0, 0.5  # Ince and Porter 2006


def flag_rows(chunk: Chunk, tally: Tally, codes: list[str], periods: Periods) -> None:
    """Count what a reader should know of; `codes` are those for a missing return, see `Chunk.code`."""
    _flag_missing(chunk, tally, codes)
    values = chunk.values
    total_loss = values["return_"] == -1
    if "final_return" in values:
        total_loss |= values["final_return"] == -1
    tally.add(16, total_loss.sum(), first_rows(chunk, total_loss))
    tally.add(20, chunk.absent.sum(), first_rows(chunk, chunk.absent > 0))
    month = chunk.day.astype("datetime64[M]").astype(np.int64)
    away = np.diff(month, prepend=month[:1]) - 1
    long_away = ~chunk.is_first & (away > LONG_AWAY)
    tally.add(41, long_away.sum(), first_rows(chunk, long_away))
    _flag_stale(chunk, tally, periods)
    if "size" in values:
        _flag_sizes(chunk, tally)


def jumps_that_reverse(chunk: Chunk) -> np.ndarray:
    """Rows whose return takes back a jump of the period before, bool (n_rows,).

    A return over 300 % and then (1 + r₁)(1 + r₂) − 1 below 50 % (Ince and Porter 2006).
    """
    now = chunk.values["return_"]
    if not (now > _JUMP).any():
        return np.zeros(len(now), bool)
    before = np.where(chunk.follows, np.roll(now, 1), np.nan)
    return (before > _JUMP) & ((1 + before) * (1 + now) - 1 < _AFTER_REVERSAL)


def zeros_so_far(chunk: Chunk) -> np.ndarray:
    """How many zero returns in consecutive periods end at each row, int64 (n_rows,); 0 where its return is another."""
    zero = chunk.values["return_"] == 0
    goes_on = zero & chunk.follows & np.append(False, zero[:-1])
    at = np.arange(len(zero))
    begins = np.maximum.accumulate(np.where(goes_on, 0, at)) if len(at) else at
    return np.where(zero, at - begins + 1, 0)


def first_rows(chunk: Chunk, mask: np.ndarray) -> list[str]:
    """The first few rows of a mask (n_rows,), as examples."""
    return chunk.where(np.flatnonzero(mask)[:N_EXAMPLES])


def _flag_missing(chunk: Chunk, tally: Tally, codes: list[str]) -> None:
    n_each = np.bincount(chunk.code[chunk.code >= 0], minlength=len(codes)).tolist()
    kinds = {name or "empty": n for name, n in zip(codes, n_each, strict=True)}
    tally.add(12, sum(n_each), first_rows(chunk, chunk.code >= 0), kinds)


def _flag_stale(chunk: Chunk, tally: Tally, periods: Periods) -> None:
    """Runs of zero returns in consecutive periods, by length, each named by its first row."""
    so_far = zeros_so_far(chunk)
    ends = (so_far > 0) & (np.append(so_far[1:], 0) != so_far + 1)
    length = so_far[ends]
    stale = length >= STALE_RUN
    found = length[stale]
    kinds = {
        said.format(periods.noun): int(((found >= low) & (found <= high)).sum())
        for low, high, said in _STALE_KINDS
    }
    begins = np.flatnonzero(ends)[stale] - found + 1
    tally.add(21, len(found), chunk.where(begins[:N_EXAMPLES]), kinds)


def _flag_sizes(chunk: Chunk, tally: Tally) -> None:
    """Count sizes that are zero, negative or missing."""
    size = chunk.values["size"]
    kinds = {
        "zero": (size == 0).sum(),
        "negative": (size < 0).sum(),
        "missing": np.isnan(size).sum(),
    }
    bad = ~(size > 0)
    tally.add(24, bad.sum(), first_rows(chunk, bad), kinds)
