"""Returns of securities in their last month."""

from __future__ import annotations

import numpy as np
import pandas as pd


def last_rows(rows: pd.DataFrame) -> np.ndarray:
    """Whether each row is the last of its security although the file goes on; rows sorted by security and date."""
    last = rows["security"].ne(rows["security"].shift(-1))
    return (last & (rows["date"] < rows["date"].max())).to_numpy()


def with_final_returns(
    rows: pd.DataFrame, missing_final_return: float | None
) -> tuple[pd.Series, int]:
    """Total returns in which a final return is compounded with the return of the last, partial month.

    Where a leaver has no final return, `missing_final_return` (decimal) stands in, or None leaves the return as it
    is. Returns the series and the number of leavers without a final return.
    """
    leaves = last_rows(rows)
    final = rows["final_return"].where(rows["final_return"].notna())
    without = leaves & final.isna().to_numpy()
    if missing_final_return is not None:
        final = final.mask(without, missing_final_return)
    both = (1 + rows["return_"].fillna(0)) * (1 + final) - 1
    return rows["return_"].where(final.isna(), both), int(without.sum())
