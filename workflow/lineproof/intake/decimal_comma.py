"""Do the returns of a file have a decimal comma though none is declared? (fault 6)"""

from __future__ import annotations

from typing import Any

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc

from lineproof.intake.headers import where_is
from lineproof.intake.stopping import stop

_DECIMAL_COMMA = r"^[+-]?[0-9]*,[0-9]+$"
_MOST, _BY_FAR = 0.5, 0.9  # shares of the values given


class DecimalComma:
    """Counts the returns that look like `0,015` among those that are given, block by block."""

    def __init__(self, reading: dict[str, Any]) -> None:
        self._reading = reading
        self._n_given = self._n_found = 0
        self._least: str | None = None

    def add(self, column: pa.Array, is_text: np.ndarray, is_missing: np.ndarray) -> None:
        """Take in one block: the returns as written, and masks (n_rows,) of those that are text, or missing.

        Raises KnownProblem at once where nearly all have a comma: no other rows of such a file are worth reading.
        """
        if self._reading.get("decimal", "point") != "point":
            return
        n_given = len(is_text) - int(is_missing.sum())
        n_found = 0
        if is_text.any():
            other = column.filter(pa.array(is_text))
            found = other.filter(pc.match_substring_regex(other, _DECIMAL_COMMA))
            n_found = len(found)
            least = pc.min(found).as_py()
            self._least = min(filter(None, (least, self._least)), default=None)
        self._n_given += n_given
        self._n_found += n_found
        if n_found > _BY_FAR * n_given:
            raise self._stop()

    def judge(self) -> None:
        """Stop when most have. Raises KnownProblem."""
        if self._n_found > _MOST * self._n_given:
            raise self._stop()

    def _stop(self) -> Exception:
        found = f"most numbers have a decimal comma, as in {self._least}"
        return stop(where_is(self._reading, "return"), found, "set decimal: comma")
