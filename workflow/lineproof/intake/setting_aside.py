"""Rows set aside: the first fault of each, and the reason in words."""

from __future__ import annotations

import numpy as np
import pandas as pd

from lineproof.intake.faults import FAULTS, N_EXAMPLES, Tally


class FirstFault:
    """The first fault noted of each row, so that a row is set aside once.

    `line` is the place of each row in its file; `found` marks the rows that have a fault.
    """

    def __init__(self, line: pd.Series) -> None:
        self._line = line
        self._noted: list[tuple[int, int, str]] = []
        self.found = np.zeros(len(line), bool)

    def note(
        self,
        mask: pd.Series | np.ndarray,
        number: int,
        said: pd.Series | None = None,
        form: str = "{}",
    ) -> None:
        """Set aside those rows of a mask (n_rows,) that have no fault yet.

        The reason is the label of the fault, followed by what `said` holds for the row's position, put into `form`.
        """
        new = np.flatnonzero(np.asarray(mask, bool) & ~self.found)
        self.found[new] = True
        reasons = [FAULTS[number].label] * len(new)
        if said is not None:
            reasons = [f"{reasons[0]}: {form.format(text)}" for text in said.loc[new]]
        lines = self._line.iloc[new].tolist()
        self._noted += [(line, number, why) for line, why in zip(lines, reasons, strict=True)]

    def table(self, rejects: pd.DataFrame) -> pd.DataFrame:
        """Line, fault and reason of every row noted and of the rows that were never split, by line."""
        label = FAULTS[5].label
        noted = self._noted + [
            (line, 5, f"{label}: {why}") for line, why in rejects.itertuples(index=False)
        ]
        found = pd.DataFrame(sorted(noted), columns=["line", "fault", "reason"])
        return found.astype({"line": "int64", "fault": "int64", "reason": "str"})


def count_set_aside(set_aside: pd.DataFrame, place: str, tally: Tally) -> None:
    """Add the rows set aside to the tally; `place` is what a row of the file is called."""
    for number, part in set_aside.groupby("fault"):
        tally.add(
            int(number), len(part), [f"{place} {line}" for line in part["line"].head(N_EXAMPLES)]
        )
