"""The columns of the table of estimates, and the address of a number: its key columns joined by slashes."""

from __future__ import annotations

from functools import reduce
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    import pandas as pd

KEY_COLUMNS = ["sort", "subperiod", "analysis", "variant", "asset", "term", "se_kind"]
NUMBER_COLUMNS = [
    *("estimate", "se", "statistic", "df1", "df2"),
    *("p", "p_one_sided", "critical", "critical_one_sided"),
]
COLUMNS = [*KEY_COLUMNS, *NUMBER_COLUMNS, "n_periods", "n_assets", "status", "reason"]
DTYPES = {
    **dict.fromkeys([*KEY_COLUMNS, "status", "reason"], "str"),
    **dict.fromkeys(NUMBER_COLUMNS, "float64"),
    **dict.fromkeys(["n_periods", "n_assets"], "int64"),
}
SEPARATOR = "/"

# Assets of rows that are about no test asset; a test asset so called would share an address with them.
RESERVED_ASSETS = frozenset({"-", "all", "market", "riskless"})
NEW, OUT = "new", "out"  # where a security comes from that was in no group, and where it goes
SPREAD = "spread"  # high minus low of a sort; `spread-01` that of its first group


def address(rows: pd.DataFrame) -> pd.Series:
    """Address of each row; (n_rows,) text."""
    keys = (rows[column].astype(str) for column in KEY_COLUMNS)
    return reduce(lambda left, right: left + SEPARATOR + right, keys)


def refused_asset_names(names: list[str]) -> list[str]:
    """Those names that no test asset may have."""
    return [name for name in names if name in RESERVED_ASSETS or SEPARATOR in name or not name]


def is_spread(asset: str) -> bool:
    """Whether an asset is a difference of groups: it is tested by itself, and never beside the groups it is made of."""
    return asset == SPREAD or asset.startswith(f"{SPREAD}-")
