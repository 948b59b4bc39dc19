"""Rows of the estimates that hold an estimate alone: counts, means and shares, without a hypothesis."""

from __future__ import annotations

import numpy as np
import pandas as pd

from lineproof.addresses import COLUMNS, DTYPES


def plain_estimates(rows: pd.DataFrame) -> pd.DataFrame:
    """The columns of `addresses` from key columns, estimate and n_periods; a missing estimate is undefined.

    `reason` says why it is. Key columns that are not given are "-".
    """
    frame = rows.assign(estimate=rows["estimate"].astype(float), n_assets=0)
    frame = frame.assign(**{key: "-" for key in ("sort", "se_kind") if key not in frame})
    undefined = frame["estimate"].isna()
    frame["status"] = np.where(undefined, "undefined", "ok")
    frame["reason"] = frame["reason"].where(undefined, "")
    return frame.reindex(columns=COLUMNS).astype(DTYPES)
