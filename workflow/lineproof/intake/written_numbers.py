"""Are the returns of a file written in another way than declared: with a decimal comma or per cent signs? (fault 6)"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc

from lineproof.intake.headers import where_is
from lineproof.intake.stopping import stop

_MOST, _BY_FAR = 0.5, 0.9  # shares of the values given
_MANY = 10_000  # values that speak for a whole file


@dataclass
class _Form:
    """A way to write numbers that is not read, what to change, and how often it was met."""

    pattern: str
    said: str
    change: str
    n: int = 0
    least: str | None = field(default=None)


class WrittenNumbers:
    """Counts the returns that look like `0,015` or `1.5%` among those that are given, block by block."""

    def __init__(self, reading: dict[str, Any]) -> None:
        self._reading = reading
        self._n_given = 0
        remove = "remove the signs, and set unit: percent"
        self._forms = [_Form(r"^[+-]?[0-9.,]+ ?%$", "end in a per cent sign", remove)]
        if reading.get("decimal", "point") == "point":
            comma = (r"^[+-]?[0-9]*,[0-9]+$", "have a decimal comma", "set decimal: comma")
            self._forms.append(_Form(*comma))

    def add(self, column: pa.Array, is_text: np.ndarray, is_missing: np.ndarray) -> None:
        """Take in one block: the returns as written, and masks (n_rows,) of those that are text, or missing.

        Raises KnownProblem at once where nearly all of many are so written: no other rows of such a file are worth
        reading.
        """
        n_given = len(is_text) - int(is_missing.sum())
        self._n_given += n_given
        if not is_text.any():
            return
        other = column.filter(pa.array(is_text))
        for form in self._forms:
            found = other.filter(pc.match_substring_regex(other, form.pattern))
            form.n += len(found)
            form.least = min(filter(None, (pc.min(found).as_py(), form.least)), default=None)
            if n_given >= _MANY and len(found) > _BY_FAR * n_given:
                raise self._stop(form)

    def judge(self) -> None:
        """Stop when most are. Raises KnownProblem."""
        for form in self._forms:
            if form.n > _MOST * self._n_given:
                raise self._stop(form)

    def _stop(self, form: _Form) -> Exception:
        found = f"most numbers {form.said}, as in {form.least}"
        return stop(where_is(self._reading, "return"), found, form.change)
