"""Text that a spreadsheet program shows as text: a cell that begins like a formula would be run by it.

The mark is an apostrophe in front, which spreadsheets read as "text follows"
(OWASP, CSV Injection: cells that begin with =, +, -, @, tab or carriage return).
"""

from __future__ import annotations

import re
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    import pandas as pd

# A sign alone and a plain number are no formulas.
_FORMULA = re.compile(r"(?![+-]?(?:\d+\.?\d*|\.\d+)?(?:[eE][+-]?\d+)?\Z)[=+\-@\t\r]")


def as_text(text: str) -> str:
    """The text, with an apostrophe in front where it begins like a formula."""
    return f"'{text}" if _FORMULA.match(text) else text


def texts_as_text(frame: pd.DataFrame) -> pd.DataFrame:
    """A frame whose text columns are safe; numbers, dates and missing values are as they were."""
    safe = {
        name: column.map(as_text, na_action="ignore")
        for name, column in frame.items()
        if column.dtype.kind in "OTU" or str(column.dtype) in ("str", "string", "category")
    }
    return frame.assign(**safe)
