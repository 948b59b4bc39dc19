"""Returns of securities in the month they leave."""

from __future__ import annotations

import numpy as np
import pandas as pd

from lineproof.calendar import month_number
from lineproof.intake.faults import Tally
from lineproof.intake.flags import first_rows


def leaving_rows(rows: pd.DataFrame, last_seen: pd.Series) -> np.ndarray:
    """Whether each row is the last of a security that leaves before the last month: bool (n_rows,).

    `rows` is sorted by security and date. `last_seen` is each security's last month in the file;
    one whose later rows are merely not among `rows` has not left before it.
    """
    is_last = rows["security"].ne(rows["security"].shift(-1)).to_numpy()
    gone = last_seen.index[last_seen < rows["date"].max()]
    return is_last & rows["security"].isin(gone).to_numpy()


def with_final_returns(
    rows: pd.DataFrame, leaves: np.ndarray, missing_final_return: float | None, tally: Tally
) -> pd.Series:
    """Total returns in which a final return is compounded with the return of the last, partial month.

    A final return counts where a security's row is not followed by one of the next month. A month
    without a return of its own has the final return alone. Where a leaver (`leaves`, one bool a
    row) has no final return, `missing_final_return` (decimal) stands in, or None leaves the
    return as it is. All returns decimal.
    """
    next_month = (
        rows["security"].eq(rows["security"].shift(-1)).to_numpy()
        & (np.diff(month_number(rows["date"]), append=0) == 1)
    )  # fmt: skip
    given = rows["final_return"].notna().to_numpy()
    unused = given & next_month
    tally.add(42, unused.sum(), first_rows(rows, unused))
    without = leaves & ~given
    used = rows["final_return"].mask(unused)
    said = "left as it is"
    if missing_final_return is not None:
        used = used.mask(without, missing_final_return)
        said = f"taken as {missing_final_return:g}"
    tally.add(25, without.sum(), first_rows(rows, without), {said: int(without.sum())})
    both = (1 + rows["return_"].fillna(0)) * (1 + used) - 1
    return rows["return_"].where(used.isna(), both)
