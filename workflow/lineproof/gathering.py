"""Put the estimates of the sample and of every subperiod into one table."""

from __future__ import annotations

from collections.abc import Sequence

import pandas as pd


def gather_estimates(parts: Sequence[pd.DataFrame]) -> pd.DataFrame:
    """One table in the order of the parts; every number keeps its address."""
    return pd.concat(parts, ignore_index=True)
