"""Is one security in another unit than the rest of the file?"""

from __future__ import annotations

from typing import Any

import numpy as np

from lineproof.intake.chunk import Chunk
from lineproof.intake.faults import N_EXAMPLES, Flag
from lineproof.intake.scale import medians_by_run
from lineproof.intake.stopping import stop
from lineproof.intake.unit import OTHER_UNIT, few, is_other, mend, said_ratio

_FEWEST_OF_A_SECURITY, _FEWEST_SECURITIES = 12, 10


class UnitBySecurity:
    """Observer: the typical size of each security's returns, against that of the others (fault 18).

    Keeps a count and a median for each security. `return_` is looked at as delivered, in decimal.
    """

    def __init__(self) -> None:
        self._names: list[np.ndarray] = []
        self._n: list[np.ndarray] = []
        self._middle: list[np.ndarray] = []

    def see(self, chunk: Chunk) -> None:
        n, middle = medians_by_run(
            np.ascontiguousarray(chunk.start, np.int64),
            np.ascontiguousarray(chunk.values["return_"], np.float64),
        )
        judged = n >= _FEWEST_OF_A_SECURITY
        self._names.append(np.asarray(chunk.names, object)[judged])
        self._n.append(n[judged])
        self._middle.append(middle[judged])

    def judge(self, label: str, stop_above: float) -> Flag:
        """Securities of another unit than most.

        Raises KnownProblem when they are more than the share `stop_above` of those with at least twelve returns that
        are not zero.
        """
        middle = np.concatenate([np.empty(0), *self._middle])
        nothing = Flag(18, 0, [], {})
        if len(middle) < _FEWEST_SECURITIES:
            return nothing
        n = np.concatenate(self._n)
        names = np.concatenate(self._names)
        ratio = middle / np.sort(middle)[(len(middle) - 1) // 2]
        off = np.flatnonzero(is_other(ratio))
        said = [f"{names[i]}, {said_ratio(ratio[i])} of the others" for i in off]
        if len(off) > stop_above * len(middle):
            found = f"{len(off):,} of {len(middle):,} securities seem to be in another unit: {few(said)}"
            raise stop(label, found, mend("the securities"))
        if not len(off):
            return nothing
        kinds = {
            "of securities some 100 times larger": int(n[ratio > OTHER_UNIT].sum()),
            "of securities some 100 times smaller": int(n[ratio < 1 / OTHER_UNIT].sum()),
        }
        return Flag(18, int(n[off].sum()), said[:N_EXAMPLES], kinds)

    def result(self) -> dict[str, Any]:
        """How many securities were judged, and the quantiles of their typical sizes."""
        middle = np.concatenate([np.empty(0), *self._middle])
        levels = (0.0, 0.05, 0.5, 0.95, 1.0)
        return {
            "n_judged": len(middle),
            "quantiles": [float(np.quantile(middle, level)) for level in levels]
            if len(middle)
            else [],
        }
