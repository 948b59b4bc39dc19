"""Returns of securities in the period they leave."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from lineproof.intake.chunk import Chunk
from lineproof.intake.faults import Tally
from lineproof.intake.flags import first_rows


def leaving_rows(chunk: Chunk, last_seen: np.ndarray, last: np.datetime64) -> np.ndarray:
    """Whether each row is the last of a security that leaves before the study's last day, bool (n_rows,).

    `last_seen` (n_securities,) is each security's last day in the raw files; one whose later rows are merely not among
    the chunk's has not left before it.
    """
    leaves = np.zeros(len(chunk), bool)
    has_rows = np.diff(chunk.start) > 0
    leaves[chunk.start[1:][has_rows & (last_seen < last)] - 1] = True
    return leaves


def with_final_returns(
    chunk: Chunk,
    leaves: np.ndarray,
    missing_final_return: float | None,
    by_reason: Mapping[str, float],
    tally: Tally,
) -> np.ndarray:
    """Total returns in which a final return is compounded with the return of the last, partial period.

    A final return counts where a security's row is not followed by one of the next period. A period
    without a return of its own has the final return alone. Where a leaver (`leaves`, one bool a
    row) has no final return, the one given for its `exit_reason` stands in, or else
    `missing_final_return`; None leaves the return as it is. All returns decimal.
    """
    own = chunk.values["return_"]
    if "final_return" not in chunk.values and not leaves.any():
        return own
    final = chunk.values.get("final_return", np.full(len(chunk), np.nan))
    given = ~np.isnan(final)
    unused = given & np.append(chunk.follows[1:], False)
    tally.add(42, unused.sum(), first_rows(chunk, unused))
    without = leaves & ~given
    stands_in = _stand_ins(chunk, np.flatnonzero(without), missing_final_return, by_reason)
    used = np.where(unused, np.nan, final)
    used[without] = stands_in
    tally.add(25, without.sum(), first_rows(chunk, without), _kinds(stands_in))
    both = (1 + np.nan_to_num(own)) * (1 + used) - 1
    return np.where(np.isnan(used), own, both)


def exit_reasons(chunk: Chunk, rows: np.ndarray) -> list[str]:
    """Why securities left, as the file has it in some rows, by index; "" where it does not say."""
    if "exit_reason" not in chunk.texts:
        return [""] * len(rows)
    codes, texts = chunk.texts["exit_reason"]
    return [texts[code] for code in codes[rows].tolist()]


def _stand_ins(
    chunk: Chunk, rows: np.ndarray, otherwise: float | None, by_reason: Mapping[str, float]
) -> np.ndarray:
    fallback = np.nan if otherwise is None else otherwise
    reasons = exit_reasons(chunk, rows)
    return np.array([by_reason.get(reason, fallback) for reason in reasons], float)


def _kinds(stands_in: np.ndarray) -> dict[str, int]:
    left = int(np.isnan(stands_in).sum())
    values, counts = np.unique(stands_in[~np.isnan(stands_in)], return_counts=True)
    taken = {f"taken as {value:g}": int(n) for value, n in zip(values, counts, strict=True)}
    return {"left as it is": left, **taken}
