"""The stage that takes raw files in: a clean panel, the market, everything set aside, and the counts."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd

from lineproof.calendar import month_name
from lineproof.intake.delisting import last_rows, with_final_returns
from lineproof.intake.faults import FAULTS
from lineproof.intake.reading import raw_lines, read_text
from lineproof.intake.returns import Cleaned, clean_returns
from lineproof.intake.screens import apply_screens
from lineproof.intake.series import check_riskless, read_series, riskless_return
from lineproof.problems import KnownProblem, Problem


@dataclass(frozen=True)
class Validated:
    """What validation writes; see `frames` for the columns. `intake` holds the counts."""

    panel: pd.DataFrame
    market: pd.DataFrame
    set_aside: pd.DataFrame
    intake: dict[str, Any]


def validate_returns(
    returns_file: str,
    market_file: str,
    riskless_file: str,
    *,
    returns: dict[str, Any],
    market: dict[str, Any],
    market_is: str,
    riskless: dict[str, Any],
    riskless_quoted: str,
    screens: list[dict[str, Any]],
    missing_final_return: float | None,
    same_month_rows: str,
) -> Validated:
    """Read and check the three raw files.

    Raises KnownProblem when a file cannot be used at all. Otherwise rows read = kept + set aside + exact duplicates.
    """
    factor = _read_market(market_file, riskless_file, market, market_is, riskless, riskless_quoted)
    cleaned = clean_returns(read_text(returns_file, returns), returns, same_month_rows)
    rows, aside = _within_market(cleaned, factor)
    if rows.empty:
        found = "no row of the returns falls in a month with both market and riskless rate"
        raise KnownProblem(
            "Nothing is left to study.", [Problem(returns["label"], found, "compare the dates")]
        )
    total, n_without = with_final_returns(rows, missing_final_return)
    cleaned.tally.add(25, n_without)
    leaves = last_rows(rows)
    cleaned.tally.add(26, 0 if leaves.any() else 1)
    eligible, screened = apply_screens(rows, screens)
    lookup = factor.set_index("date")["riskless"]
    extra = [c for c in rows if c not in {*_PANEL_COLUMNS, "return_", "final_return", "line"}]
    panel = rows.assign(
        total_return=total,
        excess_return=total - rows["date"].map(lookup),
        eligible=eligible,
        leaves=leaves,
    )[[*_PANEL_COLUMNS, *extra]]
    used = factor[(factor["date"] >= rows["date"].min()) & (factor["date"] <= rows["date"].max())]
    _check_conservation(cleaned, len(panel), len(aside))
    intake = _counts(cleaned, panel, aside, screened, returns["label"])
    set_aside = _with_raw_text(aside, returns_file, returns["label"])
    return Validated(panel, used.reset_index(drop=True), set_aside, intake)


_PANEL_COLUMNS = [
    "security",
    "date",
    "total_return",
    "excess_return",
    "size",
    "price",
    "eligible",
    "leaves",
]


def _read_market(
    market_file: str, riskless_file: str, market: dict, market_is: str, riskless: dict, quoted: str
) -> pd.DataFrame:
    """date, market_excess, riskless in the months both have; the study ends at the last common month."""
    rate = read_series(riskless_file, riskless, "rate")
    rate["riskless"] = riskless_return(rate["rate"], quoted)
    check_riskless(rate, riskless["label"], quoted)
    both = read_series(market_file, market, "return").merge(rate, on="date")
    if both.empty:
        found = f"it has no month in common with {riskless['label']}"
        raise KnownProblem(
            "Nothing is left to study.", [Problem(market["label"], found, "compare the dates")]
        )
    both["market_excess"] = both["return"] - (both["riskless"] if market_is == "total" else 0.0)
    return both[["date", "market_excess", "riskless"]]


def _within_market(cleaned: Cleaned, factor: pd.DataFrame) -> tuple[pd.DataFrame, pd.DataFrame]:
    """Rows in the market's months, and all rows set aside with the others added."""
    rows = cleaned.rows
    inside = rows["date"].isin(factor["date"])
    outside = rows.loc[~inside, ["line"]].assign(fault=28)
    outside["reason"] = FAULTS[28].label + ": " + rows.loc[~inside, "date"].dt.strftime("%Y-%m")
    cleaned.tally.add(28, len(outside), [f"line {line}" for line in outside["line"].head(3)])
    aside = pd.concat([cleaned.set_aside, outside], ignore_index=True).sort_values(
        "line", ignore_index=True
    )
    return rows[inside].reset_index(drop=True), aside.astype({"fault": "int64", "reason": str})


def _check_conservation(cleaned: Cleaned, n_kept: int, n_aside: int) -> None:
    if cleaned.n_read != n_kept + n_aside + cleaned.n_duplicates:
        raise AssertionError(
            f"rows were lost: {cleaned.n_read} read, {n_kept} kept, {n_aside} set aside, "
            f"{cleaned.n_duplicates} exact duplicates"
        )


def _with_raw_text(aside: pd.DataFrame, file: str, label: str) -> pd.DataFrame:
    raw = pd.Series(raw_lines(file, aside["line"].to_numpy()), index=aside.index, dtype=str)
    table = aside.assign(raw=raw, file=pd.Series(label, index=aside.index, dtype=str))
    return table[["file", "line", "fault", "reason", "raw"]]


def _counts(
    cleaned: Cleaned, panel: pd.DataFrame, aside: pd.DataFrame, screened: list[dict], label: str
) -> dict[str, Any]:
    return {
        "file": label,
        "first": month_name(panel["date"].min()),
        "last": month_name(panel["date"].max()),
        "rows_read": cleaned.n_read,
        "rows_kept": len(panel),
        "rows_set_aside": len(aside),
        "exact_duplicates": cleaned.n_duplicates,
        "rows_screened": int((~panel["eligible"]).sum()),
        "n_securities": int(panel["security"].nunique()),
        "n_missing_returns": int(np.isnan(panel["total_return"]).sum()),
        "faults": cleaned.tally.report(),
        "screens": screened,
    }
