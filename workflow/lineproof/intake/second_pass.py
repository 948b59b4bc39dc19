"""The second pass: sound rows of whole securities, in order, one a security and period."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numba import njit

from lineproof.ahead import ahead
from lineproof.intake.chunk import Chunk
from lineproof.intake.factor import total_and_excess
from lineproof.intake.first_pass import NUMERIC, Taken
from lineproof.intake.flags import first_rows, jumps_that_reverse
from lineproof.intake.runs import Columns, counting_order
from lineproof.intake.setting_aside import FirstFault
from lineproof.periods import ABSENT, Periods

_ROWS = 1 << 20  # of a chunk, at most, unless one security has more
_VALUES = ("return_", "excess", *(name for name in NUMERIC if name != "return"))


@dataclass(frozen=True)
class Span:
    """The periods of a study: how days are numbered, and the first and last number."""

    periods: Periods
    first: int
    last: int


@dataclass(frozen=True)
class Rules:
    """What the study file decides about rows: see config/README.md, section intake.

    `same_month_rows` is "set_aside", "first" or "last"; `return_after_hole` "keep" or "set_aside"; `jumps` "flag" or
    "set_aside"; with `from_price` returns are made from the price of the period before. Where returns are in excess,
    `added` is the riskless return of each period of the span, which makes them total; else None.
    """

    same_month_rows: str
    return_after_hole: str
    jumps: str
    from_price: bool
    added: np.ndarray | None


@dataclass
class Tracked:
    """Counts of the second pass: kept rows and exact duplicates by file, rows before and after the span."""

    n_kept: np.ndarray
    n_duplicates: np.ndarray
    n_before: int = 0
    n_after: int = 0


def chunks(taken: Taken, span: Span, rules: Rules, tracked: Tracked) -> Iterator[Chunk]:
    """The kept rows, all of some securities at a time, in the order of their names."""
    n_files = len(tracked.n_kept)
    for names, security, delivered in ahead(taken.runs.stretches(_ROWS)):
        columns = delivered
        period = span.periods.number(columns["day"].astype("datetime64[D]"))
        faults = FirstFault(taken.aside, columns["file"], columns["position"])
        _note_outside(period, columns, span, faults, tracked)
        if rules.added is not None:
            columns = _as_total(period, columns, rules.added, span, faults)
        rows = in_order(security, period, ~faults.found, len(names))
        exact = _note_repeated(
            rows, security, period, columns, rules.same_month_rows, faults, names
        )
        tracked.n_duplicates += np.bincount(columns["file"][exact], minlength=n_files)
        faults.found[exact] = True
        rows = rows[~faults.found[rows]]
        if rules.from_price:
            columns = _with_returns_from_price(rows, security, period, columns)
        if rules.return_after_hole == "set_aside" or rules.jumps == "set_aside":
            _note_suspect(
                _chunk(rows, names, security, period, columns, taken), rows, rules, faults
            )
            rows = rows[~faults.found[rows]]
        tracked.n_kept += np.bincount(columns["file"][rows], minlength=n_files)
        if len(rows) == 0:
            continue
        chunk = _chunk(rows, names, security, period, columns, taken)
        if rules.jumps == "flag":
            jumps = jumps_that_reverse(chunk)
            taken.tally.add(22, jumps.sum(), first_rows(chunk, jumps))
        yield chunk


def _note_outside(
    period: np.ndarray, columns: Columns, span: Span, faults: FirstFault, tracked: Tracked
) -> None:
    """Set aside rows of periods that the market or the riskless rate does not have."""
    days = columns["day"].astype("datetime64[D]")
    first, last = span.periods.date(np.array([span.first, span.last]))
    outside = (period == ABSENT) | (period < span.first) | (period > span.last)
    if not outside.any():
        return
    tracked.n_before += int((outside & (days < first)).sum())
    tracked.n_after += int((outside & (days > last)).sum())
    faults.note(outside, 28, lambda rows: [str(day) for day in days[rows]])


def _as_total(
    period: np.ndarray, columns: Columns, riskless: np.ndarray, span: Span, faults: FirstFault
) -> Columns:
    """The columns with total returns, and `excess` as delivered; a total return below −100 % is set aside."""
    excess = columns["return_"]
    inside = ~faults.found
    rate = np.full(len(period), np.nan)
    rate[inside] = riskless[period[inside] - span.first]
    total, _ = total_and_excess(excess, rate, "excess")
    faults.note(
        total < -1,
        15,
        lambda rows: [f"{excess[i]:g} in excess of {rate[i]:g} without risk" for i in rows],
    )
    return {**columns, "return_": total, "excess": excess}


def in_order(
    security: np.ndarray, period: np.ndarray, sound: np.ndarray, n_names: int
) -> np.ndarray:
    """Indices of the sound rows by security and period, ties in the order of the raw files."""
    rows = np.flatnonzero(sound)
    if not (security[rows[1:]] >= security[rows[:-1]]).all():
        rows = rows[counting_order(security[rows], n_names)[0]]
    if _runs_on(security, period, rows):  # files come by date, or by security and date
        return rows
    low, high = int(period[rows].min()), int(period[rows].max())
    rows = np.sort(rows)
    rows = rows[counting_order(period[rows] - low, high - low + 1)[0]]
    return rows[counting_order(security[rows], n_names)[0]]


@njit(cache=True, nogil=True)
def _runs_on(security, period, rows):  # pragma: no cover - compiled
    """Whether the periods of rows that are in the order of their securities never fall."""
    for at in range(1, len(rows)):
        row, before = rows[at], rows[at - 1]
        if security[row] == security[before] and period[row] < period[before]:
            return False
    return True


def _note_repeated(
    rows: np.ndarray,
    security: np.ndarray,
    period: np.ndarray,
    columns: Columns,
    keep: str,
    faults: FirstFault,
    names: list[str],
) -> np.ndarray:
    """Indices of exact duplicates; of different rows of one security and period, set aside those that `keep` says."""
    same = (np.diff(security[rows]) == 0) & (np.diff(period[rows]) == 0)
    if not same.any():
        return rows[:0]
    tied = np.append(same, False) | np.append(False, same)
    several = np.sort(rows[tied])
    content = {name: columns[name][several] for name in columns if name not in ("file", "position")}
    frame = pd.DataFrame(
        {"security": security[several], "period": period[several], **content}, index=several
    )
    exact = frame.index[frame.duplicated(keep="last" if keep == "last" else "first")]
    different = frame.drop(exact)
    losing = different.duplicated(
        ["security", "period"], keep=False if keep == "set_aside" else keep
    )
    mask = np.zeros(len(security), bool)
    mask[different.index[losing]] = True
    days = columns["day"].astype("datetime64[D]")
    faults.note(mask, 19, lambda at: [f"{names[security[i]]} on {days[i]}" for i in at])
    return exact.to_numpy()


def _with_returns_from_price(
    rows: np.ndarray, security: np.ndarray, period: np.ndarray, columns: Columns
) -> Columns:
    """Returns as price over price of the period before, less 1; missing where either is missing or not positive."""
    price = columns["price"][rows]
    follows = (np.diff(security[rows]) == 0) & (np.diff(period[rows]) == 1)
    both = follows & (price[1:] > 0) & (price[:-1] > 0)
    made = np.full(len(security), np.nan)
    made[rows[1:][both]] = price[1:][both] / price[:-1][both] - 1
    return {**columns, "return_": made, "code": np.full(len(security), -1, np.int8)}


def _note_suspect(chunk: Chunk, rows: np.ndarray, rules: Rules, faults: FirstFault) -> None:
    """Set aside what the study file says: returns after a hole, and jumps with their reversals."""
    where = np.empty(len(faults.found), np.int64)
    where[rows] = np.arange(len(rows))

    def note(mask: np.ndarray, number: int) -> None:
        of_block = np.zeros(len(faults.found), bool)
        of_block[rows[mask]] = True
        faults.note(of_block, number, lambda at: chunk.where(where[at]))

    if rules.return_after_hole == "set_aside":
        note(chunk.absent > 0, 20)
    if rules.jumps == "set_aside":
        back = jumps_that_reverse(chunk)
        note(back | np.append(back[1:], False), 22)


def _chunk(
    rows: np.ndarray,
    names: list[str],
    security: np.ndarray,
    period: np.ndarray,
    columns: Columns,
    taken: Taken,
) -> Chunk:
    n_each = np.bincount(security[rows], minlength=len(names))
    held = n_each > 0
    if len(rows) == len(security) and (rows == np.arange(len(rows))).all():
        rows = slice(None)  # nothing to copy
    return Chunk(
        names=np.array(names, object)[held],
        start=np.append(0, np.cumsum(n_each[held])),
        period=period[rows],
        day=columns["day"][rows].astype("datetime64[D]"),
        values={name: columns[name][rows] for name in _VALUES if name in columns},
        texts={name: (columns[name][rows], known.texts()) for name, known in taken.texts.items()},
        code=columns["code"][rows],
    )
