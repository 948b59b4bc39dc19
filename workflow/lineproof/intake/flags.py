"""Flags on rows that are kept: they change no return, but a reader should know of them."""

from __future__ import annotations

import numpy as np
import pandas as pd

from lineproof.calendar import month_name, month_number
from lineproof.intake.faults import N_EXAMPLES, Tally

_STALE_RUN = 3  # months
_STALE_KINDS = ((3, 5, "of 3 to 5 months"), (6, 11, "of 6 to 11 months"), (12, np.inf, "longer"))
_LONG_AWAY = 36  # months
_JUMP, _AFTER_REVERSAL = 3.0, 0.5  # Ince and Porter 2006


def flag_rows(rows: pd.DataFrame, tally: Tally, codes: list[str]) -> None:
    """Count what a reader should know of.

    `rows` is sorted by security and date, one row each, with return_ and final_return (decimal),
    size, and `code`, the position in `codes` of the code that stood for a missing return, or -1.
    """
    same = rows["security"].eq(rows["security"].shift()).to_numpy()
    absent = np.diff(month_number(rows["date"]), prepend=0) - 1
    absent[~same] = 0
    follows = same & (absent == 0)
    _flag_missing(rows, tally, codes)
    total_loss = (rows["return_"] == -1) | (rows["final_return"] == -1)
    tally.add(16, total_loss.sum(), first_rows(rows, total_loss))
    tally.add(20, absent.sum(), first_rows(rows, absent > 0))
    tally.add(41, (absent > _LONG_AWAY).sum(), first_rows(rows, absent > _LONG_AWAY))
    _flag_stale(rows, tally, follows)
    before = rows["return_"].shift().where(follows)
    reversal = (before > _JUMP) & ((1 + before) * (1 + rows["return_"]) - 1 < _AFTER_REVERSAL)
    tally.add(22, reversal.sum(), first_rows(rows, reversal))


def flag_sizes(rows: pd.DataFrame, tally: Tally) -> None:
    """Count sizes that are zero, negative or missing."""
    size = rows["size"]
    kinds = {"zero": (size == 0).sum(), "negative": (size < 0).sum(), "missing": size.isna().sum()}
    bad = ~(size > 0)
    tally.add(24, bad.sum(), first_rows(rows, bad), kinds)


def first_rows(rows: pd.DataFrame, mask: pd.Series | np.ndarray) -> list[str]:
    """The first few rows of a mask (n_rows,), as examples."""
    return name_rows(rows[mask].head(N_EXAMPLES))


def name_rows(rows: pd.DataFrame) -> list[str]:
    """Security and month of each row, as in `000123 in 2001-05`."""
    return [f"{s} in {month_name(d)}" for s, d in zip(rows["security"], rows["date"], strict=True)]


def _flag_missing(rows: pd.DataFrame, tally: Tally, codes: list[str]) -> None:
    code = rows["code"].to_numpy()
    kinds = {name or "empty": int((code == i).sum()) for i, name in enumerate(codes)}
    tally.add(12, (code >= 0).sum(), first_rows(rows, code >= 0), kinds)


def _flag_stale(rows: pd.DataFrame, tally: Tally, follows: np.ndarray) -> None:
    """Runs of zero returns in consecutive months, by length."""
    zero = rows["return_"].eq(0).to_numpy()
    starts = zero & ~(follows & np.append(False, zero[:-1]))
    length = np.bincount(np.cumsum(starts)[zero])[1:]
    stale = length >= _STALE_RUN
    at = np.flatnonzero(starts)[stale]
    kinds = {
        said: int(((length >= low) & (length <= high)).sum()) for low, high, said in _STALE_KINDS
    }
    tally.add(21, stale.sum(), first_rows(rows, np.isin(np.arange(len(rows)), at)), kinds)
