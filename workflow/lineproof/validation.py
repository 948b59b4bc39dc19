"""The stage that takes raw files in: a clean panel, the market, everything set aside, and the counts."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd

from lineproof.calendar import month_name
from lineproof.intake.delisting import leaving_rows, with_final_returns
from lineproof.intake.faults import FAULTS
from lineproof.intake.reading import raw_rows, read_text
from lineproof.intake.returns import Cleaned, clean_returns
from lineproof.intake.screens import apply_screens
from lineproof.intake.series import check_riskless, read_series, riskless_return
from lineproof.intake.stopping import counted
from lineproof.problems import KnownProblem, Problem

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
_NOTHING_LEFT = "Nothing is left to study."


@dataclass(frozen=True)
class Validated:
    """What validation writes; see `frames` for the columns. `intake` holds the counts."""

    panel: pd.DataFrame
    market: pd.DataFrame
    set_aside: pd.DataFrame
    intake: dict[str, Any]


@dataclass(frozen=True)
class _Factor:
    """`months`: date, market_excess, riskless in the months both series have; and the files that bound them."""

    months: pd.DataFrame
    begins: str
    ends: str


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
    rate = read_series(riskless_file, riskless, "rate")
    rate["riskless"] = riskless_return(rate["rate"], riskless_quoted)
    check_riskless(rate, riskless, riskless_quoted)
    series = read_series(market_file, market, "return")
    factor = _common_months(series, rate, market_is, market["label"], riskless["label"])
    months = factor.months
    table = read_text(returns_file, returns)
    cleaned = clean_returns(table, returns, same_month_rows, months["date"])
    _check_conservation(cleaned)
    if cleaned.rows.empty:
        raise _nothing_kept(cleaned, returns["label"])
    panel, screened = _panel(cleaned, months, screens, missing_final_return)
    used = months[months["date"].between(panel["date"].min(), panel["date"].max())]
    return Validated(
        panel=panel,
        market=used.reset_index(drop=True),
        set_aside=_with_raw_text(cleaned.set_aside, returns_file, returns["label"]),
        intake={
            **_counts(cleaned, panel, screened, returns["label"]),
            "span": _span(cleaned, factor),
        },
    )


def _common_months(
    market: pd.DataFrame, rate: pd.DataFrame, market_is: str, market_label: str, rate_label: str
) -> _Factor:
    """The months that both series have; neither has gaps, so they are one stretch."""
    both = market.merge(rate, on="date")
    if both.empty:
        found = f"it has no month in common with {rate_label}"
        raise KnownProblem(_NOTHING_LEFT, [Problem(market_label, found, "compare the dates")])
    both["market_excess"] = both["return"] - (both["riskless"] if market_is == "total" else 0.0)
    dates = {market_label: market["date"], rate_label: rate["date"]}
    first, last = both["date"].min(), both["date"].max()
    return _Factor(
        months=both[["date", "market_excess", "riskless"]],
        begins=" and ".join(label for label, date in dates.items() if date.min() == first),
        ends=" and ".join(label for label, date in dates.items() if date.max() == last),
    )


def _check_conservation(cleaned: Cleaned) -> None:
    n_kept, n_aside = len(cleaned.rows), len(cleaned.set_aside)
    if cleaned.n_read != n_kept + n_aside + cleaned.n_duplicates:
        raise AssertionError(
            f"rows were lost: {cleaned.n_read} read, {n_kept} kept, {n_aside} set aside, "
            f"{cleaned.n_duplicates} exact duplicates"
        )


def _nothing_kept(cleaned: Cleaned, label: str) -> KnownProblem:
    """The error when every row is set aside: each fault with its first row."""
    problems = []
    for number, part in cleaned.set_aside.groupby("fault"):
        line, reason = part[["line", "reason"]].iloc[0]
        found = f"{counted(len(part), 'row')} with {FAULTS[int(number)].label}"
        problems.append(Problem(label, found, f"{cleaned.place} {line} has {reason}"))
    return KnownProblem(f"{_NOTHING_LEFT} Every row is set aside.", problems)


def _panel(
    cleaned: Cleaned,
    months: pd.DataFrame,
    screens: list[dict[str, Any]],
    missing_final_return: float | None,
) -> tuple[pd.DataFrame, list[dict[str, Any]]]:
    """The panel, and what each screen took."""
    rows, tally = cleaned.rows, cleaned.tally
    leaves = leaving_rows(rows, cleaned.last_seen)
    tally.add(26, 0 if leaves.any() else 1)
    total = with_final_returns(rows, leaves, missing_final_return, tally)
    eligible, screened = apply_screens(rows, screens)
    riskless = months.set_index("date")["riskless"]
    panel = rows.assign(
        total_return=total,
        excess_return=total - rows["date"].map(riskless),
        eligible=eligible,
        leaves=leaves,
    )
    further = [c for c in rows if c not in {*_PANEL_COLUMNS, "return_", "final_return"}]
    return panel[[*_PANEL_COLUMNS, *further]], screened


def _with_raw_text(aside: pd.DataFrame, file: str, label: str) -> pd.DataFrame:
    raw = pd.Series(raw_rows(file, aside["line"].to_numpy()), index=aside.index, dtype=str)
    table = aside.assign(raw=raw, file=pd.Series(label, index=aside.index, dtype=str))
    return table[["file", "line", "fault", "reason", "raw"]]


def _span(cleaned: Cleaned, factor: _Factor) -> list[str]:
    """What is to be said when the returns reach beyond the market or the riskless rate."""
    first, last = (month_name(date) for date in factor.months["date"].iloc[[0, -1]])
    said = []
    if cleaned.n_before:
        said.append(
            f"{counted(cleaned.n_before, 'row')} of returns dated before {first}, where {factor.begins} begins: "
            "the study begins there"
        )
    if cleaned.n_after:
        said.append(
            f"{counted(cleaned.n_after, 'row')} of returns dated after {last}, where {factor.ends} ends: "
            "the study ends there"
        )
    return said


def _counts(
    cleaned: Cleaned, panel: pd.DataFrame, screened: list[dict], label: str
) -> dict[str, Any]:
    return {
        "file": label,
        "first": month_name(panel["date"].min()),
        "last": month_name(panel["date"].max()),
        "rows_read": cleaned.n_read,
        "rows_kept": len(panel),
        "rows_set_aside": len(cleaned.set_aside),
        "exact_duplicates": cleaned.n_duplicates,
        "rows_screened": int((~panel["eligible"]).sum()),
        "n_securities": int(panel["security"].nunique()),
        "n_missing_returns": int(np.isnan(panel["total_return"]).sum()),
        "faults": cleaned.tally.report(),
        "screens": screened,
    }
