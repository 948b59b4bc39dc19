"""Reading the demo market's files back."""

from __future__ import annotations

import io

import pandas as pd

LISTED_FAULTS = {5, 7, 8, 12, 13, 14, 15, 16, 19, 20, 21, 22, 23, 24, 25}
# Faults after which the row still says what the market did.
HARMLESS = {7, 20, 24, 25}


def clean_rows(demo: dict[str, str | pd.DataFrame]) -> pd.DataFrame:
    """Rows of returns.csv that carry the truth, joined with it and with the riskless rate."""
    lines = demo["returns.csv"].splitlines()
    spoilt = demo["truth_faults"]
    skip = set(spoilt.loc[~spoilt["fault"].isin(HARMLESS), "line"])
    # A run has up to eight lines and a jump two, though only the first is recorded.
    for fault, length in ((21, 8), (22, 2)):
        for line in spoilt.loc[spoilt["fault"] == fault, "line"]:
            skip |= set(range(line, line + length))
    kept = [line for number, line in enumerate(lines, start=1) if number not in skip]
    rows = pd.read_csv(io.StringIO("\n".join(kept)), dtype={"security": str}, na_values=["NA"])
    rows = rows.drop_duplicates(["security", "date"])
    rows = rows.merge(demo["truth_betas"], on=["security", "date"], validate="one_to_one")
    rows["month"] = rows["date"].str[:7]
    monthly = pd.DataFrame({"market": market_return(demo), "riskless": riskless_return(demo)})
    return rows.join(monthly, on="month")


def market_return(demo: dict[str, str | pd.DataFrame]) -> pd.Series:
    return pd.read_csv(io.StringIO(demo["market.csv"]), index_col="month")["total_return"] / 100


def riskless_return(demo: dict[str, str | pd.DataFrame]) -> pd.Series:
    table = pd.read_csv(io.StringIO(demo["riskless.csv"]), index_col="month")
    return (1.0 + table["annual_yield"] / 100) ** (1 / 12) - 1.0
