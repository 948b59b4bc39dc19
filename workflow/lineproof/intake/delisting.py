"""Returns of securities in the period they leave."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from lineproof.intake.chunk import Chunk
from lineproof.intake.faults import Tally
from lineproof.intake.flags import first_rows
from lineproof.intake.means import MeansByPeriod
from lineproof.intake.record import DelistingRecord


def leaving_rows(chunk: Chunk, last_seen: np.ndarray, last: np.datetime64) -> np.ndarray:
    """Whether each row is the last of a security that leaves before the study's last day, bool (n_rows,).

    `last_seen` (n_securities,) is each security's last day in the raw files; one whose later rows are merely not among
    the chunk's has not left before it.
    """
    leaves = np.zeros(len(chunk), bool)
    has_rows = np.diff(chunk.start) > 0
    leaves[chunk.start[1:][has_rows & (last_seen < last)] - 1] = True
    return leaves


class Leavers:
    """Securities that leave: their final returns, what stands in where there is none, and what it all does to the mean.

    Where a leaver has no final return, the one given for its `exit_reason` in `by_reason` stands in, or else
    `otherwise`; None leaves the last return as it is. All returns decimal.
    """

    def __init__(
        self, otherwise: float | None, by_reason: Mapping[str, float], first: int, n_periods: int
    ) -> None:
        self._otherwise, self._by_reason = otherwise, by_reason
        self._reasons: dict[str, list[int]] = {}
        self._with, self._without = (MeansByPeriod(first, n_periods) for _ in range(2))

    @property
    def n(self) -> int:
        """How many securities have left."""
        return sum(sum(counts) for counts in self._reasons.values())

    @property
    def means(self) -> np.ndarray:
        """Equally weighted mean of all total returns, by period."""
        return self._with.means()

    def with_final_returns(self, chunk: Chunk, leaves: np.ndarray, tally: Tally) -> np.ndarray:
        """Total returns in which a final return is compounded with the return of the last, partial period.

        A final return counts where a security's row is not followed by one of the next period. A period without a
        return of its own has the final return alone. `leaves` (n_rows,) marks the last rows of leavers.
        """
        own = chunk.values["return_"]
        total = own
        if "final_return" in chunk.values or leaves.any():
            final = self._final_returns(chunk, leaves, tally)
            both = (1 + np.nan_to_num(own)) * (1 + final) - 1
            total = np.where(np.isnan(final), own, both)
        self._without.see(chunk.period, own)
        self._with.see(chunk.period, total)
        return total

    def _final_returns(self, chunk: Chunk, leaves: np.ndarray, tally: Tally) -> np.ndarray:
        """What is compounded into each row, NaN for nothing."""
        final = chunk.values.get("final_return", np.full(len(chunk), np.nan))
        given = ~np.isnan(final)
        unused = given & np.append(chunk.follows[1:], False)
        tally.add(42, unused.sum(), first_rows(chunk, unused))
        without = leaves & ~given
        used = np.where(unused, np.nan, final)
        rows = np.flatnonzero(leaves)
        reasons = exit_reasons(chunk, rows)
        stands_in = np.array([self._stand_in(reason) for reason in reasons], float)
        used[rows[without[rows]]] = stands_in[without[rows]]
        tally.add(25, without.sum(), first_rows(chunk, without), _kinds(stands_in[without[rows]]))
        for reason, has_none in zip(reasons, without[rows].tolist(), strict=True):
            self._reasons.setdefault(reason, [0, 0])[has_none] += 1
        return used

    def _stand_in(self, reason: str) -> float:
        fallback = np.nan if self._otherwise is None else self._otherwise
        return self._by_reason.get(reason, fallback)

    def record(self) -> DelistingRecord:
        """The counts by reason, and the mean return of all securities with final returns and without."""
        by_reason = {}
        for reason in sorted(self._reasons):
            n_with, n_without = self._reasons[reason]
            stand_in = self._stand_in(reason)
            by_reason[reason] = {
                "n": n_with + n_without,
                "n_with": n_with,
                "n_without": n_without,
                "stand_in": None if np.isnan(stand_in) else stand_in,
            }
        return {
            "n_with": sum(found["n_with"] for found in by_reason.values()),
            "n_without": sum(found["n_without"] for found in by_reason.values()),
            "by_reason": by_reason,
            "mean_with": self._with.average(),
            "mean_without": self._without.average(),
        }


def exit_reasons(chunk: Chunk, rows: np.ndarray) -> list[str]:
    """Why securities left, as the file has it in some rows, by index; "" where it does not say."""
    if "exit_reason" not in chunk.texts:
        return [""] * len(rows)
    codes, texts = chunk.texts["exit_reason"]
    return [texts[code] for code in codes[rows].tolist()]


def _kinds(stands_in: np.ndarray) -> dict[str, int]:
    left = int(np.isnan(stands_in).sum())
    values, counts = np.unique(stands_in[~np.isnan(stands_in)], return_counts=True)
    taken = {f"taken as {value:g}": int(n) for value, n in zip(values, counts, strict=True)}
    return {"left as it is": left, **taken}
